import math
import re
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.core.timespan import TimeSpan
from wavegen.sources.noise import Noise
from wavegen.stages.channel.gate import Gate, on_time
from wavegen.stages.crest.clip import (
    PILOT_SAMPLES,
    Clip,
    Clipped,
    find_clip_level,
)


class Spike(Signal):
    """One everywhere, twenty at one sample."""

    def __init__(self, *, at, **loop):
        super().__init__(**loop)
        object.__setattr__(self, "at", at)

    def compute(self, start, stop, *arrays):
        samples = np.ones(stop - start, np.complex64)
        samples[np.arange(start, stop) == self.at] = 20
        return samples


def build(bench, source, ceiling_db):
    site = bench.site(source.n_samples)
    return Clip(ceiling_db=ceiling_db).build(site, source), site.notes


def power_of(samples):
    return samples.real.astype(np.float64) ** 2 + samples.imag.astype(np.float64) ** 2


class TestCeiling:
    @pytest.mark.parametrize("ceiling_db", [0.1, 1.0, 3.0, 6.0, 9.0])
    def test_is_met_exactly_where_the_whole_period_is_read(self, bench, ceiling_db):
        source = bench.gaussian(100_003)
        signal, _ = build(bench, source, ceiling_db)
        power = power_of(samples_of(signal))
        # The solver stops at 1e-7, and five float32 roundings lie above.
        assert 10 * math.log10(power.max() / power.mean()) == pytest.approx(ceiling_db, abs=1e-5)

    @pytest.mark.parametrize("ceiling_db", [0.1, 3.0, 9.0])
    def test_no_sample_passes_it(self, bench, ceiling_db):
        signal, _ = build(bench, bench.gaussian(300_000), ceiling_db)
        highest = power_of(samples_of(signal)).max()
        assert highest <= (signal.amplitude * signal.gain) ** 2 * (1 + 1e-6)

    def test_is_met_closely_where_stretches_are_read(self, bench):
        pattern = samples_of(bench.gaussian(4_999)).tolist()
        source = bench.given(pattern, PILOT_SAMPLES + 1_000_003)
        signal, notes = build(bench, source, 6.0)
        power = power_of(samples_of(signal))
        assert 10 * math.log10(power.max() / power.mean()) == pytest.approx(6.0, abs=0.03)
        assert signal.origin == "64 stretches of 65536 samples"
        assert "64 stretches of 65536 samples" in notes[0].text

    def test_a_peak_that_no_stretch_shows_is_still_clipped(self, bench):
        source = Spike(sample_rate_hz=bench.rate_hz, n_samples=1 << 30, at=70_000)
        signal, notes = build(bench, source, 12.0)
        power = power_of(samples_of(signal, 69_990, 70_010))
        assert power.max() == pytest.approx(10**1.2, rel=1e-6)
        assert "0.000% of the samples" in notes[0].text

    def test_the_same_twice(self, bench):
        first, _ = build(bench, bench.gaussian(50_000), 5.0)
        second, _ = build(bench, bench.gaussian(50_000), 5.0)
        assert (first.amplitude, first.gain) == (second.amplitude, second.gain)


class TestMean:
    @pytest.mark.parametrize("ceiling_db", [0.5, 4.0, 8.0])
    @pytest.mark.parametrize("scale", [1e-3, 1.0, 1e3])
    def test_is_what_it_was(self, bench, ceiling_db, scale):
        values = samples_of(bench.gaussian(5000)) * scale
        source = bench.given(values.tolist(), mean_power=scale**2)
        signal, _ = build(bench, source, ceiling_db)
        before, after = power_of(samples_of(source)).mean(), power_of(samples_of(signal)).mean()
        assert after == pytest.approx(before, rel=1e-6)
        assert signal.mean_power == scale**2

    def test_unknown_stays_unknown(self, bench):
        signal, _ = build(bench, bench.gaussian(5000, mean_power=None), 3.0)
        assert signal.mean_power is None


class TestSamples:
    def test_phase_is_kept_and_zero_stays_zero(self, bench):
        values = [3 + 4j, -3 + 4j, 0, -0.3j, 1, 1, 1, 1]
        source = bench.given(values)
        signal, _ = build(bench, source, 3.0)
        got = samples_of(signal)
        assert isinstance(signal, Clipped)
        assert got[2] == 0
        turned = got[[0, 1, 3, 4]] * np.conj(np.array(values)[[0, 1, 3, 4]])
        assert np.abs(np.angle(turned)).max() < 2e-7
        assert np.all(np.isfinite(got))

    def test_what_is_below_is_only_scaled(self, bench):
        source = bench.gaussian(20_000)
        signal, _ = build(bench, source, 6.0)
        before, after = samples_of(source), samples_of(signal)
        below = power_of(before) < signal.amplitude**2 * (1 - 1e-6)
        assert np.all(after[below] == before[below] * np.float32(signal.gain))
        assert 0.95 < below.mean() < 1

    def test_same_bits_for_any_cut(self, bench):
        signal, _ = build(bench, bench.gaussian(50_000), 4.0)
        whole = samples_of(signal)
        for start, stop in ((0, 1), (16_383, 16_385), (-40_000, 70_001), (49_999, 50_000)):
            want = whole.take(np.arange(start, stop), mode="wrap")
            assert samples_of(signal, start, stop).tobytes() == want.tobytes()

    def test_the_input_is_left_alone(self, bench):
        source = bench.given([1, 2j, 3, -4])  # hands out read-only arrays
        signal, _ = build(bench, source, 1.0)
        assert samples_of(signal).size == 4


