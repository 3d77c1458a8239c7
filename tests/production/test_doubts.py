import math

import numpy as np
import pytest

from wavegen.core.errors import RecipeError


def texts(document, where):
    return [note["text"] for note in document["warnings"] if note["where"] == where]


def carriers(lab, phase, level="0 dB"):
    return lab.HEAD + (
        "signal: {kind: sum, parts: [{signal: {kind: carrier}}, "
        f"{{signal: {{kind: carrier}}, phase: {phase} deg, level: {level}}}]}}\n"
    )


def test_parts_that_cancel_are_refused(lab, tmp_path):
    with pytest.raises(RecipeError) as caught:
        lab.make(carriers(lab, 180), tmp_path)
    assert caught.value.where.startswith("case.yaml:4:")
    assert "cancel" in caught.value.problem
    assert lab.left_in(tmp_path) == []


def test_a_mean_far_from_nominal_is_told(lab, tmp_path):
    # Equal carriers in phase: |2|^2 / 2 = 2, +3.01 dB; at 170 deg 4 sin(5 deg)^2 / 2 = -18.18 dB.
    for phase, db in ((0, "+3.01 dB"), (170, "-18.18 dB")):
        document = lab.make(carriers(lab, phase), tmp_path / str(phase)).document
        (text,) = texts(document, "signal")
        assert db in text
        assert document["mean"]["nominal_db"] == 0.0


def test_a_mean_that_is_nominal_is_not(lab, tmp_path):
    assert lab.make(carriers(lab, 90), tmp_path).document["warnings"] == []


@pytest.mark.parametrize(
    ("output", "allowed"),
    [
        ("average: -300 dBFS", "-90.3 dBFS"),
        ("peak: -90.4 dBFS", "-90.3 dBFS"),
        ("iq: [{format: raw, datatype: ci8}], peak: -43 dBFS", "-42.1 dBFS"),
        ("iq: [{format: raw, datatype: cf32_le}], peak: -1000 dBFS", "-600.0 dBFS"),
        ("iq: [{format: raw, datatype: cf32_le}], peak: -100000 dBFS", "-600.0 dBFS"),
    ],
)
def test_levels_below_the_smallest_step(lab, tmp_path, output, allowed):
    with pytest.raises(RecipeError) as caught:
        lab.make(lab.CARRIER + f"output: {{{output}}}\n", tmp_path)
    assert caught.value.where.startswith("case.yaml:5:")
    assert allowed in caught.value.allowed
    assert lab.left_in(tmp_path) == []


def test_float_files_take_levels_that_codes_do_not(lab, tmp_path):
    text = lab.SINGLE + "output: {iq: [{format: raw, datatype: cf32_le}], average: -500 dBFS}\n"
    made = lab.make(text, tmp_path)
    codes = np.fromfile(made.files[0], "<f4").astype(np.float64)
    assert 10 * math.log10(2 * np.mean(codes**2)) == pytest.approx(-500, abs=1e-4)
    assert made.document["mean_dbfs"] == pytest.approx(-500, abs=1e-4)
    assert made.document["warnings"] == []


def test_rounding_near_the_mean_is_told_with_its_distance(lab, tmp_path):
    text = lab.SINGLE + "output: {iq: [sigmf, {format: raw, datatype: ci8}], average: -20 dBFS}\n"
    made = lab.make(text, tmp_path)
    assert texts(made.document, "output.iq[0]") == []
    (text,) = texts(made.document, "output.iq[1]")
    # Independent: the codes against the 16-bit ones, which are 256 times finer.
    fine = lab.read_ci16(made.folder / "case.sigmf-data") * 128
    rails = np.fromfile(made.folder / "case.ci8", "i1").astype(np.float64).reshape(-1, 2)
    error = rails[:, 0] + 1j * rails[:, 1] - fine
    found = 10 * math.log10(np.mean(np.abs(fine) ** 2) / np.mean(np.abs(error) ** 2))
    told = float(text.partition("only ")[2].partition(" dB")[0])
    assert told == pytest.approx(found, abs=0.5)


def test_codes_cut_at_full_scale_are_told(lab, tmp_path):
    document = lab.make(lab.CARRIER + "output: {peak: 0 dBFS}\n", tmp_path).document
    assert document["files"][0]["n_saturated"] == 8000  # 32768 does not exist: 32767 is written
    assert texts(document, "output.iq[0]") == ["8000 I or Q codes were cut at full scale"]
