"""Multitones against published crest factors and closed forms."""

import math
from fractions import Fraction

import numpy as np
import pytest
import scipy.fft

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.sources.tones import Notch, Tone, Tones

RATE = Fraction(1_000_000)
SPACING = Fraction(250)


def site(n: int, seed: int = 1) -> Site:
    return Site(sample_rate_hz=RATE, n_samples=n, seed=seed, label="a", path="signal")


def comb(count: int, phases: str, **more):
    settings = Tones(count=count, spacing_hz=SPACING, phases=phases, **more)
    return settings, site(settings.cycle(RATE, "signal").n_samples)


def peak_db(samples, factor: int = 16) -> float:
    """Return the peak of the samples' own interpolation over their mean, dB."""
    spectrum = scipy.fft.fft(samples.astype(np.complex128))
    middle = spectrum.size // 2
    gap = np.zeros((factor - 1) * spectrum.size)
    fine = scipy.fft.ifft(np.concatenate((spectrum[:middle], gap, spectrum[middle:]))) * factor
    return float(10 * np.log10(np.max(np.abs(fine)) ** 2 / np.mean(np.abs(samples) ** 2)))


@pytest.mark.parametrize("count", [2, 3, 16, 64, 256])
def test_tones_in_phase_peak_at_their_number(count):
    # Derivation: N equal tones in phase: (sum a)^2 / sum a^2 = N. All meet at sample 0, so the
    # samples hold the peak; complex64 allows 1e-5 dB.
    settings, here = comb(count, "equal")
    expected = 10 * math.log10(count)
    samples = samples_of(settings.build(here))
    peak = 10 * np.log10(np.max(np.abs(samples)) ** 2)
    assert peak == pytest.approx(expected, abs=1e-5)
    assert settings.law(here).peak_db == pytest.approx(expected, abs=1e-9)


NEWMAN = {16: 2.619, 32: 2.636, 64: 2.600, 128: 2.598, 256: 2.599}


@pytest.mark.parametrize(("count", "expected"), NEWMAN.items())
@pytest.mark.parametrize("phases", ["newman", "schroeder"])
def test_quadratic_phases_peak_as_published(count, expected, phases):
    # D. J. Newman 1965; S. Boyd, IEEE Trans. Circuits and Systems 33(10), 1986, 1018-1022;
    # M. R. Schroeder, IEEE Trans. IT 16, 1970, 85-89: for equal powers and even N the same curve
    # shifted in time. The listed values were read on a grid: up to 0.001 dB below the true peak.
    settings, here = comb(count, phases)
    assert peak_db(samples_of(settings.build(here))) == pytest.approx(expected, abs=1.5e-3)
    assert settings.law(here).peak_db == pytest.approx(expected, abs=1.5e-3)


RUDIN_SHAPIRO = {2: 3.0103, 4: 2.4792, 8: 3.0103, 16: 2.8157, 64: 3.0103, 256: 3.0103}


@pytest.mark.parametrize(("count", "expected"), RUDIN_SHAPIRO.items())
def test_rudin_shapiro_stays_below_twice_the_mean(count, expected):
    # H. S. Shapiro 1951; W. Rudin 1959: |A|^2 <= 2 N for N = 2^k. Values: Boyd 1986 and own
    # evaluation of the same polynomials on a grid (up to 0.001 dB low).
    settings, here = comb(count, "rudin_shapiro")
    bound = 10 * math.log10(2)
    for peak in (peak_db(samples_of(settings.build(here))), settings.law(here).peak_db):
        assert peak <= bound + 1e-5
        assert peak == pytest.approx(expected, abs=1.5e-3)


@pytest.mark.parametrize(("count", "expected"), [(20, 4.880), (50, 5.661), (100, 5.687)])
def test_rudin_shapiro_breaks_where_the_count_is_no_power_of_two(count, expected):
    # The same sequence cut short; own evaluation.
    settings, here = comb(count, "rudin_shapiro")
    assert settings.law(here).peak_db == pytest.approx(expected, abs=1.5e-3)


def test_schroeder_serves_unequal_levels():
    # Schroeder 1970: the phases follow the cumulative power, here a 12 dB slope over 64 tones.
    # Published figures for shaped spectra are about those of flat ones; random phases stand
    # near 7.4 dB, equal ones near 18 dB.
    listed = tuple(
        Tone(frequency_offset_hz=(k - 32) * SPACING, level_db=-12 * k / 64) for k in range(64)
    )
    here = site(4000)
    assert Tones(tones=listed, phases="schroeder").law(here).peak_db < 4.0
    assert Tones(tones=listed, phases="equal").law(here).peak_db > 17.0


