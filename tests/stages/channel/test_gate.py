from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.timespan import TimeSpan
from wavegen.core.units import QuantityError
from wavegen.recipe.dump import dump
from wavegen.recipe.load import load_text
from wavegen.stages.channel.gate import Gate, Gated, on_time
from wavegen.stages.channel.scale import Scale
from wavegen.stages.combine.sum import Part, Sum

HEAD = "wavegen: 1\nsample_rate: 1 MHz\nduration: 1 ms\nsignal: {kind: carrier}\nstages:\n  - "


def gate(**fields):
    for key in ("slot", "period", "ramp"):
        if key in fields:
            fields[key] = TimeSpan.parse(fields[key])
    return Gate(**fields)


def quarter(**fields):
    return gate(duty_percent=Fraction(25), period="100 us", **fields)


class TestBuild:
    def test_duty(self, bench):
        source = bench.gaussian(400)
        got = samples_of(quarter().build(bench.site(400), source))
        want = samples_of(source) * (np.arange(400) % 100 < 25)
        assert got.tolist() == want.tolist()

    def test_pattern(self, bench):
        source = bench.gaussian(300)
        got = samples_of(gate(pattern="1101", slot="25 us").build(bench.site(300), source))
        want = samples_of(source) * (np.arange(300) % 100 // 25 != 2)
        assert got.tolist() == want.tolist()

    def test_ramps_lie_inside_the_on_time(self, bench):
        source = bench.given([1], 100)
        got = samples_of(quarter(ramp="4 us").build(bench.site(100), source))
        ramp = np.sin(np.pi * (np.arange(4) + 0.5) / 8) ** 2
        want = [*ramp, *np.ones(17), *ramp[::-1], *np.zeros(75)]
        np.testing.assert_allclose(got, want, rtol=1e-7, atol=0)

    @pytest.mark.parametrize("fields", [{}, {"ramp": "1 sample"}, {"ramp": "11 samples"}])
    def test_mean_power_is_exact(self, bench, fields):
        signal = quarter(**fields).build(bench.site(400), bench.given([1], 400))
        mean = np.mean(np.abs(samples_of(signal).astype(np.complex128)) ** 2)
        assert signal.mean_power == pytest.approx(mean, rel=1e-6)  # float32 ramps
        double = quarter(**fields).build(bench.site(400), bench.given([1], 400, mean_power=2.0))
        assert double.mean_power == pytest.approx(2 * signal.mean_power, rel=1e-15)

    def test_closed_form_of_the_mean(self, bench):
        signal = quarter(ramp="8 us").build(bench.site(100), bench.given([1], 100))
        assert signal.mean_power == pytest.approx((25 - 16 + 2 * 8 * 3 / 8) / 100, rel=1e-14)

    @pytest.mark.parametrize(
        "settings",
        [
            gate(duty_percent=Fraction(100), period="7 samples", ramp="2 samples"),
            gate(pattern="111", slot="1 sample"),
        ],
    )
    def test_always_on_is_no_stage(self, bench, settings):
        source = bench.gaussian(21)
        assert settings.build(bench.site(21), source) is source

    def test_markers(self, bench):
        signal = gate(pattern="1001", slot="5 us", ramp="1 us").build(
            bench.site(40), bench.gaussian(40)
        )
        assert signal.bursts(40) == [(15, 10), (35, 10)]
        assert np.flatnonzero(signal.is_on(0, 20)).tolist() == [0, 1, 2, 3, 16, 17, 18, 19]

    @pytest.mark.parametrize(
        ("fields", "key", "asked", "given"),
        [
            ({"duty_percent": Fraction(100, 3)}, "duty", "33.33333333 µs", "33 µs"),
            ({"duty_percent": Fraction(50), "ramp": "2.2 us"}, "ramp", "2.2 µs", "2 µs"),
        ],
    )
    def test_what_is_rounded_is_told(self, bench, fields, key, asked, given):
        site = bench.site(100)
        gate(period="100 us", **fields).build(site, bench.gaussian(100))
        (note,) = site.notes
        assert (note.kind, note.where) == ("rounded", f"stages[0].{key}")
        assert (note.asked, note.given) == (asked, given)


class TestRefusals:
    @pytest.mark.parametrize(
        ("settings", "key"),
        [
            (gate(pattern="10", slot="1.5 us"), "slot"),
            (gate(duty_percent=Fraction(50), period="1/3 us"), "period"),
        ],
    )
    def test_no_whole_samples(self, bench, settings, key):
        with pytest.raises(RecipeError) as caught:
            settings.cycle(bench.rate_hz, "stages[0]")
        assert caught.value.where == f"stages[0].{key}"

    @pytest.mark.parametrize(
        ("settings", "key"),
        [
            (quarter(), "period"),
            (gate(pattern="10", slot="1 us"), "slot"),
            (gate(duty_percent=Fraction(1, 1000), period="125 samples"), "duty"),
            (gate(duty_percent=Fraction(8), period="125 samples", ramp="5 us"), "ramp"),
            (gate(pattern="10000", slot="25 us", ramp="13 us"), "ramp"),
        ],
    )
    def test_what_does_not_fit_the_loop(self, bench, settings, key):
        with pytest.raises(RecipeError) as caught:
            settings.build(bench.site(125), bench.gaussian(125))
        assert caught.value.where == f"stages[0].{key}"

    @pytest.mark.parametrize(
        ("fields", "key"),
        [
            ({}, ""),
            ({"pattern": "10"}, ""),
            ({"slot": "1 us"}, ""),
            ({"duty_percent": Fraction(50)}, ""),
            ({"pattern": "10", "slot": "1 us", "period": "1 us"}, ""),
            ({"pattern": "10", "period": "1 us"}, ""),
            ({"pattern": "102", "slot": "1 us"}, "pattern"),
            ({"pattern": "000", "slot": "1 us"}, "pattern"),
            ({"pattern": "10", "slot": "0 us"}, "slot"),
            ({"duty_percent": Fraction(50), "period": "-1 us"}, "period"),
            ({"pattern": "10", "slot": "1 us", "ramp": "-1 us"}, "ramp"),
        ],
    )
    def test_settings_that_say_nothing(self, fields, key):
        with pytest.raises(QuantityError) as caught:
            gate(**fields)
        assert caught.value.key == key

    @pytest.mark.parametrize("stage", ["duty: 0 %, period: 1 us", "duty: 101 %, period: 1 us"])
    def test_bounds(self, stage):
        with pytest.raises(RecipeError) as caught:
            load_text(f"{HEAD}{{kind: gate, {stage}}}\n")
        assert "duty" in str(caught.value)


def test_cycle_is_the_period(bench):
    assert quarter().cycle(bench.rate_hz, "stages[0]").n_samples == 100
    assert gate(pattern="1101", slot="2 ms").cycle(bench.rate_hz, "x").n_samples == 8000


class TestOnTime:
    def test_stages_after_the_gate_keep_it(self, bench):
        site = bench.site(100)
        gated = quarter().build(site, bench.gaussian(100))
        assert on_time(Scale(gain_db=-3.0).build(site, gated)) is gated.gate
        shifted = Sum(parts=(Part(signal=None, frequency_offset_hz=Fraction(10_000)),))
        assert on_time(shifted.combine(site, [gated])) is gated.gate

    def test_the_outermost_gate_counts(self, bench):
        site = bench.site(200)
        inner = quarter().build(site, bench.gaussian(200))
        outer = gate(pattern="10", slot="100 us").build(site, inner)
        assert on_time(outer) == outer.gate != inner.gate
        assert outer.mean_power == pytest.approx(0.125)

    def test_a_gate_of_one_part_is_none_of_the_sum(self, bench):
        site = bench.site(100)
        parts = Sum(parts=(Part(signal=None), Part(signal=None)))
        gated = quarter().build(site, bench.gaussian(100))
        assert on_time(parts.combine(site, [gated, bench.gaussian(100)])) is None
        assert on_time(bench.gaussian(100)) is None
        assert isinstance(gated, Gated)


@pytest.mark.parametrize(
    "stage",
    [
        '{kind: gate, pattern: "1101", slot: 0.5 ms, ramp: 2 us}',
        "{kind: gate, duty: 12.5 %, period: 614400 samples}",
        "{kind: gate, duty: 100/3 %, period: 1/3 ms, ramp: 16 samples}",
    ],
)
def test_settings_come_back_from_yaml(stage):
    recipe = load_text(HEAD + stage + "\n").recipe
    assert load_text(dump(recipe)).recipe == recipe
    assert isinstance(recipe.stages[0], Gate)


def test_a_pattern_must_be_in_quotes():
    with pytest.raises(RecipeError, match="quotes"):
        load_text(HEAD + "{kind: gate, pattern: 1101, slot: 1 ms}\n")
