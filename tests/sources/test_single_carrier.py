import pickle
from fractions import Fraction

import numpy as np
import pytest
import scipy.signal

from wavegen.core.errors import RecipeError
from wavegen.core.evaluate import evaluate
from wavegen.core.site import Site
from wavegen.core.units import QuantityError
from wavegen.dsp.pulses.gaussian import Gaussian
from wavegen.dsp.pulses.half_sine import HalfSine
from wavegen.dsp.pulses.linearised_gaussian import LinearisedGaussian
from wavegen.dsp.pulses.raised_cosine import RaisedCosine
from wavegen.dsp.pulses.rectangular import Rectangular
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.dsp.pulses.taps import Taps
from wavegen.sources.data.file import File
from wavegen.sources.data.pattern import BitText, Pattern
from wavegen.sources.data.prbs import PseudoRandom
from wavegen.sources.data.random import Random
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.rotation import Rotation
from wavegen.sources.single_carrier import SingleCarrier

RATE = Fraction(2_500_000)
RATES = {  # symbol rate at 2.5 MHz: samples and symbols of a cycle
    Fraction(1_000_000): (5, 2),
    Fraction(640_000): (125, 32),
    Fraction(1_625_000, 6): (120, 13),
}
ROLL_OFFS = (0.05, 0.1, 0.2, 0.22, 0.25, 0.35, 0.5, 1.0)


def settings(rate, name="qpsk", **more):  # name: or any notation of a constellation
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


# Rotation -------------------------------------------------------------------------------------


