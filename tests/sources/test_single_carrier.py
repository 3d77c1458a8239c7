import pickle
from fractions import Fraction

import numpy as np
import pytest
import scipy.signal

from wavegen.core.errors import RecipeError
from wavegen.core.evaluate import evaluate
from wavegen.core.site import Site
from wavegen.dsp.pulses.raised_cosine import RaisedCosine
from wavegen.dsp.pulses.rectangular import Rectangular
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.dsp.pulses.taps import Taps
from wavegen.sources.data.random import Random
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.single_carrier import SingleCarrier

RATE = Fraction(2_500_000)
RATES = {  # symbol rate at 2.5 MHz: samples and symbols of a cycle
    Fraction(1_000_000): (5, 2),
    Fraction(640_000): (125, 32),
    Fraction(1_625_000, 6): (120, 13),
}
ROLL_OFFS = (0.05, 0.1, 0.2, 0.22, 0.25, 0.35, 0.5, 1.0)


def settings(rate, name="qpsk", **more):
    return SingleCarrier(constellation=Constellation.parse(name), symbol_rate_hz=rate, **more)


def site_for(made, n_cycles, *, rate=RATE, seed=1):
    cycle = made.cycle(rate, "signal")
    return Site(
        sample_rate_hz=rate,
        n_samples=cycle.n_samples * n_cycles,
        seed=seed,
        label="carrier",
        path="signal",
    )


def whole(signal):
    return evaluate({signal: (0, signal.n_samples)})[signal]


def received(samples, n_symbols, ratio, roll_off):
    """Demodulate a loop: square-root spectrum by its definition, folded to the symbol rate."""
    lines = np.fft.fft(samples.astype(complex))
    f = np.fft.fftfreq(samples.size) * float(ratio)  # symbol rates
    edge = np.clip((np.abs(f) - (1 - roll_off) / 2) / roll_off, 0, 1)
    lines *= np.cos(np.pi / 2 * edge)
    numbers = np.rint(np.fft.fftfreq(samples.size, 1 / samples.size)).astype(int)
    folded = np.zeros(n_symbols, complex)
    np.add.at(folded, numbers % n_symbols, lines)
    return np.fft.ifft(folded)


def evm_percent(got, ideal):
    gain = np.vdot(ideal, got) / np.vdot(ideal, ideal)
    error = got / gain - ideal
    return 100 * np.sqrt(np.mean(np.abs(error) ** 2) / np.mean(np.abs(ideal) ** 2))


@pytest.mark.parametrize(("rate", "cycle"), RATES.items())
def test_cycle(rate, cycle):
    made = settings(rate).cycle(RATE, "signal")
    assert (made.n_samples, made.n_symbols) == cycle


@pytest.mark.parametrize("rate", RATES)
def test_same_bits_under_random_cuts_and_across_the_seam(rate):
    made = settings(rate, "64qam")
    signal = made.build(site_for(made, 400))
    reference = whole(signal)
    n = signal.n_samples
    rng = np.random.default_rng(8)
    ranges = [(int(low), int(low + size)) for low, size in rng.integers(1, n, (12, 2))]
    for start, stop in [*ranges, (-5, 7), (n - 1, n + 1), (3 * n - 9, 3 * n + 9), (-n, 2 * n)]:
        got = evaluate({signal: (start, stop)})[signal]
        assert np.array_equal(got, reference[np.arange(start, stop) % n])


