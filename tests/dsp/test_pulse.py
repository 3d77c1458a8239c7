from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.dsp.pulse import (
    ENERGY_LATTICE,
    Pulse,
    Stretched,
    default_span,
    end_taper,
    mean_energy,
    residual_evm_percent,
)
from wavegen.dsp.pulses.raised_cosine import RaisedCosine
from wavegen.dsp.pulses.rectangular import Rectangular
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine

RATIO = Fraction(4)


def test_the_base_has_no_values():
    with pytest.raises(TypeError, match="Pulse"):
        Pulse(span_symbols=1).values(np.zeros(1))


@pytest.mark.parametrize("span", [1, 2, 3, 64])
def test_the_taper_falls_from_one_to_zero(span):
    t = np.linspace(0, span + 1, 1001)
    weight = end_taper(t, span)
    assert np.all(np.diff(weight) <= 0)
    assert np.all(weight[t <= span // 2] == 1)
    assert np.all(weight[t >= span] == 0)
    assert np.array_equal(weight, end_taper(-t, span))


def test_spans_stay_within_bounds_and_fall_with_roll_off():
    spans = [default_span(a) for a in (0.0, 1e-9, 0.05, 0.1, 0.22, 0.5, 1.0)]
    assert spans == sorted(spans, reverse=True)
    assert (spans[0], spans[-1]) == (256, 48)


def test_energy_does_not_depend_on_the_lattice_of_a_band_limited_pulse():
    pulse = RootRaisedCosine(roll_off=0.22).design(RATIO)
    coarse = mean_energy(pulse, per_symbol=5, period_symbols=1000)
    for per_symbol in (4, 4096, 10 * ENERGY_LATTICE + 7):
        fine = mean_energy(pulse, per_symbol=per_symbol, period_symbols=1000)
        assert fine == pytest.approx(coarse, abs=1e-9)
    assert coarse == pytest.approx(1.0, abs=1e-5)


def test_energy_of_the_raised_cosine():
    pulse = RaisedCosine(roll_off=0.4).design(RATIO)
    assert mean_energy(pulse, per_symbol=4, period_symbols=1000) == pytest.approx(0.9, abs=1e-6)


def test_energy_of_a_loop_shorter_than_the_pulse():
    # one symbol repeated: the pulse adds to a constant, its values at the symbol spacing sum to
    # H(0), and the mean power is that constant squared
    pulse = RaisedCosine(roll_off=0.5).design(RATIO)
    assert mean_energy(pulse, per_symbol=8, period_symbols=1) == pytest.approx(1.0, abs=1e-5)
    held = Rectangular().design(RATIO)
    assert mean_energy(held, per_symbol=8, period_symbols=1) == 1.0


def test_residual_interference_grows_when_the_pulse_is_cut_short():
    pulse = RootRaisedCosine(roll_off=0.22).design(RATIO)
    cut = replace(pulse, span_symbols=8)
    assert residual_evm_percent(pulse) < 0.005
    assert residual_evm_percent(cut) > 0.1
    assert residual_evm_percent(RaisedCosine(roll_off=1.0).design(RATIO)) > 1


@pytest.mark.parametrize("settings", [RootRaisedCosine(roll_off=0.22), Rectangular()])
def test_a_pulse_on_half_symbols(settings):
    pulse = settings.design(Fraction(4))
    stretched = Stretched.of(pulse)
    assert stretched.span_symbols == 2 * pulse.span_symbols
    assert stretched.half_band == (pulse.half_band / 2 if pulse.half_band else None)
    assert stretched.is_smooth == pulse.is_smooth
    assert np.array_equal(stretched.on_lattice(4), pulse.on_lattice(8))
