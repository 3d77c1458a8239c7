import pickle
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavegen.dsp import bursts as module
from wavegen.dsp.bursts import Bursts, raised_cosine_ramp

WRAPPED = Bursts.of_slots((True, False, False, True, True), 6, 2)
"""Period 30, one burst of 18 that begins at 18 and goes on into the next period."""

SHORT = Bursts(period_samples=50, runs=((0, 20), (25, 32)), ramp_samples=3)


def envelope(bursts, start, stop):
    """The gate by its definition, one sample at a time."""
    gain = []
    ramp = raised_cosine_ramp(bursts.ramp_samples)
    for index in range(start, stop):
        found = 0.0
        for begin, end in bursts.runs:
            place = (index - begin) % bursts.period_samples
            edge = min(place, end - begin - 1 - place)
            if edge >= 0:
                found = ramp[edge] if edge < bursts.ramp_samples else 1.0
        gain.append(found)
    return np.array(gain)


@pytest.fixture(params=["by table", "by run"])
def way(request, monkeypatch):
    if request.param == "by run":
        monkeypatch.setattr(module, "LONGEST_TABLE", 0)


@pytest.mark.usefixtures("way")
@pytest.mark.parametrize("bursts", [WRAPPED, SHORT])
@pytest.mark.parametrize("start", [0, 1, 17, 29, 30, 31, 3_000_000_000])
def test_gate_is_what_its_runs_say(bursts, start):
    rng = np.random.default_rng(3)
    x = (rng.standard_normal(200) + 1j * rng.standard_normal(200)).astype(np.complex64)
    x.flags.writeable = False
    got = bursts.apply(x, start)
    want = envelope(bursts, start, start + 200)
    # One rounding of the ramp to float32, one of the product.
    np.testing.assert_allclose(got, want * x, rtol=2**-22, atol=0)
    is_on = bursts.is_on(start, start + 200)
    assert is_on.tolist() == (want == 1).tolist()
    assert got[is_on].tobytes() == x[is_on].tobytes()
    assert not got[want == 0].any()


def test_both_ways_give_the_same_bits(monkeypatch):
    x = np.exp(1j * np.arange(1000)).astype(np.complex64)
    by_table = [bursts.apply(x, 77).tobytes() for bursts in (WRAPPED, SHORT)]
    monkeypatch.setattr(module, "LONGEST_TABLE", 0)
    assert [bursts.apply(x, 77).tobytes() for bursts in (WRAPPED, SHORT)] == by_table


@given(
    st.lists(st.booleans(), min_size=2, max_size=9).filter(lambda slots: len(set(slots)) == 2),
    st.integers(1, 5),
)
def test_slots_become_runs(slots, length):
    bursts = Bursts.of_slots(tuple(slots), length)
    want = np.repeat(slots, length)
    assert bursts.is_on(0, want.size).tolist() == want.tolist()
    assert bursts.duty == Fraction(sum(slots), len(slots))
    assert all(0 <= start < bursts.period_samples for start, _ in bursts.runs)


@pytest.mark.parametrize("bursts", [WRAPPED, SHORT])
def test_figures(bursts):
    gain = envelope(bursts, 0, bursts.period_samples)
    assert bursts.duty == Fraction(int(np.count_nonzero(gain)), gain.size)
    assert bursts.duty_fully_on == Fraction(int(np.count_nonzero(gain == 1)), gain.size)
    assert bursts.mean_gain == pytest.approx(np.mean(gain**2), rel=1e-14)


@pytest.mark.parametrize(("size", "worth"), [(1, 1 / 4), (2, 3 / 4), (3, 9 / 8), (1000, 375.0)])
def test_a_ramp_is_worth_three_eighths_of_its_samples(size, worth):
    """Closed form: the mean of sin^4 over evenly spaced midpoints; a quarter for one alone."""
    assert np.sum(raised_cosine_ramp(size) ** 2) == pytest.approx(worth, rel=1e-12)
    assert raised_cosine_ramp(size) + raised_cosine_ramp(size)[::-1] == pytest.approx(1)


def test_bursts_of_a_loop():
    assert WRAPPED.starts(60) == [(18, 18), (48, 18)]
    assert SHORT.starts(100) == [(0, 20), (25, 7), (50, 20), (75, 7)]
    assert list(SHORT.within(-10, 28, inset=3)) == [(3, 17)]


@pytest.mark.parametrize("delay", [Fraction(0), Fraction(7), Fraction(-31), Fraction(5, 2)])
@pytest.mark.parametrize("bursts", [WRAPPED, SHORT])
def test_a_delay_moves_them(bursts, delay):
    moved = bursts.delayed(delay)
    on = np.flatnonzero(bursts.is_on(-60, 240)) - 60
    # A sample at time n is fully on if the input is at both samples around n - delay.
    want = [
        all(n in on for n in {int(np.floor(t - delay)), int(np.ceil(t - delay))})
        for t in range(90, 150)
    ]
    assert moved.is_on(90, 150).tolist() == want


@pytest.mark.parametrize("ratio", [Fraction(2), Fraction(1, 2), Fraction(3, 7), Fraction(5, 4)])
@pytest.mark.parametrize("bursts", [WRAPPED, Bursts(period_samples=50, runs=((1, 30),))])
def test_a_change_of_rate_keeps_them_inside(bursts, ratio):
    moved = bursts.resampled(ratio)
    assert moved.period_samples % (bursts.period_samples * ratio).numerator == 0
    stop = int(600 * ratio)
    new = np.flatnonzero(moved.is_on(0, stop))
    assert new.size > 0.3 * stop * float(bursts.duty)
    old = set((np.flatnonzero(bursts.is_on(-60, 700)) - 60).tolist())
    for n in new.tolist():
        time = n / ratio
        assert {int(np.floor(time)), int(np.ceil(time))} <= old, (n, time)


def test_it_is_small_to_send():
    assert len(pickle.dumps(WRAPPED)) < 500
