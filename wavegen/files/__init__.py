"""File formats, bytes to signals and back: one file each, one line here."""

from wavegen.core.registry import Registry

FORMATS = Registry(
    "format",
    {
        "sigmf": "wavegen.files.sigmf:Sigmf",
        "sigmf_archive": "wavegen.files.sigmf_archive:SigmfArchive",
        "wav": "wavegen.files.wav:Wav",
        "npy": "wavegen.files.npy:Npy",
        "csv": "wavegen.files.csv_iq:CsvIq",
        "mat": "wavegen.files.mat:Mat",
        "raw": "wavegen.files.raw:Raw",
    },
)
