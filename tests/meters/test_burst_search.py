import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError, SignalError
from wavegen.dsp.bursts import Bursts
from wavegen.files.format import Annotation
from wavegen.meters.burst_search import (
    BurstSearch,
    find_bursts,
    marked_bursts,
    pattern_bursts,
)

N = 100_000
ON = ((7000, 16_000), (30_000, 31_500), (50_000, 72_000))


def bursty(band_noise, floor_db, runs=ON, n=N, seed=5):
    """Noise that fills half the rate, on in ``runs``, over a floor of its own."""
    signal = band_noise(seed, n, 0.5)
    out = band_noise(seed + 1, n, 0.9) * np.float32(10 ** (floor_db / 20))
    for start, stop in runs:
        place = np.arange(start, stop) % n
        out[place] += signal[place]
    return out


@pytest.mark.parametrize("floor_db", [-15, -40, -90])
def test_bursts_are_where_they_were_put(held, band_noise, floor_db):
    found = find_bursts(held(bursty(band_noise, floor_db)), loops=False)
    assert found.n_bursts == 3
    # Half a window of doubt: the burst's own envelope is low here and there.
    for (start, stop), (low, high) in zip(found.bursts.runs, ON, strict=True):
        assert abs(start - low) <= found.window_samples / 2
        assert abs(stop - high) <= found.window_samples / 2
    guard = found.window_samples // 2
    for low, high in found.bursts.within(0, N, inset=guard):  # what is measured is all on
        assert any(start <= low and high <= stop for start, stop in ON)
    assert found.duty == pytest.approx(0.325, abs=0.002)
    assert found.duty_measured < found.duty
    assert found.on_level_dbfs == pytest.approx(0, abs=0.2)
    assert found.n_cut == 0
    assert "bursts found: 3" in found.label


def test_strips_and_workers_change_nothing(held, band_noise):
    signal = held(bursty(band_noise, -20))
    one = find_bursts(signal, BurstSearch(window_samples=50), loops=False)
    assert find_bursts(signal, BurstSearch(window_samples=50), loops=False, workers=3) == one


@pytest.mark.parametrize("shift", [0, 4999, 12_000, 20_000, 55_000, 90_000])
def test_a_loop_may_begin_anywhere(held, band_noise, shift):
    samples = bursty(band_noise, -30)
    at_home = find_bursts(held(samples), loops=True)
    moved = find_bursts(held(np.roll(samples, shift)), loops=True)
    want = sorted(((a + shift) % N, (a + shift) % N + b - a) for a, b in at_home.bursts.runs)
    assert list(moved.bursts.runs) == want
    assert moved.n_cut == 0


def test_what_the_ends_of_a_record_cut_is_counted(held, band_noise):
    samples = bursty(band_noise, -30)[10_000:60_000]
    found = find_bursts(held(samples), loops=False)
    assert (found.n_bursts, found.n_cut) == (3, 2)
    assert (found.bursts.runs[0][0], found.bursts.runs[-1][1]) == (0, 50_000)


def test_gaps_within_the_dead_time_end_no_burst(held, band_noise):
    runs = tuple((start, start + 700) for start in range(5000, 15_000, 1000))
    signal = held(bursty(band_noise, -30, runs))
    assert find_bursts(signal, BurstSearch(window_samples=32), loops=False).n_bursts == 10
    search = BurstSearch(window_samples=32, dead_time_samples=400)
    assert find_bursts(signal, search, loops=False).n_bursts == 1


def test_short_bursts_can_be_dropped(held, band_noise):
    signal = held(bursty(band_noise, -30))
    search = BurstSearch(window_samples=32, shortest_samples=2000)
    assert find_bursts(signal, search, loops=False).n_bursts == 2


def test_hysteresis_keeps_a_burst_together(held, band_noise):
    # A burst that fades by 8 dB in the middle: without hysteresis a threshold 5 dB under the
    # level cuts it there; closing 10 dB under the level does not.
    samples = bursty(band_noise, -40, ((20_000, 60_000),))
    samples[35_000:45_000] *= np.float32(10 ** (-8 / 20))
    options = {"window_samples": 400, "threshold_db": -5.0, "dead_time_samples": 0}
    apart = find_bursts(held(samples), BurstSearch(**options, hysteresis_db=0), loops=False)
    whole = find_bursts(held(samples), BurstSearch(**options, hysteresis_db=5), loops=False)
    assert (apart.n_bursts, whole.n_bursts) == (2, 1)
    assert whole.threshold_dbfs - whole.closing_dbfs == pytest.approx(5)


