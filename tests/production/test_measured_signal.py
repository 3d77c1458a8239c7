from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.production.measure_settings import EXACT, MeasureSettings, SensorSettings
from wavegen.production.measured_signal import measure_signal, on_peak_db
from wavegen.production.subject import Subject

PLAIN = MeasureSettings()


@pytest.fixture
def subject(lab):
    def make(loops=False, **more):
        return Subject(name="x", signal=lab.held(lab.NOISE), loops=loops, **more)

    return make


def test_a_recording_is_its_own_sample(subject):
    found = measure_signal(subject(), PLAIN)
    assert found.part.n_samples == found.signal.n_samples
    assert found.part.whole.statistics.mean == found.statistics.mean
    assert found.check is not None
    assert found.gate is found.sensor is None


def test_a_loop_is_sampled_by_one_data_period(subject):
    item = subject(loops=True)
    item.signal.samples[:] = np.tile(item.signal.samples[:800], 10)
    found = measure_signal(item, PLAIN)
    assert found.part.n_samples == 800
    assert found.part.whole.statistics.n_samples == 800
    assert found.statistics.n_samples == 8000


def test_what_its_recipe_fixes_needs_no_sample(subject):
    assert measure_signal(subject(loops=True, every_loop="a law"), PLAIN).part is None
    assert measure_signal(subject(), EXACT).part is None


def test_faults_are_looked_for_in_what_nothing_describes(subject):
    item = subject()
    item.signal.samples[:] += np.complex64(0.5)
    kinds = [fault.kind for fault in measure_signal(item, PLAIN).check.faults]
    assert "dc_offset" in kinds
    assert measure_signal(subject(is_described=True), PLAIN).check is None
    assert measure_signal(subject(is_power=True), PLAIN).check is None


def test_an_offset_is_taken_off_when_asked(subject):
    item = subject()
    clean = measure_signal(item, PLAIN).statistics.mean_db
    item.signal.samples[:] += np.complex64(0.5 - 0.25j) - item.signal.samples.mean()
    found = measure_signal(item, MeasureSettings(removes_offset=True))
    assert found.removed == pytest.approx(0.5 - 0.25j, abs=2e-3)
    # The 64 samples that may be start-up do not count: 1 % of the record.
    assert found.statistics.mean_db == pytest.approx(clean, abs=0.02)
    with pytest.raises(ArgumentsError):
        measure_signal(subject(is_power=True), MeasureSettings(removes_offset=True))


def test_a_sensor_reads_over_the_true_mean(subject):
    item = subject()
    for sensor in (
        SensorSettings(video_bandwidth_hz=2e5),
        SensorSettings(video_bandwidth_hz=2e5, shape="brick_wall", sensor_rate_hz=Fraction(10**6)),
    ):
        found = measure_signal(item, MeasureSettings(sensor=sensor))
        assert found.sensor.mean == found.statistics.mean
        assert found.sensor.papr_db < found.statistics.papr_db - 0.5
    fast = MeasureSettings(sensor=SensorSettings(sensor_rate_hz=Fraction(10**9)))
    with pytest.raises(ArgumentsError):
        measure_signal(item, fast)


def test_readings_are_sampled_as_the_record_is(subject):
    slow = SensorSettings(video_bandwidth_hz=2e5, sensor_rate_hz=Fraction(10**6))
    settings = MeasureSettings(sensor=slow)
    record = measure_signal(subject(), settings)
    sampled = record.part.sensor
    assert sampled.statistics.n_samples == record.sensor.n_samples < 8000
    assert sampled.statistics.mean == record.statistics.mean
    assert sampled.batches.sums[:, 0].sum() == pytest.approx(
        record.statistics.mean * record.sensor.n_samples, rel=1e-9
    )
    loop = subject(loops=True)
    loop.signal.samples[:] = np.tile(loop.signal.samples[:800], 10)
    found = measure_signal(loop, settings)
    times = found.sensor.n_samples / found.part.sensor.statistics.n_samples
    assert times == pytest.approx(10, rel=0.02)
    exact = MeasureSettings(sensor=slow, states_process=False)
    assert measure_signal(subject(), exact).part is None
    assert measure_signal(subject(every_loop="a law"), settings).part is None


def test_the_peak_of_the_on_time_is_known_where_that_of_all_lies_in_it(subject):
    from wavegen.dsp.bursts import Bursts

    plain = measure_signal(subject(), PLAIN)
    assert np.isnan(on_peak_db(plain))
    place = int(plain.peak.position_samples)
    for shift, is_known in ((-100, True), (200, False)):
        start = max(place + shift, 0)
        bursts = Bursts(period_samples=8000, runs=((start, start + 300),))
        found = measure_signal(subject(bursts=bursts), PLAIN)
        assert np.isfinite(on_peak_db(found)) == is_known


@pytest.mark.parametrize("workers", [1, 2, 5])
def test_nothing_depends_on_workers(subject, workers):
    settings = MeasureSettings(sensor=SensorSettings(video_bandwidth_hz=5e5))
    one, many = (measure_signal(subject(), settings, workers=k) for k in (1, workers))
    assert one.statistics.mean == many.statistics.mean
    assert one.sensor.peak == many.sensor.peak
    np.testing.assert_array_equal(one.part.whole.batches.sums, many.part.whole.batches.sums)
    assert one.check == many.check
