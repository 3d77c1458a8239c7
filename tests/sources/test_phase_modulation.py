"""Settings of continuous phase modulation: which keys, which loops, what is refused."""

import dataclasses
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest
import scipy.fft

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.laws.constant import ConstantLaw
from wavegen.meters.seam import seam_figure
from wavegen.recipe.dump import dump
from wavegen.recipe.load import load_text
from wavegen.sources import phase_modulation
from wavegen.sources.data.file import File
from wavegen.sources.data.prbs import PseudoRandom
from wavegen.sources.data.random import Random
from wavegen.sources.phase_modulation import PhaseModulation

RATE = Fraction(2_500_000)
SYMBOL_RATE = Fraction(1_625_000, 6)
ALL = {
    "msk": {},
    "gmsk": {"bt": 0.3},
    "gfsk": {"bt": 0.5, "h": Fraction("0.32")},
    "cpfsk": {"h": Fraction(7, 10), "levels": 4},
    "four_level_fm": {},
    "soqpsk_tg": {},
    "oqpsk_half_sine": {},
}


@dataclass(frozen=True)
class Given:
    """Data from a list, repeated; no random ones."""

    values: tuple[int, ...]

    def period_bits(self, folder=None):
        return len(self.values)

    def bind(self, site, *, n_bits, period, label=""):
        return self

    def words(self, first, count):
        index = np.arange(first, first + count) % len(self.values)
        return np.array(self.values, np.uint8)[index]


def made(scheme, rate=SYMBOL_RATE, **more):
    return PhaseModulation(scheme=scheme, symbol_rate_hz=rate, **{**ALL[scheme], **more})


def site_for(settings, n_cycles=100, rate=RATE):
    cycle = settings.cycle(rate, "signal")
    return Site(
        sample_rate_hz=rate,
        n_samples=cycle.n_samples * n_cycles,
        seed=1,
        label="x",
        path="signal",
    )


@pytest.mark.parametrize(
    ("rate", "differential", "cycle"),
    [
        (SYMBOL_RATE, False, (240, 26)),  # 13 symbols in 120 samples: odd
        (SYMBOL_RATE, True, (480, 52)),
        (Fraction(1_000_000), False, (5, 2)),
        (Fraction(1_000_000), True, (10, 4)),
        (Fraction(625_000), False, (8, 2)),
    ],
)
def test_cycle(rate, differential, cycle):
    found = made("msk", rate, differential=differential).cycle(RATE, "signal")
    assert (found.n_samples, found.n_symbols) == cycle


@pytest.mark.parametrize("scheme", ALL)
def test_every_sample_has_unit_power(scheme):
    settings = made(scheme)
    signal = settings.build(site_for(settings))
    power = np.abs(samples_of(signal).astype(complex)) ** 2
    assert np.max(np.abs(power - 1)) < 3e-7  # both parts rounded to float32
    assert signal.mean_power == 1.0
    assert settings.law(site_for(settings)) == ConstantLaw()


@pytest.mark.parametrize("scheme", ALL)
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_the_loop_closes(scheme, seed):
    settings = made(scheme)
    site = dataclasses.replace(site_for(settings, 1000), seed=seed)
    signal = settings.build(site)
    assert seam_figure(signal, cycle_samples=settings.cycle(RATE, "s").n_samples).is_clean
    index = signal.index
    total = int(signal.symbols.levels(signal.symbols.range(0, signal.symbols.period)).sum())
    assert (index * total / 2).denominator == 1
    near = samples_of(signal, -8, 8).astype(complex)
    steps = np.angle(near[1:] * near[:-1].conj())
    highest = float(settings.symbol_rate_hz / RATE * index * signal.symbols.alphabet[-1]) * np.pi
    # filtered frequencies overshoot: four-level FM by two thirds, SOQPSK by a fifth
    overshoot = {"four_level_fm": 1.7, "soqpsk_tg": 1.2}.get(scheme, 1.0)
    assert np.max(np.abs(steps)) <= highest * overshoot + 1e-6


