import itertools
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.timespan import TimeSpan
from wavegen.core.units import QuantityError
from wavegen.stages.crest.peak_windowing import (
    PeakWindowed,
    PeakWindowing,
    deepest_windows,
    window_of,
)

N = 1 << 16


@pytest.fixture(scope="module")
def source(reduction):
    return reduction.banded(N, (-0.1, 0.1, 0))


@pytest.mark.parametrize("window", ["kaiser", "gaussian", "hann"])
@pytest.mark.parametrize("length", [None, "5 samples", "33 samples"])
def test_the_ceiling_holds_at_every_sample(reduction, source, window, length):
    span = None if length is None else TimeSpan.parse(length)
    settings = PeakWindowing(ceiling_db=5.0, window=window, length=span)
    signal, _ = reduction.build(settings, source)
    samples = samples_of(signal)
    assert reduction.papr_db(samples) == pytest.approx(5.0, abs=0.004)
    highest = np.max(np.abs(samples.astype(np.complex128)))
    assert highest <= signal.amplitude * signal.gain * (1 + 6e-7)
    assert np.mean(np.abs(samples.astype(np.complex128)) ** 2) == pytest.approx(1, rel=1e-5)


def test_phase_is_kept_and_far_samples_are_untouched(reduction, source):
    signal, _ = reduction.build(PeakWindowing(ceiling_db=8.0), source)
    ratio = samples_of(signal).astype(np.complex128) / (signal.gain * source.samples)
    assert np.max(np.abs(ratio.imag)) < 1e-6
    assert ratio.real.max() < 1 + 1e-6
    assert np.mean(np.abs(ratio - 1) < 1e-6) > 0.9


def test_of_overlapping_windows_the_deepest_counts(reduction):
    samples = np.ones(64, np.complex64)
    samples[20], samples[23], samples[40] = 2, 4, 1.25
    window = np.array([0.25, 0.5, 1.0, 0.5, 0.25])
    signal = PeakWindowed(
        sample_rate_hz=reduction.rate_hz,
        n_samples=64,
        inputs=(reduction.held(samples),),
        amplitude=1.0,
        window=window,
        gain=1.0,
    )
    depth = np.zeros(64)
    for place, deep in ((20, 0.5), (23, 0.75), (40, 0.2)):
        here = slice(place - 2, place + 3)
        depth[here] = np.maximum(depth[here], deep * window)
    assert np.allclose(samples_of(signal), samples * (1 - depth), atol=1e-6)


def test_longer_windows_leave_the_neighbours_clearer(reduction, source):
    figures = []
    for length in (5, 11, 21, 41):
        settings = PeakWindowing(ceiling_db=6.0, length=TimeSpan(Fraction(length), "samples"))
        signal, _ = reduction.build(settings, source)
        beside = reduction.change_dbc(signal, source, [(-0.1, 0.1)])
        figures.append((beside, reduction.evm_percent(signal, source)))
    assert all(a[0] > b[0] and a[1] < b[1] for a, b in itertools.pairwise(figures))


def test_windows():
    for kind in ("kaiser", "gaussian", "hann"):
        window = window_of(kind, 10, 40.0)
        assert (window.size, window[10]) == (21, 1)
        assert np.allclose(window, window[::-1])
        assert np.all(np.diff(window[:11]) > 0)
        assert window[0] > 0
    assert window_of("gaussian", 10, 40.0)[0] == pytest.approx(0.01)
    got = deepest_windows(np.array([2, 3]), np.array([1, 0.5], "f4"), np.ones(3, "f4"), 6)
    assert got.tolist() == [0, 1, 1, 1, 0.5, 0]


def test_lengths_are_rounded_and_told(reduction, source):
    settings = PeakWindowing(ceiling_db=6.0, length=TimeSpan.parse("20 us"))
    signal, notes = reduction.build(settings, source)
    assert signal.window.size in {19, 21}
    (note,) = [note for note in notes if note.kind == "rounded"]
    assert (note.where, note.asked) == ("stages[0].length", "20 us")
    _, notes = reduction.build(
        PeakWindowing(ceiling_db=6.0, length=TimeSpan.parse("21 us")), source
    )
    assert not [note for note in notes if note.kind == "rounded"]


def test_refusals(reduction, source):
    with pytest.raises(QuantityError) as caught:
        PeakWindowing(ceiling_db=6.0, window="hann", suppression_db=50.0)
    assert caught.value.key == "suppression"
    with pytest.raises(QuantityError) as caught:
        PeakWindowing(ceiling_db=6.0, length=TimeSpan.parse("-1 us"))
    assert caught.value.key == "length"
    with pytest.raises(RecipeError) as refused:
        reduction.build(PeakWindowing(ceiling_db=6.0, length=TimeSpan.parse("1 s")), source)
    assert refused.value.where == "stages[0].length"


def test_a_low_peak_is_left(reduction, source):
    ceiling_db = reduction.papr_db(source.samples) + 0.01
    assert reduction.build(PeakWindowing(ceiling_db=ceiling_db), source)[0] is source