@pytest.mark.parametrize("fraction", [0.95, 0.25, 0.1])
def test_noise_without_bursts_has_none(held, band_noise, fraction):
    for seed in range(4):
        found = find_bursts(held(band_noise(seed, N, fraction)), loops=True)
        assert found.bursts is None
        assert found.reason
        assert (found.n_bursts, found.duty, found.duty_measured) == (0, 1.0, 1.0)


def test_a_carrier_and_one_stray_sample_are_no_bursts(held):
    samples = np.ones(N, np.complex64)
    assert find_bursts(held(samples), loops=False).bursts is None
    samples[50] = 1000
    assert find_bursts(held(samples), loops=False).bursts is None


def test_bursts_rarer_than_the_percentile(held, band_noise):
    # On for 0.05 % of the time: the 99.9th percentile lies in the floor.
    n = 400_000
    found = find_bursts(held(bursty(band_noise, -40, ((200_000, 200_200),), n)), loops=False)
    assert found.n_bursts == 1
    assert abs(found.bursts.runs[0][0] - 200_000) <= found.window_samples


def test_exact_zeros_between_bursts(held, band_noise):
    samples = bursty(band_noise, -300)
    samples[np.abs(samples) < 1e-10] = 0
    found = find_bursts(held(samples), loops=False)
    assert found.n_bursts == 3
    assert found.top_dbfs - found.floor_dbfs == pytest.approx(60)


@pytest.mark.parametrize(
    "settings",
    [
        {"window_samples": 0},
        {"threshold_db": 0.0},
        {"threshold_db": float("nan")},
        {"hysteresis_db": -1.0},
        {"dead_time_samples": -1},
        {"guard_samples": -1},
        {"shortest_samples": -1},
    ],
)
def test_settings_that_mean_nothing_are_refused(held, settings):
    with pytest.raises(ArgumentsError) as caught:
        find_bursts(held(np.ones(100)), BurstSearch(**settings), loops=False)
    assert caught.value.where in settings


class TestMarkers:
    def test_are_joined_sorted_and_cut(self):
        marks = [
            Annotation(start_sample=500, n_samples=100, label="b"),
            Annotation(start_sample=0, n_samples=50, label="a"),
            Annotation(start_sample=550, n_samples=100, label="b"),
            Annotation(start_sample=700),
            Annotation(start_sample=950, n_samples=100, label="a"),
        ]
        found = marked_bursts(marks, n_samples=1000)
        assert found.bursts.runs == ((0, 50), (500, 650), (950, 1000))
        assert found.label == "bursts by the file's markers: 3"
        only = marked_bursts(marks, n_samples=1000, label="a", guard_samples=5)
        assert only.bursts.runs == ((0, 50), (950, 1000))
        assert only.duty_measured == pytest.approx(0.08)

    def test_none_is_told(self):
        with pytest.raises(SignalError):
            marked_bursts([Annotation(start_sample=3)], n_samples=10)


class TestPattern:
    def test_is_unrolled_over_the_record(self):
        found = pattern_bursts(Bursts(period_samples=100, runs=((10, 40),)), n_samples=250)
        assert found.bursts.runs == ((10, 40), (110, 140), (210, 240))
        assert found.duty == pytest.approx(0.36)

    def test_that_is_never_on_is_told(self):
        with pytest.raises(SignalError):
            pattern_bursts(Bursts(period_samples=500, runs=((300, 400),)), n_samples=250)


@pytest.mark.parametrize("threshold_db", [None, -6.0, -12.0])
def test_abrupt_edges_are_found_to_the_sample(held, threshold_db):
    # Constant level: the window crosses the threshold after that share of its length.
    samples = np.full(N, 1e-3, np.complex64)
    samples[20_000:50_000] = 1
    search = BurstSearch(window_samples=400, threshold_db=threshold_db)
    ((start, stop),) = find_bursts(held(samples), search, loops=False).bursts.runs
    assert abs(start - 20_000) <= 2
    assert abs(stop - 50_000) <= 2
    crossing = BurstSearch(window_samples=400, threshold_db=threshold_db, edges="crossing")
    ((early, late),) = find_bursts(held(samples), crossing, loops=False).bursts.runs
    assert early < 20_000 - 90
    assert late > 50_000 + 90
