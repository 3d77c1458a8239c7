"""Continuous phase modulation against standards and constructions of the test's own."""

import math
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest
import scipy.fft
import scipy.special

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.dsp.phase_pulses import gaussian_frequency_pulse, soqpsk_tg_frequency_pulse
from wavegen.sources.phase_modulation import PhaseModulation

GSM_RATE = Fraction(1_625_000, 6)
SCHEMES = (
    {"scheme": "msk"},
    {"scheme": "msk", "differential": True},
    {"scheme": "gmsk", "bt": 0.3},
    {"scheme": "gmsk", "bt": 0.3, "differential": True},
    {"scheme": "gfsk", "bt": 0.5, "h": Fraction("0.32")},
    {"scheme": "gfsk", "bt": 0.5, "h": Fraction("0.315"), "levels": 4},
    {"scheme": "cpfsk", "h": Fraction(7, 10)},
    {"scheme": "cpfsk", "h": Fraction(1, 3), "levels": 4},
    {"scheme": "cpfsk", "h": Fraction(1, 3), "levels": 8},
    {"scheme": "four_level_fm"},
    {"scheme": "soqpsk_tg"},
    {"scheme": "oqpsk_half_sine"},
)


@dataclass(frozen=True)
class Given:
    """Data from a list, repeated."""

    values: tuple[int, ...]

    def bind(self, site, *, n_bits, period, label=""):
        return self

    def words(self, first, count):
        return np.array(self.values, np.uint8)[np.arange(first, first + count) % len(self.values)]


def build(per_symbol, n_symbols, *, symbol_rate_hz=Fraction(1), **fields):
    """A carrier of so many samples a symbol."""
    settings = PhaseModulation(symbol_rate_hz=symbol_rate_hz, **fields)
    per_symbol = Fraction(per_symbol)
    return settings.build(
        Site(
            sample_rate_hz=per_symbol * symbol_rate_hz,
            n_samples=int(n_symbols * per_symbol),
            seed=3,
            label="x",
            path="signal",
        )
    )


def samples(*args, **fields):
    return samples_of(build(*args, **fields)).astype(complex)


def deviation(x, span, rate_hz):
    """Mean frequency over ``span`` samples centred on each sample, cyclic, Hz."""
    turn = np.angle(np.roll(x, -1) * x.conj()) / (2 * np.pi)
    total = np.concatenate([[0.0], np.cumsum(np.concatenate([turn, turn]))])
    start = np.arange(x.size) + x.size - span // 2
    start %= x.size
    return (total[start + span] - total[start]) * rate_hz / span


@pytest.mark.parametrize("fields", SCHEMES, ids=str)
@pytest.mark.parametrize("per_symbol", [Fraction(8), Fraction(120, 13), Fraction(62_501, 6250)])
def test_constant_envelope(fields, per_symbol):
    # definition: 0 dB; float32 parts leave 3e-7, 3e-6 dB
    signal = build(per_symbol, 2 * 6500 if per_symbol.denominator == 13 else 12_500, **fields)
    level = 20 * np.log10(np.abs(samples_of(signal).astype(complex)))
    assert np.max(np.abs(level)) < 1e-4
    assert 10 * np.log10(np.mean(10 ** (level / 10))) == pytest.approx(0.0, abs=1e-6)


# Gaussian frequency pulses --------------------------------------------------------------------


def test_gaussian_pulse_of_the_standard():
    # 3GPP TS 45.004 cl. 2: rectangle of height 1/(2T) convolved with a Gaussian of
    # sigma = sqrt(ln 2) / (2 pi BT); here by quadrature
    sigma = math.sqrt(math.log(2)) / (2 * math.pi * 0.3)
    assert sigma == pytest.approx(0.4416839391989948, abs=1e-15)
    x, w = np.polynomial.legendre.leggauss(80)
    t = np.linspace(-2.5, 2.5, 21)
    bell = np.exp(-(((t[:, None] - x / 2) / sigma) ** 2) / 2) / (sigma * math.sqrt(2 * math.pi))
    want = 0.5 * np.sum(bell * w / 2, axis=1)
    assert gaussian_frequency_pulse(t, 0.3) == pytest.approx(want, abs=1e-12)
    assert gaussian_frequency_pulse(np.array(0.0), 0.3) == pytest.approx(0.37119, abs=5e-6)
    fine = np.linspace(-6, 6, 12_001)
    area = np.sum(gaussian_frequency_pulse(fine, 0.3)) * 1e-3
    assert area == pytest.approx(0.5, abs=1e-9)


