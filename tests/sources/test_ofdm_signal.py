import pickle
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import render, samples_of
from wavegen.core.site import Site
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm, Pilots
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.subcarriers import IndexSet, PilotValues

CASES = {
    "slot with edge": (64, ["10 samples", "6 x 8 samples"], "8 samples"),
    "slot without edge": (64, ["10 samples", "6 x 8 samples"], "0 samples"),
    "one length": (128, "1/8", "16 samples"),
    "no prefix": (32, 0, "0 samples"),
    "odd FFT": (45, "5 samples", "3 samples"),
    "whole prefix": (24, "1/1, 12 samples", "1/2"),
}


def build(case: str, n_cycles: int, seed: int = 1):
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
    rate = Fraction(15000) * n_fft
    n_samples = settings.cycle(rate, "signal").n_samples * n_cycles
    site = Site(sample_rate_hz=rate, n_samples=n_samples, seed=seed, label="carrier", path="signal")
    return settings.build(site)


def plain(signal) -> np.ndarray:
    """The whole loop, symbol by symbol, from what each subcarrier carries."""
    layout, bodies = signal.layout, signal.inputs[0]
    n_fft, edge = layout.n_fft, layout.edge
    values = samples_of(signal.ideal).astype(complex).reshape(-1, bodies.indices.size)
    grid = np.zeros((values.shape[0], n_fft), complex)
    grid[:, bodies.indices % n_fft] = values
    body = np.fft.ifft(grid, axis=1) * n_fft
    rising = 0.5 - 0.5 * np.cos(np.pi * (np.arange(edge) + 0.5) / max(edge, 1))
    symbols = []
    for k in range(body.shape[0]):
        prefix = layout.prefixes[k % layout.n_symbols]
        symbol = np.concatenate([body[k, n_fft - prefix :], body[k]])
        symbol[:edge] = rising * symbol[:edge] + (1 - rising) * body[k - 1, :edge]
        symbols.append(symbol)
    return np.concatenate(symbols)


@pytest.mark.parametrize("case", CASES)
def test_the_loop_is_what_a_plain_construction_gives(case) -> None:
    signal = build(case, 9)
    expected = plain(signal)
    assert expected.size == signal.n_samples
    # float32 values and FFT of unit power: errors around 1e-7, the largest below ten times that.
    assert np.max(np.abs(samples_of(signal) - expected)) < 2e-6


@pytest.mark.parametrize("case", CASES)
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


@pytest.mark.parametrize("case", CASES)
def test_bodies_and_subcarriers_are_the_same_for_any_cut(case) -> None:
    rng = np.random.default_rng(20)
    signal = build(case, 30)
    for part in (signal.inputs[0], signal.ideal):
        whole = samples_of(part)
        for _ in range(10):
            start = int(rng.integers(-part.n_samples, part.n_samples))
            count = int(rng.integers(1, part.n_samples))
            expected = whole.take(np.arange(start, start + count), mode="wrap")
            assert samples_of(part, start, start + count).tobytes() == expected.tobytes()


@pytest.mark.parametrize("case", ["slot with edge", "one length"])
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


def test_signals_can_be_sent_to_another_process() -> None:
    signal = build("slot with edge", 9)
    packed = pickle.dumps(signal)
    assert len(packed) < 50_000
    assert samples_of(pickle.loads(packed)).tobytes() == samples_of(signal).tobytes()  # noqa: S301


def test_seeds_give_other_loops() -> None:
    assert not np.array_equal(
        samples_of(build("one length", 4)), samples_of(build("one length", 4, seed=2))
    )
