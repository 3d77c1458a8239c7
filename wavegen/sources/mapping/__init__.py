"""Constellations: name in recipes -> a function without arguments that makes it."""

from wavegen.core.registry import Registry

MAPPINGS = Registry(
    "constellation",
    {
        "bpsk": "wavegen.sources.mapping.psk:bpsk",
        "qpsk": "wavegen.sources.mapping.psk:qpsk",
        "8psk": "wavegen.sources.mapping.psk:psk8",
        "16apsk": "wavegen.sources.mapping.apsk:apsk16",
        "32apsk": "wavegen.sources.mapping.apsk:apsk32",
        "16qam": "wavegen.sources.mapping.square_qam:qam16",
        "64qam": "wavegen.sources.mapping.square_qam:qam64",
        "256qam": "wavegen.sources.mapping.square_qam:qam256",
        "1024qam": "wavegen.sources.mapping.square_qam:qam1024",
        "4096qam": "wavegen.sources.mapping.square_qam:qam4096",
        "32qam": "wavegen.sources.mapping.cross_qam:qam32",
        "128qam": "wavegen.sources.mapping.cross_qam:qam128",
        "512qam": "wavegen.sources.mapping.cross_qam:qam512",
    },
)
