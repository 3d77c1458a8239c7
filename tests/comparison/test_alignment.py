import numpy as np
import pytest

from wavegen.comparison.alignment import align
from wavegen.comparison.curves import ExactCurve
from wavegen.comparison.side import Side
from wavegen.laws.gaussian import GaussianLaw

N = 1 << 15


@pytest.fixture
def driven(noise):
    return noise(N) * 10 ** (-8 / 20)


def saleh(samples, drive):
    """A. A. M. Saleh, IEEE Trans. Commun. 29, 1981, table I: the output is highest at r = 0.93."""
    r = np.abs(samples) * drive
    turn = 4.0033 * r**2 / (1 + 9.1040 * r**2)
    return 2.1587 * r / (1 + 1.1517 * r**2) * np.exp(1j * (np.angle(samples) + turn))


@pytest.mark.parametrize("delay", [0, 5, -300])
@pytest.mark.parametrize("loops", [True, False])
def test_a_delay_is_found(side, driven, rapp, delay, loops):
    output = np.roll(rapp(driven), delay)
    found = align(side(driven, loops=loops), side(output, loops=loops))
    # A loop may come late by what is left of it.
    assert found.delay_samples % N == pytest.approx(delay % N, abs=0.02)
    assert found.correlation > 0.95
    assert not found.has_memory
    assert found.folds_from_db is None


def test_part_of_a_sample(side, driven):
    turns = np.exp(-2j * np.pi * np.fft.fftfreq(N) * 0.37)
    late = np.fft.ifft(np.fft.fft(driven) * turns)
    found = align(side(driven), side(late))
    assert found.delay_samples == pytest.approx(0.37, abs=1e-3)
    assert found.left_db < -60


def test_gain_and_phase_are_those_of_the_device(side, driven):
    found = align(side(driven), side(saleh(driven, 1.0)))
    r = 10 ** (found.input_db / 20) * np.sqrt(np.mean(np.abs(driven) ** 2))
    # Bins are half a dB wide.
    assert found.gain_db == pytest.approx(20 * np.log10(2.1587 / (1 + 1.1517 * r**2)), abs=0.05)
    turn = np.rad2deg(4.0033 * r**2 / (1 + 9.1040 * r**2))
    assert found.phase_deg == pytest.approx(turn - turn[0], abs=0.5)


def test_an_output_that_falls_again_is_seen(side, driven):
    found = align(side(driven), side(saleh(driven, 2.0)))
    mean_db = 10 * np.log10(np.mean(np.abs(driven) ** 2))
    assert found.folds_from_db == pytest.approx(20 * np.log10(0.93 / 2.0) - mean_db, abs=0.5)


def test_noise_far_below_is_no_fold(side, driven, rapp, rng):
    """Bins of few samples far below the noise go up and down by half a dB; the top does not."""
    for _ in range(4):
        hiss = 0.05 * (rng.standard_normal(N) + 1j * rng.standard_normal(N))
        assert align(side(driven), side(rapp(driven) + hiss)).folds_from_db is None


def test_memory_is_told_from_noise(side, driven, rapp, rng):
    clean = rapp(driven)
    late = np.roll(clean, 3)
    with_memory = clean + 0.1 * late * np.abs(late) ** 2
    hiss = 0.01 * (rng.standard_normal(N) + 1j * rng.standard_normal(N))
    assert align(side(driven), side(with_memory)).has_memory
    noisy = align(side(driven), side(clean + hiss))
    assert not noisy.has_memory
    assert noisy.left_db == pytest.approx(-40 + 3 + 8.3, abs=0.5)


def test_what_is_not_of_one_signal(side, driven, noise):
    assert align(side(driven), side(noise(N))) is None
    assert align(side(driven), side(driven, rate_hz=2 * 10**6)) is None
    assert align(side(driven[:500]), side(driven[:500])) is None
    bare = Side(name="law", is_="a law", curve=ExactCurve(source=GaussianLaw()))
    assert align(side(driven), bare) is None


def test_another_centre_frequency(side, driven, rapp):
    moved = rapp(driven) * np.exp(2j * np.pi * 0.01 * np.arange(N))
    found = align(side(driven, loops=False), side(np.roll(moved, 40), loops=False))
    assert round(found.delay_samples / 2) == 20
