"""A frame in which groups share subcarriers at different symbols, taken apart again.

Where the known signals stand: 3GPP TS 36.211 cl. 6.10.1.2, antenna port 0: every sixth
subcarrier, in symbols 0, 4, 7 and 11 of a subframe, by three subcarriers apart in 4 and 11 (from
memory). The rest is made up: control in symbols 0 and 1, data after, symbols 12 and 13 idle.
Tolerance of the error vector: -138 dB, see ``test_ofdm_demodulation.py``.
"""

from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm, Pilots
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.subcarriers import IndexSet, PilotValues, SymbolSet

N_FFT, PREFIXES = 128, [10, 9, 9, 9, 9, 9, 9]
ALL = [k for k in range(-36, 37) if k]
COMB = {0: [k for k in ALL if k % 6 == 1], 3: [k for k in ALL if k % 6 == 4]}


def group(subcarriers, symbols, constellation, level_db: float = 0.0) -> Group:
    return Group(
        subcarriers=IndexSet.parse(subcarriers),
        symbols=SymbolSet.parse(symbols),
        constellation=Constellation.parse(constellation),
        level_db=level_db,
    )


def without(comb: int) -> list[int]:
    return [k for k in ALL if k not in COMB[comb]]


DOWNLINK = Ofdm(
    subcarrier_spacing_hz=Fraction(15000),
    groups=(
        group(without(0), "0", "qpsk"),
        group(ALL, "1", "qpsk", -3.0),
        group(ALL, "2..3, 5..6, 8..10", "64qam"),
        group(without(3), "4, 11", "64qam"),
        group(without(0), "7", "256qam"),
    ),
    pilots=(
        Pilots(
            subcarriers=IndexSet.parse(COMB[0]),
            values=PilotValues.parse({"random": "qpsk"}),
            symbols=SymbolSet.parse("0, 7"),
            level_db=3.0,
        ),
        Pilots(
            subcarriers=IndexSet.parse(COMB[3]),
            values=PilotValues.parse({"random": "qpsk"}),
            symbols=SymbolSet.parse("4, 11"),
            level_db=3.0,
        ),
    ),
    cyclic_prefix=CyclicPrefix.parse([f"{n} samples" for n in PREFIXES]),
    frame_symbols=14,
)
KINDS = {0: "qpsk", 1: "qpsk", 7: "256qam"} | dict.fromkeys((2, 3, 4, 5, 6, 8, 9, 10, 11), "64qam")


def built(settings: Ofdm, n_frames: int, *, seed: int = 1):
    rate = Fraction(15000) * N_FFT
    cycle = settings.cycle(rate, "signal")
    return settings.build(
        Site(
            sample_rate_hz=rate,
            n_samples=n_frames * cycle.n_samples,
            seed=seed,
            label="cell",
            path="signal",
        )
    )


def bodies(x: np.ndarray):
    """Yield number and useful part of every symbol, and the whole of it."""
    start, number = 0, 0
    while start < x.size:
        prefix = PREFIXES[number % 7]
        whole = x[start : start + prefix + N_FFT]
        yield number, whole[prefix:], whole
        start, number = start + whole.size, number + 1


def test_each_symbol_holds_what_its_schedule_says() -> None:
    x = samples_of(built(DOWNLINK, 6)).astype(complex)
    first: dict[int, np.ndarray] = {}
    amplitude = None
    for number, body, whole in bodies(x):
        place = number % 14
        if place >= 12:
            assert not np.any(whole)  # exact zeros, prefix too
            continue
        values = np.fft.fft(body) / N_FFT
        power = np.abs(values) ** 2
        empty = np.setdiff1d(np.arange(N_FFT), np.array(ALL) % N_FFT)
        assert 10 * np.log10(power[empty].max() / power.max()) < -120
        comb = {0: 0, 7: 0, 4: 3, 11: 3}.get(place)
        data = ALL if comb is None else without(comb)
        amplitude = amplitude or np.abs(values[data[0]])  # QPSK at 0 dB, symbol 0
        if comb is not None:
            pilots = values[COMB[comb]]
            assert np.allclose(np.abs(pilots) / amplitude, 10**0.15, rtol=1e-5)
            assert np.allclose(pilots, first.setdefault(comb, pilots), atol=1e-6)
        level = 10 ** (-3 / 20) if place == 1 else 1.0
        points = Constellation.parse(KINDS[place]).points * (amplitude * level)
        nearest = points[np.argmin(np.abs(values[data][:, None] - points), axis=1)]
        error = np.mean(np.abs(values[data] - nearest) ** 2) / np.mean(np.abs(nearest) ** 2)
        # the amplitude was read off a single subcarrier, to -138 dB or so
        assert 10 * np.log10(error) < -125
        assert np.unique(nearest).size > min(points.size, 70) // 2
    assert number == 6 * 14 - 1