@pytest.mark.parametrize(("bt", "ratio"), [(0.5, 0.8816), (0.3, 0.4861)])
def test_deviation_of_alternating_bits(bt, ratio):
    # Bluetooth Core Vol 2 Part A 3.1.1, Vol 6 Part A 3.1: deviation on 1010 at least 80 % of that
    # on 00001111; the ratio itself: derivation. 256 samples a symbol, a mean over two of them:
    # (pi / 256)^2 / 6 = 2.5e-5; float32 3e-5
    h = Fraction(1, 2)
    found = {}
    for name, bits in (("1010", (1, 0)), ("00001111", (0,) * 4 + (1,) * 4)):
        x = samples(256, 16, scheme="gfsk", bt=bt, h=h, data=Given(bits))
        found[name] = np.max(deviation(x, 2, 256.0))
    if bt == 0.5:
        assert found["00001111"] == pytest.approx(float(h) / 2, rel=2e-4)
        assert found["1010"] / found["00001111"] > 0.8
    assert found["1010"] / (float(h) / 2) == pytest.approx(ratio, abs=1.5e-4)


def test_one_raises_the_frequency():
    # Bluetooth Core Vol 6 Part A 3.1: a one is a positive frequency deviation
    x = samples(8, 16, scheme="gfsk", bt=0.5, h=Fraction(1, 2), data=Given((1,) * 8 + (0,) * 8))
    f = deviation(x, 2, 8.0)
    assert f[4 * 8] == pytest.approx(0.25, abs=1e-3)
    assert f[12 * 8] == pytest.approx(-0.25, abs=1e-3)


# GSM ------------------------------------------------------------------------------------------


def test_gsm_differential_encoding():
    # 3GPP TS 45.004 cl. 2: +1 when consecutive bits are equal, else -1; MSK shows it undisturbed
    bits = (1, 1, 0, 0, 0, 1, 0, 1)
    x = samples(8, 8, scheme="msk", differential=True, data=Given(bits))
    want = [
        0.25 if now == last else -0.25 for last, now in zip(bits[-1:] + bits, bits, strict=False)
    ]
    assert deviation(x, 8, 8.0)[::8] == pytest.approx(want, abs=1e-6)


def test_gsm_equal_bits_are_a_tone():
    # frequency correction burst: a quarter of 1625/6 kHz = 67.708 kHz (3GPP TS 45.002 cl. 5.2.4;
    # from memory)
    x = samples(
        Fraction(120, 13), 2600, symbol_rate_hz=GSM_RATE,
        scheme="gmsk", bt=0.3, differential=True, data=Given((0,)),
    )  # fmt: skip
    power = np.abs(scipy.fft.fft(x)) ** 2 / x.size**2
    line = 67_708.333333 / 2_500_000 * x.size
    assert power[round(line)] == pytest.approx(1.0, abs=1e-6)


def test_gmsk_at_a_rational_rate_from_the_bits():
    # 1625/6 kHz at 2.5 MHz: phase by the definition, the frequency pulse integrated numerically
    signal = build(
        Fraction(120, 13), 2600, symbol_rate_hz=GSM_RATE, scheme="gmsk", bt=0.3, differential=True
    )
    bits = (signal.symbols.words.words(0, 2600) & 1).astype(int)
    alpha = 1 - 2 * (bits ^ np.roll(bits, 1))
    fine = np.linspace(-5, 5, 100_001)
    g = gaussian_frequency_pulse(fine, 0.3)
    q = np.concatenate([[0.0], np.cumsum((g[1:] + g[:-1]) / 2) * 1e-4])
    n = np.arange(600, 1800)
    t = n * 13 / 120
    phase = np.zeros(n.size)
    for i in range(220):
        phase += np.pi * alpha[i] * np.interp(t - i, fine, q)
    turned = samples_of(signal, 600, 1800).astype(complex) * np.exp(-1j * phase)
    # trapezoid at 1e-4: g'' h^2 / 12 = 1e-9 a symbol, interpolation 1e-9; float32 2e-7
    assert np.max(np.abs(turned - turned[0])) < 1e-6


# MSK and offset QPSK --------------------------------------------------------------------------


