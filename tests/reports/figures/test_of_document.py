"""Figures of any document."""

import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.reports.figures.of_document import figures_in, pictures_in


def test_a_stimulus_and_a_measurement(made_document, measured_document):
    for document in (made_document, measured_document):
        found = figures_in(document)
        assert list(found) == ["ccdf", "density"]
        assert found["ccdf"].axes[0].get_yscale() == "log"


def test_each_kind_of_comparison_is_known():
    trial = {"method": "clip", "evm_percent": 3.0, "level_db": 7.0}
    document = {
        "format": "wavegen.tuning",
        "evaluations": [trial],
        "best": trial,
        "probability": 1e-4,
        "limits": {"evm_percent": 8.0},
    }
    assert [item.name for item in pictures_in(document)] == ["trade-off"]
    assert pictures_in({"format": "wavegen.gain_curve", "gain": [], "levels": []}) == []


def test_what_holds_no_curve_is_refused():
    with pytest.raises(ArgumentsError) as caught:
        figures_in({"format": "wavegen.fidelity"})
    assert "fidelity" in caught.value.problem
