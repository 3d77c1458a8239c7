"""Where symbols come from: one file each, one line here."""

from wavegen.core.registry import Registry

DATA = Registry(
    "data",
    {
        "random": "wavegen.sources.data.random:Random",
        "prbs": "wavegen.sources.data.prbs:PseudoRandom",
        "pattern": "wavegen.sources.data.pattern:Pattern",
        "file": "wavegen.sources.data.file:File",
    },
)
