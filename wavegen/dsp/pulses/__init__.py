"""Pulse shapes: one file each, one line here."""

from wavegen.core.registry import Registry

PULSES = Registry(
    "pulse",
    {
        "root_raised_cosine": "wavegen.dsp.pulses.root_raised_cosine:RootRaisedCosine",
        "raised_cosine": "wavegen.dsp.pulses.raised_cosine:RaisedCosine",
        "rectangular": "wavegen.dsp.pulses.rectangular:Rectangular",
        "taps": "wavegen.dsp.pulses.taps:Taps",
    },
)
