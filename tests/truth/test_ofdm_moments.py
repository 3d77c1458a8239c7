"""Second and third moment of instantaneous power, and the peak of each symbol.

Moments of N independent subcarriers of equal power with fourfold-symmetric points:
``E x^2 = 2 + k4 / N``, ``E x^3 = 6 + 9 k4 / N + k6 / N^2`` with ``k4 = E|a|^4 - 2`` and
``k6 = E|a|^6 - 9 E|a|^4 + 12``. Source: derivation (cumulants of independent terms).
Peak of a symbol: H. Ochiai, H. Imai, "On the distribution of the peak-to-average power ratio in
OFDM signals", IEEE Trans. Commun. 49(2), 2001: ``P(PAPR > z) = 1 - exp(-N sqrt(pi z / 3) e^-z)``.
"""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix
from wavegen.sources.subcarriers import IndexSet

LEVELS = np.array([-3, -1, 1, 3])
POINTS = {
    "qpsk": np.array([1 + 1j, 1 - 1j, -1 + 1j, -1 - 1j]) / np.sqrt(2),
    "16qam": (LEVELS[:, None] + 1j * LEVELS).ravel() / np.sqrt(10),
}


def signal(n_fft: int, subcarriers: str, constellation: str, n_symbols: int):
    source = Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=(
            Group(
                subcarriers=IndexSet.parse(subcarriers),
                constellation=Constellation.parse(constellation),
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse("0 samples"),
    )
    return source.build(
        Site(
            sample_rate_hz=Fraction(15000) * n_fft,
            n_samples=n_symbols * n_fft,
            seed=5,
            label="carrier",
            path="signal",
        )
    )


@pytest.mark.parametrize("constellation", POINTS)
def test_moments_of_64_subcarriers(constellation) -> None:
    n_tones, n_symbols = 64, 60_000
    x = samples_of(signal(n_tones, "-32..31", constellation, n_symbols))
    p = (x.real.astype(float) ** 2 + x.imag.astype(float) ** 2).reshape(n_symbols, n_tones)
    sixth = np.abs(POINTS[constellation])
    k4 = np.mean(sixth**4) - 2
    k6 = np.mean(sixth**6) - 9 * np.mean(sixth**4) + 12
    expected = {2: 2 + k4 / n_tones, 3: 6 + 9 * k4 / n_tones + k6 / n_tones**2}
    for order, value in expected.items():
        of_symbols = np.mean(p**order, axis=1)  # symbols are independent
        sigma = of_symbols.std() / np.sqrt(n_symbols)
        assert abs(of_symbols.mean() - value) < 4 * sigma
        # the tolerance is tight enough to tell 64 subcarriers from a Gaussian signal
        assert 4 * sigma < abs(value - (2, 6)[order - 2])


def test_peak_of_each_symbol_at_ten_percent() -> None:
    n_tones, over, n_symbols = 1024, 8, 6000
    source = signal(n_tones * over, "-512..511", "qpsk", n_symbols)
    peaks = []
    for start in range(0, source.n_samples, 500 * n_tones * over):
        x = samples_of(source, start, start + 500 * n_tones * over)
        peaks.append((x.real**2 + x.imag**2).reshape(500, -1).max(axis=1))
    level_db = 10 * np.log10(np.quantile(np.concatenate(peaks), 0.9))
    z = 10 ** (np.linspace(8, 13, 5001) / 10)
    exceeded = 1 - np.exp(-n_tones * np.sqrt(np.pi * z / 3) * np.exp(-z))
    law_db = 10 * np.log10(np.interp(-0.1, -exceeded, z))
    # Tolerance: the quantile's 3 sigma, 3 sqrt(0.1 0.9 / 6000) / (0.25 per dB) = 0.047 dB; the
    # law's own error at N = 1024 (0.01 dB) and the peak lost at 8 samples a period (0.014 dB).
    assert abs(level_db - law_db) < 0.07