@pytest.mark.parametrize("rate", [RATE / 16, RATE / 17, RATE * 6007 / 100_003])
@pytest.mark.parametrize("scheme", ["gmsk", "gfsk", "soqpsk_tg", "four_level_fm"])
def test_the_spectrum_of_the_loop_has_no_seam(scheme, rate):
    # the loop's own lines; a jump of 1 rad anywhere lifts them to about -60 dB. Four symbol rates
    # from the middle the smooth schemes are at float32 rounding (-158 dB), SOQPSK at -146 dB (the
    # ends of its window)
    settings = made(scheme, rate)
    cycle = settings.cycle(RATE, "signal").n_samples
    signal = settings.build(site_for(settings, -(-60_000 // cycle)))
    power = np.abs(scipy.fft.fft(samples_of(signal).astype(complex))) ** 2
    f = np.abs(scipy.fft.fftfreq(power.size)) * float(RATE / rate)
    ratio = np.mean(power[f > 4]) / np.mean(power[f < 0.25])
    assert 10 * np.log10(ratio) < -140


def test_a_loop_that_does_not_close_depends_on_where_it_is_cut():
    """What closing is for: the checks on cuts would see an open loop."""
    settings = made("gfsk")
    signal = settings.build(site_for(settings, 1000))
    last = signal.symbols.range(signal.symbols.period - 1, 1)
    opened = dataclasses.replace(signal, symbols=signal.symbols.with_tail(1 - last))
    whole = samples_of(opened)
    assert not np.allclose(samples_of(opened, 50_000, 50_010), whole[50_000:50_010])


@pytest.mark.parametrize("scheme", ["soqpsk_tg", "oqpsk_half_sine"])
def test_offset_forms_need_no_change_of_symbols(scheme):
    site = site_for(made(scheme), 777)
    made(scheme).build(site)
    assert site.notes == []


def test_random_symbols_are_changed_with_a_note():
    settings = made("gfsk")
    site = site_for(settings)
    signal = settings.build(site)
    (note,) = site.notes
    assert (note.kind, note.where) == ("rounded", "signal.data")
    tail = signal.symbols.tail
    assert 0 < tail.size <= 25
    assert f"last {tail.size} symbols were" in note.text
    assert "loop of 2600" in note.text


def test_other_data_are_refused_with_lengths_that_close():
    # 26 symbols: 15 ones, 11 zeros: the levels add up to 4; index 0.32 closes at multiples of 25
    given = Given((1,) * 15 + (0,) * 11)
    settings = made("gfsk", data=given)
    with pytest.raises(RecipeError) as found:
        settings.build(site_for(settings, 1))
    assert found.value.where == "signal.data"
    assert "add up to 4, no multiple of 25" in found.value.problem
    assert "multiples of 650 symbols" in found.value.allowed
    site = site_for(settings, 25)
    settings.build(site)
    assert site.notes == []


@pytest.mark.parametrize(
    ("scheme", "more", "n_symbols"),
    [
        # pn9: 511 bits, 256 ones; two periods for an even length, levels of +-2 then
        ("msk", {}, 4 * 511),
        ("gfsk", {}, 50 * 511),
        ("soqpsk_tg", {}, 2 * 511),
        ("oqpsk_half_sine", {}, 2 * 511),
        # two periods of pn9 hold 511 dibits, of levels -1 in all: eight times to close
        ("four_level_fm", {}, 8 * 511),
    ],
)
def test_cycle_with_whole_periods_of_the_data(scheme, more, n_symbols):
    settings = made(scheme, RATE / 8, data=PseudoRandom(sequence="pn9"), **more)
    cycle = settings.data_cycle(RATE, "signal")
    assert (cycle.n_samples, cycle.n_symbols) == (8 * n_symbols, n_symbols)
    site = dataclasses.replace(site_for(settings, 1), n_samples=cycle.n_samples)
    signal = settings.build(site)
    assert site.notes == []
    first = samples_of(signal, -4, 40)
    assert np.allclose(first[4:], samples_of(signal, 0, 40))


def test_cycle_of_data_too_long_to_read(monkeypatch):
    monkeypatch.setattr(phase_modulation, "MOST_SCANNED", 100)
    settings = made("gfsk", RATE / 8, data=PseudoRandom(sequence="pn9"))
    assert settings.data_cycle(RATE, "signal").n_symbols == 25 * 2 * 511
    offset = made("soqpsk_tg", RATE / 8, data=PseudoRandom(sequence="pn9"))
    assert offset.data_cycle(RATE, "signal").n_symbols == 2 * 511
    assert made("gfsk").data_cycle(RATE, "signal") is None


def test_data_that_cannot_be_read(tmp_path):
    settings = made("msk", data=File(path="nowhere.bin"))
    with pytest.raises(RecipeError) as found:
        settings.data_cycle(RATE, "signal", tmp_path)
    assert found.value.where == "signal.data.path"


def test_given_data_that_close_are_kept():
    settings = made("msk", data=Given((1, 0) * 13))
    signal = settings.build(site_for(settings, 3))
    assert signal.symbols.range(0, 4).tolist() == [1, 0, 1, 0]


@pytest.mark.parametrize(
    ("scheme", "key"),
    [("gmsk", "bt"), ("gfsk", "bt"), ("gfsk", "h"), ("cpfsk", "h")],
)
def test_needed_keys_are_named(scheme, key):
    with pytest.raises(RecipeError) as found:
        made(scheme, **{key: None}).build(site_for(made(scheme)))
    assert found.value.where == f"signal.{key}"
    assert f"Add it, such as {key}:" in found.value.remedy


@pytest.mark.parametrize(
    ("scheme", "more", "reason"),
    [
        ("msk", {"bt": 0.3}, "not filtered"),
        ("msk", {"h": Fraction(1, 2)}, "its index is 1/2"),
        ("msk", {"levels": 2}, "none to choose"),
        ("gmsk", {"h": Fraction(1, 2)}, "its index is 1/2"),
        ("gmsk", {"levels": 4}, "none to choose"),
        ("gfsk", {"differential": True}, "none to choose"),
        ("cpfsk", {"bt": 0.5}, "not filtered"),
        ("four_level_fm", {"levels": 4}, "it has four levels"),
        ("four_level_fm", {"bt": 0.5}, "fixed roll-off"),
        ("soqpsk_tg", {"h": Fraction(1, 2)}, "none to choose"),
        ("oqpsk_half_sine", {"differential": True}, "none to choose"),
    ],
)
def test_keys_of_other_schemes_are_refused(scheme, more, reason):
    with pytest.raises(RecipeError) as found:
        made(scheme, **more).build(site_for(made(scheme)))
    (key,) = more
    assert found.value.where == f"signal.{key}"
    assert reason in found.value.problem


def test_a_band_wider_than_the_sample_rate_is_refused():
    # Carson's rule: (1 + 3 x 7/10) x 1 MHz = 3.1 MHz
    settings = made("cpfsk", Fraction(1_000_000))
    with pytest.raises(RecipeError) as found:
        settings.build(site_for(settings))
    assert found.value.where == "signal.symbol_rate"
    assert "3.1 MHz" in found.value.problem


def test_an_index_of_too_many_states_is_refused():
    settings = made("gfsk", h=Fraction("0.33333333"))
    with pytest.raises(RecipeError) as found:
        settings.build(site_for(settings))
    assert found.value.where == "signal.h"
    assert found.value.remedy == "Write 1/3."


def test_shared_data_are_the_same_and_others_differ():
    first = made("gmsk", data=Random(share="a")).build(site_for(made("gmsk")))
    second = made("gmsk", data=Random(share="b")).build(site_for(made("gmsk")))
    same = made("msk", data=Random(share="a")).build(site_for(made("msk")))
    drawn = [signal.symbols.words.words(0, 2600) & 1 for signal in (first, second, same)]
    assert np.array_equal(drawn[0], drawn[2])
    assert not np.array_equal(drawn[0], drawn[1])


@pytest.mark.parametrize("scheme", ALL)
def test_settings_survive_yaml(scheme):
    settings = made(scheme)
    keys = ", ".join(f"{key}: {value}" for key, value in ALL[scheme].items())
    text = (
        "wavegen: 1\nsample_rate: 2.5 MHz\nduration: 48 ms\n"
        f"signal: {{kind: phase_modulation, scheme: {scheme}, symbol_rate: 1625/6 kHz"
        f"{', ' + keys if keys else ''}}}\n"
    )
    recipe = load_text(text).recipe
    assert recipe.signal == settings
    assert load_text(dump(recipe)).recipe == recipe
