"""What was sent is what a transform of the samples finds, to the limit of float32.

Source: definition of OFDM and EVM. Tolerance: float32 rounds at 6e-8 of a value, and an FFT of
N points adds up a few such errors; -142 to -148 dB were measured, -138 dB is asked.
"""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm, Pilots
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.subcarriers import IndexSet, PilotValues


@pytest.mark.parametrize("n_fft", [64, 1536, 2048, 8192])
@pytest.mark.parametrize("edge", ["0 samples", "1/32"])
def test_error_vector_is_rounding(n_fft, edge) -> None:
    prefix, n_symbols = n_fft // 16, 48
    source = Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=(
            Group(
                subcarriers=IndexSet.parse("-26..-22, -20..-1, 1..20, 22..26"),
                constellation=Constellation.parse("256qam"),
            ),
        ),
        pilots=(
            Pilots(
                subcarriers=IndexSet.parse("-21, 21"),
                values=PilotValues.parse([1, -1]),
                level_db=3.0,
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse("1/16"),
        edge_window=Stretch.parse(edge),
    )
    site = Site(
        sample_rate_hz=Fraction(15000) * n_fft,
        n_samples=n_symbols * (n_fft + prefix),
        seed=1,
        label="carrier",
        path="signal",
    )
    signal = source.build(site)
    rows = samples_of(signal).astype(complex).reshape(n_symbols, -1)[:, prefix:]
    found = np.fft.fft(rows, axis=1)[:, np.r_[-26:0, 1:27]] / n_fft
    sent = samples_of(signal.ideal).astype(complex).reshape(n_symbols, -1)
    error = np.mean(np.abs(found - sent) ** 2) / np.mean(np.abs(sent) ** 2)
    assert 10 * np.log10(error) < -138
    # and each is one of the 256 points: odd numbers on both rails, the largest 15
    data = np.delete(found, [5, 46], axis=1)
    rails = np.stack([data.real, data.imag])
    rails *= 15 / rails.max()
    assert np.allclose(rails, 2 * np.round((rails - 1) / 2) + 1, atol=1e-4)
    assert len(np.unique(np.round(rails))) == 16
