from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.evaluate import evaluate
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.dsp.arrival import Arrival
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm, Pilots
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.subcarriers import IndexSet, PilotValues, SymbolSet

N_FFT = 128


def build(*, spreading=None, is_shifted=False, symbols=None, edge="2 samples"):
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=(
            Group(
                subcarriers=IndexSet.parse("-30..-7, 7..30"),
                constellation=Constellation.parse("64qam"),
                spreading=spreading,
            ),
            Group(
                subcarriers=IndexSet.parse("31..40"),
                constellation=Constellation.parse("qpsk"),
                symbols=SymbolSet.parse(symbols) if symbols else None,
            ),
        ),
        pilots=(Pilots(subcarriers=IndexSet.parse("-3, 3"), values=PilotValues.parse([1, -1])),),
        cyclic_prefix=CyclicPrefix.parse(["160/2048", "6 x 144/2048"]),
        edge_window=Stretch.parse(edge),
        half_subcarrier_shift=is_shifted,
    )
    rate = Fraction(15000) * N_FFT
    site = Site(
        sample_rate_hz=rate,
        n_samples=settings.cycle(rate, "signal").n_samples * 5,
        seed=1,
        label="x",
        path="signal",
    )
    return settings.build(site)


CASES = {
    "plain": {},
    "shifted": {"is_shifted": True},
    "scheduled": {"symbols": "1..3"},
    "spread": {"spreading": "dft", "is_shifted": True, "symbols": "0, 5"},
}


def receive(signal, early=None):
    return signal.receive(signal, Arrival(n_samples=signal.n_samples), early_samples=early)


def error(reception):
    got = samples_of(reception.received).astype(complex)
    sent = samples_of(reception.ideal).astype(complex)
    return np.sqrt(np.mean(np.abs(got - sent) ** 2) / np.mean(np.abs(sent) ** 2))


@pytest.mark.parametrize("early", [None, 0, 3, 7])
@pytest.mark.parametrize("case", CASES)
def test_untouched_symbols_come_back_at_any_timing_inside_the_prefix(case, early) -> None:
    """Tolerance: float32 through two transforms, 1e-7 of the RMS measured, 1e-6 asked."""
    signal = build(**CASES[case])
    reception = receive(signal, early)
    assert error(reception) < 1e-6
    if reception.spread is not None:
        assert error(reception.spread.reception(reception.received)) < 1e-6


@pytest.mark.parametrize("early", [-1, 10, 200])
def test_a_timing_outside_the_prefix_is_refused(early) -> None:
    """The shortest prefix has 9 samples."""
    with pytest.raises(SignalError):
        receive(build(), early)


@pytest.mark.parametrize("case", CASES)
def test_any_cut_gives_the_same_bits(case) -> None:
    reception = receive(build(**CASES[case]))
    axis = [reception.received]
    if reception.spread is not None:
        axis.append(reception.spread.reception(reception.received).received)
    rng = np.random.default_rng(3)
    for received in axis:
        whole = samples_of(received)
        for _ in range(6):
            start, stop = np.sort(rng.integers(-50, received.n_samples, 2))
            part = evaluate({received: (int(start), int(stop) + 1)})[received]
            assert np.array_equal(part, whole[np.arange(start, stop + 1) % received.n_samples])


@pytest.mark.parametrize("n_fft", [64, 96, 1536, 5000, 1 << 17])
def test_any_length_of_the_transform(n_fft) -> None:
    """Symbols are transformed in groups; none may be lost at their ends."""
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=(
            Group(subcarriers=IndexSet.parse("-20..20"), constellation=Constellation.parse("qpsk")),
        ),
        cyclic_prefix=CyclicPrefix.parse("4 samples"),
    )
    rate = Fraction(15000) * n_fft
    n_symbols = max(400_000 // n_fft, 5) + 3
    site = Site(
        sample_rate_hz=rate,
        n_samples=settings.cycle(rate, "signal").n_samples * n_symbols,
        seed=1,
        label="x",
        path="signal",
    )
    assert error(receive(settings.build(site))) < 1e-6


def test_labels_say_what_is_where() -> None:
    reception = receive(build(symbols="1..3"))
    assert [item.name for item in reception.classes] == ["groups[0]", "groups[1]", "pilots[0]"]
    assert [item.constellation for item in reception.classes] == ["64qam", "qpsk", ""]
    labels = reception.labels
    assert labels.shape == (7, reception.n_columns)
    sent = samples_of(reception.ideal).reshape(-1, 7, reception.n_columns)
    assert np.array_equal(np.abs(sent).max(axis=0) > 0, labels >= 0)
    assert np.array_equal((labels == 1).any(axis=1), [False, True, True, True, False, False, False])
    assert np.array_equal(
        np.abs(samples_of(reception.received)).reshape(sent.shape)[:, 0] > 0,
        np.broadcast_to(labels[0] >= 0, sent[:, 0].shape),
    )


def test_points_have_labels_of_their_own() -> None:
    reception = receive(build(spreading="dft", symbols="0, 5"))
    points = reception.spread.reception(reception.received)
    sent = samples_of(points.ideal).reshape(-1, *points.labels.shape)
    assert np.array_equal(np.abs(sent).max(axis=0) > 0, points.labels >= 0)
    assert [item.name for item in points.classes] == ["groups[0]", "groups[1]"]
