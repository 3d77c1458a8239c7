"""The tables that a recipe's ``kind:`` is looked up in."""

from __future__ import annotations

from collections.abc import Mapping

from wavegen.core.registry import Registry
from wavegen.dsp.pulses import PULSES
from wavegen.sources import SOURCES
from wavegen.sources.data import DATA
from wavegen.stages import COMBINERS, STAGES

Tables = Mapping[str, tuple[Registry, ...]]

TABLES: Tables = {
    "signal": (SOURCES, COMBINERS),
    "stage": (STAGES,),
    "pulse": (PULSES,),
    "data": (DATA,),
}
"""Name in :class:`wavegen.core.registry.Member` -> registries, first one first."""


DEFAULT_KINDS = {"data": "random"}
"""Table -> what a mapping without ``kind:`` means, unless the field's own mark says."""


def members(tables: Tables, names: tuple[str, ...]) -> dict[str, Registry]:
    """Return each kind that these tables hold, with the registry that loads it."""
    found: dict[str, Registry] = {}
    for name in names:
        for registry in tables[name]:
            for kind in registry:
                found.setdefault(kind, registry)
    return found


def kind_of_class(tables: Tables, names: tuple[str, ...], settings: type) -> str | None:
    """Return the kind whose class this is, or None if no table has it."""
    target = f"{settings.__module__}:{settings.__qualname__}"
    found = members(tables, names)
    for kind, registry in found.items():
        if registry[kind] == target:
            return kind
    for kind, registry in found.items():
        is_alike = registry[kind].rpartition(":")[2] == settings.__name__
        if is_alike and registry.load(kind) is settings:
            return kind
    return None
