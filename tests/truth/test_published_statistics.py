"""Statistics of sources and codes against published laws that no other file here covers."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from scipy import special, stats

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.files.datatypes import Datatype, encode
from wavegen.sources.carrier import Carrier
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.noise import Noise
from wavegen.sources.ofdm import Group, Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix
from wavegen.sources.subcarriers import IndexSet
from wavegen.sources.tones import Tones
from wavegen.stages.combine.sum import Part, Sum

RATE = Fraction(1_000_000)


def site(n_samples: int, rate: Fraction = RATE, seed: int = 3) -> Site:
    return Site(sample_rate_hz=rate, n_samples=n_samples, seed=seed, label="signal", path="signal")


@pytest.fixture(scope="module")
def white() -> np.ndarray:
    """Independent complex Gaussian samples: noise as wide as the sample rate."""
    return samples_of(Noise(bandwidth_hz=RATE).build(site(1 << 20))).astype(np.complex128)


def test_one_rail_follows_the_real_gaussian_law(white):
    # Textbook: P(x^2 > L mean) = erfc(sqrt(L/2)); levels 4.3225 ... 11.8003 dB, 10 % ... 0.01 %.
    power = np.concatenate([white.real, white.imag]) ** 2
    power /= power.mean()
    for level_db, probability in ((4.3225, 0.1), (8.2183, 1e-2), (10.3453, 1e-3), (11.8003, 1e-4)):
        assert special.erfc(np.sqrt(10 ** (level_db / 10) / 2)) == pytest.approx(
            probability, rel=1e-4
        )
        beyond = np.mean(power > 10 ** (level_db / 10))
        four_sigma = 4 * np.sqrt(probability / power.size)
        assert abs(beyond - probability) < four_sigma


def test_peak_of_n_samples_over_their_own_mean(white):
    # Fisher 1929 (g test), from memory; mean = harmonic number H_n: Wunderlich & Sanders (NIST),
    # arXiv 2501.11261. n = 64: H_64 = 4.7439, and 0.12550 at z = 6.
    power = np.abs(white.reshape(-1, 64)) ** 2
    ratio = power.max(axis=1) / power.mean(axis=1)
    harmonic = np.sum(1 / np.arange(1, 65))
    assert harmonic == pytest.approx(4.7439, abs=1e-4)
    assert abs(ratio.mean() - harmonic) < 4 * ratio.std() / np.sqrt(ratio.size)
    k = np.arange(1, 11)
    terms = (-1.0) ** (k - 1) * special.binom(64, k) * (1 - k * 6 / 64) ** 63
    law = float(terms.sum())
    assert law == pytest.approx(0.12550, abs=1e-4)
    assert abs(np.mean(ratio > 6) - law) < 4 * np.sqrt(law * (1 - law) / ratio.size)


def test_log_and_voltage_averages_of_noise(white):
    # Textbook detector corrections: -10 gamma / ln 10 = -2.5068 dB, 20 log10(sqrt(pi)/2) = -1.0491.
    power = np.abs(white) ** 2
    power /= power.mean()
    logs = 10 * np.log10(power)
    assert abs(logs.mean() + 2.5068) < 4 * 5.570 / np.sqrt(power.size)
    assert logs.std() == pytest.approx(5.570, abs=0.02)
    assert 20 * np.log10(np.sqrt(power).mean()) == pytest.approx(-1.0491, abs=0.01)


def test_l_moment_ratios_of_noise_power(white):
    # Hosking, JRSS B 52, 1990, from memory: exponential law has 1/2, 1/3, 1/6.
    x = np.sort(np.abs(white) ** 2)
    n = x.size
    i = np.arange(n)
    b = [
        np.mean(x),
        np.mean(x * i / (n - 1)),
        np.mean(x * i * (i - 1) / ((n - 1) * (n - 2))),
        np.mean(x * (i / (n - 1)) * ((i - 1) / (n - 2)) * ((i - 2) / (n - 3))),
    ]
    second = 2 * b[1] - b[0]
    third = 6 * b[2] - 6 * b[1] + b[0]
    fourth = 20 * b[3] - 30 * b[2] + 12 * b[1] - b[0]
    assert second / b[0] == pytest.approx(1 / 2, abs=2e-3)
    assert third / second == pytest.approx(1 / 3, abs=4e-3)
    assert fourth / second == pytest.approx(1 / 6, abs=4e-3)


def test_up_crossings_of_band_limited_noise():
    # Rice 1945; Blachman & McAlpine 1969, from memory: flat band B: B sqrt(pi u / 3) exp(-u).
    n = 1 << 21
    width = RATE / 16
    power = np.abs(samples_of(Noise(bandwidth_hz=width, edge_fraction=0.02).build(site(n)))) ** 2
    power /= power.mean()
    for u in (1.0, 2.0, 3.0):
        crossings = np.count_nonzero((power[:-1] <= u) & (power[1:] > u))
        expected = float(width) * np.sqrt(np.pi * u / 3) * np.exp(-u) * n / float(RATE)
        # A Poisson-like count scatters by its root at most; sampling at 16 x misses under 1 %.
        assert abs(crossings / expected - 1) < 0.01 + 4 / np.sqrt(expected)


@pytest.mark.parametrize(("k_db", "level_db"), [(0, 8.475), (6, 6.478), (10, 4.928)])
def test_carrier_plus_noise(k_db, level_db):
    # Rice 1944/45; Marcum Q: P = ncx2.sf(2 (1 + K) x, 2, 2 K). Levels at 1e-4 from memory.
    k = 10 ** (k_db / 10)
    assert 10 * np.log10(stats.ncx2.isf(1e-4, 2, 2 * k) / (2 * (1 + k))) == pytest.approx(
        level_db, abs=1e-3
    )
    both = Sum(
        parts=(
            Part(signal=Carrier(), level_db=float(k_db)),
            Part(signal=Noise(bandwidth_hz=RATE)),
        )
    )
    here = site(1 << 20)
    signals = [part.signal.build(here.at(f"p{i}")) for i, part in enumerate(both.parts)]
    power = np.abs(samples_of(both.combine(here, signals)).astype(np.complex128)) ** 2
    mean_square = 1 + (1 + 2 * k) / (1 + k) ** 2
    assert np.mean(power**2) / np.mean(power) ** 2 == pytest.approx(mean_square, rel=6e-3)
    for q in (0.1, 1e-2, 1e-3):
        x = stats.ncx2.isf(q, 2, 2 * k) / (2 * (1 + k))
        assert abs(np.mean(power > x) - q) < 4 * np.sqrt(q / power.size) + 0.002 * q


def ofdm_symbols(n_active: int, over: int, count: int) -> np.ndarray:
    """Return OFDM bodies, shape (count, n_active over), QPSK on neighbouring subcarriers."""
    n_fft = n_active * over
    half = n_active // 2
    settings = Ofdm(
        subcarrier_spacing_hz=RATE / n_fft,
        groups=(
            Group(
                subcarriers=IndexSet.parse(f"-{half}..{half - 1}"),
                constellation=Constellation.parse("qpsk"),
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse("0 samples"),
    )
    return samples_of(settings.build(site(n_fft * count))).reshape(count, n_fft)


def per_symbol_db(symbols: np.ndarray) -> np.ndarray:
    """Return peak over the expected mean of each symbol, dB (the mean over all is 1)."""
    power = np.abs(symbols) ** 2
    return 10 * np.log10(power.max(axis=1) / power.mean())


@pytest.mark.parametrize(("n", "levels"), [(64, (8.641, 9.839)), (256, (9.465, 10.510))])
def test_peak_of_each_ofdm_symbol(n, levels):
    # Ochiai & Imai, IEEE Trans. Commun. 49(2), 2001: the law; levels at 10 % and 1 % at 16 times
    # oversampling by simulation, +-0.06 dB. This statistic is per symbol, not instantaneous.
    peaks = np.sort(np.concatenate([per_symbol_db(ofdm_symbols(n, 16, 1 << 13))]))
    for probability, level in zip((0.1, 0.01), levels, strict=True):
        found = peaks[int((1 - probability) * peaks.size)]
        assert found == pytest.approx(level, abs=0.06 if probability > 0.05 else 0.09)


def test_peak_of_each_ofdm_symbol_at_the_nyquist_rate():
    # Textbook: 1 - (1 - exp(-z))^N; N = 1024 at 10 %: 9.629 dB (simulated 9.621).
    peaks = np.sort(per_symbol_db(ofdm_symbols(1024, 1, 1 << 13)))
    law = 10 * np.log10(-np.log(1 - 0.9 ** (1 / 1024)))
    assert law == pytest.approx(9.629, abs=1e-3)
    assert peaks[int(0.9 * peaks.size)] == pytest.approx(law, abs=0.05)


def test_raw_cubic_metric_of_one_and_two_tones():
    # 3GPP R1-060385: 10 log10 E p^3 over (E p)^3; anchors 0 and 3.979 dB by derivation (5/2).
    for count, expected in ((1, 0.0), (2, 10 * np.log10(2.5))):
        signal = Tones(count=count, spacing_hz=RATE / 100, phases="equal").build(site(200))
        power = np.abs(samples_of(signal).astype(np.complex128)) ** 2
        metric = 10 * np.log10(np.mean(power**3) / np.mean(power) ** 3)
        assert metric == pytest.approx(expected, abs=1e-4)


@pytest.mark.parametrize(
    ("n_bits", "npr_db", "load_db", "tolerance_db"),
    [(8, 40.60, 11.88, 0.1), (10, 51.56, 13.05, 0.5)],
)
def test_noise_power_ratio_of_the_rounding(white, n_bits, npr_db, load_db, tolerance_db):
    # Gray & Zeoli 1971, from memory: an ideal quantiser at its best loading. Rounding to codes with
    # saturation must reach it; about 15 saturated rails at 10 bits set that tolerance.
    scale = 1 << (n_bits - 1)
    datatype = Datatype(name="test", rail="<i2", full_scale=scale, is_integer=True, n_bits=n_bits)
    rms = 10 ** (-load_db / 20)
    samples = (white * rms * np.sqrt(2)).astype(np.complex64)
    codes, n_saturated = encode(samples, datatype)
    error = codes / scale - np.stack([samples.real, samples.imag], axis=1).astype(np.float64)
    ratio = 10 * np.log10(rms**2 / np.mean(error**2))
    assert n_saturated > 0
    assert ratio == pytest.approx(npr_db, abs=tolerance_db)