def test_msk_deviation():
    # a quarter of the symbol rate to each side, held for a symbol (definition of MSK, h = 1/2)
    x = samples(8, 64, scheme="msk")
    f = deviation(x, 1, 8.0)
    assert np.abs(f) == pytest.approx(0.25, abs=1e-6)
    held = np.roll(f, 4).reshape(64, 8)  # from half a symbol before each instant
    assert np.ptp(held, axis=1) == pytest.approx(0.0, abs=1e-6)


CHIPS_0 = "11011001110000110101001000101110"


@pytest.mark.parametrize("chips", [CHIPS_0, None], ids=["symbol 0 of 802.15.4", "random"])
@pytest.mark.parametrize("per_symbol", [8, Fraction(25, 2)])
def test_half_sine_offset_qpsk(chips, per_symbol):
    # IEEE 802.15.4-2006 cl. 6.5.2: even chips on I, odd ones on Q a chip later, half a sine two
    # chips long; chip sequence of symbol 0 from there. Built here from that text.
    data = {} if chips is None else {"data": Given(tuple(int(chip) for chip in chips))}
    signal = build(per_symbol, 64, scheme="oqpsk_half_sine", **data)
    c = 2 * (signal.symbols.words.words(0, 64) & 1).astype(float) - 1
    t = np.arange(signal.n_samples) / float(Fraction(per_symbol))
    want = np.zeros(t.size, complex)
    for i in range(-2, 67):
        pulse = np.where(np.abs(t - i) < 1, np.cos(np.pi / 2 * (t - i)), 0.0)
        want += c[i % 64] * pulse * (1j if i % 2 else 1)
    # cos^2 + sin^2: constant envelope by itself; float32 3e-7
    assert np.max(np.abs(samples_of(signal) - want)) < 4e-7


def test_msk_spectrum():
    # (cos 2 pi f / (1 - 16 f^2))^2, f in symbol rates: S. Pasupathy, IEEE Communications Magazine
    # 17(4), 1979. Mean over 2048 stretches of 64 symbols: 1 / sqrt(2048) = 2.2 %, four sigma
    n = 64 * 16
    x = samples(16, 64 * 2048, scheme="msk").reshape(2048, n) * np.hanning(n + 1)[:-1]
    got = np.mean(np.abs(scipy.fft.fft(x, axis=1)) ** 2, axis=0)
    f = scipy.fft.fftfreq(n, 1 / 16)
    with np.errstate(divide="ignore", invalid="ignore"):
        want = np.where(np.abs(np.abs(f) - 0.25) < 1e-9, (np.pi / 4) ** 2,
                        (np.cos(2 * np.pi * f) / (1 - 16 * f**2)) ** 2)  # fmt: skip
    near = np.abs(f) < 0.65
    scale = np.sum(want) / np.sum(got)
    assert got[near] * scale == pytest.approx(want[near], rel=0.12, abs=1e-3)


@pytest.mark.parametrize(
    ("fields", "width"),
    [
        ({"scheme": "msk"}, 1.20),
        ({"scheme": "gmsk", "bt": 0.5}, 1.04),
        ({"scheme": "gmsk", "bt": 0.25}, 0.86),
        ({"scheme": "gmsk", "bt": 0.2}, 0.79),
    ],
    ids=str,
)
def test_bandwidth_of_99_percent(fields, width):
    # K. Murota, K. Hirade, IEEE Trans. Commun. 29(7), 1981, table of occupied bandwidths (from
    # memory). Two decimals there; the grid here is 1/128 symbol rate, the record 1e5 symbols
    n = 256 * 8
    x = samples(8, 256 * 400, **fields).reshape(400, n) * np.hanning(n + 1)[:-1]
    density = np.mean(np.abs(scipy.fft.fft(x, axis=1)) ** 2, axis=0)
    f = scipy.fft.fftfreq(n, 1 / 8)
    by_width = np.argsort(np.abs(f), kind="stable")
    held = np.cumsum(density[by_width]) / density.sum()
    found = 2 * np.abs(f[by_width][np.searchsorted(held, 0.99)])
    assert found == pytest.approx(width, abs=0.02)


# four-level FM --------------------------------------------------------------------------------

DIBITS = {0b01: 1800.0, 0b00: 600.0, 0b10: -600.0, 0b11: -1800.0}


def test_four_level_deviations_at_symbol_centres():
    # TIA-102.BAAA: 4800 symbols a second; receive filter sin(pi f/4800)/(pi f/4800) is the mean
    # over a symbol. The cut pulse leaves 0.03 % of 1800 Hz, 0.6 Hz
    signal = build(10, 3000, symbol_rate_hz=Fraction(4800), scheme="four_level_fm")
    words = signal.symbols.words.words(0, 3000) & 3
    kept = 3000 - signal.symbols.tail.size
    found = deviation(samples_of(signal).astype(complex), 10, 48_000.0)[::10]
    want = np.array([DIBITS[int(word)] for word in words])
    assert found[:kept] == pytest.approx(want[:kept], abs=1.0)