@pytest.mark.parametrize("angle", ["pi/4", "3 pi/8", "-pi/2", "67.5 deg", "2 pi/3"])
@pytest.mark.parametrize("name", ["bpsk", "8psk", "512qam"])
def test_each_symbol_is_turned_over_the_one_before(angle, name):
    plain = settings(Fraction(1_000_000), name)
    turned = settings(Fraction(1_000_000), name, rotation=Rotation.parse(angle))
    n_symbols = turned.cycle(RATE, "signal").n_symbols * 40
    site = site_for(plain, n_symbols // 2)
    one, other = (whole(made.build(site).ideal) for made in (plain, turned))
    steps = np.exp(2j * np.pi * float(Rotation.parse(angle).turns) * np.arange(n_symbols))
    assert other == pytest.approx(one * steps, abs=1e-6)  # float32 points, exact turns


@pytest.mark.parametrize(
    ("rate", "angle", "cycle"),
    [
        (Fraction(1_000_000), "pi/4", (20, 8)),
        (Fraction(640_000), "pi/4", (125, 32)),
        (Fraction(1_625_000, 6), "3 pi/8", (1920, 208)),
        (Fraction(1_625_000, 6), "pi/13", (240, 26)),
    ],
)
def test_the_cycle_holds_whole_turns(rate, angle, cycle):
    made = settings(rate, rotation=Rotation.parse(angle)).cycle(RATE, "signal")
    assert (made.n_samples, made.n_symbols) == cycle


def test_a_rotation_with_too_many_points():
    made = settings(Fraction(1_000_000), "4096qam", rotation=Rotation.parse("pi/1024"))
    with pytest.raises(RecipeError) as caught:
        made.build(site_for(made, 1))
    assert caught.value.where == "signal.rotation"


# Stagger --------------------------------------------------------------------------------------


def rails_apart(samples, ratio):
    """Receive I as it is and Q half a symbol earlier: a shift of the spectrum's phase."""
    lines = np.fft.fft(samples.astype(complex).imag)
    f = np.fft.fftfreq(samples.size) * float(ratio)
    early = np.fft.ifft(lines * np.exp(1j * np.pi * f)).real
    return samples.real + 1j * early


@pytest.mark.parametrize("rate", RATES)
@pytest.mark.parametrize("name", ["qpsk", "16qam"])
def test_q_is_late_by_half_a_symbol(rate, name):
    made = settings(rate, name, stagger=True)
    signal = made.build(site_for(made, 4096 // RATES[rate][1]))
    ideal = whole(signal.ideal).astype(complex)
    assert signal.ideal.sample_rate_hz == rate
    straight = rails_apart(whole(signal), RATE / rate)
    got = received(straight, ideal.size, RATE / rate, 0.22)
    assert evm_percent(got, ideal) < 0.01


@pytest.mark.parametrize("ratio", [Fraction(4), Fraction(3), Fraction(7, 3), Fraction(2000003, 9)])
def test_half_sine_rails_have_a_constant_envelope(ratio):
    # float32 and, at rates between, polynomials to 1e-9: 1e-6 leaves room for both
    made = settings(RATE / ratio, pulse=HalfSine(), stagger=True)
    signal = made.build(site_for(made, max(1, 300 // ratio.denominator)))
    samples = evaluate({signal: (0, min(signal.n_samples, 50_000))})[signal]
    assert np.abs(samples).astype(float) == pytest.approx(1, abs=1e-6)


@pytest.mark.parametrize("ratio", [Fraction(4), Fraction(7, 3)])
def test_held_rails(ratio):
    made = settings(RATE / ratio, pulse=Rectangular(), stagger=True)
    signal = made.build(site_for(made, 100))
    ideal = whole(signal.ideal)
    n = np.arange(signal.n_samples) * ratio.denominator * 2
    in_phase = ideal.real[n // (2 * ratio.numerator)]
    late = (n - ratio.numerator) // (2 * ratio.numerator)  # half a symbol earlier, may be -1
    expected = in_phase + 1j * ideal.imag[late]
    assert whole(signal) == pytest.approx(expected, abs=2e-6)


@pytest.mark.parametrize(
    "constellation",
    [
        "bpsk",
        "8psk",
        "32qam",
        [[1, 1], [-1, 1], [3, 1], [-3, 1], [1, -1], [-1, -1], [3, -1], [-3, -1]],
    ],
)
def test_only_independent_rails_are_staggered(constellation):
    made = settings(Fraction(1_000_000), constellation, stagger=True)
    with pytest.raises(RecipeError) as caught:
        made.build(site_for(made, 4))
    assert caught.value.where == "signal.stagger"


@pytest.mark.parametrize(
    "more", [{"rotation": Rotation.parse("pi/4")}, {"differential": True}], ids=str
)
def test_stagger_stands_alone(more):
    with pytest.raises(QuantityError) as caught:
        settings(Fraction(1_000_000), stagger=True, **more)
    assert caught.value.key == "stagger"


def test_staggered_taps_want_an_even_number_of_samples_a_symbol():
    made = settings(Fraction(1_250_000), pulse=Taps(taps=(1.0, 1.0)), stagger=True)
    whole(made.build(site_for(made, 10)))
    made = settings(RATE / 3, pulse=Taps(taps=(1.0, 1.0)), stagger=True)
    with pytest.raises(RecipeError) as caught:
        made.build(site_for(made, 10))
    assert "even" in caught.value.allowed


# Differential ---------------------------------------------------------------------------------


def turned_by(signal, order):
    """Return by how many steps each symbol turns the last one, over the loop's seam too."""
    symbols = whole(signal.ideal).astype(complex)
    turns = np.angle(symbols * np.conj(np.roll(symbols, 1))) / (2 * np.pi)
    steps = np.rint(turns * order)
    assert turns * order == pytest.approx(steps, abs=1e-5)
    return steps.astype(int) % order


@pytest.mark.parametrize(
    ("name", "angle", "increments"),
    [  # eighths of a turn by symbol number
        ("bpsk", None, [0, 4]),
        ("bpsk", "pi/2", [2, 6]),
        ("qpsk", None, [0, 6, 2, 4]),
        ("qpsk", "pi/4", [1, 7, 3, 5]),
        ([[1, 1], [-1, 1], [1, -1], [-1, -1]], "pi/4", [1, 3, 7, 5]),
        ("8psk", None, [0, 7, 3, 4, 1, 6, 2, 5]),
    ],
)
def test_symbols_turn_the_last_one_by_their_data(name, angle, increments):
    made = settings(
        Fraction(1_000_000),
        name,
        rotation=angle and Rotation.parse(angle),
        differential=True,
        data=PseudoRandom(sequence="pn11"),
    )
    site = site_for(made, 2000 // made.cycle(RATE, "signal").n_symbols)
    got = turned_by(made.build(site), 8)
    bits = made.constellation.n_bits
    numbers = made.data.bind(site, n_bits=bits, period=got.size).words(0, got.size)
    assert np.array_equal(got[:-1], np.array(increments)[numbers][:-1])
    closes = got[-1] == increments[numbers[-1]]
    assert any(note.where == "signal.differential" for note in site.notes) != closes


def test_a_residue_is_noted_and_the_last_symbol_makes_up_for_it():
    data = Pattern(bits=BitText.parse("10"))  # 10 turns by a quarter: of 6 symbols 2/4 are left
    made = settings(Fraction(1_000_000), differential=True, data=data)
    site = site_for(made, 3)
    assert turned_by(made.build(site), 4).tolist() == [1, 1, 1, 1, 1, 3]
    assert [(note.kind, note.where) for note in site.notes] == [("warning", "signal.differential")]
    assert "2/4" in site.notes[0].text
    site = site_for(made, 4)
    assert turned_by(made.build(site), 4).tolist() == [1] * 8
    assert site.notes == []


def test_random_data_close_by_themselves():
    made = settings(Fraction(1_000_000), rotation=Rotation.parse("pi/4"), differential=True)
    site = site_for(made, 2000)
    got = turned_by(made.build(site), 8)
    assert site.notes == []
    # chi-squared over 4 cells, 3 degrees of freedom: 99.99 % below 21.1
    counts = np.bincount(got, minlength=8)[1::2]
    assert counts.sum() == got.size
    assert np.sum((counts - got.size / 4) ** 2) / (got.size / 4) < 21.1


@pytest.mark.parametrize("constellation", ["16qam", "16apsk", [[1, 0], [2, 0], [3, 0], [4, 0]]])
def test_only_phases_are_encoded_differentially(constellation):
    made = settings(Fraction(1_000_000), constellation, differential=True)
    with pytest.raises(RecipeError) as caught:
        made.build(site_for(made, 4))
    assert caught.value.where == "signal.differential"


# Data -----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("name", "more", "rate", "n_symbols"),
    [
        ("qpsk", {}, Fraction(1_000_000), 1022),
        ("bpsk", {}, Fraction(2_500_000, 4), 511),
        ("8psk", {}, Fraction(2_500_000, 4), 511),
        ("128qam", {}, Fraction(2_500_000, 4), 73),
        ("qpsk", {"rotation": Rotation.parse("pi/4")}, Fraction(2_500_000, 4), 4088),
        ("qpsk", {}, Fraction(1_625_000, 6), 6643),
    ],
)
def test_the_loop_that_holds_whole_periods_of_the_data(name, more, rate, n_symbols):
    made = settings(rate, name, data=PseudoRandom(sequence="pn9"), **more)
    cycle = made.data_cycle(RATE, "signal")
    assert cycle.n_symbols == n_symbols
    assert cycle.n_samples == n_symbols * RATE / rate
    site = site_for(made, cycle.n_samples // made.cycle(RATE, "signal").n_samples)
    made.build(site)
    assert site.notes == []


def test_random_data_have_no_period(tmp_path):
    assert settings(Fraction(1_000_000)).data_cycle(RATE, "signal") is None
    made = settings(Fraction(1_000_000), data=File(path="bits.txt"))
    with pytest.raises(RecipeError) as caught:
        made.data_cycle(RATE, "signal.parts[1]", tmp_path)
    assert caught.value.where == "signal.parts[1].data.path"
    (tmp_path / "bits.txt").write_text("10110")
    assert made.data_cycle(RATE, "signal", tmp_path).n_symbols == 10


def test_symbols_carry_the_bits_in_order():
    made = settings(Fraction(1_000_000), "16qam", data=Pattern(bits=BitText.parse("0x01F")))
    signal = made.build(site_for(made, 3))
    points = made.constellation.points
    assert whole(signal.ideal) == pytest.approx(points[[0, 1, 15, 0, 1, 15]], abs=1e-6)


def test_a_carrier_with_a_long_sequence_is_a_small_description():
    made = settings(
        Fraction(1_000_000),
        data=PseudoRandom(sequence="pn31"),
        rotation=Rotation.parse("pi/4"),
        differential=True,
    )
    signal = made.build(site_for(made, 5000))
    reference = whole(signal)
    packed = pickle.dumps(signal)
    assert len(packed) < 8000
    assert np.array_equal(whole(pickle.loads(packed)), reference)  # noqa: S301 - our own bytes


# Pulses ---------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "pulse", [HalfSine(), Gaussian(bt=0.5), Gaussian(bt=0.3, symbols="impulses")], ids=str
)
@pytest.mark.parametrize("ratio", [Fraction(8), Fraction(7, 3), Fraction(2000003, 300000)])
@pytest.mark.parametrize("stagger", [False, True])
def test_every_pulse_at_any_rate(pulse, ratio, stagger):
    # the definition in float64; float32 rows leave -132 dB of the mean power, 2.5e-7: 20 sigma
    made = settings(RATE / ratio, pulse=pulse, stagger=stagger)
    signal = made.build(site_for(made, max(1, 64 // ratio.denominator)))
    shape = pulse.design(ratio)
    count = min(signal.n_samples, 3000)
    t = np.arange(count) / float(ratio)
    symbols = whole(signal.ideal).astype(complex)
    expected = np.zeros(count, complex)
    for back in range(-shape.span_symbols - 1, shape.span_symbols + 1):
        number = np.floor(t).astype(int) - back
        sent = symbols[number % symbols.size]
        late = 0.5 if stagger else 0.0
        expected += sent.real * shape.values(t - number)
        expected += 1j * sent.imag * shape.values(t - number - late)
    lattice = shape.on_lattice(1024).reshape(-1, 1024) ** 2
    got = evaluate({signal: (0, count)})[signal]
    scale = np.sqrt(np.sum(lattice) / 1024)
    assert got * scale == pytest.approx(expected, abs=5e-6)


def test_taps_from_a_file(tmp_path):
    (tmp_path / "taps.txt").write_text("30, 40")
    from_file = settings(Fraction(1_250_000), pulse=Taps(file="taps.txt"))
    given = settings(Fraction(1_250_000), pulse=Taps(taps=(30.0, 40.0)))
    site = Site(
        sample_rate_hz=RATE, n_samples=100, seed=1, label="a", path="signal", folder=tmp_path
    )
    assert np.array_equal(whole(from_file.build(site)), whole(given.build(site)))
    (tmp_path / "taps.txt").write_text("30, x")
    with pytest.raises(RecipeError) as caught:
        from_file.build(site)
    assert caught.value.where == "signal.pulse.file"
    (tmp_path / "taps.txt").write_text("0 0")
    with pytest.raises(RecipeError) as caught:
        from_file.build(site)
    assert "no energy" in caught.value.problem


def test_the_linearised_pulse_is_that_of_its_formula():
    made = settings(RATE / 4, "8psk", pulse=LinearisedGaussian())
    signal = made.build(site_for(made, 64))
    symbols = whole(signal.ideal).astype(complex)
    t = np.arange(256) / 4
    shape = made.pulse.design(Fraction(4))
    expected = np.zeros(256, complex)
    for k in range(-4, 68):
        expected += symbols[k % 64] * shape.values(t - k)
    scale = np.sqrt(np.sum(shape.on_lattice(4) ** 2) / 4)
    assert whole(signal) == pytest.approx(expected / scale, abs=1e-5)


def test_rails_from_any_half_symbol():
    made = settings(Fraction(1_000_000), "16qam", stagger=True)
    signal = made.build(site_for(made, 20))
    rails = signal.inputs[0]
    ideal = whole(signal.ideal)
    period = np.stack([ideal.real, 1j * ideal.imag], axis=1).ravel() * np.sqrt(2)
    for start, stop in ((0, 80), (1, 80), (3, 4), (4, 5), (7, 20), (-3, 90)):
        got = evaluate({rails: (start, stop)})[rails]
        assert got == pytest.approx(period[np.arange(start, stop) % 80], abs=1e-6)
