"""Random-phase phasors and Ricean envelopes: published values of their laws."""

import math

import numpy as np
import pytest

from wavegen.core.site import Site
from wavegen.laws.composite import LineTerm, Placed, combine_terms
from wavegen.laws.inversion import law_of_term
from wavegen.laws.phasors import phasor_law
from wavegen.laws.term import GaussianTerm
from wavegen.sources.tones import Tones

PROBABILITY = [1e-1, 1e-2, 1e-3, 1e-4]

EQUAL = {
    2: (2.903, 3.009, 3.010, 3.010),
    3: (3.688, 4.666, 4.761, 4.770),
    4: (3.664, 5.533, 5.916, 5.998),
    5: (3.546, 5.937, 6.661, 6.886),
    6: (3.557, 6.112, 7.126, 7.522),
    8: (3.582, 6.233, 7.589, 8.289),
    16: (3.602, 6.446, 8.030, 9.091),
    32: (3.612, 6.542, 8.220, 9.384),
}

RICE = {
    -10: (3.618488, 6.609015, 8.353239, 9.58826),
    0: (3.362298, 5.908736, 7.405606, 8.475284),
    3: (3.034919, 5.268921, 6.609872, 7.579943),
    6: (2.581499, 4.46406, 5.624774, 6.477563),
    10: (1.92148, 3.338059, 4.245864, 4.928417),
    20: (0.7292822, 1.296799, 1.689484, 1.999922),
}


@pytest.mark.parametrize("n_tones", EQUAL)
def test_equal_phasors(n_tones):
    """Kluyver, Proc. KNAW 8, 1905; three and four also by the closed forms of Borwein, Straub,
    Wan and Zudilin, Canad. J. Math. 64, 2012. Tolerance: half the last digit of the table.
    """
    law = phasor_law(np.ones(n_tones), name="x")
    np.testing.assert_allclose(law.level_db(PROBABILITY), EQUAL[n_tones], atol=5.1e-4)
    assert law.peak_db == pytest.approx(10 * math.log10(n_tones))


@pytest.mark.parametrize("ratio_db", RICE)
def test_carrier_in_noise(ratio_db):
    """Rice, Bell System Technical Journal 24, 1945: Marcum's Q. Tolerance: 0.0001 dB."""
    made = combine_terms(
        [
            Placed(term=LineTerm.of(10 ** (ratio_db / 20) + 0j), n_cycles=5),
            Placed(term=GaussianTerm()),
        ],
        n_samples=1000,
    )
    law = law_of_term(made)
    np.testing.assert_allclose(law.level_db(PROBABILITY), RICE[ratio_db], atol=1e-4)


@pytest.mark.parametrize("n_tones", [2, 3, 4, 5, 8, 16])
def test_moments_of_equal_phasors(n_tones):
    """E x^2 = 2 - 1/N, E x^3 = 6 - 9/N + 4/N^2 (same paper); tolerance 1e-3: the sum over a
    grid of the curve.
    """
    law = phasor_law(np.ones(n_tones), name="x")
    step = n_tones / 400
    x = step * (np.arange(400) + 0.5)
    tail = law.ccdf(10 * np.log10(x))
    assert np.sum(tail) * step == pytest.approx(1, rel=1e-3)
    assert 2 * np.sum(x * tail) * step == pytest.approx(2 - 1 / n_tones, rel=1e-3)
    want = 6 - 9 / n_tones + 4 / n_tones**2
    assert 3 * np.sum(x**2 * tail) * step == pytest.approx(want, rel=1e-3)


def test_the_ensemble_of_64_tones_describes_no_comb_of_them():
    """At 0.1 %: ensemble 8.3 dB, Newman 2.6, equal 18.1 (``common practice`` to confuse them)."""
    here = Site(sample_rate_hz=8_192_000, n_samples=8192, seed=1, label="comb", path="signal")
    level = {}
    for phases in ("newman", "equal"):
        comb = Tones(count=64, spacing_hz=2000, phases=phases)
        level[phases] = float(comb.law(here).level_db(1e-3))
        ensemble = comb.ensemble(here)
    assert ensemble.name == "random-phase ensemble of 64 tones"
    assert float(ensemble.level_db(1e-3)) == pytest.approx(8.31, abs=0.01)
    assert level["newman"] == pytest.approx(2.60, abs=0.01)
    assert level["equal"] == pytest.approx(18.06, abs=0.03)
