"""A shaped stimulus in words."""

import pytest

from wavegen.reports.shape import lines, tables


def document(**more):
    row = {"probability": 0.01, "stimulus_db": 5.0, "field_db": 5.1, "difference_db": -0.1}
    base = {
        "verdict": "differ",
        "largest_difference_db": 0.1,
        "tolerance_db": 0.05,
        "down_to": 0.001,
        "levels": [row],
        "levels_are": "of all of the time",
        "recipe": "x.yaml",
        "files": [{"name": "x.sigmf-data", "format": "sigmf", "datatype": "ci16_le"}],
        "skipped_samples": 0,
        "spectrum": None,
        "gate": None,
    }
    return base | more


def test_levels_and_files():
    levels, files = tables(document())
    assert levels.rows == (("1 %", "5.00 dB", "5.10 dB", "-0.100 dB"),)
    assert [row[0] for row in files.rows] == ["x.yaml", "x.sigmf-data"]


@pytest.mark.parametrize(
    ("more", "word"),
    [
        ({}, "DIFFER"),
        ({"verdict": "match"}, "match: every level down to 0.1 %"),
        ({"largest_difference_db": None}, "no level"),
        ({"skipped_samples": 7}, "first 7 samples"),
        (
            {
                "spectrum": {
                    "occupied_bandwidth_hz": 5e6,
                    "largest_difference_db": -0.3,
                    "is_over": "the field's",
                }
            },
            "within 0.30 dB",
        ),
        ({"gate": {"is": "regular", "duty": 0.25, "period_samples": 400}}, "25 % of 400"),
    ],
)
def test_sentences(more, word):
    assert word in " ".join(lines(document(**more)))