def test_ideal_is_what_a_transform_finds() -> None:
    signal = built(DOWNLINK, 6)
    sent = samples_of(signal.ideal).astype(complex).reshape(84, -1)
    assert signal.inputs[0].indices.tolist() == ALL
    found = np.array(
        [np.fft.fft(body)[ALL] / N_FFT for _, body, _ in bodies(samples_of(signal).astype(complex))]
    )
    error = np.mean(np.abs(found - sent) ** 2) / np.mean(np.abs(sent) ** 2)
    assert 10 * np.log10(error) < -138


def test_data_flow_on_from_one_frame_to_the_next() -> None:
    # The third group is on in 7 symbols of a frame and draws 7 * 72 points for each, none twice.
    signal = built(DOWNLINK, 6)
    part = signal.inputs[0].carried[2]
    words = part.data.words(0, 6 * 7 * 72).reshape(42, 72) & 63
    sent = samples_of(signal.ideal).reshape(84, 72)
    symbols = [14 * frame + k for frame in range(6) for k in (2, 3, 5, 6, 8, 9, 10)]
    assert np.allclose(sent[symbols], part.table[words])
    assert part.data.period == 6 * 7 * 72


@pytest.mark.parametrize("edge", ["0 samples", "8 samples"])
def test_mean_power_over_the_loop_is_one(edge) -> None:
    # Frames are independent but for the edges; 5 sigma of the mean of 400 frames, which is small
    # enough to show the 0.67 dB by which idle symbols lower the mean, and a slip of 2 %.
    settings = replace(DOWNLINK, edge_window=Stretch.parse(edge))
    x = samples_of(built(settings, 400)).astype(complex)
    of_frames = np.mean(np.abs(x.reshape(400, -1)) ** 2, axis=1)
    sigma = of_frames.std() / np.sqrt(400)
    assert abs(of_frames.mean() - 1) < 5 * sigma
    assert 5 * sigma < 0.02


def test_mean_power_is_exact_where_no_power_is_random() -> None:
    # QPSK and no prefix: each symbol's power is that of its subcarriers (Parseval), whatever the
    # data. Tolerance: float32, 128 values of which round at 6e-8, about 1e-8 in the mean.
    settings = replace(
        DOWNLINK,
        groups=(group(ALL, "0", "qpsk"), group("1..9", "2, 3", "qpsk", -6.0)),
        pilots=(),
        cyclic_prefix=CyclicPrefix.parse(0),
        frame_symbols=5,
    )
    signal = built(settings, 40)
    x = samples_of(signal).astype(complex).reshape(40, 5, N_FFT)
    power = np.mean(np.abs(x) ** 2, axis=2)
    assert np.allclose(power.mean(axis=1), 1, atol=1e-6)
    low = 9 * 10**-0.6
    expected = 5 / (72 + 2 * low) * np.array([72, 0, low, low, 0])
    assert np.allclose(power, expected, rtol=1e-5)
    assert signal.mean_power == 1
    assert not np.any(x[:, [1, 4]])


def test_edges_of_silent_symbols_hold_the_end_of_the_symbol_before() -> None:
    settings = replace(DOWNLINK, edge_window=Stretch.parse("8 samples"))
    x = samples_of(built(settings, 3))
    for number, _, whole in bodies(x):
        if number % 14 == 12:
            assert np.any(whole[:8])
            assert not np.any(whole[8:])
        if number % 14 == 13:
            assert not np.any(whole)
