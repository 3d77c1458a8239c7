import copy
import csv
import hashlib
import io
import json

import numpy as np
import pytest
from jsonschema import Draft202012Validator

from wavegen.core.site import Note
from wavegen.production.sidecar import as_csv, as_json, in_db, note_rows, rounded, schema

SOURCES = ["CARRIER", "TONES", "NOISE", "SINGLE"]


@pytest.fixture(scope="module")
def made(lab, tmp_path_factory):
    out = tmp_path_factory.mktemp("sidecar")
    extra = "output: {iq: [sigmf, {format: raw, datatype: ci8}], peak: -1 dBFS}\n"
    return {
        source: lab.make(getattr(lab, source) + extra, out, source.lower()) for source in SOURCES
    }


def stored(made):
    return json.loads(made.files[-3].read_text(encoding="utf-8"))


def test_the_schema_is_one():
    Draft202012Validator.check_schema(schema())


@pytest.mark.parametrize("source", SOURCES)
def test_the_file_beside_the_stimulus_is_valid_and_what_was_returned(made, source):
    document = stored(made[source])
    Draft202012Validator(schema()).validate(document)
    assert document == json.loads(as_json(made[source].document))


@pytest.mark.parametrize("source", SOURCES)
def test_figures_equal_numpy_on_the_codes(made, lab, source):
    folder = made[source].folder
    document = stored(made[source])
    rails = np.fromfile(folder / f"{source.lower()}.ci8", "i1").astype(np.float64).reshape(-1, 2)
    both = (
        lab.read_ci16(folder / f"{source.lower()}.sigmf-data"),
        (rails[:, 0] + 1j * rails[:, 1]) / 128,
    )
    for codes, entry in zip(both, document["files"], strict=True):
        power = np.abs(codes) ** 2
        level = 10 * np.log10(np.sort(power[power > 0]) / power.mean())
        assert entry["n_samples"] == power.size
        assert entry["n_zeros"] == np.count_nonzero(power == 0)
        assert entry["mean_dbfs"] == pytest.approx(10 * np.log10(power.mean()), abs=1e-5)
        assert entry["peak_dbfs"] == pytest.approx(10 * np.log10(power.max()), abs=1e-5)
        assert entry["papr_db"] == pytest.approx(level[-1], abs=1e-5)
        assert entry["peak_between_samples_dbfs"] >= entry["peak_dbfs"] - 1e-6
        for row in entry["levels"]:
            count = np.floor(row["probability"] * power.size * (1 + 1e-12))
            exact = level[level.size - 1 - int(count)] if count < level.size else -np.inf
            assert row["level_db"] == pytest.approx(exact, abs=0.0085)  # one bin of the histogram
            assert row["resolved"] == (row["probability"] * power.size >= 10)
        grid = np.array(entry["ccdf"]["level_db"])
        assert np.diff(grid).max() < 0.0501
        exact_db = 10 * np.log10(np.maximum(power, 1e-30) / power.mean())
        bin_db = 0.0085
        above = np.array([np.mean(exact_db > x + bin_db) for x in grid])
        below = np.array([np.mean(exact_db > x - bin_db) for x in grid])
        curve = np.array(entry["ccdf"]["probability"])
        assert np.all((curve >= above - 1e-12) & (curve <= below + 1e-12))
        assert curve[-1] == 0
        assert np.allclose(entry["cdf"]["probability"], 1 - curve, atol=1e-15)
        share = np.sum(entry["pdf"]["per_db"]) * 0.05
        assert share == pytest.approx(curve[0], abs=1e-9)


@pytest.mark.parametrize("source", SOURCES)
def test_hash_and_names_are_those_of_the_files(made, source):
    folder = made[source].folder
    for entry in stored(made[source])["files"]:
        assert hashlib.sha512((folder / entry["name"]).read_bytes()).hexdigest() == entry["sha512"]
        assert all((folder / name).is_file() for name in entry["all_names"])


@pytest.mark.parametrize("source", SOURCES)
def test_the_top_level_repeats_the_first_file(made, source):
    document = stored(made[source])
    first = document["files"][0]
    for key in set(first) - {
        "name",
        "all_names",
        "format",
        "datatype",
        "sha512",
        "n_saturated",
        "rounding_noise_dbc",
        "bits",
        "align",
        "real",
        "channels",
        "against_law",
    }:
        assert document[key] == first[key], key


