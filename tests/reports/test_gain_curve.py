import copy

import pytest

from wavegen.reports.gain_curve import gain_lines, gain_tables

SIDE = {"name": "x", "is": "this loop", "duty": None, "mean_dbfs": -8.0}
ROW = {"input_db": -1.0, "gain_db": -0.1, "low_db": -0.2, "high_db": 0.0, "probability": 0.4}
DOCUMENT = {
    "gain_is": "over the gain at low levels, dB",
    "input": SIDE,
    "output": SIDE,
    "gain": [ROW | {"input_db": k * 0.5} for k in range(60)],
    "levels": [
        {
            "probability": 0.01,
            "input_over_mean_db": 6.62,
            "output_over_mean_db": 5.96,
            "change_db": -0.66,
            "compression_db": 0.92,
        }
    ],
    "compression": [
        {"fall_db": 1.0, "input": 6.8, "low": None, "high": 7.0, "unit": "dB over the mean input"}
    ],
    "over_p1db": {"share": 0.008, "low": 0.008, "high": 0.008},
    "expansion": {"gain_db": 0.5},
    "rule_of_thumb": None,
    "rapp": None,
    "assumptions": [{"name": "no_memory", "holds": None, "says": "cannot be told"}],
    "phase": "a turn of the phase does not show",
    "aligned": None,
    "model": None,
    "statement": "match: it is linear",
}


def test_tables():
    sides, gain, levels = gain_tables(DOCUMENT)
    assert len(sides.rows) == 2
    assert len(gain.rows) <= 25
    assert gain.rows[-1][0] == "29.50 dB"
    assert levels.rows[0] == ("1 %", "6.62 dB", "5.96 dB", "-0.66 dB", "0.92 dB")


def test_lines():
    lines = gain_lines(DOCUMENT)
    assert lines[0] == "Gain down by 1 dB at 6.80 dB over the mean input (any to 7.00)."
    assert lines[1] == "The input is over the 1 dB point for 0.8 % of the time."
    assert lines[-1] == "Match: it is linear."
    assert "No memory: not known: cannot be told." in lines


@pytest.mark.parametrize(
    ("key", "value", "word"),
    [
        ("aligned", {"phase_deg": 4.0}, "+4.00 degrees"),
        ("model", "device.csv", "Written: device.csv."),
        (
            "rapp",
            {"smoothness": 2.0, "input_back_off_db": 8.0, "largest_deviation_db": 0.01},
            "p = 2.00",
        ),
        (
            "rule_of_thumb",
            {
                "probability": 1e-4,
                "change_db": -2.2,
                "mean_compression_db": 0.26,
                "corrected_db": -2.46,
            },
            "compressed by 0.26 dB",
        ),
    ],
)
def test_what_is_there_is_said(key, value, word):
    document = copy.deepcopy(DOCUMENT) | {key: value}
    assert any(word in line for line in gain_lines(document))
