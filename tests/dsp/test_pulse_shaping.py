"""Every form of shaping against the sum it stands for, and against itself under other cuts."""

from fractions import Fraction
from itertools import pairwise

import numpy as np
import pytest

from wavegen.dsp.pulse import mean_energy
from wavegen.dsp.pulse_shaping import (
    LONGEST_ROW,
    HoldShaper,
    PolynomialShaper,
    RowShaper,
    plan_shaping,
)
from wavegen.dsp.pulses.gaussian import Gaussian
from wavegen.dsp.pulses.half_sine import HalfSine
from wavegen.dsp.pulses.linearised_gaussian import LinearisedGaussian
from wavegen.dsp.pulses.raised_cosine import RaisedCosine
from wavegen.dsp.pulses.rectangular import Rectangular
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.dsp.pulses.taps import Taps

RRC = RootRaisedCosine(roll_off=0.22)
CASES = [
    (RRC, Fraction(4), RowShaper),
    (RRC, Fraction(5, 2), RowShaper),
    (RRC, Fraction(125, 32), RowShaper),
    (RRC, Fraction(120, 13), RowShaper),
    (RRC, Fraction(147456, 325), PolynomialShaper),
    (RRC, Fraction(1234567, 500000), PolynomialShaper),
    (RRC, Fraction(5000), PolynomialShaper),
    (RootRaisedCosine(roll_off=1.0), Fraction(2), RowShaper),
    (RootRaisedCosine(roll_off=1.0), Fraction(2000001, 1000000), PolynomialShaper),
    (RootRaisedCosine(roll_off=0.05), Fraction(21, 20), RowShaper),
    (RootRaisedCosine(roll_off=0.3, span_symbols=3), Fraction(7, 5), RowShaper),
    (RootRaisedCosine(roll_off=0.3, span_symbols=3), Fraction(1000003, 700000), PolynomialShaper),
    (RootRaisedCosine(roll_off=0.0), Fraction(1), RowShaper),
    (RaisedCosine(roll_off=0.5), Fraction(3), RowShaper),
    (RaisedCosine(roll_off=0.5), Fraction(11, 7), RowShaper),
    (Rectangular(), Fraction(4), HoldShaper),
    (Rectangular(), Fraction(7, 3), HoldShaper),
    (Taps(taps=(1.0, -2.0, 3.0, 0.5, 0.25)), Fraction(2), RowShaper),
    (Taps(taps=(1.0, 2.0, 2.0, 1.0)), Fraction(4), RowShaper),
    (Taps(taps=(1.0, 0.5)), Fraction(1), RowShaper),
    (HalfSine(), Fraction(4), RowShaper),
    (HalfSine(), Fraction(7, 3), PolynomialShaper),
    (Gaussian(bt=0.3), Fraction(5, 2), RowShaper),
    (Gaussian(bt=1.0, symbols="impulses"), Fraction(1000003, 700000), PolynomialShaper),
    (Gaussian(bt=1.0), Fraction(1000003, 700000), PolynomialShaper),
    (LinearisedGaussian(), Fraction(4), RowShaper),
    (LinearisedGaussian(), Fraction(1000003, 300000), PolynomialShaper),
]
IDS = [f"{type(settings).__name__}-{ratio}" for settings, ratio, _ in CASES]


class Source:
    """Random symbols on an unbounded axis."""

    def __init__(self, seed=3, size=1 << 15):
        rng = np.random.default_rng(seed)
        self.table = (rng.standard_normal(size) + 1j * rng.standard_normal(size)).astype(
            np.complex64
        )

    def __call__(self, low, high):
        return self.table[np.arange(low, high) % self.table.size]


def planned(settings, ratio, **more):
    pulse = settings.design(ratio)
    shaper = plan_shaping(
        pulse,
        n_samples=ratio.numerator,
        n_symbols=ratio.denominator,
        period_symbols=1 << 15,
        **more,
    )
    return pulse, shaper


def direct(pulse, ratio, source, start, stop):
    """The definition in float64: every symbol under the pulse, at exact instants."""
    a, b = ratio.numerator, ratio.denominator
    n = np.arange(start, stop, dtype=np.int64)
    whole, fraction = n * b // a, (n * b % a) / a
    total = np.zeros(n.size, complex)
    for back in range(-pulse.span_symbols, pulse.span_symbols):
        symbol = source.table.astype(complex)[(whole - back) % source.table.size]
        total += symbol * pulse.values(back + fraction)
    return total / np.sqrt(mean_energy(pulse, per_symbol=a, period_symbols=1 << 15))


