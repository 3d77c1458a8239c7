from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.timespan import TimeSpan
from wavegen.stages.channel.gate import Gate, on_time
from wavegen.stages.channel.resample import Resample


def upstream(bench, ratio, n_in, **fields):
    """White noise at the input rate of a ratio (output over input)."""
    return replace(bench.gaussian(n_in, **fields), sample_rate_hz=bench.rate_hz / ratio)


def resample(bench, ratio, n_in, source=None):
    site = bench.site(int(n_in * ratio))
    settings = Resample(input_rate_hz=bench.rate_hz / ratio)
    return settings.build(site, source or upstream(bench, ratio, n_in)), site


@pytest.mark.parametrize("ratio", [Fraction(3), Fraction(5, 2), Fraction(2, 3), Fraction(1, 4)])
@pytest.mark.parametrize("share", [-0.44, 0.0, 0.1, 0.44])
def test_a_tone_stays_where_it_was(bench, ratio, share):
    n_in = 1200
    n_cycles = round(share * n_in * float(min(ratio, 1)))
    values = np.exp(2j * np.pi * np.arange(n_in) * n_cycles / n_in).astype(np.complex64)
    tone = replace(bench.given(values), sample_rate_hz=bench.rate_hz / ratio)
    signal, site = resample(bench, ratio, n_in, tone)
    n_out = int(n_in * ratio)
    want = np.exp(2j * np.pi * np.arange(n_out) * n_cycles / n_out)
    # 120 dB of the design and a few roundings of float32.
    assert np.abs(samples_of(signal) - want).max() < 2e-6
    assert site.notes == []


def test_zero_strength_is_the_signal_itself(bench):
    source = upstream(bench, Fraction(1), 100)
    assert resample(bench, Fraction(1), 100, source)[0] is source


@pytest.mark.parametrize("ratio", [Fraction(7, 3), Fraction(3, 7)])
def test_form(bench, ratio):
    signal, _ = resample(bench, ratio, 2100)
    assert (signal.sample_rate_hz, signal.n_samples) == (bench.rate_hz, int(2100 * ratio))
    assert signal.mean_power == 1.0
    source = upstream(bench, ratio, 2100, mean_power=None)
    assert resample(bench, ratio, 2100, source)[0].mean_power is None


def test_power_beyond_the_passband_is_warned_of(bench):
    _, site = resample(bench, Fraction(2), 5000)
    (note,) = site.notes
    assert (note.kind, note.where) == ("warning", "stages[0].input_rate")
    assert "225 kHz" in note.text  # 0.9 of half of 500 kHz
    _, site = resample(bench, Fraction(1, 2), 5000)
    assert "450 kHz" in site.notes[0].text  # of half of 1 MHz, the lower rate


@pytest.mark.parametrize(
    ("ratio", "n_samples"), [(Fraction(3, 2), 3), (Fraction(1, 4), 1), (Fraction(125, 96), 125)]
)
def test_cycle_is_whole_at_both_rates(bench, ratio, n_samples):
    settings = Resample(input_rate_hz=bench.rate_hz / ratio)
    assert settings.cycle(bench.rate_hz, "stages[0]").n_samples == n_samples
    assert settings.upstream_rate(bench.rate_hz) == bench.rate_hz / ratio


@pytest.mark.parametrize("ratio", [Fraction(1, 1025), Fraction(1025)])
def test_rates_far_apart_are_refused(bench, ratio):
    with pytest.raises(RecipeError) as caught:
        Resample(input_rate_hz=bench.rate_hz / ratio).cycle(bench.rate_hz, "stages[0]")
    assert caught.value.where == "stages[0].input_rate"


def test_a_source_of_another_rate_or_loop_is_refused(bench):
    settings = Resample(input_rate_hz=Fraction(500_000))
    for source in (bench.gaussian(50), upstream(bench, Fraction(2), 51)):
        with pytest.raises(RecipeError) as caught:
            settings.build(bench.site(100), source)
        assert caught.value.where == "stages[0].input_rate"


def test_a_gate_before_it_is_followed(bench):
    gate = Gate(pattern="10", slot=TimeSpan.parse("50 samples"))
    source = gate.build(bench.site(1000), upstream(bench, Fraction(3, 2), 1000))
    signal, _ = resample(bench, Fraction(3, 2), 1000, source)
    bursts = on_time(signal)
    assert (bursts.period_samples, bursts.runs) == (150, ((0, 75),))
    power = np.abs(samples_of(signal)) ** 2
    is_on = bursts.is_on(0, 1500)
    assert power[is_on].mean() > 5 * power[~is_on].mean()
