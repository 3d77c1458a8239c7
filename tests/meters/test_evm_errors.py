import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.render import Tap, render, samples_of
from wavegen.meters import METERS
from wavegen.meters.evm_errors import (
    FrameErrorMeter,
    equalised,
    errors_of,
    spread_of,
)
from wavegen.meters.power import measure_samples
from wavegen.sources.reception import Reception, SymbolClass


def test_is_in_the_table() -> None:
    assert METERS.load("frame_error") is FrameErrorMeter


def test_symbols_are_divided_by_the_gain_of_their_column(held) -> None:
    gains = np.array([1, 2, 4j])
    signal = equalised(held(np.tile(gains, 40)), gains)
    assert np.allclose(samples_of(signal), 1)
    assert np.allclose(samples_of(signal, 7, 50), 1)
    assert np.allclose(samples_of(equalised(held(np.full(10, 3)), 3)), 1)


def test_errors_of_a_class_and_their_percentiles(held) -> None:
    """Lengths 1 to 100 % in random order: the 95th percentile is 95 %, within a bin."""
    rng = np.random.default_rng(1)
    length = rng.permutation(np.arange(1, 101)) / 100
    sent = np.ones(200, np.complex64)
    got = sent + np.stack([length, np.full(100, 5.0)], axis=1).ravel() * 2
    reception = Reception(
        received=held(got),
        ideal=held(sent),
        classes=(SymbolClass(name="a"), SymbolClass(name="b")),
        n_columns=2,
        labels=np.array([[0, 1]], np.int16),
    )
    errors = errors_of(reception, rms=2.0, number=0)
    samples = samples_of(errors)
    assert np.allclose(samples[0::2], length)
    assert not samples[1::2].any()
    spread = spread_of(measure_samples(samples), share=0.5)
    assert spread.peak_percent == pytest.approx(100, abs=1e-4)
    assert spread.peak_index == 2 * np.argmax(length)
    assert spread.p95_percent == pytest.approx(95, abs=0.6)
    assert spread.median_percent == pytest.approx(50, abs=0.6)


def test_mean_over_frames_of_the_rms_in_each(held) -> None:
    errors = np.repeat([0.1, 0.3], 50)
    signal = held(errors)

    def measure(points, strip=None):
        meter = FrameErrorMeter(frame_points=points, used_points=points)
        tap = Tap(name="x", signal=signal, meter=meter)
        return render(signal, taps=(tap,), strip_samples=strip)["x"]

    assert measure(50) == pytest.approx(0.2, rel=1e-6)
    assert measure(50, strip=7) == measure(50)
    assert measure(100) == pytest.approx(np.sqrt(0.05), rel=1e-6)
    with pytest.raises(SignalError):
        measure(33)
