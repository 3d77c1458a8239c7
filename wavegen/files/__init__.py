"""File formats, bytes to signals and back: one file each, one line here."""

from wavegen.core.registry import Registry

FORMATS = Registry(
    "format",
    {
        "sigmf": "wavegen.files.sigmf:Sigmf",
        "wav": "wavegen.files.wav:Wav",
        "raw": "wavegen.files.raw:Raw",
    },
)
