"""What methods say of their settings can be set, and every shelf member says something."""

import dataclasses

import pytest

from wavegen.stages import STAGES
from wavegen.stages.searchable import Searchable

SEARCHED = {kind: STAGES.load(kind) for kind in STAGES if hasattr(STAGES.load(kind), "search")}
NEEDED = {"tone_reservation": {"count": 12}}
"""What a search cannot choose."""


def test_methods_without_symbols_are_among_them():
    known = {"clip", "clip_filter", "peak_cancellation", "peak_windowing", "projection"}
    assert known <= set(SEARCHED)


@pytest.mark.parametrize("kind", SEARCHED)
def test_bounds_and_values_are_taken(kind):
    method, space = SEARCHED[kind], SEARCHED[kind].search
    assert isinstance(space, Searchable)
    fields = {item.name for item in dataclasses.fields(method)}
    needed = dict(NEEDED.get(kind, {}))
    if space.ceiling_db is not None:
        low, high = space.ceiling_db
        assert 0.1 <= low < high <= 60
        needed["ceiling_db"] = high
    for choice in space.choices:
        assert choice.field in fields
        assert len(set(choice.values)) == len(choice.values) > 1
        if choice.is_ordered:
            assert list(choice.values) == sorted(choice.values)
        for value in choice.values:
            if not choice.in_reciprocal_bands:
                made = method(**{**needed, choice.field: value})
                assert getattr(made, choice.field) == value
    if isinstance(space.pairs, str):
        assert space.pairs in fields
