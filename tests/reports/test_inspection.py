from wavegen.reports.inspection import (
    check_table,
    converted_words,
    facts_table,
    law_lines,
    listed_files,
    tree_table,
    verdict_words,
)

ROW = {
    "name": "a.wav",
    "hash": "differs",
    "verdict": "differ",
    "is_readable": True,
    "mean_difference_db": -0.0004,
    "largest_difference_db": 0.31,
    "at_probability": 1e-3,
}
CHECK = {"title": "", "name": "a", "tolerance_db": 0.05, "verdict": "differ"}


def test_a_check():
    rows = (
        ROW,
        ROW | {"hash": "missing", "is_readable": False, "mean_difference_db": None},
        ROW | {"at_probability": None, "largest_difference_db": None, "verdict": "undecided"},
    )
    table = check_table(CHECK | {"files": rows})
    assert table.rows == (
        ("a.wav", "DIFFERS", "+0.000 dB", "+0.310 dB at 0.1 %", "DIFFER"),
        ("a.wav", "no file", "", "+0.310 dB at 0.1 %", "not readable"),
        ("a.wav", "DIFFERS", "+0.000 dB", "", "undecided"),
    )
    assert table.title.startswith("a: ")


def test_words_of_a_verdict():
    for verdict, hashes, word in (
        ("match", ("equal", "equal"), "every"),
        ("match", ("equal", "differs"), "0.05 dB"),
        ("differ", ("differs",), "do not use"),
        ("undecided", ("differs",), "too few"),
    ):
        files = [{"hash": one} for one in hashes]
        assert word in verdict_words(CHECK | {"verdict": verdict, "files": files})


def test_a_conversion():
    converted = {"from": "a.wav", "format": "wav", "datatype": "ci16_le"}
    same = converted_words(converted | {"rate_factor": "1", "gain_db": 0.0})
    assert same == "from a.wav (wav ci16_le)"
    other = converted_words(converted | {"rate_factor": "3/2", "gain_db": -1.0})
    assert other.endswith(", rate x 3/2, gain -1.000 dB")
    real = converted_words(
        converted
        | {"rate_factor": "1", "gain_db": 0.0, "channel": 1}
        | {"real": {"from_hz": None, "to_hz": 3e7}}
    )
    assert real.endswith("), channel 1, complex to real around 30 MHz")


CURVE = {
    "is": "ccdf curve",
    "name": "x.csv",
    "n_points": 3,
    "lowest_level_db": -30.0,
    "highest_level_db": 9.5,
    "highest_probability": 1.0,
    "lowest_probability": None,
    "n_samples": None,
}


def test_a_curve():
    said = dict(facts_table(CURVE).rows)
    assert said["levels"] == "-30 dB to 9.5 dB"
    assert said["probabilities"] == "1"
    assert said["measured on"] == "not stated"
    assert tree_table(CURVE) is None
    assert listed_files(CURVE) is None


def test_a_tree_is_indented():
    tree = [
        {"depth": 0, "kind": "sum", "name": None, "says": ""},
        {"depth": 1, "kind": "part", "name": "wide", "says": "level -3 dB"},
    ]
    table = tree_table({"tree": tree})
    assert [row[0] for row in table.rows] == ["sum", "  part wide"]


RECORDING = {
    "is": "recording",
    "name": "x.sigmf-data",
    "title": "",
    "description": "",
    "file_format": "sigmf",
    "datatype": "ci16_le",
    "bits": None,
    "align": None,
    "n_channels": 2,
    "channel": 1,
    "is_real": False,
    "real_centre_hz": None,
    "is_power": False,
    "sample_rate_hz": 1e6,
    "n_samples": 1000,
    "duration_s": 1e-3,
    "centre_frequency_hz": 1e9,
    "level": None,
    "level_from": None,
    "labels": {"a": 1, "b": 7, "": 2, "c": 1, "d": 1, "e": 1},
    "n_annotations": 13,
    "sidecar": None,
    "hash": "none stated",
    "law": None,
}


def test_a_recording():
    said = dict(facts_table(RECORDING).rows)
    assert said["annotations"] == "7 b, 2 without a label, 1 a, 1 c, 2 others"
    assert said["channels"] == "2; this is 1"
    assert said["centre frequency"] == "1 GHz"
    assert "not stated" in said["level"]
    assert "law" not in said
    assert "title" not in said
    centred = RECORDING | {"is_real": True, "labels": {}, "real_centre_hz": 30e6}
    assert "around 30 MHz" in dict(facts_table(centred).rows)["holds"]
    real = dict(facts_table(RECORDING | {"is_real": True, "labels": {}}).rows)
    assert "analytic" in real["holds"]
    assert real["annotations"] == "none"
    power = dict(facts_table(RECORDING | {"is_power": True}).rows)
    assert power["holds"] == "power against time"


def test_a_stimulus_with_its_level():
    level = {"mean_dbfs": -12.0, "peak_dbfs": -1.0, "papr_db": 11.0}
    law = {"name": "tones", "verdict": "differs"}
    changes = {"is": "stimulus", "level": level, "level_from": "sidecar", "sidecar": "x.ccdf.json"}
    said = dict(facts_table(RECORDING | changes | {"law": law, "hash": "differs"}).rows)
    assert said["mean"] == "-12.00 dBFS"
    assert said["levels are"] == "those of its sidecar"
    assert said["law"] == "tones: DIFFERS"
    assert "DIFFERS" in said["bytes"]


def test_files_of_a_recipe_and_of_a_sidecar():
    item = {"name": None, "format": "wav", "datatype": "cf32_le"}
    asked = listed_files({"is": "recipe", "name": "run", "files": [item]})
    assert asked.rows == (("run", "wav cf32_le"),)
    there = listed_files({"is": "sidecar", "files": [item | {"name": "a", "is_there": False}]})
    assert there.rows == (("a", "wav cf32_le", "MISSING"),)


def test_each_file_against_its_law():
    rows = [{"verdict": "agrees", "statement": "agrees within 1 dB down to 1 %"}, None]
    files = [
        {"name": "a", "against_law": {"from": "measured", "channels": rows[:1]}},
        {"name": "b", "against_law": {"from": "as its sidecar says", "channels": rows}},
        {"name": "c", "against_law": None},
    ]
    assert law_lines({"files": files}) == [
        "a: against its law, measured: agrees within 1 dB down to 1 %.",
        "b, channel 0: against its law, as its sidecar says: agrees within 1 dB down to 1 %.",
    ]