def test_what_was_made_and_how(made):
    document = stored(made["SINGLE"])
    text = document["recipe"]["text"]
    assert hashlib.sha256(text.encode()).hexdigest() == document["recipe"]["sha256"]
    assert (document["recipe"]["name"], document["recipe"]["overrides"]) == ("single", [])
    assert document["seed"] == 1
    assert document["versions"]["numpy"] == np.__version__
    assert document["sample_rate_exact_hz"] == "4000000"
    assert document["duration_s"] == 0.002
    assert document["loop"]["cycle_samples"] == 4
    assert document["loop"]["seam"]["is_clean"]
    assert document["scaling"]["peak_dbfs"] == pytest.approx(-1, abs=1e-6)
    assert document["law"]["verdict"] == "undecided"  # 2000 symbols
    assert document["no_law"] is None
    assert "exposure" in document["safety"]


def test_the_reference_is_the_complex_gaussian(made):
    reference = stored(made["NOISE"])["reference"]
    level = np.array(reference["level_db"])
    assert reference["probability"] == pytest.approx(np.exp(-(10 ** (level / 10))), rel=1e-9)


def test_the_law_of_tones_is_their_own_period(made):
    law = stored(made["TONES"])["law"]
    assert law["verdict"] == "agrees"
    assert (
        law["n_instants"] == 400
    )  # the envelope of 10 kHz spacing closes after 400 samples at 4 MHz
    # Independent: eight tones with Newman phases pi (k - 1)^2 / 8 on a dense grid.
    k, t = np.arange(8), np.arange(200_000) / 200_000
    wave = np.exp(1j * np.pi * k**2 / 8) @ np.exp(2j * np.pi * np.outer(k, t)) / np.sqrt(8)
    power = np.sort(np.abs(wave) ** 2)
    for row in law["levels"][:3]:
        exact = 10 * np.log10(power[-1 - int(row["probability"] * t.size)])
        assert row["level_db"] == pytest.approx(exact, abs=0.01)


def paths(value, path=()):
    yield path
    if isinstance(value, dict):
        for key in value:
            yield from paths(value[key], (*path, key))
    elif isinstance(value, list) and value:
        yield from paths(value[0], (*path, 0))


def shortened(value):
    """Return the document with lists of three items at most: thousands would only take time."""
    if isinstance(value, dict):
        return {key: shortened(item) for key, item in value.items()}
    return [shortened(item) for item in value[:3]] if isinstance(value, list) else value


OPTIONAL = {"n_instants", "asked", "given"}


def test_the_schema_refuses_what_is_missing_or_unknown_or_of_another_type(made):
    validator = Draft202012Validator(schema())
    good = shortened(stored(made["TONES"]))
    assert validator.is_valid(good)
    free = {"versions", "loop", "reference", "text", "seam"}
    for path in paths(good):
        if not path or set(path) & free:
            continue
        last = path[-1]
        broken = copy.deepcopy(good)
        owner = broken
        for step in path[:-1]:
            owner = owner[step]
        owner[last] = {"unheard": "of"}
        assert not validator.is_valid(broken), path
        if isinstance(last, str) and last not in OPTIONAL:
            del owner[last]
            assert not validator.is_valid(broken), path
    for key, value in (
        ("version", 2),
        ("format", "other"),
        ("n_samples", 0),
        ("sample_rate_exact_hz", "4e6"),
        ("files", []),
        ("more", 1),
    ):
        assert not validator.is_valid(good | {key: value}), key


def test_curves_as_columns(made):
    document = made["SINGLE"].document
    rows = list(csv.DictReader(io.StringIO(made["SINGLE"].files[-2].read_text())))
    assert as_csv(document) == made["SINGLE"].files[-2].read_text()
    assert [float(row["level_db"]) for row in rows] == document["ccdf"]["level_db"]
    assert [float(row["ccdf"]) for row in rows] == document["ccdf"]["probability"]
    assert [float(row["pdf_per_db"]) for row in rows] == document["pdf"]["per_db"]
    assert set(rows[0]) == {"level_db", "ccdf", "cdf", "pdf_per_db", "complex_gaussian_ccdf"}


def test_json_is_strict_and_short():
    text = as_json({"a": [1.0, -2.5e-9, 3], "t": "[1, 2]\n", "n": None})
    assert json.loads(text) == {"a": [1.0, -2.5e-9, 3], "t": "[1, 2]\n", "n": None}
    assert len(text.splitlines()) == 5
    with pytest.raises(ValueError, match="JSON compliant"):
        as_json({"a": float("nan")})


def test_figures_without_a_value_are_null():
    assert rounded(float("-inf")) is None
    assert rounded(1.23456789) == 1.234568
    assert in_db(None) is None
    assert in_db(0.0) is None
    assert in_db(2.0) == 3.0103


def test_notes_have_no_empty_cells():
    note = Note(kind="warning", where="signal", text="x")
    assert note_rows([note]) == [{"kind": "warning", "where": "signal", "text": "x"}]
