import pytest

from wavegen.reports.comparison import interval_words, look_words, rough_percent


@pytest.mark.parametrize(
    ("low", "high", "words"),
    [
        (1.0, 1.0, "+1.00 dB"),
        (0.5, 1.25, "+1.00 dB (+0.50 to +1.25)"),
        (None, 1.25, "+1.00 dB (any to +1.25)"),
    ],
)
def test_intervals(low, high, words):
    assert (
        interval_words({"difference_db": 1.0, "low_db": low, "high_db": high}, "difference_db")
        == words
    )


def test_no_figure_no_interval():
    assert interval_words({"x": None, "low_db": None, "high_db": None}, "x") == "not known"


def test_looks():
    look = {"law": "carrier plus noise", "carrier_to_noise_db": 6.96, "duty": 0.25}
    assert look_words(look) == (
        "carrier plus noise, carrier 7.0 dB over the noise, on for 25 % of the time"
    )
    assert look_words({"law": "equal tones", "n_tones": 4.0, "duty": 1}) == "equal tones, 4 of them"


def test_rough_percent():
    assert rough_percent(0.281215) == "28 %"
