import pickle
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import render, samples_of
from wavegen.core.site import Site
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm, Pilots
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.rotation import Rotation
from wavegen.sources.subcarriers import IndexSet, PilotValues, SymbolSet

CASES = {
    "slot with edge": (64, ["10 samples", "6 x 8 samples"], "8 samples"),
    "slot without edge": (64, ["10 samples", "6 x 8 samples"], "0 samples"),
    "one length": (128, "1/8", "16 samples"),
    "no prefix": (32, 0, "0 samples"),
    "odd FFT": (45, "5 samples", "3 samples"),
    "whole prefix": (24, "1/1, 12 samples", "1/2"),
}


SCHEDULED = {
    "schedule": {"frame_symbols": 5},
    "schedule and shift": {"frame_symbols": 5, "half_subcarrier_shift": True},
}
"""What is added to the layout called "slot with edge"."""


def scheduled(**more) -> Ofdm:
    """Shared subcarriers, spread and rotated groups, one silent symbol."""
    return Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=(
            Group(
                subcarriers=IndexSet.parse("-9..-1"),
                constellation=Constellation.parse("16qam"),
                symbols=SymbolSet.parse("0, 2"),
                spreading="dft",
            ),
            Group(
                subcarriers=IndexSet.parse("-9..4"),
                constellation=Constellation.parse("bpsk"),
                symbols=SymbolSet.parse("1"),
                spreading="dft",
                rotation=Rotation.parse("pi/2"),
                level_db=-2.0,
            ),
            Group(
                subcarriers=IndexSet.parse("0..14 by 2"),
                constellation=Constellation.parse("1024qam"),
                symbols=SymbolSet.parse("0, 4"),
                rotation=Rotation.parse("pi/5"),
            ),
        ),
        pilots=(
            Pilots(
                subcarriers=IndexSet.parse("-3, 1, 5"),
                values=PilotValues.parse([1, [0, 1]]),
                symbols=SymbolSet.parse("4"),
            ),
            Pilots(
                subcarriers=IndexSet.parse("7, 11"),
                values=PilotValues.parse([1, -1]),
                symbols=SymbolSet.parse("0..2"),
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse(CASES["slot with edge"][1]),
        edge_window=Stretch.parse(CASES["slot with edge"][2]),
        **more,
    )


def build(case: str, n_cycles: int, seed: int = 1):
    if case in SCHEDULED:
        return place(scheduled(**SCHEDULED[case]), 64, n_cycles, seed)
    n_fft, prefix, edge = CASES[case]
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=(
            Group(
                subcarriers=IndexSet.parse("-9..-5, -3..-1"),
                constellation=Constellation.parse("64qam"),
            ),
            Group(
                subcarriers=IndexSet.parse([10, "2..8 by 2"]),
                constellation=Constellation.parse("1024qam"),
                level_db=-3.0,
            ),
        ),
        pilots=(
            Pilots(
                subcarriers=IndexSet.parse("-4, 1, 5"),
                values=PilotValues.parse([1, [0, 1]]),
                level_db=3.0,
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse(prefix),
        edge_window=Stretch.parse(edge),
    )
    return place(settings, n_fft, n_cycles, seed)


def place(settings: Ofdm, n_fft: int, n_cycles: int, seed: int):
    rate = Fraction(15000) * n_fft
    n_samples = settings.cycle(rate, "signal").n_samples * n_cycles
    site = Site(sample_rate_hz=rate, n_samples=n_samples, seed=seed, label="carrier", path="signal")
    return settings.build(site)


def plain(signal) -> np.ndarray:
    """The whole loop, symbol by symbol, as a sum of the tones that each subcarrier carries."""
    layout, bodies = signal.layout, signal.inputs[0]
    n_fft, edge = layout.n_fft, layout.edge
    values = samples_of(signal.ideal).astype(complex).reshape(-1, bodies.indices.size)
    rising = 0.5 - 0.5 * np.cos(np.pi * (np.arange(edge) + 0.5) / max(edge, 1))
    longest = max(layout.prefixes)
    times = np.arange(-longest, n_fft + edge)  # 0 where the useful part starts
    tones = bodies.indices + (0.5 if bodies.is_shifted else 0.0)
    waves = values @ np.exp(2j * np.pi / n_fft * np.outer(tones, times))
    symbols = []
    for k in range(waves.shape[0]):
        prefix = layout.prefixes[k % layout.n_symbols]
        symbol = waves[k, longest - prefix : longest + n_fft].copy()
        symbol[:edge] *= rising
        symbol[:edge] += (1 - rising) * waves[k - 1, longest + n_fft :]
        symbols.append(symbol)
    return np.concatenate(symbols)


@pytest.mark.parametrize("case", [*CASES, *SCHEDULED])
def test_the_loop_is_what_a_plain_construction_gives(case) -> None:
    signal = build(case, 9)
    expected = plain(signal)
    assert expected.size == signal.n_samples
    # float32 values and FFT of unit power: errors around 1e-7, the largest below ten times that.
    assert np.max(np.abs(samples_of(signal) - expected)) < 2e-6


@pytest.mark.parametrize("case", [*CASES, *SCHEDULED])
def test_any_cut_gives_the_same_bits(case) -> None:
    rng = np.random.default_rng(20)
    signal = build(case, 60)
    whole = samples_of(signal)
    n = signal.n_samples
    for _ in range(40):
        start = int(rng.integers(-2 * n, 2 * n))
        count = int(rng.integers(1, 2 * n)) if rng.random() < 0.3 else int(rng.integers(1, 300))
        piece = samples_of(signal, start, start + count)
        expected = whole.take(np.arange(start, start + count), mode="wrap")
        assert piece.tobytes() == expected.tobytes()


@pytest.mark.parametrize("case", [*CASES, *SCHEDULED])
def test_bodies_and_subcarriers_are_the_same_for_any_cut(case) -> None:
    rng = np.random.default_rng(20)
    signal = build(case, 30)
    for part in filter(None, (signal.inputs[0], signal.ideal, signal.points)):
        whole = samples_of(part)
        for _ in range(10):
            start = int(rng.integers(-part.n_samples, part.n_samples))
            count = int(rng.integers(1, part.n_samples))
            expected = whole.take(np.arange(start, start + count), mode="wrap")
            assert samples_of(part, start, start + count).tobytes() == expected.tobytes()


@pytest.mark.parametrize("case", ["slot with edge", "one length", "schedule and shift"])
def test_strips_and_workers_do_not_show(case) -> None:
    signal = build(case, 400)
    expected = samples_of(signal).tobytes()
    for workers, strip in ((1, 1 << 14), (2, 10007), (1, signal.n_samples)):
        pieces: list[bytes] = []
        render(
            signal,
            workers=workers,
            strip_samples=strip,
            sink=lambda samples, kept=pieces: kept.append(samples.tobytes()),
        )
        assert b"".join(pieces) == expected


def test_a_long_pattern_cut_in_pieces_that_stay_in_cache() -> None:
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(480000),
        groups=(
            Group(
                subcarriers=IndexSet.parse("-396..395"), constellation=Constellation.parse("qpsk")
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse(["328 samples", "447 x 72 samples"]),
        edge_window=Stretch.parse("64 samples"),
    )
    rate = Fraction(480000) * 1024
    n_samples = settings.cycle(rate, "signal").n_samples
    signal = settings.build(
        Site(sample_rate_hz=rate, n_samples=n_samples, seed=3, label="carrier", path="signal")
    )
    assert len(signal.runs) > 2
    whole = samples_of(signal)
    assert np.max(np.abs(whole - plain(signal))) < 3e-6
    assert samples_of(signal, -5000, 9000).tobytes() == (
        np.concatenate([whole[-5000:], whole[:9000]]).tobytes()
    )


def test_scattered_subcarriers_are_carried_like_any() -> None:
    rng = np.random.default_rng(20)
    scattered = [k for k in range(-150, 150) if k % 6 and k % 7]
    groups = (
        Group(subcarriers=IndexSet.parse(scattered), constellation=Constellation.parse("16qam")),
        Group(
            subcarriers=IndexSet.parse("-150..149 by 42"), constellation=Constellation.parse("qpsk")
        ),
    )
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=groups,
        cyclic_prefix=CyclicPrefix.parse("1/8"),
    )
    rate = Fraction(15000) * 512
    site = Site(sample_rate_hz=rate, n_samples=576 * 300, seed=3, label="carrier", path="signal")
    signal = settings.build(site)
    assert signal.inputs[0].gaps == [slice(0, 512)]
    whole = samples_of(signal)
    assert np.max(np.abs(whole - plain(signal))) < 2e-6
    for _ in range(20):
        start, count = (int(k) for k in rng.integers(0, signal.n_samples, 2))
        expected = whole.take(np.arange(start, start + count), mode="wrap")
        assert samples_of(signal, start, start + count).tobytes() == expected.tobytes()
    values = np.abs(samples_of(signal.ideal).reshape(300, -1)) ** 2 * signal.ideal.n_samples / 300
    is_qpsk = np.isin(signal.inputs[0].indices, groups[1].subcarriers.indices)
    assert np.allclose(values[:, is_qpsk], 1, rtol=1e-5)
    assert np.allclose(np.unique(values[:, ~is_qpsk].round(3)), [0.2, 1, 1.8])


def test_the_data_are_the_words_of_each_group_in_the_order_listed() -> None:
    signal = build("slot with edge", 3)
    bodies = signal.inputs[0]
    values = samples_of(signal.ideal).reshape(21, -1)
    for part, constellation in zip(bodies.carried, ("64qam", "1024qam"), strict=True):
        points = Constellation.parse(constellation).points
        words = part.data.words(0, 21 * part.bins.size).reshape(21, -1)
        expected = points[words & (points.size - 1)]
        got = values[:, np.searchsorted(bodies.indices, (part.bins.astype(int) + 32) % 64 - 32)]
        gain = np.vdot(expected, got) / np.vdot(expected, expected)
        assert np.allclose(got, gain * expected, rtol=1e-5, atol=1e-7)


@pytest.mark.parametrize("case", SCHEDULED)
def test_a_schedule_is_on_the_axis_of_subcarriers(case) -> None:
    signal = build(case, 4)
    bodies = signal.inputs[0]
    values = samples_of(signal.ideal).reshape(-1, bodies.indices.size)
    assert values.shape[0] == 4 * 35  # 7 prefixes, a frame of 5
    used = {
        0: [*range(-9, 0), 7, 11, *range(0, 15, 2)],
        1: [*range(-9, 5), 7, 11],
        2: [*range(-9, 0), 7, 11],
        3: [],
        4: [-3, 1, 5, *range(0, 15, 2)],
    }
    for symbol, row in enumerate(values):
        where = {int(k) for k in bodies.indices[row != 0]}
        assert where <= set(used[symbol % 5])
        assert len(where) >= len(used[symbol % 5]) - 2  # a spread point may come out as zero


@pytest.mark.parametrize("case", SCHEDULED)
def test_points_are_what_was_spread(case) -> None:
    signal = build(case, 4)
    bodies = signal.inputs[0]
    values = samples_of(signal.ideal).astype(complex).reshape(140, -1)
    points = samples_of(signal.points).astype(complex).reshape(140, -1)
    column = 0
    for part in bodies.carried:
        n = part.bins.size
        on = np.resize(part.presence.on, 140)
        mine = points[:, column : column + n]
        assert not mine[~on].any()
        where = np.searchsorted(bodies.indices, (part.bins.astype(int) + 32) % 64 - 32)
        sent = np.fft.fft(mine[on], norm="ortho") if part.is_spread else mine[on]
        assert np.allclose(values[np.ix_(on, where)], sent, atol=1e-6)
        column += n
    assert column == points.shape[1]
    bpsk = points[1::5, 9 : 9 + 14] / np.exp(0.25j * np.pi)  # BPSK lies on the diagonal
    assert np.allclose(bpsk[:, ::2].imag, 0, atol=1e-7)
    assert np.allclose(bpsk[:, 1::2].real, 0, atol=1e-7)
    assert np.allclose(np.abs(bpsk), np.abs(bpsk[0, 0]), rtol=1e-6)


def test_points_are_there_only_if_something_is_spread() -> None:
    assert build("one length", 4).points is None


@pytest.mark.parametrize("case", ["slot with edge", "schedule and shift"])
def test_signals_can_be_sent_to_another_process(case) -> None:
    signal = build(case, 9)
    packed = pickle.dumps(signal)
    assert len(packed) < 50_000
    assert samples_of(pickle.loads(packed)).tobytes() == samples_of(signal).tobytes()  # noqa: S301


def test_seeds_give_other_loops() -> None:
    assert not np.array_equal(
        samples_of(build("one length", 4)), samples_of(build("one length", 4, seed=2))
    )
