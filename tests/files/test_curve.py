"""CCDF curves in CSV, as this program and others write them."""

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.files.curve import read_curve
from wavegen.files.read import open_recording

LEVEL = [0.0, 3.0, 6.0, 9.5]
CCDF = [0.368, 0.136, 0.0187, 1e-4]


def written(folder, text):
    path = folder / "x.csv"
    path.write_text(text, encoding="utf-8")
    return path


def rows(levels, probabilities, separator=","):
    pairs = zip(levels, probabilities, strict=True)
    return "".join(f"{a:.10g}{separator}{b:.10g}\n" for a, b in pairs)


PERCENT = [100 * item for item in CCDF]


@pytest.mark.parametrize(
    "text",
    [
        "level_db,ccdf\n" + rows(LEVEL, CCDF),
        "# n_samples: 1000000\n# from the bench\nLevel [dB];Probability [%]\n"
        + rows(LEVEL, PERCENT, ";"),
        "Level (dB);CCDF (%)\n" + rows(LEVEL, PERCENT, ";").replace(".", ","),
        "dB above average\tPercent\n" + rows(LEVEL, PERCENT, "\t"),
        "# samples: 1000000\ndB above average,Probability %\n" + rows(LEVEL, PERCENT),
        "CCDF %;Power above average [dB]\n" + rows(PERCENT, LEVEL, ";"),
        "probability,level_db\n" + rows(CCDF, LEVEL),
        "level_db,ccdf\n" + rows(LEVEL[::-1], CCDF[::-1]),
        rows(LEVEL, CCDF),
    ],
)
def test_levels_and_probabilities(tmp_path, text):
    curve = read_curve(written(tmp_path, text))
    np.testing.assert_allclose(curve.level_db, LEVEL)
    np.testing.assert_allclose(curve.probability, CCDF)
    assert curve.n_samples == (1_000_000 if "samples:" in text else None)


def test_our_own_sidecar(tmp_path):
    text = "level_db,ccdf,cdf,pdf_per_db,complex_gaussian_ccdf\n0,0.4,0.6,0.1,0.37\n1,0,1,0,0.28\n"
    curve = read_curve(written(tmp_path, text))
    np.testing.assert_array_equal(curve.probability, [0.4, 0])


@pytest.mark.parametrize(
    ("text", "word"),
    [
        ("I,Q\n1,2\n3,4\n", "i, q"),
        ("1,2,3\n4,5,6\n", "3 columns"),
        ("level_db,ccdf\n0,0.5\n", "fewer than two"),
        ("level_db,ccdf\n0,0.5\n1,0.4\n1,0.3\n", "rise"),
        ("level_db,ccdf\n0,50\n1,20\n", "50"),
        ("level_db,percent\n0,101\n1,20\n", "101 %"),
        ("level_db,ccdf\n0,0.5\n1,-0.1\n", "-0.1"),
        ("level_db,ccdf\n0,0.1\n1,0.5\n", "CDF"),
        ("level_db,ccdf\n0,0.5\n1,x\n", "line 3"),
        ("level_dbm,ccdf\n0,0.5\n1,0.4\n", "level"),
        ("", "no row"),
    ],
)
def test_what_is_no_ccdf(tmp_path, text, word):
    with pytest.raises(FileError) as caught:
        read_curve(written(tmp_path, text))
    assert word in caught.value.problem
    assert caught.value.remedy


def test_a_curve_is_no_recording(tmp_path):
    with pytest.raises(FileError) as caught:
        open_recording(written(tmp_path, "Level [dB],CCDF [%]\n" + rows(LEVEL, PERCENT)))
    assert "CCDF curve" in caught.value.problem
