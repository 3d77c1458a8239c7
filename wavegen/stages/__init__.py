"""Stages from signal to signal: one file each, one line here."""

from wavegen.core.registry import Registry

STAGES = Registry(
    "stage",
    {
        "clip": "wavegen.stages.crest.clip:Clip",
        "clip_filter": "wavegen.stages.crest.clip_filter:ClipFilter",
        "delay": "wavegen.stages.channel.delay:Delay",
        "filter": "wavegen.stages.channel.filter:Filter",
        "gate": "wavegen.stages.channel.gate:Gate",
        "peak_cancellation": "wavegen.stages.crest.peak_cancellation:PeakCancellation",
        "peak_windowing": "wavegen.stages.crest.peak_windowing:PeakWindowing",
        "projection": "wavegen.stages.crest.projection:Projection",
        "resample": "wavegen.stages.channel.resample:Resample",
        "scale": "wavegen.stages.channel.scale:Scale",
    },
)

COMBINERS = Registry("combiner", {"sum": "wavegen.stages.combine.sum:Sum"})
