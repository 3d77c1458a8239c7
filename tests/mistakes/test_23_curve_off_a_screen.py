"""Mistake: a field curve read off a screen, taken for the whole truth.

It has a few points, each read to some tenth of a dB; nobody says how many samples it rests on, its
last points are those of single samples, and what its levels are over is anybody's guess. Remedies:
an uncertainty of each point, by the number of samples where it is stated; only the part with ten
events beyond is compared; and points that cannot be levels over a mean are refused.
"""

import numpy as np
import pytest

from wavegen.comparison.curves import ExactCurve, PointsCurve
from wavegen.comparison.difference import compare
from wavegen.comparison.match import match
from wavegen.comparison.needed_samples import needed_samples
from wavegen.comparison.side import SideSettings
from wavegen.core.errors import FileError
from wavegen.laws.gaussian import GaussianLaw

LAW = GaussianLaw()
STIMULUS = ExactCurve(source=LAW)
NOISE = """wavegen: 1
sample_rate: 1 MHz
duration: 20 ms
signal: {kind: noise, bandwidth: 400 kHz}
"""


@pytest.fixture
def screen():
    """A curve of a million independent samples, by twelve points rounded to a tenth."""
    rng = np.random.default_rng(23)
    share = np.array([0.9, 0.5, 0.2, 0.1, 0.05, 0.02, 0.01, 5e-3, 1e-3, 1e-4, 1e-5, 2e-6])
    power = np.sort(rng.exponential(size=10**6))[::-1]
    level = 10 * np.log10(power[(share * 10**6).astype(np.int64)])
    return np.round(level, 1), share


def curve(points, **settings):
    return PointsCurve(levels=points[0], probabilities=points[1], **settings)


def test_its_tail_is_not_compared(screen):
    """The last point stands for two samples: it may lie anywhere, and nobody is misled by it."""
    counted = curve(screen, n_samples=10**6, reading_db=0.05)
    assert compare(STIMULUS, counted, down_to=1e-3).verdict == "match"
    deeper = compare(STIMULUS, counted, down_to=2e-6)
    assert deeper.verdict == "undecided"
    assert deeper.resolved_to == pytest.approx(1e-5)
    low, high = counted.level_interval(2e-6, confidence=0.95)
    assert high[0] - low[0] > 0.8


def test_without_a_count_only_ten_times_its_floor_is_compared(screen):
    field = curve(screen, reading_db=0.05)
    found = compare(STIMULUS, field, down_to=2e-6)
    assert found.verdict == "undecided"
    assert found.resolved_to == pytest.approx(2e-5)
    assert needed_samples(STIMULUS, field, found) == ()


def test_each_point_is_as_unsure_as_it_was_read(screen):
    found = compare(STIMULUS, curve(screen, n_samples=10**6, reading_db=0.3), down_to=1e-2)
    assert found.verdict == "undecided"
    assert found.decisive.high_db - found.decisive.low_db > 0.6


@pytest.mark.parametrize(
    ("change", "unit"),
    [
        (lambda level, share: (level + 4.0, share), "ccdf"),  # over something else
        (lambda level, share: (level - 37.0, share), "ccdf"),  # dBm
        (lambda level, share: (level, share), "percent"),  # a fraction called percent
    ],
)
def test_what_cannot_be_over_a_mean_is_refused(tmp_path, screen, change, unit):
    level, share = change(*screen)
    path = tmp_path / "screen.csv"
    rows = "\n".join(f"{x},{q}" for x, q in zip(level, share, strict=True))
    path.write_text(f"level_db,{unit}\n{rows}\n")
    recipe = tmp_path / "noise.yaml"
    recipe.write_text(NOISE)
    sides = (
        SideSettings(subject=str(recipe), is_recipe=True),
        SideSettings(subject=str(path)),
    )
    with pytest.raises(FileError) as caught:
        match(*sides)
    assert "mean" in caught.value.problem
