from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.timespan import TimeSpan
from wavegen.stages.channel.delay import Delay
from wavegen.stages.channel.gate import Gate, on_time


def delay(text):
    return Delay(delay=TimeSpan.parse(text))


def tone(bench, n, n_cycles, **fields):
    turn = np.exp(2j * np.pi * (np.arange(n) * n_cycles % n) / n)
    return bench.given(turn.astype(np.complex64), **fields)


@pytest.mark.parametrize("samples", [1, 7, -3, 999, 1000, 1001, -2500, 10**12])
def test_whole_samples_are_exact(bench, samples):
    source = bench.gaussian(1000)
    got = samples_of(delay(f"{samples} samples").build(bench.site(1000), source))
    assert got.tobytes() == np.roll(samples_of(source), samples % 1000).tobytes()


def test_a_time_is_counted_at_the_rate_of_the_signal(bench):
    source = bench.gaussian(100)  # 1 MHz
    got = samples_of(delay("-3 us").build(bench.site(100), source))
    assert got.tobytes() == np.roll(samples_of(source), -3).tobytes()


@pytest.mark.parametrize("text", ["0 s", "0 samples", "100 us", "-300 samples"])
def test_no_delay_is_no_stage(bench, text):
    source = bench.gaussian(100)
    assert delay(text).build(bench.site(100), source) is source


@pytest.mark.parametrize("n_cycles", [-449, -100, 0, 1, 333, 449])
@pytest.mark.parametrize("samples", ["1/3", "-0.25", "12.5", "-700.9"])
def test_a_tone_turns_by_its_phase(bench, n_cycles, samples):
    n = 1000
    signal = delay(f"{samples} samples").build(bench.site(n), tone(bench, n, n_cycles))
    place = np.arange(n) - float(Fraction(samples))
    want = np.exp(2j * np.pi * n_cycles * place / n)
    # 120 dB of the design and a few roundings of float32.
    assert np.abs(samples_of(signal) - want).max() < 2e-6


def test_two_delays_add(bench):
    n = 5000
    site, source = bench.site(n), tone(bench, n, 1777)
    twice = delay("0.7 samples").build(site, delay("1.65 samples").build(site, source))
    once = delay("2.35 samples").build(site, source)
    assert np.abs(samples_of(twice) - samples_of(once)).max() < 4e-6
    back = delay("-0.3 us").build(site, delay("0.3 us").build(site, source))
    assert np.abs(samples_of(back) - samples_of(source)).max() < 4e-6


def test_power_beyond_the_passband_is_warned_of(bench):
    site = bench.site(1000)
    delay("0.5 samples").build(site, tone(bench, 1000, 449))
    delay("5 samples").build(site, tone(bench, 1000, 470))
    assert site.notes == []
    delay("0.5 samples").build(site, tone(bench, 1000, -470))
    (note,) = site.notes
    assert (note.kind, note.where) == ("warning", "stages[0].delay")
    assert "450 kHz" in note.text


@pytest.mark.parametrize("power", [None, 0.25])
@pytest.mark.parametrize("text", ["1 sample", "0.5 samples"])
def test_mean_power_stays(bench, power, text):
    source = bench.gaussian(50, mean_power=power)
    assert delay(text).build(bench.site(50), source).mean_power == power


@pytest.mark.parametrize("text", ["3 samples", "-2.4 samples"])
def test_a_gate_before_it_is_followed(bench, text):
    gate = Gate(pattern="100", slot=TimeSpan.parse("20 samples"), ramp=TimeSpan.parse("2 samples"))
    site = bench.site(600)
    gated = gate.build(site, bench.gaussian(600))
    moved = delay(text).build(site, gated)
    bursts = on_time(moved)
    assert bursts == gated.gate.delayed(TimeSpan.parse(text).value)
    assert bursts.starts(60)[0][0] == int(np.floor(TimeSpan.parse(text).value)) % 60
