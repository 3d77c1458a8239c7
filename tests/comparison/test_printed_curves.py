import numpy as np
import pytest

from wavegen.comparison.printed_curves import check_over_mean, loop_curve, read_points
from wavegen.core.errors import FileError
from wavegen.laws.gaussian import GaussianLaw

LAW = GaussianLaw()
DECADES = np.array([0.1, 0.01, 0.001, 0.0001])


def test_a_loop_is_exact_within_its_grid():
    level = np.arange(-10, 9, 0.05)
    curve = loop_curve(level.tolist(), LAW.ccdf(level).tolist())
    assert curve.is_exact
    low, high = curve.level_interval(0.01, confidence=0.95)
    assert high[0] - low[0] == pytest.approx(0.05, abs=1e-3)


def test_a_table_is_read_with_what_is_told_of_it(tmp_path):
    path = tmp_path / "curve.csv"
    level = np.arange(-20, 10, 0.5)
    rows = "\n".join(f"{x},{float(LAW.ccdf(x))}" for x in level)
    path.write_text(f"# n_samples: 1000\nlevel_db,ccdf\n{rows}\n")
    assert read_points(path, n_samples=None, reading_db=0.0).n_samples == 1000
    told = read_points(path, n_samples=77, reading_db=0.1)
    assert (told.n_samples, told.reading_db) == (77, 0.1)
    path.write_text("level_db,ccdf\n1,0.3\n2,0.1\n3,0\n")
    with pytest.raises(FileError) as caught:
        read_points(path, n_samples=None, reading_db=0.0)
    assert "probabilities" in caught.value.problem


@pytest.mark.parametrize(
    ("level_db", "probability", "is_refused"),
    [
        (np.arange(-20.0, 10), LAW.ccdf(np.arange(-20.0, 10)), False),
        (np.arange(-20.0, 10), LAW.ccdf(np.arange(-20.0, 10)) / 100, True),  # percent of percent
        (np.arange(-20.0, 10) + 3, LAW.ccdf(np.arange(-20.0, 10)), True),  # over something else
        (np.arange(-20.0, 10) - 40, LAW.ccdf(np.arange(-20.0, 10)), True),  # dBm
        (LAW.level_db(DECADES), DECADES, False),  # four points tell little, and refuse little
        (LAW.level_db(DECADES) + 20, DECADES, True),
    ],
)
def test_levels_that_cannot_be_over_the_mean_are_refused(level_db, probability, is_refused):
    if not is_refused:
        check_over_mean("x.csv", level_db, probability)
        return
    with pytest.raises(FileError) as caught:
        check_over_mean("x.csv", level_db, probability)
    assert caught.value.where == "x.csv"
    assert "mean" in caught.value.problem
