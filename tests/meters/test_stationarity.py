import numpy as np
import pytest

from wavegen.meters.faults import check_record

N = 200_000


def kinds(check):
    return [fault.kind for fault in check.faults]


@pytest.fixture
def noise(band_noise):
    return band_noise(21, N, 0.25)


def test_a_step_of_the_level(held, noise):
    samples = noise.copy()
    samples[120_000:] *= np.float32(10 ** (1.5 / 20))
    check = check_record(held(samples))
    assert "level_step" in kinds(check)
    fault = next(fault for fault in check.faults if fault.kind == "level_step")
    assert fault.size == pytest.approx(1.5, abs=0.2)
    assert abs(fault.first_sample - 120_000) <= N / 64


def test_a_drift_of_the_level(held, band_noise):
    samples = band_noise(2, N, 0.9) * 10 ** (np.linspace(-0.5, 0.5, N) / 20)
    check = check_record(held(samples))
    assert kinds(check) == ["level_drift"]
    assert check.faults[0].size == pytest.approx(1.0, abs=0.2)


def test_splices(held, noise):
    samples = np.concatenate([noise[:60_000], noise[110_000:180_000], noise[5000:40_000]])
    check = check_record(held(samples))
    assert kinds(check) == ["splice"]
    assert check.faults[0].size == 2
    assert check.faults[0].first_sample == pytest.approx(60_000, abs=2)


def test_edges_of_bursts_are_no_splices(held, noise):
    samples = np.where((np.arange(N) > 50_000) & (np.arange(N) < 150_000), noise, 0.01 * noise)
    assert kinds(check_record(held(samples))) == []


def test_breaks_at_equal_distances_are_symbols(held, noise):
    parts = np.concatenate([noise[k * 31_000 : k * 31_000 + 20_000] for k in range(6)])
    assert kinds(check_record(held(parts))) == []


def test_what_is_on_for_part_of_the_time(held, noise, band_noise):
    place = np.arange(N)
    assert check_record(held(np.where(place % 50_000 < 12_500, noise, 0.03 * noise))).on_share == (
        pytest.approx(0.25, abs=0.04)
    )
    assert check_record(held(noise)).on_share == 1
    # Too few samples, or too narrow, for the level of a batch to say anything.
    for seed in range(5):
        assert check_record(held(band_noise(seed, 300, 0.9))).on_share == 1
        assert check_record(held(band_noise(seed, 20_000, 0.02))).on_share == 1
