"""Sources of signals: one family a file, one line here."""

from wavegen.core.registry import Registry

SOURCES = Registry(
    "source",
    {
        "single_carrier": "wavegen.sources.single_carrier:SingleCarrier",
        "phase_modulation": "wavegen.sources.phase_modulation:PhaseModulation",
        "ofdm": "wavegen.sources.ofdm:Ofdm",
        "tones": "wavegen.sources.tones:Tones",
        "noise": "wavegen.sources.noise:Noise",
        "carrier": "wavegen.sources.carrier:Carrier",
        "recording": "wavegen.sources.recording:Recording",
        "shaped": "wavegen.sources.shaped:Shaped",
    },
)
