import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.meters.power import measure_samples


def gaussian(seed, n, scale=1.0):
    rng = np.random.default_rng(seed)
    noise = rng.standard_normal(n) + 1j * rng.standard_normal(n)
    return (noise * (scale * 2**-0.5)).astype(np.complex64)


def test_counts_are_exact_at_edges():
    samples = gaussian(2, 20_000)
    found = measure_samples(samples)
    power = (samples.real**2 + samples.imag**2).astype(np.float64)
    asked = found.edges[1:-2:997]
    exact = [np.count_nonzero(power >= edge) for edge in asked]
    np.testing.assert_array_equal(found.exceedances_of_power(asked), exact)


def test_counts_are_exact_in_the_highest_bin_and_below_the_least():
    powers = np.array([0.25, 0.25, 1.0, 1.0, 1.0, 1.0005])
    found = measure_samples(np.sqrt(powers).astype(np.complex64))
    # More than a power, not that power itself.
    asked = np.append(found.top_powers, found.least * np.array([0.9999, 1.00001]))
    assert found.top_counts.tolist() == [3, 1]
    counts = found.exceedances_of_power(asked)
    assert counts[:3].tolist() == [1, 0, 6]
    # Inside the lowest bin the two samples are spread from the least power upwards.
    assert 5.9 < counts[3] < 6


def test_levels_are_where_the_sorted_samples_are():
    samples = gaussian(3, 200_000)
    found = measure_samples(samples)
    power = np.sort(np.abs(samples.astype(np.complex128)) ** 2)[::-1]
    for probability in (0.5, 0.1, 1e-2, 1e-3, 1e-4, 1e-5):
        # The smallest level that at most q n samples exceed is the (q n + 1)-th largest sample.
        exact = power[int(probability * 200_000 + 1e-6)]
        expected = 10 * np.log10(exact / power.mean())
        assert found.level_db(probability) == pytest.approx(expected, abs=0.0085)
    assert found.level_db(0) == pytest.approx(found.papr_db, abs=1e-12)


def test_level_and_ccdf_are_inverse():
    found = measure_samples(gaussian(4, 100_000))
    for probability in np.geomspace(1e-6, 0.999, 60):
        level = float(found.level_db(probability))
        assert found.ccdf(level + 1e-9) <= probability * (1 + 1e-6)
        assert level <= found.level_db(0)
        if probability > 2e-5:
            assert found.ccdf(level - 0.009) >= probability * (1 - 1e-6)


def test_constant_envelope_reads_zero_at_every_probability():
    phase = np.random.default_rng(6).uniform(0, 2 * np.pi, 50_000)
    for amplitude in (1.0, 0.5, 0.37):
        found = measure_samples((amplitude * np.exp(1j * phase)).astype(np.complex64))
        asked = [0, 1e-9, 1e-4, 0.1, 0.5, 0.9, 0.999, 1]
        np.testing.assert_allclose(found.level_db(asked), 0, atol=1e-4)
        assert found.papr_db == pytest.approx(0, abs=1e-4)
        np.testing.assert_array_equal(found.ccdf([-0.01, 0.01]), [1, 0])


def test_burst_of_constant_envelope():
    rng = np.random.default_rng(7)
    samples = np.exp(1j * rng.uniform(0, 2 * np.pi, 40_000)).astype(np.complex64)
    samples[::4] = 0
    samples[1::4] *= np.float32(0.3)
    found = measure_samples(samples)
    # Powers 0, 0.09, 1, 1: mean 0.5225.
    assert found.n_zeros == 10_000
    wall = -10 * np.log10(0.5225)
    np.testing.assert_allclose(found.level_db([1e-3, 0.1, 0.49]), wall, atol=1e-4)
    np.testing.assert_allclose(found.level_db([0.6, 0.7]), wall + 20 * np.log10(0.3), atol=0.0085)
    assert np.isneginf(found.level_db(0.76))
    assert found.ccdf(-np.inf) == 0.75
    assert found.ccdf(wall - 0.01) == 0.5


def test_wall_of_a_clipped_signal_is_at_its_peak():
    samples = gaussian(8, 200_000)
    magnitude = np.abs(samples)
    clipped = (samples / np.maximum(magnitude / 1.2345, 1)).astype(np.complex64)
    found = measure_samples(clipped)
    share = np.mean(magnitude > 1.2345)  # about 0.22
    wall = 10 * np.log10(1.2345**2 / found.mean)
    assert found.papr_db == pytest.approx(wall, abs=1e-5)
    np.testing.assert_allclose(found.level_db([0, 1e-4, 0.01, 0.1, share - 0.001]), wall, atol=1e-5)
    assert found.level_db(share + 0.01) < wall - 0.05
    assert found.ccdf(wall - 1e-4) == pytest.approx(share, abs=1e-4)
    assert found.ccdf(wall + 1e-4) == 0


def test_pdf_integrates_to_the_share_of_the_grid():
    found = measure_samples(gaussian(9, 50_000))
    grid = np.arange(-40, 13, 0.1)
    density = found.pdf(grid)
    assert np.all(density >= 0)
    assert np.sum(density * np.diff(grid)) == pytest.approx(float(found.ccdf(-40) - found.ccdf(13)))


def test_curve_goes_down_to_the_last_sample():
    found = measure_samples(gaussian(10, 50_000))
    curve = found.curve()
    step = np.diff(curve.level_db)
    np.testing.assert_allclose(step, 0.05)
    assert curve.level_db[0] == -30
    assert curve.level_db[-2] < found.papr_db <= curve.level_db[-1]
    assert curve.probability[-1] == 0
    assert curve.probability[-2] >= 1 / 50_000
    assert np.all(np.diff(curve.probability) <= 0)
    np.testing.assert_allclose(found.curve(step_db=0.01).probability[-1], 0)


def test_curve_of_a_carrier():
    curve = measure_samples(np.ones(100, np.complex64)).curve()
    assert curve.level_db.tolist() == [0.0]
    assert curve.probability.tolist() == [0.0]


def test_table_says_what_is_resolved():
    rows = measure_samples(gaussian(11, 100_000)).levels()
    assert [row.probability for row in rows] == [1e-1, 1e-2, 1e-3, 1e-4, 1e-5, 1e-6]
    # 100 000 samples: 10 lie beyond the level at 1e-4, 1 beyond that at 1e-5.
    assert [row.resolved for row in rows] == [True, True, True, True, False, False]
    levels = [row.level_db for row in rows]
    assert levels == sorted(levels)


@pytest.mark.parametrize("probability", [-0.1, 1.1, np.nan])
def test_probability_out_of_range(probability):
    with pytest.raises(ArgumentsError) as caught:
        measure_samples(gaussian(1, 10)).level_db(probability)
    assert caught.value.where == "probability"
    assert caught.value.allowed == "0 to 1"
