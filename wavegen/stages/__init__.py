"""Stages from signal to signal: one file each, one line here."""

from wavegen.core.registry import Registry

STAGES = Registry(
    "stage",
    {
        "clip": "wavegen.stages.crest.clip:Clip",
        "delay": "wavegen.stages.channel.delay:Delay",
        "filter": "wavegen.stages.channel.filter:Filter",
        "gate": "wavegen.stages.channel.gate:Gate",
        "resample": "wavegen.stages.channel.resample:Resample",
        "scale": "wavegen.stages.channel.scale:Scale",
    },
)

COMBINERS = Registry("combiner", {"sum": "wavegen.stages.combine.sum:Sum"})
