"""Stages from signal to signal: one file each, one line here."""

from wavegen.core.registry import Registry

STAGES = Registry(
    "stage",
    {
        "clip": "wavegen.stages.crest.clip:Clip",
        "scale": "wavegen.stages.channel.scale:Scale",
    },
)

COMBINERS = Registry("combiner", {"sum": "wavegen.stages.combine.sum:Sum"})
