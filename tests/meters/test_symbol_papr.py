import math
from dataclasses import replace
from fractions import Fraction
from itertools import pairwise

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.render import Tap, render
from wavegen.core.site import Site
from wavegen.meters.symbol_papr import SymbolPaprMeter
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix
from wavegen.sources.ofdm_parts import Group
from wavegen.sources.subcarriers import IndexSet, SymbolSet


def read(meter, samples, cuts=()):
    """Feed in pieces and merge them."""
    edges = [0, *cuts, samples.size]
    readings = []
    for start, stop in pairwise(edges):
        reading = meter.begin(None)
        reading.feed(start, samples[start:stop])
        readings.append(reading)
    total = readings[0]
    for reading in readings[1:]:
        total.merge(reading)
    return total.result()


@pytest.fixture
def symbols():
    rng = np.random.default_rng(8)
    return (rng.normal(size=(40 * 64, 2)) @ (1, 1j)).astype(np.complex64)


@pytest.mark.parametrize("reference", ["ensemble", "symbol"])
def test_the_peak_of_each_symbol_without_interpolation(symbols, reference):
    found = read(SymbolPaprMeter(n_fft=64, interpolation=1, reference=reference), symbols)
    power = np.abs(symbols.reshape(40, 64).astype(complex)) ** 2
    mean = power.mean() if reference == "ensemble" else power.mean(axis=1)
    papr_db = np.sort(10 * np.log10(power.max(axis=1) / mean))
    assert found.n_symbols == 40
    assert found.highest_db == pytest.approx(papr_db[-1], abs=1e-5)
    for share in (0.1, 0.5, 0.9):
        # Bins of 0.005 dB.
        assert found.papr_db(share) == pytest.approx(papr_db[round(40 * (1 - share)) - 1], abs=6e-3)
        assert found.share_of_symbols(papr_db[20] + 0.006) <= 19 / 40
        assert found.share_of_symbols(papr_db[20] - 0.006) >= 20 / 40


def test_any_cut_gives_the_same_counts(symbols):
    meter = SymbolPaprMeter(n_fft=64, interpolation=2)
    whole = read(meter, symbols)
    rng = np.random.default_rng(1)
    for n_cuts in (1, 3, 30, 200):
        cuts = np.sort(rng.choice(np.arange(1, symbols.size), n_cuts, replace=False)).tolist()
        parts = read(meter, symbols, cuts)
        assert parts.counts.tolist() == whole.counts.tolist()
        assert (parts.mean_power, parts.highest_db) == (whole.mean_power, whole.highest_db)


def test_two_tones_between_the_samples():
    # exp(j w) + exp(-j w) at half a sample: the peak of 3.01 dB falls between 4 samples.
    n = np.arange(8)
    x = np.exp(2j * np.pi * (n + 0.5) / 8 * 1) + np.exp(-2j * np.pi * (n + 0.5) / 8 * 1)
    x = np.tile(x, 3).astype(np.complex64)
    coarse = read(SymbolPaprMeter(n_fft=8, interpolation=1), x)
    fine = read(SymbolPaprMeter(n_fft=8, interpolation=16), x)
    assert fine.highest_db == pytest.approx(3.0103, abs=1e-4)
    assert coarse.highest_db == pytest.approx(
        20 * math.log10(math.cos(math.pi / 8)) + 3.0103, abs=1e-4
    )


def test_the_lowest_subcarrier_keeps_its_sign():
    # -n/2 and -n/2 + 1: interpolated as neighbours, 3.01 dB; at +n/2 they would be far apart.
    n = np.arange(8)
    x = np.exp(-2j * np.pi * n * 4 / 8) + np.exp(-2j * np.pi * n * 3 / 8)
    found = read(SymbolPaprMeter(n_fft=8, interpolation=16), x.astype(np.complex64))
    envelope = np.abs(1 + np.exp(2j * np.pi * np.arange(128) / 128)) ** 2
    assert found.highest_db == pytest.approx(10 * math.log10(envelope.max() / 2), abs=1e-4)


def test_silent_symbols_are_not_counted(symbols):
    keyed = symbols.reshape(40, 64).copy()
    keyed[::2] = 0
    found = read(SymbolPaprMeter(n_fft=64, interpolation=1), keyed.reshape(-1))
    assert (found.n_symbols, found.n_silent) == (20, 20)
    assert found.mean_power == pytest.approx(np.mean(np.abs(keyed[1::2]) ** 2), rel=1e-6)


def test_what_cannot_be_measured(symbols):
    meter = SymbolPaprMeter(n_fft=64)
    with pytest.raises(SignalError):
        read(meter, symbols[:63])
    with pytest.raises(SignalError):
        read(meter, np.zeros(128, np.complex64))
    with pytest.raises(SignalError):
        read(meter, np.full(64, np.nan, np.complex64))


@pytest.mark.parametrize("is_shifted", [False, True])
def test_on_the_axis_of_useful_symbols(is_shifted):
    source = Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=(
            Group(
                subcarriers=IndexSet.parse("-30..29"),
                constellation=Constellation.parse("qpsk"),
                symbols=SymbolSet.parse("0..5"),
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse("1/8"),
        frame_symbols=7,
        half_subcarrier_shift=is_shifted,
    )
    signal = source.build(
        Site(
            sample_rate_hz=Fraction(15000) * 64,
            n_samples=700 * 72,
            seed=1,
            label="carrier",
            path="signal",
        )
    )
    (bodies,) = signal.inputs
    meter = SymbolPaprMeter(n_fft=64, interpolation=4, is_shifted=is_shifted)
    results = [
        render(
            signal,
            taps=(Tap(name="papr", signal=bodies, meter=one),),
            workers=2,
            strip_samples=5000,
        )["papr"]
        for one in (meter, replace(meter, is_shifted=False))
    ]
    assert (results[0].n_symbols, results[0].n_silent) == (600, 100)
    assert results[0].mean_power == pytest.approx(7 / 6, rel=1e-3)
    # Interpolating without undoing the shift sees a jump at the ends of each symbol.
    assert (results[0].highest_db == results[1].highest_db) != is_shifted
