"""Cyclic prefixes and FFT lengths of LTE and NR fill slots and subframes exactly.

LTE: 3GPP TS 36.211 cl. 5.6 and 6.12, TS 36.104 Table 5.6-1. NR: 3GPP TS 38.211 cl. 5.3.1,
TS 38.104 Annex B.5.2 and C.5.2. The rows and how far each is confirmed: ``data/*.json``.
Everything is counted in whole samples, so there is no tolerance.
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

DATA = Path(__file__).parent / "data"
LTE = json.loads((DATA / "lte_ofdm.json").read_text())["rows"]
NR = json.loads((DATA / "nr_ofdm.json").read_text())["rows"]


def settings(spacing_hz: int, subcarriers: str, prefix: object) -> Ofdm:
    return Ofdm(
        subcarrier_spacing_hz=Fraction(spacing_hz),
        groups=(
            Group(
                subcarriers=IndexSet.parse(subcarriers), constellation=Constellation.parse("qpsk")
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse(prefix),
    )


def check_prefixes(source: Ofdm, rate_hz: int, n_samples: int, prefixes: list[int]) -> None:
    """Each prefix repeats the end of its own symbol, where the standard puts it."""
    n_fft = rate_hz // int(source.subcarrier_spacing_hz)
    assert sum(prefixes) + len(prefixes) * n_fft == n_samples
    cycle = source.cycle(Fraction(rate_hz), "signal")
    assert n_samples % cycle.n_samples == 0
    assert len(prefixes) * cycle.n_samples == cycle.n_symbols * n_samples
    signal = source.build(
        Site(
            sample_rate_hz=Fraction(rate_hz),
            n_samples=n_samples,
            seed=1,
            label="carrier",
            path="signal",
        )
    )
    x = samples_of(signal)
    assert x.size == n_samples
    start = 0
    for prefix in prefixes:
        body = x[start + prefix : start + prefix + n_fft]
        assert np.array_equal(x[start : start + prefix], body[n_fft - prefix :])
        assert x[start - 1] != body[n_fft - prefix - 1]  # and begins there, not before
        start += prefix + n_fft
    assert start == n_samples


@pytest.mark.parametrize("row", LTE, ids=[f"{row['bw_mhz']} MHz" for row in LTE])
@pytest.mark.parametrize("kind", ["normal", "extended"])
def test_lte_slots_are_half_a_millisecond(row, kind) -> None:
    half = 6 * row["n_rb"]
    listed = ["160/2048", "6 x 144/2048"] if kind == "normal" else "512/2048"
    expected = [row["cp_extended"]] * 6
    if kind == "normal":
        expected = [row["cp_first"]] + [row["cp_other"]] * 6
    source = settings(15000, f"-{half}..-1, 1..{half}", listed)
    check_prefixes(source, row["fs_hz"], row["fs_hz"] // 2000, expected)
    check_prefixes(source, row["fs_hz"], row["fs_hz"] // 1000, expected * 2)


def _name(row: dict) -> str:
    return f"{row['fr']} {row['scs_khz']} kHz {row['bw_mhz']} MHz {row['cp']}"


@pytest.mark.parametrize("row", NR, ids=[_name(row) for row in NR])
def test_nr_subframes_are_a_millisecond(row) -> None:
    per_subframe = row["scs_khz"] // 15  # 2^mu slots
    half = 6 * row["n_rb"]
    if row["cp"] == "extended":
        listed: object = "512/2048"
        expected = [row["cp_other_samples"]] * (12 * per_subframe)
    else:
        # TS 38.211 cl. 5.3.1: 16 kappa more, kappa 2^-mu being one sample at 2048, in symbols 0
        # and 7 * 2^mu of the subframe.
        n = 7 * per_subframe
        listed = [f"{144 + 16 * per_subframe}/2048", f"{n - 1} x 144/2048"]
        expected = [row["cp_other_samples"]] * (2 * n)
        expected[0] = expected[n] = row["cp_long_samples"]
    source = settings(row["scs_khz"] * 1000, f"-{half}..{half - 1}", listed)
    check_prefixes(source, row["fs_hz"], row["fs_hz"] // 1000, expected)
