import pytest

from wavegen.core.errors import RecipeError
from wavegen.production import prepare as room
from wavegen.production.prepare import prepare, refuse_too_large


def test_what_was_rounded_stands_in_the_order_it_happened(lab):
    text = lab.HEAD.replace("2 ms", "2.0003 ms") + (
        "signal: {kind: sum, parts: [{frequency_offset: 123456 Hz, signal: {kind: carrier}}]}\n"
    )
    prepared = prepare(lab.load(text))
    assert [(note.kind, note.where) for note in prepared.notes] == [
        ("rounded", "duration"),
        ("rounded", "signal.parts[0].frequency_offset"),
    ]
    assert prepared.site.n_samples == 8001
    assert prepared.built.signal.n_samples == 8001
    assert prepared.cycle_samples == 1


def test_the_cycle_of_a_carrier_with_symbols(lab):
    prepared = lab.prepared(lab.SINGLE)
    assert (prepared.cycle_samples, prepared.site.n_samples) == (4, 8000)
    assert prepared.notes == []
    assert prepared.site.seed == 1


def test_memory_is_estimated_before_anything_is_allocated(lab, monkeypatch):
    refuse_too_large(lab.prepared(lab.SINGLE).built)
    monkeypatch.setattr(room, "MOST_MEMORY_BYTES", 1000)
    with pytest.raises(RecipeError) as caught:
        prepare(lab.load(lab.SINGLE))
    assert caught.value.where.startswith("case.yaml:4:")
    assert "GB of memory" in caught.value.problem
