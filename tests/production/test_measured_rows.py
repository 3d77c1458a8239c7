import json

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.meters.batches import measure_batches
from wavegen.meters.intervals import SampledStatistics
from wavegen.meters.power import measure_samples
from wavegen.production import measured_rows as rows
from wavegen.production.measure_settings import AskedLevel, SensorSettings


@pytest.fixture(scope="module")
def samples():
    rng = np.random.default_rng(1)
    return (rng.standard_normal(2 * 40_000) * np.sqrt(0.5)).astype(np.float32).view(np.complex64)


@pytest.fixture(scope="module")
def sample(samples):
    return SampledStatistics.of(measure_batches(samples))


def test_asked_probabilities_join_the_usual_ones():
    asked = rows.asked_probabilities([0.05, 0.1])
    assert asked[:3] == (0.1, 0.05, 0.01)
    assert len(asked) == 7


def test_levels_with_intervals(sample):
    found = rows.sampled_levels(sample, (0.1, 1e-3, 1e-6))
    assert list(found[0]) == ["probability", "level_db", "low_db", "high_db", "resolved"]
    for row in found[:2]:
        assert row["low_db"] < row["level_db"] < row["high_db"]
        assert row["resolved"]
    # White noise of 40 000 values: 95 % of 1.96 sqrt(0.1 0.9 / n) over x f(x) = 0.23, in dB.
    half_db = 10 / np.log(10) * 1.96 * np.sqrt(0.09 / 40_000) / 0.23
    assert found[0]["high_db"] - found[0]["low_db"] == pytest.approx(2 * half_db, rel=0.3)
    assert not found[2]["resolved"]
    assert found[2]["high_db"] is None


def test_a_record_that_says_nothing(samples):
    short = SampledStatistics.of(measure_batches(samples[:60]))
    assert short.levels_resolved([0.5]).all()  # clusters enough, but no batches
    found = rows.process_rows(
        short, n_samples=60, n_turns=None, sample_rate_hz=1e6, probabilities=(0.5,)
    )
    assert "too short" in found["says"]
    assert found["next_decade"] is None
    assert found["levels"][0]["low_db"] is found["levels"][0]["high_db"] is None
    assert not found["levels"][0]["resolved"]
    json.dumps(found, allow_nan=False)


def test_the_next_decade_is_ten_clusters_long(sample):
    found = rows.process_rows(
        sample, n_samples=40_000, n_turns=3, sample_rate_hz=1e6, probabilities=(0.1,)
    )
    needed = found["next_decade"]
    # 1e-3 is resolved by 40 white samples, 1e-4 by 4 is not: 10 / 1e-4, by clusters of one.
    assert needed["probability"] == pytest.approx(1e-4)
    assert needed["n_samples"] == pytest.approx(1e5, rel=0.15)
    assert needed["duration_s"] == pytest.approx(needed["n_samples"] / 1e6, rel=1e-4)
    assert found["n_data_periods"] == 3
    assert np.all(np.array(found["ccdf"]["low"]) <= np.array(found["ccdf"]["probability"]) + 1e-12)
    assert np.all(np.array(found["ccdf"]["high"]) >= np.array(found["ccdf"]["probability"]) - 1e-12)


def test_shares_of_time(samples, sample):
    asked = [AskedLevel(level_db=3.0, unit=unit) for unit in ("dB", "dBFS", "dBm")]
    statistics = measure_samples(samples)
    over, absolute, in_dbm = rows.time_rows(asked, statistics, sample, 3.0)
    power = np.abs(samples.astype(np.complex128)) ** 2
    share = 100 * np.mean(power > power.mean() * 10**0.3)
    assert over["above_percent"] == pytest.approx(share, abs=0.05)
    assert over["above_low_percent"] < share < over["above_high_percent"]
    assert over["above_percent"] + over["below_percent"] == pytest.approx(100)
    assert absolute["level_dbfs"] == pytest.approx(3.0)
    assert in_dbm["level_dbfs"] == pytest.approx(0.0)
    assert in_dbm["level_dbm"] == pytest.approx(3.0)
    plain = rows.time_rows(asked[:1], statistics, None, None)[0]
    assert "above_low_percent" not in plain
    with pytest.raises(ArgumentsError) as caught:
        rows.time_rows(asked[2:], statistics, sample, None)
    assert "--reference-level" in caught.value.remedy


def test_other_averages_read_noise_low(samples):
    found = rows.averages(measure_samples(samples))
    # Euler's constant in dB and pi/4: 3 sigma of 40 000 values.
    assert found["of_decibels_db"] == pytest.approx(-2.507, abs=0.09)
    assert found["of_volts_db"] == pytest.approx(-1.049, abs=0.04)


def test_the_peak_of_a_record_needs_its_length():
    found = rows.peak_rows(duration_s=1.0, bandwidth_hz=1e3)
    assert found["median_db"] == pytest.approx(9.2, abs=0.05)
    assert found["low_db"] < found["median_db"] < found["high_db"]
    assert rows.peak_rows(duration_s=1e-3, bandwidth_hz=1e3) is None
    assert rows.peak_rows(duration_s=1.0, bandwidth_hz=None) is None


def test_rf_levels_are_no_flat_3_db(samples):
    found = rows.rf_rows(measure_samples(samples), (0.1, 0.01))
    assert found["peak_over_envelope_db"] == pytest.approx(3.0103, abs=1e-4)
    # Real Gaussian: 4.323 and 8.218 dB; 3 sigma of the record.
    assert found["levels"][0]["level_db"] == pytest.approx(4.323, abs=0.07)
    assert found["levels"][1]["level_db"] == pytest.approx(8.218, abs=0.15)


def test_what_a_sensor_reads_low(samples):
    signal = measure_samples(samples)
    seen = measure_samples(samples * np.float32(0.5))
    sensor = SensorSettings(video_bandwidth_hz=1e5)
    found = rows.sensor_rows(seen, signal, sensor, (0.1,))
    assert found["shape"] == "one_pole"
    assert found["levels"][0]["shortfall_db"] == pytest.approx(0.0, abs=0.01)
    assert found["peak_shortfall_db"] == pytest.approx(0.0, abs=1e-4)
    assert rows.sensor_rows(seen, signal, SensorSettings(), (0.1,))["shape"] is None
    assert "low_db" not in found["levels"][0]


@pytest.mark.parametrize("loops", [False, True])
def test_readings_carry_the_interval_of_the_process(samples, loops):
    batched = measure_batches(samples)
    found = rows.sensor_rows(
        batched.statistics,
        batched.statistics,
        SensorSettings(video_bandwidth_hz=1e5),
        (0.1, 0.01),
        sample=SampledStatistics.of(batched),
        loops=loops,
    )
    stated = found["process_levels"] if loops else found["levels"]
    for row in stated:
        assert row["low_db"] < row["level_db"] < row["high_db"]
    assert ("low_db" in found["levels"][0]) == ("low" in found["ccdf"]) == (not loops)
    assert found["confidence"] == 0.95
    assert all("shortfall_db" in row for row in found["levels"])


def test_no_symbols_no_rows():
    assert rows.symbol_rows((), None) is None


def test_faults_in_one_line():
    row = {
        "fault": "DC offset", "where": "throughout", "size": -12.3456, "unit": "dB",
        "effect": "adds", "remedy": "Remove it.",
    }  # fmt: skip
    assert rows.fault_text(row) == "DC offset (throughout, -12.35 dB): adds. Remove it."
    assert rows.fault_rows(None) == []
