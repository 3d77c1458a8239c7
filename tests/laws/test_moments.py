import numpy as np
import pytest

from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.mapped import clip_law
from wavegen.laws.moments import moment_of, moment_of_tail


class Plain:
    """A law without moments of its own."""

    def __init__(self, law):
        self.ccdf, self.level_db, self.peak_db = law.ccdf, law.level_db, law.peak_db


@pytest.mark.parametrize(("order", "exact"), [(2, 2.0), (3, 6.0)])
def test_of_noise_by_its_levels(order, exact):
    value, error = moment_of(Plain(GaussianLaw()), order)
    assert value == pytest.approx(exact, rel=1e-5)
    assert error == pytest.approx(order * 0.001 * np.log(10) / 10)
    assert moment_of(GaussianLaw(), order) == (exact, 0.0)


def test_of_a_wall():
    # E min(p, g)^2 = 2 (1 - (1 + g) e^-g) for an exponential p (derivation: by parts).
    law = clip_law(GaussianLaw(), 4.0)
    g = law.ratio
    second = 2 * (1 - (1 + g) * np.exp(-g)) / law.mean**2
    # Half a step of 0.005 dB at the wall.
    assert moment_of(law, 2)[0] == pytest.approx(second, rel=1e-3)
    assert moment_of(ConstantLaw(), 3)[0] == pytest.approx(1, rel=2e-3)


def test_of_a_tail_on_a_grid():
    level = np.linspace(-60, 0, 6001)
    even = 1 - 10 ** (level / 10)  # power even between 0 and 1: E p^k = 1 / (k + 1)
    assert moment_of_tail(level, even, 2) == pytest.approx(4 / 3, rel=1e-5)
    assert moment_of_tail(level, even, 3) == pytest.approx(2, rel=1e-5)
