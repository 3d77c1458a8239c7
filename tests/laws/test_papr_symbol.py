import math

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.laws.papr_symbol import IndependentSamples, LevelCrossing, SelfNormalised

LAWS = [LevelCrossing.of_equal(300), IndependentSamples(n=300), SelfNormalised(n=300)]


@pytest.mark.parametrize("law", LAWS, ids=lambda law: type(law).__name__)
class TestEveryLaw:
    def test_share_and_value_are_inverse(self, law):
        share = np.array([[0.9, 0.1], [1e-3, 1e-6]])
        assert law.share_of_symbols(law.papr_db(share)) == pytest.approx(share, rel=1e-6)

    def test_it_is_no_law_of_the_envelope(self, law):
        assert law.name.startswith("PAPR per symbol")
        assert not hasattr(law, "ccdf")
        assert not hasattr(law, "level_db")

    def test_a_share_is_checked(self, law):
        with pytest.raises(SignalError):
            law.papr_db(-0.1)

    def test_it_falls(self, law):
        shares = law.share_of_symbols(np.linspace(-5, 20, 300))
        assert np.all(np.diff(shares) <= 1e-12)
        assert shares[0] == pytest.approx(1)


def test_a_spectrum_of_equal_subcarriers_is_a_flat_band():
    law = LevelCrossing.of_spectrum(np.arange(40, 140), np.full(100, 0.3))
    assert law.rms_cycles == pytest.approx(100 / math.sqrt(12), rel=1e-12)


def test_only_the_rms_bandwidth_matters():
    # Two lines at +-10: 10, and 1/12 for their own width.
    law = LevelCrossing.of_spectrum([-10, 10], [1, 1])
    assert law.rms_cycles == pytest.approx(math.sqrt(100 + 1 / 12))


@pytest.mark.parametrize("n", [2, 5, 16, 17, 64, 500])
def test_the_mean_over_the_own_mean_is_the_harmonic_number(n):
    # E z = integral of P(z > x) from 0: 1 + 1/2 + ... + 1/n (Fisher 1929; NIST, 2025).
    z = np.linspace(1, min(n, 60), 4001)
    mean = 1 + np.trapezoid(SelfNormalised(n=n).share_of_symbols(10 * np.log10(z)), z)
    assert mean == pytest.approx(np.sum(1 / np.arange(1, n + 1)), rel=2e-5)


@pytest.mark.parametrize("n", [20, 64, 256])
@pytest.mark.parametrize("z", [1.5, 2.5, 4.0, 6.0, 8.0, 12.0])
def test_the_alternating_sum_where_it_can_be_added(n, z):
    mpmath = pytest.importorskip("mpmath")
    with mpmath.workdps(150):
        want = sum(
            (-1) ** (k - 1) * mpmath.binomial(n, k) * (1 - k * mpmath.mpf(z) / n) ** (n - 1)
            for k in range(1, n + 1)
            if k * z < n
        )
    found = float(SelfNormalised(n=n).share_of_symbols(10 * math.log10(z)))
    assert found == pytest.approx(float(want), abs=1e-12)


def test_one_sample_has_no_peak():
    with pytest.raises(SignalError):
        SelfNormalised(n=1)
