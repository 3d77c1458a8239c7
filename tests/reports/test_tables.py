import pytest

from wavegen.reports.tables import (
    bench_table,
    channel_table,
    fault_words,
    file_table,
    fixed,
    law_words,
    length_words,
    level_table,
    percent,
    process_table,
    seam_words,
    summary_table,
    verdict_lines,
)

LEVELS = [
    {"probability": 0.1, "level_db": 3.6221, "resolved": True},
    {"probability": 1e-3, "level_db": 8.3, "resolved": False},
    {"probability": 1e-6, "level_db": 9.0, "resolved": False},
]
FIGURES = {
    "sample_rate_hz": 3.84e6,
    "duration_s": 0.002,
    "n_samples": 7680,
    "mean_dbfs": -10.0,
    "peak_dbfs": -1.5,
    "peak_between_samples_dbfs": -1.0,
    "papr_db": 8.5,
    "papr_between_samples_db": 9.0,
    "n_zeros": 0,
    "levels": LEVELS,
}


def cells(document, **options):
    return dict(summary_table(FIGURES | document, title="x").rows, **options)


def test_the_main_figures_with_units():
    assert cells({}) == {
        "sample rate": "3.84 MHz",
        "length": "2 ms, 7680 samples",
        "mean": "-10.00 dBFS",
        "peak at samples": "-1.50 dBFS",
        "peak between samples": "-1.00 dBFS",
        "PAPR at samples": "8.50 dB",
        "PAPR between samples": "9.00 dB",
    }


def test_dbm_never_without_the_peak_envelope_power():
    rows = summary_table(
        FIGURES | {"mean_dbm": -20.0, "peak_envelope_dbm": -11.0, "n_zeros": 3}, title="x"
    ).rows
    assert ("mean", "-20.00 dBm") in rows
    assert rows[rows.index(("mean", "-20.00 dBm")) + 1] == ("peak envelope power", "-11.00 dBm")
    assert ("exact zeros", "3 samples") in rows


@pytest.mark.parametrize(
    ("seam", "words"),
    [
        ({"is_clean": True, "at_seam_dbc": -80.04, "n_stretches": 20}, "clean, -80.0 dBc"),
        ({"is_clean": False, "at_seam_dbc": -30.0, "n_stretches": 20}, "BROKEN, -30.0 dBc"),
        ({"is_clean": True, "at_seam_dbc": -30.0, "n_stretches": 0}, "not tested"),
    ],
)
def test_how_a_loop_closes(seam, words):
    assert words in seam_words(seam)
    assert words in cells({"loop": {"seam": seam}})["loop seam"]
    assert words in cells({"seam": seam})["loop seam"]


def test_levels_of_a_loop_are_exact_and_those_of_a_recording_need_samples():
    loop = level_table(FIGURES | {"law": None}).rows
    assert loop == (
        ("10 %", "3.62 dB", "3.62 dB"),
        ("0.1 %", "8.30 dB", "8.39 dB"),
        ("0.0001 %", "loop too short", "11.40 dB"),
    )
    recording = level_table(FIGURES | {"law": None, "is": "a recording"}).rows
    assert [row[1] for row in recording] == ["3.62 dB", "too few samples", "too few samples"]


def test_a_level_that_does_not_exist():
    levels = [{"probability": 0.1, "level_db": None, "resolved": True}]
    assert level_table(FIGURES | {"levels": levels}).rows[0][1] == "too few samples"


def test_the_law_has_a_column():
    law = {"levels": [{"probability": row["probability"], "level_db": 1.0} for row in LEVELS]}
    table = level_table(FIGURES | {"law": law})
    assert table.headings[-1] == "law"
    assert {row[-1] for row in table.rows} == {"1.00 dB"}


@pytest.mark.parametrize(
    ("verdict", "words"),
    [("agrees", "agrees with"), ("differs", "DIFFERS FROM"), ("undecided", "not enough")],
)
def test_verdicts(verdict, words):
    said = law_words({"name": "8 tones", "verdict": verdict, "n_instants": 400})
    assert "8 tones" in said
    assert words in said
    assert ("400 different instants" in said) == (verdict != "undecided")


def test_a_verdict_is_told_in_the_words_of_its_statement():
    law = {"name": "x", "verdict": "differs", "statement": "differs: level at 1 %: +0.3 dB"}
    assert law_words(law) == "Law: x; the file DIFFERS FROM it: level at 1 %: +0.3 dB."
    law = {"name": "x", "verdict": "agrees", "statement": "agrees within 0.2 dB down to 1 %"}
    assert law_words(law) == "Law: x; the file agrees with it within 0.2 dB down to 1 %."