def test_four_level_isolated_step():
    # +3 for long: 1800 Hz, the outer deviation; -3: -1800 Hz
    x = samples(10, 200, symbol_rate_hz=Fraction(4800), scheme="four_level_fm",
                data=Given((0b01,) * 100 + (0b11,) * 100))  # fmt: skip
    f = deviation(x, 10, 48_000.0)
    assert f[500] == pytest.approx(1800.0, abs=1.0)
    assert f[1500] == pytest.approx(-1800.0, abs=1.0)


# SOQPSK-TG ------------------------------------------------------------------------------------


def test_soqpsk_normalisation():
    # IRIG 106 ch. 2, cl. 2.4.3.2: rho 0.70, B 1.25, T1 1.5, T2 0.50; A makes the area 1/2 over
    # bits. Written out here
    t = (np.arange(1 << 16) + 0.5) / (1 << 14)  # 0 to 4 bits, midpoints
    u = t / 2
    first = np.cos(np.pi * 0.7 * 1.25 * u) / (1 - 4 * (0.7 * 1.25 * u) ** 2)
    second = np.sin(np.pi * 1.25 * u) / (np.pi * 1.25 * u)
    window = np.where(u <= 1.5, 1.0, 0.5 + 0.5 * np.cos(np.pi * (u - 1.5) / 0.5))
    density = first * second * window
    assert soqpsk_tg_frequency_pulse(t) == pytest.approx(density, abs=1e-12)
    a_per_bit = 0.5 / (2 * np.sum(density) / (1 << 14))
    assert a_per_bit == pytest.approx(0.31116353630908, abs=1e-9)
    # the program's own scale: the slope of its phase pulse at the centre
    signal = build(64, 64, scheme="soqpsk_tg")
    q = signal.pulse.values(np.array([-1 / 64, 1 / 64]))
    assert (q[1] - q[0]) * 32 == pytest.approx(a_per_bit, rel=1e-3)  # curvature over 1/32 bit


def test_soqpsk_precoder():
    # IRIG 106 ch. 2, cl. 2.4.3.2: (-1)^(i+1) a[i-1] (a[i] - a[i-2]) / 2 with a = +-1
    signal = build(8, 4096, scheme="soqpsk_tg")
    a = 2 * (signal.symbols.words.words(0, 4096) & 1).astype(int) - 1
    sign = np.where(np.arange(4096) % 2, 1, -1)
    want = sign * np.roll(a, 1) * (a - np.roll(a, 2)) // 2
    found = signal.symbols.levels(signal.symbols.range(0, 4096))
    assert np.array_equal(found, want)
    # a known property: +1 never follows -1 nor the other way round
    assert np.all(found * np.roll(found, 1) >= 0)
    assert np.mean(found == 0) == pytest.approx(0.5, abs=4 * 0.5 / 64)


def test_soqpsk_bits_are_read_on_the_rails():
    # derivation: bit i stands on I (even) or Q (odd) between the transitions at i and i + 2
    signal = build(8, 4096, scheme="soqpsk_tg")
    bits = (signal.symbols.words.words(0, 4096) & 1).astype(int)
    x = samples_of(signal)
    middle = np.roll(x[::8], -1)
    rails = np.where(np.arange(4096) % 2, middle.imag, middle.real)
    assert np.array_equal(rails > 0, bits == 1)
    assert np.min(np.abs(rails)) > 0.3


# CPFSK ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(("levels", "gray"), [(2, "0 1"), (4, "00 01 11 10"),
                                              (8, "000 001 011 010 110 111 101 100")])  # fmt: skip
def test_cpfsk_frequencies(levels, gray):
    # neighbours h symbol rates apart, Gray code from the lowest (common practice)
    h = Fraction(2, 5)
    words = [int(word, 2) for word in gray.split()]
    x = samples(16, levels * 5, scheme="cpfsk", h=h, levels=levels, data=Given(tuple(words)))
    want = float(h) * (np.arange(levels) - (levels - 1) / 2)
    assert deviation(x, 16, 16.0)[::16][:levels] == pytest.approx(want, abs=1e-6)
