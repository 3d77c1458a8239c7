import math

import numpy as np
import pytest

from wavegen.comparison.curves import ExactCurve, PointsCurve
from wavegen.comparison.difference import combined, compare, probabilities
from wavegen.core.errors import ArgumentsError
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.mapped import GatedLaw

GAUSSIAN = ExactCurve(source=GaussianLaw())


class Stretched:
    """Noise whose power is raised to the power ``a``: levels move by (a - 1) times themselves."""

    def __init__(self, largest_db, down_to=1e-4):
        # log10 of the level at q is a log10(-ln q) less that of the mean, Gamma(1 + a).
        low, high = 1.0, 2.0
        for _ in range(60):
            self.a = (low + high) / 2
            reach = np.abs(
                self.level_db(probabilities(down_to)) - GAUSSIAN.level_db(probabilities(down_to))
            ).max()
            low, high = (self.a, high) if reach < abs(largest_db) else (low, self.a)
        if largest_db < 0:
            self.a = 2 - self.a

    def level_db(self, probability):
        power = (-np.log(np.asarray(probability, np.float64))) ** self.a
        return 10 * np.log10(power / math.gamma(1 + self.a))

    def ccdf(self, level_db):
        power = 10 ** (np.asarray(level_db) / 10) * math.gamma(1 + self.a)
        return np.exp(-(power ** (1 / self.a)))


def test_probabilities_end_where_asked():
    assert probabilities(1e-4)[[0, -1]].tolist() == [0.5, 1e-4]
    assert probabilities(1e-4).size == 12
    assert probabilities(0.5).tolist() == [0.5]
    assert probabilities(3e-4)[-2:].tolist() == [5e-4, 3e-4]


@pytest.mark.parametrize("down_to", [0.0, -1.0, 0.6, float("nan")])
def test_no_probability_to_go_down_to(down_to):
    with pytest.raises(ArgumentsError) as caught:
        probabilities(down_to)
    assert caught.value.where == "--down-to"


def test_no_tolerance():
    with pytest.raises(ArgumentsError):
        compare(GAUSSIAN, GAUSSIAN, tolerance_db=0.0)


def test_exact_curves_are_decided_by_the_tolerance_alone():
    other = ExactCurve(source=Stretched(0.15))
    found = compare(GAUSSIAN, other)
    assert found.verdict == "match"
    assert found.largest_db == pytest.approx(-0.15, abs=1e-6)
    assert found.largest_at == pytest.approx(1e-4)
    assert compare(other, GAUSSIAN).largest_db == pytest.approx(0.15, abs=1e-6)
    differ = compare(GAUSSIAN, other, tolerance_db=0.1)
    assert differ.verdict == "differ"
    assert differ.decisive.probability == 1e-4


def test_records_of_one_process(noise, sampled):
    long = compare(sampled(noise(1 << 20)), sampled(noise(1 << 20)), down_to=1e-3)
    assert long.verdict == "match"
    assert long.resolved_to == 1e-3
    short = compare(sampled(noise(1 << 16)), sampled(noise(1 << 16)))
    assert short.verdict == "undecided"
    assert short.resolved_to > 1e-4


def test_records_of_different_processes(noise, sampled):
    a = Stretched(0.6).a
    samples = noise(1 << 20)
    raised = samples * np.abs(samples) ** np.float32(a - 1)
    found = compare(sampled(raised), sampled(noise(1 << 20)))
    assert found.verdict == "differ"
    assert found.decisive.difference_db > 0.2
    assert found.decisive.widest_low_db > 0.2


def test_off_times_are_alike_however_quiet():
    gated = ExactCurve(source=GatedLaw(source=GaussianLaw(), duty_fully_on=0.25, ramp=np.zeros(0)))
    level = np.arange(-60.0, 20.0, 0.05)
    share = gated.ccdf(level) + 0.75 * GaussianLaw().ccdf(level + 45)  # a floor 39 dB down
    with_floor = PointsCurve(levels=level, probabilities=share, is_exact=True)
    found = compare(gated, with_floor)
    assert found.rows[0].first_db == -np.inf
    assert found.rows[0].difference_db == 0
    assert found.verdict == "match"
    always_on = compare(gated, GAUSSIAN)
    assert always_on.verdict == "differ"


def test_a_curve_without_a_count_is_matched_where_its_points_reach():
    """Points to 1e-3 and nothing on how many samples: 10 of them lie beyond 1 % at least."""
    level = GaussianLaw().level_db(np.logspace(-0.01, -3, 60))
    curve = PointsCurve(levels=level, probabilities=GaussianLaw().ccdf(level))
    found = compare(GAUSSIAN, curve)
    assert found.verdict == "undecided"
    assert found.resolved_to == pytest.approx(0.01)
    assert compare(GAUSSIAN, curve, down_to=0.01).verdict == "match"
    # Its points go on to 1e-3 and agree, but may be those of one sample.
    assert compare(GAUSSIAN, curve, down_to=0.002).verdict == "undecided"


def test_a_wall_stands_where_it_is():
    found = compare(ExactCurve(source=ConstantLaw()), ExactCurve(source=ConstantLaw()))
    assert found.verdict == "match"
    assert found.largest_db == 0


def test_the_interval_of_a_difference_is_exact_where_one_side_is():
    level = (np.array([3.0]), np.array([1.0]))
    low, high = combined(level, (np.array([2.5]), np.array([3.2])), (level[1], level[1]))
    assert (low[0], high[0]) == pytest.approx((1.5, 2.2))
    low, _ = combined(level, (np.array([-np.inf]), np.array([3.2])), (level[1], level[1]))
    assert low[0] == -np.inf
    low, high = combined(
        level, (np.array([2.7]), np.array([3.4])), (np.array([0.6]), np.array([1.3]))
    )
    assert (low[0], high[0]) == pytest.approx((2 - math.hypot(0.3, 0.3), 2 + math.hypot(0.4, 0.4)))


@pytest.mark.parametrize(
    ("largest_db", "wrong"), [(0.0, "differ"), (0.1, "differ"), (0.3, "match")]
)
def test_wrong_verdicts_are_rare(noise, sampled, largest_db, wrong):
    """A small version of tests/speed/study_match.py: 40 pairs, of which 5 % may err.

    Five wrong ones of 40 would have a chance of 5 % at an error rate of 5 %; the study counts
    0.000 to 0.015 over 1000 pairs.
    """
    a = Stretched(largest_db).a if largest_db else 1.0
    found = []
    for _ in range(40):
        samples = noise(1 << 17)
        raised = samples * np.abs(samples) ** np.float32(a - 1)
        found.append(compare(sampled(raised), sampled(noise(1 << 17))).verdict)
    assert found.count(wrong) <= 4
