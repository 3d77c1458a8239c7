import numpy as np
import pytest

from wavegen.dsp.phase_descent import dwelling_phases, optimised_phases, peak_over_mean
from wavegen.dsp.phases import newman_phases, schroeder_phases

FREE = np.nan


def peak_db(places, powers, phases, times=32):
    """Return the highest power over the mean, dB, by a transform of the test's own."""
    n = times * (int(places.max() - places.min()) + 1)
    lines = np.zeros(n, complex)
    lines[places - places.min()] = np.sqrt(powers) * np.exp(1j * phases)
    power = np.abs(np.fft.ifft(lines)) ** 2
    return 10 * np.log10(power.max() / power.mean())


def searched(places, powers):
    return optimised_phases(places, powers, np.full(places.size, FREE))


@pytest.mark.parametrize("seed", [1, 2])
@pytest.mark.parametrize(("count", "span"), [(20, 100), (64, 200)])
def test_uneven_tones_of_any_level(seed, count, span):
    """Lower by 3 dB than any law: those start near 8 dB."""
    rng = np.random.default_rng(seed)
    places = np.sort(rng.permutation(span)[:count])
    powers = 10 ** (rng.uniform(-10, 0, count) / 10)
    others = [newman_phases(count), schroeder_phases(powers), rng.uniform(0, 7, count)]
    best = min(peak_db(places, powers, phases) for phases in others)
    found = searched(places, powers)
    got = peak_db(places, powers, found)
    assert got < best - 3
    assert got == pytest.approx(10 * np.log10(peak_over_mean(places, powers, found)), abs=0.02)


def test_the_same_tones_have_the_same_phases():
    places = np.array([0, 3, 4, 9, 12, 20])
    powers = np.ones(6)
    found = searched(places, powers)
    assert np.array_equal(found, searched(places, powers))
    assert np.array_equal(found, searched(7 * places - 50, powers))
    found[:] = 0  # the caller's own
    assert searched(places, powers).any()


def test_phases_that_are_given_stay():
    places, fixed = np.arange(12), np.full(12, FREE)
    fixed[[2, 7]] = 1.0, -2.0
    found = optimised_phases(places, np.ones(12), fixed)
    assert found[[2, 7]].tolist() == [1.0, -2.0]
    assert peak_db(places, np.ones(12), found) < 2.5
    held = np.linspace(0, 1, 12)
    assert np.array_equal(optimised_phases(places, np.ones(12), held), held)


@pytest.mark.parametrize("count", [1, 2])
def test_one_and_two_tones_have_nothing_to_search(count):
    found = searched(np.arange(count), np.ones(count))
    assert found.shape == (count,)
    assert np.isfinite(found).all()


def test_even_tones_start_as_schroeder_has_it():
    """But for a delay and a turn: the same second differences."""
    powers = np.array([1, 2, 1, 4, 3, 1.0])
    mine, his = dwelling_phases(np.arange(6), powers), schroeder_phases(powers)
    for phases in (mine, his):
        assert np.all(np.diff(phases, 2) < 0)
    share = powers / powers.sum()
    assert np.diff(his, 2) == pytest.approx(-2 * np.pi * share[1:-1])
    both = (share[:-2] + 2 * share[1:-1] + share[2:]) / 4
    assert np.diff(mine, 2) == pytest.approx(-2 * np.pi * both)


def test_the_slope_is_that_of_the_norm():
    """Against differences of the norm: 1e-6 of central ones at steps of 1e-5."""
    from wavegen.dsp.phase_descent import _Envelope

    rng = np.random.default_rng(3)
    places = np.array([0, 2, 3, 7, 11])
    envelope = _Envelope(places, rng.uniform(0.1, 1, 5))
    phases, free = rng.uniform(0, 6, 5), np.array([True, True, False, True, True])
    _, slope = envelope.norm(phases, 8, free)
    for k in range(5):
        step = np.eye(5)[k] * 1e-5
        up, down = (envelope.norm(phases + sign * step, 8, free)[0] for sign in (1, -1))
        want = (up - down) / 2e-5 if free[k] else 0.0
        assert slope[k] == pytest.approx(want, abs=1e-6)
