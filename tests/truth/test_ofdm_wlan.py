"""Subcarriers in use of IEEE 802.11 OFDM, found again by a transform of the samples.

Sets and guard intervals: IEEE Std 802.11-2020 cl. 17, 19, 21, 802.11ax-2021 Tables 27-7 to 27-9,
802.11be draft 7.0 Tables 36-5 and 36-6; the rows and how far each is confirmed:
``data/wlan_ofdm.json``. Tolerance: a bin counts as empty 120 dB below the ones in use; float32
transforms leave about -140 dB.
"""

import json
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm, Pilots
from wavegen.sources.ofdm_layout import CyclicPrefix
from wavegen.sources.subcarriers import IndexSet, PilotValues

ROWS = json.loads((Path(__file__).parent / "data" / "wlan_ofdm.json").read_text())["rows"]
N_SYMBOLS = 12


@pytest.mark.parametrize("row", ROWS, ids=[row["phy"] for row in ROWS])
def test_active_subcarriers_and_no_others(row) -> None:
    active = {k for low, high in row["active"] for k in range(low, high + 1)}
    pilots = row["pilots"] or []
    assert len(active) == row["n_active"]
    assert active >= set(pilots)
    for guard in row["gi_samples"]:
        source = Ofdm(
            subcarrier_spacing_hz=Fraction(row["scs_hz"]),
            groups=(
                Group(
                    subcarriers=IndexSet.parse(sorted(active - set(pilots))),
                    constellation=Constellation.parse("qpsk"),
                ),
            ),
            pilots=(
                Pilots(subcarriers=IndexSet.parse(pilots), values=PilotValues.parse([1, 1, 1, -1])),
            )
            if pilots
            else (),
            cyclic_prefix=CyclicPrefix.parse(f"{guard} samples"),
        )
        n_fft = row["fft"]
        site = Site(
            sample_rate_hz=Fraction(row["fs_hz"]),
            n_samples=N_SYMBOLS * (n_fft + guard),
            seed=1,
            label="carrier",
            path="signal",
        )
        samples = samples_of(source.build(site)).astype(complex).reshape(N_SYMBOLS, -1)
        values = np.fft.fft(samples[:, guard:], axis=1)
        power = np.mean(np.abs(values) ** 2, axis=0)
        level = 10 * np.log10(power / power.max() + 1e-30)
        is_active = np.isin((np.arange(n_fft) + n_fft // 2) % n_fft - n_fft // 2, list(active))
        assert np.all(level[is_active] > -0.001)  # QPSK and unit pilots: all alike
        assert np.all(level[~is_active] < -120)
