"""The tables of kinds."""

import pytest

from wavegen.core.registry import Registry
from wavegen.recipe.tables import DEFAULT_KINDS, TABLES, Tables, kind_of_class, members


def test_a_signal_is_a_source_or_a_combiner() -> None:
    found = members(TABLES, ("signal",))
    assert {"noise", "sum"} <= set(found)
    assert "clip" not in found


def test_kinds_are_told_apart_in_every_table() -> None:
    for registries in TABLES.values():
        names = [kind for registry in registries for kind in registry]
        assert len(names) == len(set(names))


def test_defaults_are_members() -> None:
    for table, kind in DEFAULT_KINDS.items():
        assert kind in members(TABLES, (table,))


def test_a_class_finds_its_kind(tables: Tables) -> None:
    pulses = tables["pulse"][0]
    assert kind_of_class(tables, ("pulse",), pulses.load("round")) == "round"
    assert kind_of_class(tables, ("pulse",), int) is None


def test_an_unknown_table_is_our_bug(tables: Tables) -> None:
    with pytest.raises(KeyError):
        members(tables, ("pulses",))


def test_the_first_table_wins() -> None:
    first, second = Registry("a", {"x": "m:A"}), Registry("b", {"x": "m:B", "y": "m:C"})
    found = members({"t": (first, second)}, ("t",))
    assert found == {"x": first, "y": second}
