"""Gated figures of real recordings against NumPy, by a definition that is written out here.

Definition, own: moving mean of power over a stated window; a sample is on where it reaches the
threshold that lies halfway in dB between the 5th and the 99.9th percentile of that mean. Ours
differs, on purpose, where not asked for this one: hysteresis, dead time, edges moved inwards by
what the window adds, and a guard for ramps. The excerpt and its licence:
tests/files/recordings/README.md.
"""

from pathlib import Path

import numpy as np
import pytest

from wavegen.core.render import Tap, render
from wavegen.files.format import ReadHints
from wavegen.files.read import open_recording
from wavegen.meters.burst_powers import BurstPowerMeter
from wavegen.meters.burst_search import BurstSearch, find_bursts, marked_bursts
from wavegen.meters.gated import GatedPowerMeter

PATH = (
    Path(__file__).resolve().parents[1]
    / "files"
    / "recordings"
    / "nbiot_uplink_832mhz_640ksps_cut.sigmf-data"
)
WINDOW = 64
SAME = BurstSearch(
    window_samples=WINDOW,
    hysteresis_db=0,
    dead_time_samples=0,
    shortest_samples=0,
    edges="crossing",
)


@pytest.fixture(scope="module")
def recording():
    return open_recording(PATH, ReadHints())


@pytest.fixture(scope="module")
def power():
    rails = np.fromfile(PATH, "<i2").astype(np.float64).reshape(-1, 2)
    return (rails**2).sum(axis=1) / 32768**2


def gated(recording, found):
    meters = {
        "on": GatedPowerMeter(bursts=found.bursts),
        "each": BurstPowerMeter(bursts=found.bursts),
    }
    signal = recording.signal
    taps = tuple(Tap(name=name, signal=signal, meter=meter) for name, meter in meters.items())
    return render(signal, taps=taps)


def by_numpy(power):
    """Return which samples are on, and the threshold, dB over the mean."""
    moving = np.convolve(power, np.ones(WINDOW) / WINDOW, "same")
    edge = WINDOW // 2
    moving[:edge] *= WINDOW / np.arange(WINDOW - edge, WINDOW)
    moving[-edge + 1 :] *= WINDOW / np.arange(WINDOW - 1, WINDOW - edge, -1)
    floor, top = np.percentile(moving, [5, 99.9])
    threshold = np.sqrt(floor * top)
    return moving >= threshold, 10 * np.log10(threshold)


def test_the_same_definition_gives_the_same_figures(recording, power):
    is_on, threshold_dbfs = by_numpy(power)
    found = find_bursts(recording.signal, SAME, loops=False)
    assert found.threshold_dbfs == pytest.approx(threshold_dbfs, abs=0.05)
    assert found.duty == pytest.approx(is_on.mean(), abs=2e-4)
    got = gated(recording, found)["on"]
    kept = power[is_on]
    assert got.mean_db == pytest.approx(10 * np.log10(kept.mean()), abs=0.05)
    assert got.papr_db == pytest.approx(10 * np.log10(kept.max() / kept.mean()), abs=0.05)
    for probability in (0.1, 0.01, 1e-3):
        exact = np.sort(kept)[kept.size - 1 - int(probability * kept.size)] / kept.mean()
        assert float(got.level_db(probability)) == pytest.approx(10 * np.log10(exact), abs=0.05)


def test_our_definition_leaves_out_what_the_window_adds(recording):
    same, ours = (find_bursts(recording.signal, search, loops=False) for search in (SAME, None))
    assert ours.n_bursts <= same.n_bursts
    assert ours.duty_measured < ours.duty < same.duty
    # A window of silence at each end of a burst lowers the mean; without it the mean is higher.
    low, high = (gated(recording, found)["on"].mean_db for found in (same, ours))
    assert 0 < high - low < 0.2


def test_markers_are_a_gate_of_their_own(recording, power):
    found = marked_bursts(recording.annotations, n_samples=recording.n_samples)
    is_on = np.zeros(power.size, np.bool_)
    for mark in recording.annotations:
        is_on[mark.start_sample : mark.start_sample + (mark.n_samples or 0)] = True
    got = gated(recording, found)
    assert got["on"].n_samples == np.count_nonzero(is_on)
    assert got["on"].mean == pytest.approx(power[is_on].mean(), rel=1e-6)
    each = got["each"]
    for start, stop, mean, peak in zip(
        each.start_sample, each.stop_sample, each.mean, each.peak, strict=True
    ):
        assert mean == pytest.approx(power[start:stop].mean(), rel=1e-6)
        assert peak == pytest.approx(power[start:stop].max(), rel=1e-6)


def test_gated_and_ungated_differ_by_the_duty(recording, power):
    # The floor is 40 dB down: mean over all = duty x mean while on, to 0.01 dB.
    found = find_bursts(recording.signal, SAME, loops=False)
    on = gated(recording, found)["on"]
    rise_db = on.mean_db - 10 * np.log10(power.mean())
    assert rise_db == pytest.approx(10 * np.log10(1 / found.duty), abs=0.01)
