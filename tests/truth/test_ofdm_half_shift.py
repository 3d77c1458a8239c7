"""Uplink of E-UTRA: subcarriers at odd multiples of half the spacing.

3GPP TS 36.211 cl. 5.6: symbol ``l`` of a slot is ``s(t) = sum a_k exp(j 2 pi (k + 1/2) df (t -
N_CP T_s))``, ``k = -floor(N_RB 12 / 2) ... ceil(N_RB 12 / 2) - 1``, ``0 <= t < (N_CP + N) T_s``;
cl. 5.3.3: the ``M`` points of a symbol go through ``M^(-1/2) sum d_i exp(-j 2 pi i k / M)``. From
memory; the prefixes and N_RB: ``data/lte_ofdm.json``. Tolerances: float32 rounds at 6e-8 of a value
and an FFT adds up a few such errors; half-tones count as empty 120 dB down. Two transforms and the
turn by half a tone leave an error vector of -136 dB (measured); -133 dB is asked.
"""

import json
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix
from wavegen.sources.subcarriers import IndexSet

ROWS = json.loads((Path(__file__).parent / "data" / "lte_ofdm.json").read_text())["rows"]


def uplink(row: dict, *, n_slots: int = 2):
    half = 6 * row["n_rb"]
    source = Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=(
            Group(
                subcarriers=IndexSet.parse(f"-{half}..{half - 1}"),
                constellation=Constellation.parse("qpsk"),
                spreading="dft",
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse(["160/2048", "6 x 144/2048"]),
        half_subcarrier_shift=True,
    )
    rate = Fraction(row["fs_hz"])
    # the phase starts anew in each symbol: a slot closes as it does without the shift
    assert source.cycle(rate, "signal").n_samples == row["fs_hz"] // 2000
    n_samples = n_slots * row["fs_hz"] // 2000
    return source.build(
        Site(sample_rate_hz=rate, n_samples=n_samples, seed=3, label="carrier", path="signal")
    )


@pytest.mark.parametrize("row", ROWS, ids=[f"{row['bw_mhz']} MHz" for row in ROWS])
def test_half_tones_and_no_others(row) -> None:
    n, half = row["fft"], 6 * row["n_rb"]
    x = samples_of(uplink(row)).astype(complex)
    points = samples_of(uplink(row).points).astype(complex).reshape(14, -1)
    start = 0
    for number in range(14):
        prefix = row["cp_first"] if number % 7 == 0 else row["cp_other"]
        body = x[start + prefix : start + prefix + n]
        # transform of twice the length: bin 2 k + 1 is (k + 1/2) spacings
        halves = np.fft.fft(body, 2 * n)[1::2] / n
        level = 10 * np.log10(np.abs(halves) ** 2 / np.mean(np.abs(halves) ** 2) + 1e-30)
        k = (np.arange(n) + n // 2) % n - n // 2
        is_used = (k >= -half) & (k < half)
        assert np.all(level[~is_used] < -120)
        used = halves[np.arange(-half, half)]
        despread = np.fft.ifft(used, norm="ortho")
        error = np.mean(np.abs(despread - points[number]) ** 2) / np.mean(np.abs(despread) ** 2)
        assert 10 * np.log10(error) < -133
        amplitude = np.abs(points[0, 0])
        assert np.allclose(np.abs(despread.real), amplitude / np.sqrt(2), rtol=1e-5)
        if row["n_rb"] <= 25:  # the formula, prefix and all
            t = np.arange(prefix + n) - prefix
            tones = np.exp(2j * np.pi / n * np.outer(np.arange(-half, half) + 0.5, t))
            symbol = x[start : start + prefix + n]
            assert np.max(np.abs(used @ tones - symbol)) < 5e-6
            plain = np.concatenate([body[n - prefix :], body])
            assert np.max(np.abs(plain - symbol)) > 0.1  # a copied prefix would be wrong
        start += prefix + n
    assert start == x.size


def test_the_spectrum_is_symmetrical_about_the_centre() -> None:
    # QPSK spread by a DFT: its 72 subcarriers carry power at random, alike on average. The sums
    # over 36 subcarriers and 840 symbols differ by 3 sqrt(2 / (36 * 840)) = 0.024 (3 sigma); the
    # centre of gravity, in spacings, by 3 * 72 / sqrt(12 * 72 * 840) = 0.25. Without the shift
    # the set -36 ... 35 has its centre of gravity at -0.5.
    row = ROWS[0]
    x = samples_of(uplink(row, n_slots=120)).astype(complex)
    lines = np.abs(np.fft.fft(x)) ** 2
    upper, lower = lines[1 : x.size // 2].sum(), lines[x.size // 2 + 1 :].sum()
    assert abs(upper / lower - 1) < 0.024
    f = np.fft.fftfreq(x.size) * row["fft"]
    centre = np.sum(f * lines) / np.sum(lines)
    assert abs(centre) < 0.25
