"""Power statistics of shaped carriers against exact identities and published levels.

Sources of the numbers are in README.md.
"""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.evaluate import evaluate
from wavegen.core.site import Site
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.single_carrier import SingleCarrier

N_SYMBOLS = 1 << 18


def carrier(name, roll_off, *, ratio=4, n_symbols=N_SYMBOLS, seed=5):
    settings = SingleCarrier(
        constellation=Constellation.parse(name),
        symbol_rate_hz=Fraction(1_000_000),
        pulse=RootRaisedCosine(roll_off=roll_off),
    )
    site = Site(
        sample_rate_hz=Fraction(1_000_000) * ratio,
        n_samples=int(n_symbols * ratio),
        seed=seed,
        label="carrier",
        path="signal",
    )
    signal = settings.build(site)
    samples = evaluate({signal: (0, signal.n_samples)})[signal]
    return samples.real.astype(np.float64) ** 2 + samples.imag.astype(np.float64) ** 2


def rrc(t, a):
    """Textbook form, singular points apart."""
    with np.errstate(divide="ignore", invalid="ignore"):
        top = np.sin(np.pi * t * (1 - a)) + 4 * a * t * np.cos(np.pi * t * (1 + a))
        plain = top / (np.pi * t * (1 - (4 * a * t) ** 2))
    return np.where(t == 0, 1 - a + 4 * a / np.pi, plain)


def moments(name, roll_off):
    """E x^2 and E x^3 of the power over its mean, for fourfold-symmetric symbols."""
    points = Constellation.parse(name).points
    fourth, sixth = np.mean(np.abs(points) ** 4), np.mean(np.abs(points) ** 6)
    k4, k6 = fourth - 2, sixth - 9 * fourth + 12
    phases = (np.arange(16) + 0.5) / 16
    h = rrc(np.arange(-200, 200)[:, None] + phases, roll_off)
    s2, s4, s6 = (np.sum(h**m, axis=0) for m in (2, 4, 6))
    second = 2 * np.mean(s2**2) + k4 * np.mean(s4)
    third = 6 * np.mean(s2**3) + 9 * k4 * np.mean(s4 * s2) + k6 * np.mean(s6)
    return second, third


@pytest.mark.parametrize(
    ("name", "roll_off", "second", "third"),
    [("qpsk", 0.22, 1.23618, 1.73148), ("16qam", 0.35, 1.47176, 2.59938)],
)
def test_identities_give_the_tabulated_moments(name, roll_off, second, third):
    assert moments(name, roll_off) == pytest.approx((second, third), abs=1e-5)  # five decimals


@pytest.mark.parametrize(
    ("name", "roll_off"),
    [("qpsk", 0.22), ("16qam", 0.35), ("64qam", 0.22), ("32qam", 0.25), ("4096qam", 0.1)],
)
def test_moments_of_the_samples(name, roll_off):
    # four standard errors from 64 batch means (correlation dies within 100 symbols of 4096)
    power = carrier(name, roll_off)
    for order, expected in zip((2, 3), moments(name, roll_off), strict=True):
        batches = np.mean(power.reshape(64, -1) ** order, axis=1)
        error = np.std(batches, ddof=1) / 8
        assert np.mean(batches) == pytest.approx(expected, abs=4 * error)
        assert error < 0.01 * expected


@pytest.mark.parametrize("ratio", [Fraction(5, 2), Fraction(125, 32), Fraction(120, 13)])
def test_second_moment_at_rational_rates(ratio):
    power = carrier("qpsk", 0.22, ratio=ratio, n_symbols=ratio.denominator << 12)
    usable = power[: power.size // 64 * 64].reshape(64, -1)
    batches = np.mean(usable**2, axis=1)
    error = np.std(batches, ddof=1) / 8
    assert np.mean(batches) == pytest.approx(1.23618, abs=4 * error)


@pytest.mark.parametrize("name", ["bpsk", "qpsk", "8psk", "256qam", "128qam"])
def test_mean_power_is_one(name):
    power = carrier(name, 0.22, n_symbols=1 << 16)
    batches = np.mean(power.reshape(64, -1), axis=1)
    assert np.mean(batches) == pytest.approx(1.0, abs=4 * np.std(batches, ddof=1) / 8)


LEVELS = {  # dB over the mean at 1e-1, 1e-2, 1e-3, 1e-4: exact method of the sheet, span 16
    ("qpsk", 0.22): (1.99, 3.60, 4.46, 4.92),
    ("qpsk", 0.35): (1.87, 2.99, 3.55, 3.76),
    ("qpsk", 0.5): (1.84, 2.47, 2.90, 3.15),
    ("16qam", 0.22): (3.00, 4.51, 5.60, 6.34),
    ("16qam", 0.35): (2.98, 4.35, 5.09, 5.64),
    ("64qam", 0.22): (3.06, 4.83, 5.86, 6.66),
    ("64qam", 0.35): (3.04, 4.78, 5.57, 6.11),
}


@pytest.mark.parametrize(("name", "roll_off"), LEVELS)
def test_levels(name, roll_off):
    # 16 phases a symbol stand for continuous time (4 leave 0.1 dB at roll-off 0.5). Rounding
    # 0.005 dB; sampling of 2^18 symbols, about one independent excess each: 0.003, 0.005, 0.012,
    # 0.025 dB from the slope of the curve; so 0.02, 0.03, 0.03, 0.06, above 2 sigma everywhere
    power = carrier(name, roll_off, ratio=16)
    got = 10 * np.log10(np.quantile(power, [0.9, 0.99, 0.999, 0.9999]) / np.mean(power))
    for level, expected, allowed in zip(
        got, LEVELS[name, roll_off], (0.02, 0.03, 0.03, 0.06), strict=True
    ):
        assert level == pytest.approx(expected, abs=allowed)