def test_two_tones_follow_the_arccosine_on_their_samples():
    # Derivation: P(p > g) = arccos(g - 1) / pi. The loop has 8000 instants; two arcs' ends (one
    # arc) may each be off by one instant: 2 / 8000 in probability.
    settings, here = comb(2, "random")
    assert here.n_samples == 8000
    power = np.abs(samples_of(settings.build(here)).astype(np.complex128)) ** 2
    for level in (0.1, 0.5, 1.0, 1.5, 1.9, 1.99):
        expected = math.acos(level - 1) / math.pi
        assert abs(np.mean(power > level) - expected) <= 2 / 8000
        assert settings.law(here).ccdf(10 * math.log10(level)) == pytest.approx(expected, abs=1e-6)


@pytest.mark.parametrize("phases", ["newman", "random", "rudin_shapiro"])
def test_samples_of_a_comb_follow_its_own_law(phases):
    # Derivation: evenly spaced instants count each arc above a level to within one instant.
    settings, here = comb(33, phases)
    law = settings.law(here)
    power = np.abs(samples_of(settings.build(here)).astype(np.complex128)) ** 2
    levels = np.linspace(-10, law.peak_db - 0.001, 60)  # complex64 may round a peak upwards
    share = (power[None] > 10 ** (levels[:, None] / 10)).mean(axis=1)
    assert (np.abs(share - law.ccdf(levels)) <= law.sampling_slack(levels) + 1e-4).all()
    assert law.sampling_slack(levels).max() < 0.01


def test_second_moment_of_random_phases():
    # Derivation (also Borwein, Straub, Wan, Zudilin, Canad. J. Math. 64, 2012, even moments):
    # over random phases E p^2 = 2 - sum p_i^2 at every instant. A time average over one draw of
    # an evenly spaced comb differs, its mean over draws does not: 400 draws, and the tolerance
    # is 4 standard deviations of their mean, taken from the draws themselves.
    shares = np.array([0.4, 0.3, 0.15, 0.1, 0.05])
    listed = tuple(
        Tone(frequency_offset_hz=k * 10 * SPACING, level_db=10 * math.log10(share))
        for k, share in enumerate(shares)
    )
    tones = Tones(tones=listed)
    second = []
    for seed in range(400):
        samples = samples_of(tones.build(site(400, seed))).astype(np.complex128)
        second.append(np.mean(np.abs(samples) ** 4))
    expected = 2 - np.sum(shares**2)
    sigma = np.std(second) / np.sqrt(len(second))
    assert sigma < 0.03
    assert abs(np.mean(second) - expected) < 4 * sigma


def test_moments_of_incommensurate_tones():
    # The same identities hold in time where no sum of differences vanishes: E p^2 = 2 - 1/N,
    # E p^3 = 6 - 9/N + 4/N^2 (ibid.), here exactly, as the loop is a whole period. complex64
    # leaves 1e-6.
    offsets = (1, 10, 100, 1000, 10_000)
    tones = Tones(tones=tuple(Tone(frequency_offset_hz=Fraction(k)) for k in offsets))
    power = np.abs(samples_of(tones.build(site(1_000_000))).astype(np.complex128)) ** 2
    assert np.mean(power) == pytest.approx(1, abs=1e-6)
    assert np.mean(power**2) == pytest.approx(2 - 1 / 5, abs=1e-5)
    assert np.mean(power**3) == pytest.approx(6 - 9 / 5 + 4 / 25, abs=1e-4)


def test_notch_is_empty_down_to_the_numerical_floor():
    # Noise-power-ratio practice: the notch lies 10-15 dB below the best converter's ratio, 85.4
    # dB at 16 bits. The floor here is the rounding of complex64: 2^-24 of each rail gives a total
    # of about -150 dB, spread over all lines; asked is -130 dB of the density beside it.
    notch = Notch(width_hz=10 * SPACING, centre_hz=20 * SPACING)
    settings, here = comb(401, "random", notch=notch)
    spectrum = np.abs(np.fft.fft(samples_of(settings.build(here)).astype(np.complex128))) ** 2
    number = np.fft.fftfreq(here.n_samples, 1 / here.n_samples).round()
    inside = np.abs(number - 20) <= 5
    loaded = (np.abs(number) <= 200) & ~inside
    assert spectrum[inside].max() / spectrum[loaded].mean() < 1e-13
    assert np.ptp(10 * np.log10(spectrum[loaded])) < 1e-4


def test_many_random_tones_approach_the_gaussian_level():
    # Reference practice: over random phases the 1e-4 level of N tones falls short of the Gaussian
    # 9.643 dB by 0.55 dB at 16 tones and as 1/N beyond. 1000 tones are within 0.01 dB over seeds;
    # one period of 4 samples per tone spacing holds some 1000 independent powers, so the 1 % level
    # (6.632 dB) has a standard deviation of 4.34 sqrt(99 / 1000) / 4.6 = 0.3 dB; 16 draws: 0.075.
    levels = []
    for seed in range(16):
        settings = Tones(count=1000, spacing_hz=SPACING)
        levels.append(float(settings.law(site(8000, seed)).level_db(0.01)))
    assert np.mean(levels) == pytest.approx(6.632, abs=4 * 0.075)