def test_what_is_said_of_the_verdict():
    law = {"name": "x", "verdict": "agrees", "statement": "agrees at every level"}
    second = {"law": None, "no_law": "y has no law"}
    best = {
        "first_seed": 3, "n_tried": 5, "chosen_seed": 6, "down_to": 0.01,
        "deviation_db": 0.0314, "median_deviation_db": 0.1,
    }  # fmt: skip
    files = [
        {"name": "a", "against_law": {"verdict": "agrees", "statement": "agrees at every level"}},
        {"name": "b", "against_law": {"verdict": "differs", "statement": "differs: a fault"}},
    ]
    document = {"law": law, "second_channel": second, "best_of": best, "files": files}
    lines = verdict_lines(document)
    assert lines[0].startswith("Seed 6 of 3 to 7: its levels lie within 0.031 dB")
    assert lines[1:] == [law_words(law), "Channel 1: No law: y has no law.", "b: differs: a fault."]
    plain = {"law": None, "no_law": "z has no law", "files": files[:1]}
    assert verdict_lines(plain) == ["No law: z has no law."]


def test_the_process_beside_the_loop():
    row = {
        "probability": 10**-1.5, "law_db": 5.0, "level_db": 5.1, "low_db": 4.9, "high_db": None,
        "is_within": False, "detectable_db": None,
    }  # fmt: skip
    table = process_table({"of": "all of the time", "compared": [row]})
    assert table.rows == (("3.16 %", "5.00 dB", "5.10 dB", "4.90 dB to open", ""),)
    assert "(" not in table.title
    gated = process_table({"of": "the on-time, ramps excluded", "compared": [row]})
    assert gated.title.endswith("(the on-time, ramps excluded)")
    assert process_table({"of": "x", "compared": []}) is None
    assert process_table(None) is None


def test_the_length_that_shows_a_fault():
    fault = {
        "fault_db": 0.1, "probability": 1e-3, "found_in": 0.8, "n_samples": 1_234_567,
        "duration_s": 0.0123,
    }  # fmt: skip
    said = fault_words(fault)
    assert "0.1 dB at 0.1 % is found in 80 % of loops of about 1200000 samples (12 ms)" in said
    assert "any loop" in fault_words(fault | {"n_samples": None})


def test_the_bench():
    assert bench_table({"bench": None}) is None
    place = {"name": "amp", "average_dbm": -10.0, "peak_envelope_dbm": -1.0}
    limits = {"average_limit_dbm": 3.5, "peak_limit_dbm": 10.0}
    table = bench_table({"bench": {"path": [place, place | limits]}})
    assert table.headings[1:3] == ("average", "peak envelope")
    assert table.rows == (
        ("amp", "-10.00 dBm", "-1.00 dBm", "none given"),
        ("amp", "-10.00 dBm", "-1.00 dBm", "average 3.5 dBm, peak 10 dBm"),
    )


def test_files_with_their_formats_once():
    item = {"name": "a.x", "all_names": ["a.x", "a.y"], "format": "sigmf", "datatype": "ci8"}
    assert file_table({"files": [item]}).rows == (("a.x", "sigmf ci8"), ("a.y", ""))


def test_words():
    assert [percent(p) for p in (0.1, 1e-6, 0.05)] == ["10 %", "0.0001 %", "5 %"]
    assert fixed(-0.004, "dB") == "0.00 dB"
    assert length_words(1.0, 2) == "1 s, 2 samples"


def test_a_power_series_has_no_peak_between_samples():
    found = {"peak_between_samples_dbfs": None, "papr_between_samples_db": None}
    rows = cells(found | {"mean_dbm": -10.0, "peak_envelope_dbm": -1.5})
    assert rows["peak between samples"] == rows["PAPR between samples"]
    assert "power series" in rows["peak between samples"]
    assert rows["peak envelope power"] == "-1.50 dBm, of the largest sample"


def test_files_say_how_they_hold_their_samples():
    item = {"name": "a.x", "all_names": ["a.x"], "format": "raw", "datatype": "ci16_le"}
    told = item | {"bits": 14, "align": "left", "channels": [FIGURES, FIGURES]}
    real = item | {"datatype": "ri16_le", "real": {"centre_hz": 3e7}}
    rows = file_table({"files": [item, told, real]}).rows
    assert [row[1] for row in rows] == [
        "raw ci16_le",
        "raw ci16_le, 14 bits at the left, 2 channels",
        "raw ri16_le, around 30 MHz",
    ]


def test_both_channels_side_by_side():
    assert channel_table({"files": [{"channels": None}]}) is None
    table = channel_table({"files": [{"channels": [FIGURES, FIGURES | {"mean_dbfs": -16.0}]}]})
    assert table is not None
    assert table.headings == ("figure", "channel 0", "channel 1")
    assert table.rows[0] == ("mean", "-10.00 dBFS", "-16.00 dBFS")


def test_the_places_of_each_channel_are_told_apart():
    place = {"name": "pad", "average_dbm": 0.0, "peak_envelope_dbm": 9.0}
    table = bench_table({"bench": {"path": [place | {"channel": 0}, place | {"channel": 1}]}})
    assert table is not None
    assert [row[0] for row in table.rows] == ["pad, channel 0", "pad, channel 1"]