@pytest.mark.parametrize("rate", RATES)
def test_the_loop_is_closed_and_the_floor_outside_the_band_is_low(rate):
    # the loop's own spectrum sees the seam; the pulse leaves -121 dB 0.2 symbol rates beyond its
    # edge (test_pulses), float32 rows -132 dB in all, spread over the band
    made = settings(rate)
    signal = made.build(site_for(made, 8192 // RATES[rate][1]))
    samples = whole(signal).astype(complex)
    power = np.abs(np.fft.fft(samples)) ** 2
    f = np.abs(np.fft.fftfreq(samples.size)) * float(RATE / rate)
    inside, outside = np.mean(power[f < 0.39]), np.mean(power[f > 0.81])
    assert 10 * np.log10(outside / inside) < -120


@pytest.mark.parametrize("rate", RATES)
def test_mean_power_is_one(rate):
    # QPSK: every symbol has unit power; what is left is the cross terms, whose share falls with
    # the number of symbols: four standard errors of 32 batch means
    made = settings(rate)
    signal = made.build(site_for(made, 32 * (16384 // RATES[rate][1] // 32)))
    assert signal.mean_power == 1.0
    batches = np.mean(np.abs(whole(signal).reshape(32, -1)).astype(float) ** 2, axis=1)
    assert np.mean(batches) == pytest.approx(1.0, abs=4 * np.std(batches, ddof=1) / np.sqrt(32))


@pytest.mark.parametrize("rate", RATES)
@pytest.mark.parametrize("roll_off", ROLL_OFFS)
def test_evm_of_the_untouched_carrier(rate, roll_off):
    made = settings(rate, "16qam", pulse=RootRaisedCosine(roll_off=roll_off))
    signal = made.build(site_for(made, 4096 // RATES[rate][1]))
    ideal = whole(signal.ideal).astype(complex)
    got = received(whole(signal), ideal.size, RATE / rate, roll_off)
    assert evm_percent(got, ideal) < 0.01


@pytest.mark.parametrize("roll_off", ROLL_OFFS)
def test_evm_behind_an_ordinary_matched_filter(roll_off):
    # time domain, four samples a symbol, textbook taps four times as long as the default pulse
    made = settings(Fraction(1_000_000), "64qam", pulse=RootRaisedCosine(roll_off=roll_off))
    signal = made.build(site_for(made, 6000, rate=Fraction(4_000_000)))
    samples = whole(signal).astype(complex)
    t = np.arange(-4000, 4001) / 4 + 1e-7  # beside the singular points
    top = np.sin(np.pi * t * (1 - roll_off))
    top += 4 * roll_off * t * np.cos(np.pi * t * (1 + roll_off))
    taps = top / (np.pi * t * (1 - (4 * roll_off * t) ** 2))
    symbols = scipy.signal.fftconvolve(samples, taps, mode="same")[4400:-4400:4]
    ideal = whole(signal.ideal).astype(complex)[1100:-1100]
    assert evm_percent(symbols, ideal) < 0.01


def test_sample_zero_stands_at_symbol_zero():
    made = settings(Fraction(500_000), "64qam", pulse=RaisedCosine(roll_off=0.5))
    signal = made.build(site_for(made, 300))
    ideal = whole(signal.ideal)
    scale = 1 / np.sqrt(1 - 0.5 / 4)  # energy of a raised cosine
    assert whole(signal)[::5] == pytest.approx(ideal * scale, abs=2e-6)


def test_ideal_is_on_the_symbol_axis():
    rate = Fraction(640_000)
    made = settings(rate)
    signal = made.build(site_for(made, 10))
    assert (signal.ideal.sample_rate_hz, signal.ideal.n_samples) == (rate, 320)
    assert (signal.sample_rate_hz, signal.n_samples) == (RATE, 1250)


@pytest.mark.parametrize("rate", RATES)
def test_a_loop_shorter_than_the_pulse(rate):
    made = settings(rate)
    signal = made.build(site_for(made, 1))
    got = whole(signal).astype(complex)
    n_symbols = RATES[rate][1]
    ideal = whole(signal.ideal).astype(complex)
    assert evm_percent(received(got, n_symbols, RATE / rate, 0.22), ideal) < 0.02
    twice = evaluate({signal: (0, 2 * got.size)})[signal]
    assert np.array_equal(twice[: got.size], twice[got.size :])


def test_held_symbols():
    made = settings(Fraction(1_000_000), pulse=Rectangular())
    signal = made.build(site_for(made, 50))
    ideal = whole(signal.ideal)
    assert np.array_equal(whole(signal), ideal[np.arange(250) * 2 // 5])


def test_own_taps_have_unit_mean_power():
    made = settings(Fraction(1_250_000), "qpsk", pulse=Taps(taps=(30.0, 40.0)))
    signal = made.build(site_for(made, 1000))
    ideal = whole(signal.ideal)
    scale = 1 / np.sqrt((30**2 + 40**2) / 2)
    assert whole(signal).reshape(-1, 2) == pytest.approx(
        ideal[:, None] * scale * np.array([30, 40]), abs=1e-6
    )


def test_own_taps_want_a_whole_number_of_samples_a_symbol():
    made = settings(Fraction(1_000_000), pulse=Taps(taps=(1.0, 1.0)))
    with pytest.raises(RecipeError) as caught:
        made.build(site_for(made, 10))
    assert caught.value.where == "signal.pulse.taps"
    assert "2.5" in caught.value.problem


@pytest.mark.parametrize("taps", [(0.0, 0.0), (1.0, float("nan")), (float("inf"),)])
def test_own_taps_are_finite_and_not_all_zero(taps):
    made = settings(Fraction(1_250_000), pulse=Taps(taps=taps))
    with pytest.raises(RecipeError) as caught:
        made.build(site_for(made, 10))
    assert caught.value.where == "signal.pulse.taps"


@pytest.mark.parametrize(
    ("pulse", "rate"),
    [
        (RootRaisedCosine(roll_off=0.22), Fraction(80_000_000)),
        (RaisedCosine(roll_off=1.0), Fraction(1_250_001)),
        (Rectangular(), Fraction(2_500_001)),
    ],
)
def test_too_wide_for_the_sample_rate(pulse, rate):
    made = settings(rate, pulse=pulse)
    with pytest.raises(RecipeError) as caught:
        made.build(site_for(made, 1))
    assert caught.value.where == "signal.symbol_rate"
    assert "occupies" in caught.value.problem
    assert "2.5 MHz" in caught.value.allowed


def test_the_message_of_the_error():
    made = settings(Fraction(80_000_000))
    site = site_for(made, 1, rate=Fraction(61_440_000))
    with pytest.raises(RecipeError) as caught:
        made.build(site)
    assert caught.value.problem == "80 MHz with roll-off 0.22 occupies 97.6 MHz"
    assert caught.value.allowed == "up to the sample rate, 61.44 MHz"


def test_occupying_the_whole_sample_rate_is_allowed():
    made = settings(Fraction(1_250_000), pulse=RootRaisedCosine(roll_off=1.0))
    signal = made.build(site_for(made, 2048))
    ideal = whole(signal.ideal).astype(complex)
    assert evm_percent(received(whole(signal), 2048, Fraction(2), 1.0), ideal) < 0.01


def test_a_pulse_cut_short_is_noted():
    made = settings(Fraction(1_000_000), pulse=RootRaisedCosine(roll_off=0.22, span_symbols=8))
    site = site_for(made, 4)
    made.build(site)
    assert [(note.kind, note.where) for note in site.notes] == [("warning", "signal.pulse")]
    assert "0.5" in site.notes[0].text
    made = settings(Fraction(1_000_000))
    site = site_for(made, 4)
    made.build(site)
    assert site.notes == []


def test_seed_and_label_choose_the_data():
    made = settings(Fraction(1_000_000), data=Random())
    one, same, other = (whole(made.build(site_for(made, 40, seed=s))) for s in (1, 1, 2))
    assert np.array_equal(one, same)
    assert not np.array_equal(one, other)


def test_a_worker_gets_a_small_description():
    made = settings(Fraction(1_000_000), "64qam")
    signal = made.build(site_for(made, 100))
    reference = whole(signal)
    packed = pickle.dumps(signal)
    assert len(packed) < 8000
    assert np.array_equal(whole(pickle.loads(packed)), reference)  # noqa: S301 - our own bytes


def test_default_pulse():
    assert settings(Fraction(1)).pulse == RootRaisedCosine(roll_off=0.22)
