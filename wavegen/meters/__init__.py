"""Meters: one file each, one line here."""

from wavegen.core.registry import Registry

METERS = Registry(
    "meter",
    {
        "power": "wavegen.meters.power:PowerMeter",
        "gated_power": "wavegen.meters.gated:GatedPowerMeter",
        "mean": "wavegen.meters.mean:MeanMeter",
    },
)
