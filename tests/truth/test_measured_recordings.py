"""`wavegen measure` on real recordings, whole and gated, against figures by others' definitions.

Figures of whole files and variants were computed once with NumPy on the codes, apart from the
package (levels: the sorted power with ``floor(q n)`` samples above; full scale 32768), and are
restated here to three decimals; those of bursts are computed here. Sources and licences of the
recordings: tests/files/recordings/README.md.
"""

import json
from pathlib import Path

import numpy as np
import pytest

from wavegen.cli.main import run

FOLDER = Path(__file__).resolve().parents[1] / "files" / "recordings"
WIFI = ("wifi_11a_conducted_20msps.ci16_le", "20MHz")
NOISE = ("rxnoise_440mhz_10ksps.ci16_le", "10kHz")
NBIOT = "nbiot_uplink_832mhz_640ksps_cut.sigmf-data"
TOLERANCE_DB = 0.05
WINDOW = 64
SAME_GATE = (
    *("--gate", "auto", "--gate-window", f"{WINDOW}samples", "--edges", "crossing"),
    *("--hysteresis", "0dB", "--dead-time", "0s", "--shortest-burst", "0s"),
)

WHOLE = {
    "wifi": (WIFI, (), -12.994, 9.971, {0.1: 3.421, 0.01: 6.612, 1e-3: 8.291}),
    "noise": (NOISE, (), -36.965, 39.975, {0.1: -21.511, 0.01: -20.748, 1e-3: -20.087}),
    "without the fill word": (
        NOISE, ("--from", "1samples"), -59.459, 2.670, {0.1: 0.983, 0.01: 1.746},
    ),
    "without its start": (
        NOISE, ("--from", "100samples"), -59.460, 2.671, {0.1: 0.984, 0.01: 1.747},
    ),
    "and without its offset": (
        NOISE, ("--from", "100samples", "--remove-dc"), -76.552, 9.640, {0.1: 3.572, 0.01: 6.663},
    ),
}  # fmt: skip


@pytest.fixture
def measure(capsys):
    def measure(name, *options):
        capsys.readouterr()
        assert run(["measure", str(FOLDER / name), "--json", *options]) == 0
        return json.loads(capsys.readouterr().out)

    return measure


@pytest.mark.parametrize("case", WHOLE)
def test_whole_recordings(measure, case):
    (name, rate), options, mean_dbfs, papr_db, levels = WHOLE[case]
    document = measure(name, "--sample-rate", rate, *options)
    assert document["mean_dbfs"] == pytest.approx(mean_dbfs, abs=1e-3)
    assert document["papr_db"] == pytest.approx(papr_db, abs=3e-3)
    found = {row["probability"]: row["level_db"] for row in document["levels"]}
    for probability, level_db in levels.items():
        # The offset goes without the first 64 samples: 0.012 dB from one with them.
        assert found[probability] == pytest.approx(level_db, abs=0.015)


def test_the_faults_of_the_noise_recording_are_found(measure):
    name, rate = NOISE
    document = measure(name, "--sample-rate", rate)
    faults = {row["kind"]: row for row in document["faults"]}
    assert set(faults) == {"fill", "start_up", "dc_offset", "coarse_quantisation"}
    assert faults["fill"]["size"] == pytest.approx(22.49, abs=0.01)
    # The offset stands 17 dB over the noise, whose sigma is 3.45 codes.
    assert faults["dc_offset"]["size"] == pytest.approx(17.0, abs=0.1)
    assert "RMS 3.4 steps" in faults["coarse_quantisation"]["effect"]
    name, rate = WIFI
    assert measure(name, "--sample-rate", rate)["faults"] == []


@pytest.fixture(scope="module")
def power():
    rails = np.fromfile(FOLDER / NBIOT, "<i2").astype(np.float64).reshape(-1, 2)
    return (rails**2).sum(axis=1) / 32768**2


def by_sorting(power):
    """Return mean (dBFS), peak over mean and levels at 10, 1 and 0.1 %, dB."""
    ranked, mean = np.sort(power), power.mean()
    levels = [10 * np.log10(ranked[-1 - int(q * power.size)] / mean) for q in (0.1, 0.01, 1e-3)]
    return 10 * np.log10(mean), 10 * np.log10(ranked[-1] / mean), levels


def agrees(figures, power):
    mean_dbfs, papr_db, levels = by_sorting(power)
    assert figures["n_samples"] == pytest.approx(power.size, abs=0.001 * power.size)
    assert figures["mean_dbfs"] == pytest.approx(mean_dbfs, abs=TOLERANCE_DB)
    assert figures["papr_db"] == pytest.approx(papr_db, abs=TOLERANCE_DB)
    found = {row["probability"]: row["level_db"] for row in figures["levels"]}
    assert [found[q] for q in (0.1, 0.01, 1e-3)] == pytest.approx(levels, abs=TOLERANCE_DB)


def test_bursts_by_level_and_all_of_the_time(measure, power):
    """Moving mean over 64 samples; halfway in dB between its 5th and 99.9th percentile."""
    moving = np.convolve(power, np.ones(WINDOW) / WINDOW, "same")
    floor, top = np.percentile(moving, [5, 99.9])
    is_on = moving >= np.sqrt(floor * top)
    document = measure(NBIOT, *SAME_GATE)
    agrees(document, power)
    agrees(document["on_time"], power[is_on])
    assert document["on_time"]["duty"] == pytest.approx(is_on.mean(), abs=2e-3)
    gain_db = document["on_time"]["mean_dbfs"] - document["mean_dbfs"]
    assert gain_db == pytest.approx(-10 * np.log10(is_on.mean()), abs=TOLERANCE_DB)


def test_bursts_by_markers(measure, power):
    meta = json.loads((FOLDER / NBIOT).with_suffix(".sigmf-meta").read_text())
    is_on = np.zeros(power.size, np.bool_)
    for mark in meta["annotations"]:
        start = mark["core:sample_start"]
        is_on[start : start + mark["core:sample_count"]] = True
    agrees(measure(NBIOT, "--gate", "markers")["on_time"], power[is_on])


def test_our_own_gate_leaves_out_what_is_no_burst(measure):
    """Edges moved inwards and a guard: less of the off-time counts, and the mean is higher."""
    same = measure(NBIOT, *SAME_GATE)["on_time"]
    ours = measure(NBIOT, "--gate", "auto")["on_time"]
    assert 0 < ours["mean_dbfs"] - same["mean_dbfs"] < 0.2
    assert ours["n_samples"] < same["n_samples"]
    assert ours["guard_samples"] > 0


def test_intervals_hold_the_level_of_more_of_the_same(measure):
    """Receiver noise, offset off: a complex Gaussian's levels lie in the intervals."""
    name, rate = NOISE
    document = measure(name, "--sample-rate", rate, "--from", "100samples", "--remove-dc")
    for row in document["levels"][:3]:
        gaussian_db = 10 * np.log10(-np.log(row["probability"]))
        assert row["low_db"] < gaussian_db < row["high_db"]