def shaped(shaper, source, start, stop):
    return shaper.shape(start, stop, source(*shaper.needs(start, stop)))


@pytest.mark.parametrize(("settings", "ratio", "kind"), CASES, ids=IDS)
def test_every_form_agrees_with_the_sum_it_stands_for(settings, ratio, kind):
    # float32 rows leave -132 dB; lines below -140 dB are left out; so -120 dB with room
    pulse, shaper = planned(settings, ratio)
    assert isinstance(shaper, kind)
    source = Source()
    start = 3 * shaper.step
    stop = start + 2000
    got = shaped(shaper, source, start, stop)
    assert got.dtype == np.complex64
    wanted = direct(pulse, ratio, source, start, stop)
    error = np.mean(np.abs(got - wanted) ** 2) / np.mean(np.abs(wanted) ** 2)
    assert 10 * np.log10(error + 1e-30) < -120


@pytest.mark.parametrize(("settings", "ratio", "kind"), CASES, ids=IDS)
def test_bits_do_not_depend_on_the_cut(settings, ratio, kind):
    _, shaper = planned(settings, ratio)
    source = Source()
    cell = max(shaper.step, 1)
    if kind is HoldShaper:
        cell = 501
    cuts = np.array([0, 1, 2, 7, 11, 20]) * cell
    whole = shaped(shaper, source, 0, int(cuts[-1]))
    for low, high in pairwise(cuts):
        for stop in (int(high), int(low) + 1 + (int(high) - int(low)) // 3):
            part = shaped(shaper, source, int(low), stop)
            assert np.array_equal(part, whole[low:stop])


@pytest.mark.parametrize("ratio", [Fraction(4), Fraction(5, 2), Fraction(120, 13)])
def test_rows_and_polynomials_agree(ratio):
    _, rows = planned(RRC, ratio)
    _, polynomials = planned(RRC, ratio, longest=1)
    assert isinstance(polynomials, PolynomialShaper)
    source = Source(5)
    one, other = (shaped(shaper, source, 0, 20_000) for shaper in (rows, polynomials))
    error = np.mean(np.abs(one - other) ** 2) / np.mean(np.abs(one) ** 2)
    assert 10 * np.log10(error) < -125


def test_symbols_are_not_written_to():
    for settings, ratio, _ in CASES[::4]:
        _, shaper = planned(settings, ratio)
        symbols = Source()(*shaper.needs(0, 100))
        symbols.flags.writeable = False
        before = symbols.copy()
        shaper.shape(0, 100, symbols)
        assert np.array_equal(symbols, before)


def test_rows_stay_short():
    for settings, ratio, kind in CASES:
        if kind is RowShaper:
            _, shaper = planned(settings, ratio)
            assert shaper.units * shaper.n_samples <= LONGEST_ROW


def test_folding_below_the_band_is_that_of_the_samples():
    # 1.1 samples a symbol cannot hold a roll-off of 0.22: the lines beyond half the sample rate
    # fold back, as sampling the pulse folds them
    ratio = Fraction(11, 10)
    pulse, shaper = planned(RRC, ratio)
    source = Source(7)
    got = shaped(shaper, source, 0, 3000)
    wanted = direct(pulse, ratio, source, 0, 3000)
    error = np.mean(np.abs(got - wanted) ** 2) / np.mean(np.abs(wanted) ** 2)
    assert 10 * np.log10(error) < -120


@pytest.mark.parametrize("ratio", [(4, 1), (1234567, 500000)])
def test_a_given_gain_replaces_unit_power(ratio):
    pulse = RootRaisedCosine(roll_off=0.3).design(Fraction(*ratio))
    options = {"n_samples": ratio[0], "n_symbols": ratio[1], "period_symbols": 10**6}
    usual, twice = plan_shaping(pulse, **options), plan_shaping(pulse, gain=2.0, **options)
    low, high = usual.needs(0, 500)
    symbols = np.exp(2j * np.arange(high - low) ** 2).astype(np.complex64)
    factor = 2 * np.sqrt(mean_energy(pulse, per_symbol=ratio[0], period_symbols=10**6))
    assert twice.shape(0, 500, symbols) == pytest.approx(
        factor * usual.shape(0, 500, symbols), abs=1e-5
    )
