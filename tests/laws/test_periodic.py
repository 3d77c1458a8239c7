import numpy as np
import pytest

from wavegen.laws.periodic import PeriodicLaw


def some_law(count: int = 9, span: int = 40, seed: int = 5, n_instants: int | None = None):
    rng = np.random.default_rng(seed)
    harmonics = np.sort(rng.choice(span, count, replace=False)).astype(np.int64)
    amplitudes = rng.standard_normal(count) + 1j * rng.standard_normal(count)
    law = PeriodicLaw.of_harmonics(harmonics, amplitudes, n_instants=n_instants)
    return law, harmonics, amplitudes / np.sqrt(np.sum(np.abs(amplitudes) ** 2))


def power_at(times, harmonics, amplitudes):
    wave = np.exp(2j * np.pi * np.outer(times, harmonics)) @ amplitudes
    return np.abs(wave) ** 2


@pytest.mark.parametrize("seed", range(4))
def test_curve_is_that_of_the_samples_of_a_dense_period(seed):
    law, harmonics, amplitudes = some_law(seed=seed)
    n = 200_003
    power = np.sort(power_at(np.arange(n) / n, harmonics, amplitudes))
    for probability in (0.9, 0.5, 0.1, 0.01, 1e-3):
        # The k-th highest of n even instants stands within a few instants of the curve; about
        # 2 * 40 arcs / n = 4e-4 in probability, in level the distance between neighbours there.
        place = n - 1 - int(probability * n)
        expected = 10 * np.log10(power[place])
        nearby = 10 * np.log10(power[min(place + 80, n - 1)] / power[place - 80])
        assert law.level_db(probability) == pytest.approx(expected, abs=max(nearby, 1e-3))


def test_peak_is_exact():
    law, harmonics, amplitudes = some_law()
    times = np.arange(1 << 17) / (1 << 17)
    coarse = power_at(times, harmonics, amplitudes)
    near = times[np.argmax(coarse)] + np.linspace(-1, 1, 20001) / (1 << 17)
    expected = 10 * np.log10(power_at(near, harmonics, amplitudes).max())
    assert law.peak_db == pytest.approx(expected, abs=1e-9)
    assert law.level_db(0.0) == pytest.approx(law.peak_db, abs=1e-12)


def test_ccdf_and_level_are_inverse_and_fall():
    law, *_ = some_law()
    probability = np.geomspace(1e-9, 0.999, 60)
    level = law.level_db(probability)
    np.testing.assert_allclose(law.ccdf(level), probability, rtol=1e-4)  # differences of 1e-14
    assert (np.diff(level) < 0).all()
    assert law.ccdf(law.peak_db + 1e-9) == 0
    assert law.ccdf(-300.0) == pytest.approx(1.0, abs=1e-4)
    assert law.holds == "every loop"


def test_one_harmonic_is_a_constant_envelope():
    law = PeriodicLaw.of_harmonics(np.array([3]), np.array([2j]))
    assert law.peak_db == pytest.approx(0.0, abs=1e-12)
    np.testing.assert_allclose(law.ccdf([-0.001, 0.001]), [1, 0])
    assert law.level_db(0.5) == pytest.approx(0.0, abs=1e-12)


@pytest.mark.parametrize("n_instants", [64, 1000, 4096])
def test_samples_of_a_loop_stay_within_the_slack(n_instants):
    law, harmonics, amplitudes = some_law(n_instants=n_instants)
    power = power_at(np.arange(n_instants) / n_instants, harmonics, amplitudes)
    levels = np.linspace(-15, law.peak_db, 100)
    share = (power[None] > 10 ** (levels[:, None] / 10)).mean(axis=1)
    gap = np.abs(share - law.ccdf(levels))
    slack = law.sampling_slack(levels)
    assert (gap <= slack + 1e-4).all()  # 1e-4: straight lines between the grid's points
    assert slack.max() <= 40 / n_instants


def test_slack_is_zero_where_the_instants_are_not_known():
    law, *_ = some_law()
    assert not law.sampling_slack([0.0, 3.0]).any()


def test_levels_keep_their_accuracy_with_many_tones():
    # Against the sorted powers of a grid four times as fine; laws promise 0.001 dB.
    rng = np.random.default_rng(9)
    harmonics = np.arange(4000, dtype=np.int64)
    amplitudes = np.exp(2j * np.pi * rng.random(4000))
    law = PeriodicLaw.of_harmonics(harmonics, amplitudes)
    spectrum = np.zeros(1 << 22, np.complex128)
    spectrum[:4000] = amplitudes / np.sqrt(4000)
    power = np.sort(np.abs(np.fft.ifft(spectrum, norm="forward")) ** 2)
    for probability in (0.99, 0.9, 0.1, 0.01, 1e-3):
        expected = 10 * np.log10(power[power.size - 1 - int(probability * power.size)])
        # Even instants: some 2000 arcs of 4e6 instants, each off by a random part of one.
        assert law.level_db(probability) == pytest.approx(expected, abs=0.001)
