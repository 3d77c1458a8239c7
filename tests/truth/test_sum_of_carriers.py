"""Carriers side by side: mean, peak and distribution that arithmetic gives."""

import math
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.stages.combine.sum import Part, Sum

N_SAMPLES = 6_000


class Carrier(Signal):
    """An unmodulated carrier of unit power."""

    def compute(self, start, stop, *arrays):
        return np.ones(stop - start, np.complex64)


def carriers(cycles, **shared):
    loop = {"sample_rate_hz": Fraction(6_000_000), "n_samples": N_SAMPLES}
    site = Site(**loop, seed=1, label="sum", path="signal")
    parts = tuple(
        Part(signal=None, frequency_offset_hz=Fraction(1000 * k), **shared) for k in cycles
    )
    return samples_of(Sum(parts=parts).combine(site, [Carrier(**loop)] * len(cycles)))


@pytest.mark.parametrize("n_carriers", [1, 2, 3, 4, 8, 16, 100])
def test_equal_carriers_in_phase_peak_at_their_number(n_carriers):
    """Definition: n phasors of equal power in phase reach n^2 over a mean of n: 10 log10 n.

    They meet at sample 0. Tolerance: float32 roundings, 1e-6 of the envelope, 1e-5 dB.
    """
    power = np.abs(carriers(range(1, n_carriers + 1)).astype(np.complex128)) ** 2
    assert power.mean() == pytest.approx(1, rel=2e-6)
    papr_db = 10 * math.log10(power.max() / power.mean())
    assert papr_db == pytest.approx(10 * math.log10(n_carriers), abs=2e-5)
    assert power[0] == pytest.approx(n_carriers, rel=2e-6)


@pytest.mark.parametrize("level", [0.1, 0.5, 1.0, 1.5, 1.9, 1.99])
def test_two_equal_carriers_follow_the_arc_cosine_law(level):
    """P(x > X) = arccos(X - 1) / pi: two random-phase phasors (Kluyver, 1905; derivation).

    Carriers one line apart run through all phase differences once in the loop, so the loop
    follows the law to one sample in 6000 at each of the two crossings.
    """
    power = np.abs(carriers([10, 11]).astype(np.complex128)) ** 2
    want = math.acos(level - 1) / math.pi
    assert np.mean(power > level) == pytest.approx(want, abs=2.01 / N_SAMPLES)


@pytest.mark.parametrize("n_carriers", [2, 3, 5, 8])
def test_second_moment_of_incommensurate_carriers(n_carriers):
    """E x^2 = 2 - sum p_i^2 / (sum p_i)^2 (Borwein, Straub, Wan, Zudilin, 2012, even moments).

    Spacings 1, 2, 4, 8 ... let no two differences coincide, so the loop has the same second
    moment as random phases, exactly; float32 roundings remain.
    """
    power = np.abs(carriers([2**k for k in range(n_carriers)]).astype(np.complex128)) ** 2
    assert np.mean(power**2) == pytest.approx(2 - 1 / n_carriers, rel=5e-6)
