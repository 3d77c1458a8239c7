"""Pulses against their closed forms and spectra; sources of the numbers are in README.md."""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.dsp.pulse import residual_evm_percent
from wavegen.dsp.pulses.raised_cosine import raised_cosine
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine, root_raised_cosine

ROLL_OFFS = (0.05, 0.1, 0.2, 0.22, 0.25, 0.35, 0.5, 1.0)
EDGES = (0.0, *ROLL_OFFS)
INSTANTS = np.array([0.0, 0.1, 0.37, 0.5, 1.0, 1.6180339, 2.5, 7.0, 11.3])


def spectrum(f, roll_off):
    """Raised-cosine spectrum over frequency in symbol rates."""
    edge = (np.abs(f) - (1 - roll_off) / 2) / max(roll_off, 1e-300)
    return np.where(edge <= 0, 1.0, np.where(edge >= 1, 0.0, 0.5 + 0.5 * np.cos(np.pi * edge)))


def transform(shape, roll_off, t):
    """Inverse transform of an even spectrum: Gauss-Legendre on each smooth stretch."""
    x, w = np.polynomial.legendre.leggauss(200)
    total = 0.0
    for low, high in ((0.0, (1 - roll_off) / 2), ((1 - roll_off) / 2, (1 + roll_off) / 2)):
        f = low + (high - low) * (x + 1) / 2
        total = total + (high - low) * np.sum(
            w * shape(spectrum(f, roll_off)) * np.cos(2 * np.pi * np.outer(t, f)), axis=1
        )
    return total


@pytest.mark.parametrize("roll_off", EDGES)
def test_closed_forms_are_the_transforms_of_their_spectra(roll_off):
    # 200-point Gauss rules are exact to rounding here: 1e-13 leaves two decades
    t = np.concatenate([INSTANTS, -INSTANTS])
    near = 1 / (4 * roll_off) if roll_off else 1.0
    t = np.append(t, [near * k for k in (1, 2, 1 - 1e-9, 1 + 1e-7, 2 + 1e-8, -1)])
    assert root_raised_cosine(t, roll_off) == pytest.approx(
        transform(np.sqrt, roll_off, t), abs=1e-13
    )
    assert raised_cosine(t, roll_off) == pytest.approx(
        transform(lambda s: s, roll_off, t), abs=1e-13
    )


@pytest.mark.parametrize("roll_off", ROLL_OFFS)
def test_singular_points(roll_off):
    # derivation by limits of the textbook forms, standards sheet of pulse shapes
    a = roll_off
    quarter = 1 / (4 * a)
    beside = (1 + 2 / np.pi) * np.sin(np.pi * quarter) + (1 - 2 / np.pi) * np.cos(np.pi * quarter)
    at = root_raised_cosine(np.array([0.0, quarter, -quarter]), a)
    assert at == pytest.approx(
        [1 - a + 4 * a / np.pi, a / np.sqrt(2) * beside, a / np.sqrt(2) * beside], abs=1e-14
    )
    at = raised_cosine(np.array([0.0, 2 * quarter, -2 * quarter]), a)
    peak = np.pi / 4 * np.sinc(2 * quarter)
    assert at == pytest.approx([1.0, peak, peak], abs=1e-14)


@pytest.mark.parametrize(
    ("roll_off", "middle", "quarter"),
    [
        (0.20, 1.0546479, -0.2),
        (0.22, 1.0601127, -0.1571843),
        (0.25, 1.0683099, -0.0642372),
        (0.35, 1.0956338, 0.2606035),
    ],
)
def test_tabulated_values(roll_off, middle, quarter):
    got = root_raised_cosine(np.array([0.0, 0.25 / roll_off]), roll_off)
    assert got == pytest.approx([middle, quarter], abs=6e-8)  # seven decimals


@pytest.mark.parametrize("roll_off", [0.2, 0.22, 0.35, 0.5, 1.0])
def test_energies(roll_off):
    # 4 points a symbol hold the squares; the tail beyond 2000 symbols is below 2e-11 (1/t^4)
    t = np.arange(-8000, 8001) / 4
    assert np.sum(root_raised_cosine(t, roll_off) ** 2) / 4 == pytest.approx(1.0, abs=1e-10)
    assert np.sum(raised_cosine(t, roll_off) ** 2) / 4 == pytest.approx(1 - roll_off / 4, abs=1e-10)


@pytest.mark.parametrize("roll_off", [0.22, 0.35, 0.5, 1.0])
def test_root_raised_cosine_twice_is_a_nyquist_pulse(roll_off):
    # common practice: +-64 symbols at roll-off 0.22 leave less than 6e-7 in its own energy
    t = np.arange(-256, 257) / 4
    pulse = root_raised_cosine(t, roll_off)
    both = np.convolve(pulse, pulse)[::4] / 4
    middle = both.size // 2
    assert both[middle] == pytest.approx(1.0, abs=1e-6)
    near = np.delete(both[middle - 32 : middle + 33], 32)
    assert np.max(np.abs(near)) < 1e-5
    whole = np.convolve(pulse, pulse)[middle * 4 - 20 : middle * 4 + 21] / 4
    assert whole == pytest.approx(raised_cosine(np.arange(-20, 21) / 4, roll_off), abs=1e-5)


@pytest.mark.parametrize("roll_off", ROLL_OFFS)
def test_default_span_leaves_less_than_a_hundredth_of_a_percent(roll_off):
    pulse = RootRaisedCosine(roll_off=roll_off).design(Fraction(4))
    shape = pulse.values(np.arange(-4 * pulse.span_symbols, 4 * pulse.span_symbols + 1) / 4)
    both = np.convolve(shape, shape)[(2 * shape.size - 2) // 2 % 4 :: 4]
    middle = np.argmax(both)
    rest = np.delete(both, middle)
    percent = 100 * np.sqrt(np.sum(rest**2)) / both[middle]
    assert percent < 0.0055  # the default's own claim; computed 0.00506 at 0.25, the largest
    assert residual_evm_percent(pulse) == pytest.approx(percent, rel=1e-3)


@pytest.mark.parametrize(
    ("roll_off", "floor_db"),
    [(0.05, -150), (0.1, -135), (0.22, -120), (0.35, -110), (0.5, -113), (0.7, -115)],
)
def test_floor_outside_the_band(roll_off, floor_db):
    # spectrum of the default pulse 0.2 symbol rates beyond its band edge, against the passband
    pulse = RootRaisedCosine(roll_off=roll_off).design(Fraction(8))
    n = 1 << 15
    lines = np.abs(np.fft.rfft(pulse.on_lattice(8), n)) / 8
    f = np.arange(lines.size) * 8 / n
    assert 20 * np.log10(np.max(lines[f > (1 + roll_off) / 2 + 0.2])) < floor_db
    assert np.max(np.abs(lines[f < (1 - roll_off) / 2 - 0.02] - 1)) < 1e-4
