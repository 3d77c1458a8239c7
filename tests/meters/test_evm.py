import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.render import Tap, render
from wavegen.meters import METERS
from wavegen.meters.evm import EvmMeter, Paired, waveform_sums

N = 6000


GAIN = 0.9 * np.exp(0.2j)


def pair(seed, n=N, *, gain=GAIN, noise=0.1):
    rng = np.random.default_rng(seed)
    sent = np.exp(2j * np.pi * rng.integers(0, 8, n) / 8) * rng.choice([0.5, 1.0], n)
    error = noise * (rng.standard_normal(n) + 1j * rng.standard_normal(n)) * np.sqrt(0.5)
    return (gain * (sent + error)).astype(np.complex64), sent.astype(np.complex64)


def percent(got, sent, gain):
    error = got.astype(complex) / gain - sent
    return 100 * np.sqrt(np.sum(np.abs(error) ** 2) / np.sum(np.abs(sent.astype(complex)) ** 2))


def test_is_in_the_table() -> None:
    assert METERS.load("evm") is EvmMeter


def test_fitted_and_unfitted_are_what_they_say() -> None:
    got, sent = pair(1)
    sums = waveform_sums(got, sent)
    gain = np.vdot(sent.astype(complex), got) / np.vdot(sent, sent).real
    assert sums.gain == pytest.approx(gain, rel=1e-6)
    assert sums.fitted_percent == pytest.approx(percent(got, sent, gain), rel=1e-6)
    assert sums.unfitted_percent == pytest.approx(percent(got, sent, 1), rel=1e-6)
    assert sums.percent(1.2 - 0.1j) == pytest.approx(percent(got, sent, 1.2 - 0.1j), rel=1e-6)
    assert sums.gain_db == pytest.approx(20 * np.log10(0.9), abs=0.02)
    assert sums.phase_deg == pytest.approx(np.degrees(0.2), abs=0.2)


def test_small_errors_are_not_lost() -> None:
    """1e-6 of the RMS is at the rounding of float32 samples, not of the sums."""
    got, sent = pair(2, gain=1.0, noise=0.0)
    got = got + np.float32(1e-5)
    assert waveform_sums(got, sent).unfitted_percent == pytest.approx(
        1e-3 / np.sqrt(np.mean(np.abs(sent) ** 2)), rel=0.02
    )
    assert waveform_sums(sent, sent).fitted_percent == 0


@pytest.mark.parametrize("n_columns", [3, 500, 1500])
def test_classes_and_columns(n_columns) -> None:
    got, sent = pair(3, gain=1.1)
    labels = np.resize([0, 1, 2, -1, 1], (2, n_columns)).astype(np.int16)
    which = np.resize(labels, (N // n_columns, n_columns))
    got = np.where(which.ravel() < 0, 0, got).astype(np.complex64)
    sent = np.where(which.ravel() < 0, 0, sent).astype(np.complex64)
    sums = waveform_sums(got, sent, n_columns=n_columns, n_classes=3, labels=labels)
    for number in range(3):
        is_in = which.ravel() == number
        assert sums.percent(1.05, [number]) == pytest.approx(
            percent(got[is_in], sent[is_in], 1.05), rel=1e-5
        )
    gains = sums.column_gains()
    grids = got.reshape(-1, n_columns).astype(complex), sent.reshape(-1, n_columns).astype(complex)
    power = np.sum(np.abs(grids[1]) ** 2, axis=0)
    want = np.sum(np.conj(grids[1]) * grids[0], axis=0)[power > 0] / power[power > 0]
    assert np.allclose(gains[power > 0], want, rtol=1e-6)
    assert (gains[power == 0] == 1).all()
    assert sums.percent(gains) == pytest.approx(
        percent((grids[0] / gains).ravel(), sent, 1.0), rel=1e-5
    )


def test_smoothing_narrows_towards_the_edges() -> None:
    got, sent = pair(5, n=9)
    gains = waveform_sums(got, sent, n_columns=9).column_gains()
    smooth = waveform_sums(got, sent, n_columns=9).column_gains(5)
    assert smooth[0] == pytest.approx(gains[0])
    assert smooth[1] == pytest.approx(gains[:3].mean())
    assert smooth[4] == pytest.approx(gains[2:7].mean())
    assert smooth[-2] == pytest.approx(gains[-3:].mean())


def test_rails_count_alone() -> None:
    """At even places the I rail is sent, at odd ones Q; what the other rail reads is no error."""
    rng = np.random.default_rng(6)
    levels = rng.choice([-1.0, 1.0], N)
    turn = np.where(np.arange(N) % 2, 1j, 1)
    other = rng.standard_normal(N)
    noise = 0.05 * rng.standard_normal(N)
    gain = 1.3 * np.exp(0.4j)
    got = (gain * turn * (levels + noise + 1j * other)).astype(np.complex64)
    sums = waveform_sums(got, (turn * levels).astype(np.complex64), is_railed=True)
    assert sums.gain == pytest.approx(gain, rel=0.1)  # the other rail is noise to the fit
    assert sums.percent(gain) == pytest.approx(100 * np.sqrt(np.mean(noise**2)), rel=1e-4)


def test_strips_and_workers_change_nothing(held) -> None:
    got, sent = pair(7, n=150_000)
    both = Paired.of(held(got), held(sent))
    for settings in ({}, {"n_columns": 1000}, {"n_columns": 30}, {"is_railed": True}):
        tap = Tap(name="x", signal=both, meter=EvmMeter(**settings))
        one = render(held(got), taps=(tap,))["x"]
        for strip, workers in ((70_001, 2), (999, 1)):
            two = render(held(got), taps=(tap,), strip_samples=strip, workers=workers)["x"]
            for name in ("reference", "cross", "error", "square"):
                assert np.array_equal(getattr(one, name), getattr(two, name))


def test_pairs_are_cut_anywhere(held) -> None:
    got, sent = pair(8, n=100)
    both = Paired.of(held(got), held(sent))
    whole = np.stack([got, sent], axis=1).ravel()
    for start, stop in ((0, 200), (1, 2), (7, 20), (8, 21)):
        (low, high), _ = both.needs(start, stop)
        part = both.compute(start, stop, got[low:high], sent[low:high])
        assert np.array_equal(part, whole[start:stop])
    with pytest.raises(ValueError, match="paired"):
        Paired.of(held(got), held(sent[:-1]))


@pytest.mark.parametrize("value", [0.0, np.nan])
def test_nothing_sent_or_not_finite(value) -> None:
    with pytest.raises(SignalError):
        waveform_sums(np.full(10, value, np.complex64), np.zeros(10, np.complex64))
