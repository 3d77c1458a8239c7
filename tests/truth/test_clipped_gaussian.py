"""The clipped complex Gaussian: closed forms for gain, power, peak and distribution.

For a unit-power complex Gaussian clipped at the power ratio g (clip amplitude squared over the
input's mean): gain ``1 - e^-g + sqrt(pi g)/2 erfc(sqrt g)``, output power ``1 - e^-g``, share of
time clipped ``e^-g``, and about the new mean the CCDF ``exp(-x (1 - e^-g))`` up to the wall at
``g / (1 - e^-g)``. Bussgang, 1952; Rowe, Bell Syst. Tech. J. 61, 1982; Ochiai and Imai, IEEE
Trans. Commun. 50(1), 2002 (formulas from memory, derived again: they are integrals of a
Rayleigh density).
"""

from fractions import Fraction

import numpy as np
import pytest
from scipy.optimize import brentq
from scipy.special import erfc

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.core.stored import Stored
from wavegen.stages.crest.clip import Clip

N_SAMPLES = 1 << 20

TABLE = {
    4: (0.95400, -0.367, 8.11e-2, 4.367),
    5: (0.97644, -0.188, 4.23e-2, 5.188),
    6: (0.98978, -0.082, 1.87e-2, 6.082),
    7: (0.99641, -0.029, 6.66e-3, 7.029),
    8: (0.99903, -0.008, 1.82e-3, 8.008),
}
"""Clip ratio, dB: gain, output power in dB, share clipped, peak over the new mean in dB."""


@pytest.fixture(scope="module")
def samples():
    """White complex Gaussian samples of unit power."""
    rng = np.random.default_rng(5)
    rails = rng.normal(scale=np.sqrt(0.5), size=2 * N_SAMPLES).astype(np.float32)
    return rails.view(np.complex64).astype(np.complex128)


@pytest.fixture(scope="module")
def source(samples, tmp_path_factory):
    path = tmp_path_factory.mktemp("gaussian") / "white.cf32"
    samples.astype(np.complex64).tofile(path)
    return Stored(sample_rate_hz=Fraction(1_000_000), n_samples=N_SAMPLES, path=path)


def clip(source, ceiling_db):
    site = Site(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        seed=1,
        label="clip",
        path="stages[0]",
    )
    return Clip(ceiling_db=ceiling_db).build(site, source)


def ceiling_of(ratio):
    return ratio / -np.expm1(-ratio)


@pytest.mark.parametrize("clip_ratio_db", TABLE)
def test_the_table_agrees_with_the_closed_forms(clip_ratio_db):
    g = 10 ** (clip_ratio_db / 10)
    gain, power_db, share, papr_db = TABLE[clip_ratio_db]
    assert -np.expm1(-g) + np.sqrt(np.pi * g) / 2 * erfc(np.sqrt(g)) == pytest.approx(
        gain, abs=6e-6
    )
    assert 10 * np.log10(-np.expm1(-g)) == pytest.approx(power_db, abs=6e-4)
    assert np.exp(-g) == pytest.approx(share, rel=5e-3)
    assert 10 * np.log10(ceiling_of(g)) == pytest.approx(papr_db, abs=6e-4)


@pytest.mark.parametrize("clip_ratio_db", TABLE)
def test_gain_power_share_and_peak(source, samples, clip_ratio_db):
    """Tolerance: five standard errors of each mean, from the spread of the samples themselves."""
    gain, power_db, share, papr_db = TABLE[clip_ratio_db]
    signal = clip(source, papr_db)
    clipped = samples_of(signal).astype(np.complex128) / signal.gain
    before, after = np.abs(samples) ** 2, np.abs(clipped) ** 2

    def agrees(terms, want, given):
        """Compare mean(terms) / mean(before), a ratio of two means of the same samples."""
        error = np.std(terms - want * before) / np.sqrt(N_SAMPLES)
        assert terms.mean() / before.mean() == pytest.approx(want, abs=5 * error + given)

    agrees((clipped * np.conj(samples)).real, gain, 1e-5)
    # The table's ceiling is rounded to 0.0005 dB; near it power moves by less than 1e-5.
    agrees(after, 10 ** (power_db / 10), 1.3e-4)
    where_clipped = before > signal.amplitude**2
    spread = np.sqrt(share / N_SAMPLES)
    # The amplitude is found on the samples, so the share moves with it by about as much again.
    assert where_clipped.mean() == pytest.approx(share, abs=10 * spread + 0.01 * share)
    peak_db = 10 * np.log10(after.max() / after.mean())
    assert peak_db == pytest.approx(papr_db, abs=1e-4)


@pytest.mark.parametrize("ceiling_db", [1.0, 3.0, 6.0, 9.0])
def test_the_amplitude_found_is_the_one_that_mathematics_gives(source, samples, ceiling_db):
    """A ceiling over the output's mean belongs to the g with g / (1 - e^-g) = ceiling."""
    ceiling = 10 ** (ceiling_db / 10)
    g = brentq(lambda ratio: ceiling_of(ratio) - ceiling, 1e-6, 100)
    found = clip(source, ceiling_db).amplitude ** 2 / np.mean(np.abs(samples) ** 2)
    power = np.abs(samples) ** 2
    error = np.std(np.minimum(power, g) + np.expm1(-g) * power) / np.sqrt(N_SAMPLES)
    slope = 1 - ceiling * np.exp(-g)
    assert found == pytest.approx(g, abs=5 * ceiling * error / slope)


@pytest.mark.parametrize("ceiling_db", [3.0, 6.0])
def test_the_distribution_ends_at_a_wall(source, ceiling_db):
    """Tolerance: five standard errors of a share of 2^20 samples, doubled for the mean's own."""
    ceiling = 10 ** (ceiling_db / 10)
    g = brentq(lambda ratio: ceiling_of(ratio) - ceiling, 1e-6, 100)
    power = np.abs(samples_of(clip(source, ceiling_db)).astype(np.complex128)) ** 2
    power /= power.mean()
    for level_db in np.arange(-10, ceiling_db, 0.5):
        level = 10 ** (level_db / 10)
        want = np.exp(-level * -np.expm1(-g))
        error = np.sqrt(want * (1 - want) / N_SAMPLES)
        assert np.mean(power > level) == pytest.approx(want, abs=10 * error)
    assert np.mean(power > ceiling * (1 - 1e-5)) == pytest.approx(
        np.exp(-g), abs=10 * np.sqrt(np.exp(-g) / N_SAMPLES)
    )
    assert not np.any(power > ceiling * (1 + 2e-6))
