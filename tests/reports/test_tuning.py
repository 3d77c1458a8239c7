from wavegen.reports.tuning import (
    confirmation_words,
    method_table,
    outcome_words,
    settings_words,
    unsuited_words,
)

BEFORE = {
    "method": "", "settings": {}, "level_db": 9.66, "evm_percent": 0.0, "aclr_db": 69.5,
    "output_dbm": None, "input_dbm": None, "fft_pairs": 0.0,
}  # fmt: skip
BEST = {
    **BEFORE, "method": "clip_filter", "settings": {"ceiling_db": 5.625, "rounds": 16},
    "level_db": 5.68, "evm_percent": 7.86, "fft_pairs": 16.0, "gained_db": 3.98,
    "bound_db": 5.7, "over_bound_db": -0.02, "level_before_db": 9.66, "binding": "EVM",
    "margin_db": 0.15, "peak_db": 5.7,
}  # fmt: skip
CONFIRMED = {
    "verdict": "confirmed",
    "seeds": [6, 7, 8, 9],
    "level_db": {"mean": 5.68, "low": 5.66, "high": None},
    "evm_percent": {"mean": 7.82, "low": 7.69, "high": 7.95},
    "margin_db": {"mean": 0.19, "low": 0.05, "high": 0.34},
    "output_dbm": None,
}
DOCUMENT = {
    "objective": "level_db",
    "probability": 1e-4,
    "limits": {
        "told": "EVM up to 8 %",
        "aclr_db": None,
        "keeps_channel_limits": False,
        "keeps_mask": False,
    },
    "channels": "NR BS FR1, 20 MHz",
    "before": BEFORE,
    "best": BEST,
    "nearest": None,
    "is_unfinished": False,
    "reference": {"settings": {"rounds": 50}},
    "confirmation": CONFIRMED,
    "device": None,
    "methods": [
        {"method": "clip_filter", "state": "kept", "best": BEST, "reason": "", "is_cut": True},
        {
            "method": "clip",
            "state": "missed",
            "best": {**BEFORE, "method": "clip"},
            "reason": "",
            "is_cut": False,
        },
        {
            "method": "tone_reservation",
            "state": "unsuited",
            "best": None,
            "reason": "no tones",
            "is_cut": False,
        },
    ],
}


def test_one_row_a_method_and_one_before():
    table = method_table(DOCUMENT, title="Pier")
    assert "0.01 %" in table.title
    assert [row[0] for row in table.rows] == [
        "as it is",
        "clip filter (cut short): ceiling 5.625 dB, rounds 16",
        "clip (not kept)",
    ]
    assert table.rows[1][1:] == ("5.68", "7.86", "69.5", "-0.02", "16", "3.98")


def test_behind_an_amplifier_power_stands_there():
    best = {**BEST, "output_dbm": 23.69, "input_dbm": -5.77, "bound_db": None}
    document = {
        **DOCUMENT, "objective": "output_dbm", "best": best, "device": "amp.csv",
        "reference": None,
        "methods": [{**DOCUMENT["methods"][0], "best": best}],
        "before": {**BEFORE, "output_dbm": 23.4},
    }  # fmt: skip
    table = method_table(document, title="Pier")
    assert "dBm out" in table.headings
    assert table.rows[1][4] == "23.69"
    said = " ".join(outcome_words(document))
    assert "23.69 dBm behind amp.csv" in said
    assert "peak at its input is -0.07 dBm" in said


def test_what_is_said_of_the_best():
    said = " ".join(outcome_words(DOCUMENT))
    assert "5.68 dB instead of 9.66 dB" in said
    assert "0.02 dB below" in said
    assert "goes on from here" in said
    assert "Confirmed on other data (4 seeds" in said
    assert "(from 5.66 on: the loops are too short for the other end)" in said


def test_what_is_said_where_nothing_keeps_the_limits():
    nearest = {**BEST, "binding": "ACLR", "margin_db": -5.5, "aclr_db": 39.5}
    document = {**DOCUMENT, "best": None, "nearest": nearest}
    said = " ".join(outcome_words(document))
    assert "No method keeps the limits" in said
    assert "ACLR misses its limit by 5.50 dB" in said
    late = " ".join(outcome_words({**document, "is_unfinished": True}))
    assert "time was over" in late
    untouched = {**document, "nearest": {**nearest, "method": "", "settings": {}}}
    assert "the signal as it is" in " ".join(outcome_words(untouched))


def test_what_is_said_where_no_method_suits():
    unsuited = {**DOCUMENT["methods"][0], "state": "unsuited", "reason": "no symbols", "best": None}
    nearest = {**BEST, "method": "", "settings": {}, "margin_db": 60.0, "binding": "EVM"}
    document = {**DOCUMENT, "best": None, "nearest": nearest, "methods": [unsuited]}
    said = " ".join(outcome_words(document))
    assert "No method suits this signal: " in said
    assert ": no symbols. The signal as it is keeps the limits." in said
    assert "misses" not in said


def test_other_verdicts():
    for verdict, word in (("undecided", "UNDECIDED"), ("missed", "MISSED")):
        document = {**DOCUMENT, "confirmation": {**CONFIRMED, "verdict": verdict}}
        assert word in confirmation_words(document)
    document = {**DOCUMENT, "confirmation": {**CONFIRMED, "verdict": "no_other_data"}}
    assert "this loop is all there is" in confirmation_words(document)


def test_why_a_method_asked_for_was_left_out():
    assert unsuited_words(DOCUMENT, frozenset({"tone_reservation"})) == [
        "tone_reservation: no tones"
    ]
    assert unsuited_words(DOCUMENT, frozenset()) == []


def test_settings_as_recipes_name_them():
    told = settings_words({"ceiling_db": 6.0, "length": "500 ns", "suppression_db": None})
    assert told == "ceiling 6 dB, length 500 ns"


def test_nothing_gained():
    assert "Nothing is gained" not in " ".join(outcome_words(DOCUMENT))
    document = {**DOCUMENT, "best": {**BEST, "gained_db": -0.01}}
    assert "Nothing is gained" in " ".join(outcome_words(document))


def test_neighbours_that_nothing_keeps_clear():
    document = {**DOCUMENT, "best": {**BEST, "aclr_db": 27.5}}
    assert "falls from 69.5 to 27.5 dB" in " ".join(outcome_words(document))
    kept = {**document, "limits": {**DOCUMENT["limits"], "aclr_db": 25.0}}
    assert "falls" not in " ".join(outcome_words(kept))
    assert "falls" not in " ".join(outcome_words(DOCUMENT))
