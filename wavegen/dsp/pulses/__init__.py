"""Pulse shapes: one file each, one line here."""

from wavegen.core.registry import Registry

PULSES = Registry(
    "pulse",
    {
        "root_raised_cosine": "wavegen.dsp.pulses.root_raised_cosine:RootRaisedCosine",
        "raised_cosine": "wavegen.dsp.pulses.raised_cosine:RaisedCosine",
        "rectangular": "wavegen.dsp.pulses.rectangular:Rectangular",
        "half_sine": "wavegen.dsp.pulses.half_sine:HalfSine",
        "gaussian": "wavegen.dsp.pulses.gaussian:Gaussian",
        "linearised_gaussian": "wavegen.dsp.pulses.linearised_gaussian:LinearisedGaussian",
        "taps": "wavegen.dsp.pulses.taps:Taps",
    },
)