class TestNotes:
    def test_ratio_change_and_share_are_told(self, bench):
        signal, notes = build(bench, bench.gaussian(100_000), 6.0)
        (note,) = notes
        power = power_of(samples_of(bench.gaussian(100_000)))
        ratio_db = 10 * math.log10(signal.amplitude**2 / power.mean())
        change_db = -20 * math.log10(signal.gain)
        share = np.mean(power > signal.amplitude**2)
        assert (note.kind, note.where) == ("info", "stages[0].ceiling")
        for figure in (f"{ratio_db:.3f} dB", f"{change_db:.4f} dB", f"{share:.3%}"):
            assert figure in note.text
        assert signal.origin == "the whole period"

    def test_a_ceiling_out_of_reach_is_no_stage(self, bench):
        source = bench.given([1, 2])  # 4 over 2.5: 2.041 dB
        signal, notes = build(bench, source, 2.1)
        assert signal is source
        assert notes[0].kind == "info"
        assert "2.041 dB" in notes[0].text
        assert build(bench, source, 2.0)[0] is not source


class TestRefusals:
    def test_a_signal_of_zeros(self, bench):
        with pytest.raises(RecipeError) as caught:
            build(bench, bench.given([0, 0]), 3.0)
        assert caught.value.where == "stages[0].ceiling"

    def test_zeros_for_so_long_that_the_rest_stands_higher(self, bench):
        # On for one sample in four: the mean lies 6.02 dB under the lowest envelope there is.
        quarter = bench.given([1, 0, 0, 0, 2, 0, 0, 0])
        with pytest.raises(RecipeError) as caught:
            build(bench, quarter, 6.0)
        assert caught.value.where == "stages[0].ceiling"
        assert "6.02 dB" in caught.value.allowed
        power = power_of(samples_of(build(bench, quarter, 6.1)[0]))
        assert 10 * math.log10(power.max() / power.mean()) == pytest.approx(6.1, abs=1e-5)


class TestSolver:
    def test_two_levels_by_hand(self):
        # p is 1 or 9, equally often; a ceiling of 1.5 over E[min(p, a)] = (1 + a) / 2 gives
        # a = 0.75 (1 + a) = 3.
        level = find_clip_level([np.array([1, 9], np.float32)], 1.5)
        assert level.power == pytest.approx(3, rel=1e-6)
        assert level.output_mean == pytest.approx(2, rel=1e-6)
        assert (level.input_mean, level.share_clipped) == (5, 0.5)

    def test_pieces_count_by_their_length(self):
        pieces = [np.array([1], np.float32), np.array([9, 9, 9], np.float32)]
        # a = 1.25 (1 + 3 a) / 4  ->  a = 5.
        assert find_clip_level(pieces, 1.25).power == pytest.approx(5, rel=1e-6)

    def test_nothing_gives_less_than_the_lowest_envelope(self):
        assert find_clip_level([np.array([1, 0], np.float32)], 1.99) is None


@pytest.mark.parametrize("duration", [1 << 18, 3 << 21])
def test_of_a_gated_signal_the_ceiling_is_over_the_on_time(duration):
    rate = Fraction(10**6)
    here = Site(sample_rate_hz=rate, n_samples=duration, seed=5, label="signal", path="signal")
    noise = Noise(bandwidth_hz=rate / 4).build(here)
    period = TimeSpan.parse("65536 samples")
    gated = Gate(duty_percent=Fraction(25), period=period, ramp=TimeSpan.parse("64 samples")).build(
        here, noise
    )
    clipped = Clip(ceiling_db=5.0).build(here, gated)
    bursts = on_time(clipped)
    assert bursts is not None
    power = np.abs(samples_of(clipped)) ** 2
    on = power[bursts.is_on(0, duration)]
    assert 10 * np.log10(on.max() / on.mean()) == pytest.approx(5.0, abs=0.03)
    before = np.abs(samples_of(gated))[bursts.is_on(0, duration)] ** 2
    assert on.mean() == pytest.approx(before.mean(), rel=0.01)
    assert not power[20_000:60_000].any()


def test_the_error_told_is_that_of_the_waveform_beside_the_gaussian_one(bench):
    """2e5 samples: the clips of 2 % of them are counted to 2 %, their error to half of that."""
    source, site = bench.gaussian(200_000), bench.site(200_000)
    signal = Clip(ceiling_db=6.0).build(site, source)
    x, y = (samples_of(each).astype(np.complex128) for each in (source, signal))
    gain = np.vdot(x, y) / np.vdot(x, x)
    error = 100 * np.sqrt(np.mean(np.abs(y / gain - x) ** 2) / np.mean(np.abs(x) ** 2))
    text = site.notes[-1].text
    told, gaussian = map(float, re.findall(r"([0-9.]+) %", text)[-2:])
    assert told == pytest.approx(error, abs=0.006)
    assert told == pytest.approx(gaussian, rel=0.03)
