import dataclasses
import math
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError, SignalError
from wavegen.core.render import samples_of
from wavegen.core.timespan import TimeSpan
from wavegen.sources.noise import Noise
from wavegen.stages.channel.gate import Gate, on_time
from wavegen.stages.device.modified_rapp import ModifiedRapp
from wavegen.stages.device.rapp import RappCurve
from wavegen.stages.drive import Amplified, below, drive

CURVE = RappCurve(name="Rapp", saturation=1.0, smoothness=2.0)


def build(bench, source, amplifier=CURVE, rms=0.5):
    site = bench.site(source.n_samples)
    return drive(site, source, amplifier, rms, told="as asked"), site.notes


class TestDrive:
    def test_samples_follow_the_curve_at_the_mean_they_had(self, bench):
        source = bench.gaussian(60_000)
        signal, _ = build(bench, source)
        x = samples_of(source).astype(np.complex128)
        drive_factor = 0.5 / np.sqrt(np.mean(np.abs(x) ** 2))
        want = x * (1 + np.abs(drive_factor * x) ** 4) ** -0.25
        want *= np.sqrt(np.mean(np.abs(x) ** 2) / np.mean(np.abs(want) ** 2))
        # Float32 on both sides; the pilot's powers are float32 too.
        np.testing.assert_allclose(samples_of(signal), want, rtol=1e-6, atol=1e-7)
        assert signal.mean_power == source.mean_power

    def test_level_of_the_source_does_not_matter(self, bench):
        values = [0.5, 1.5j, -1.0, 0.2]
        one, _ = build(bench, bench.given(values))
        two, _ = build(bench, bench.given([64 * value for value in values]))
        np.testing.assert_allclose(samples_of(two), 64 * samples_of(one), rtol=1e-6)

    def test_what_was_done_is_told(self, bench):
        values = np.exp(2j * np.pi * np.arange(8) / 8) * 3  # a carrier: everything in closed form
        _, notes = build(bench, bench.given(values.tolist()), rms=1.0)
        text = notes[0].text
        assert "0.000 dB below its saturation" in text
        assert "1.165 dB above its 1 dB compression point" in text
        assert f"mean output power {10 * math.log10(2) / 2:.3f} dB below its highest" in text
        assert f"{-10 * math.log10(2) / 2:.4f} dB, is undone" in text
        assert "fitted error 0.00 %" in text

    def test_folded_distortion_is_a_warning_where_it_is_much(self, bench):
        wide = Noise(bandwidth_hz=Fraction(600_000)).build(bench.site(1 << 16))
        narrow = Noise(bandwidth_hz=Fraction(60_000)).build(bench.site(1 << 16))
        assert [note.kind for note in build(bench, wide)[1]] == ["info", "warning"]
        assert [note.kind for note in build(bench, narrow)[1]] == ["info", "info"]

    def test_linear_drive_is_the_source_itself(self, bench):
        source = bench.gaussian(1000)
        assert build(bench, source, rms=1e-6)[0] is source

    def test_silence_is_refused(self, bench):
        with pytest.raises(RecipeError):
            build(bench, bench.given([0, 0, 0]))

    def test_of_a_gated_signal_the_on_time_counts(self, bench):
        gate = Gate(duty_percent=Fraction(25), period=TimeSpan.parse("400 samples"))
        source = bench.gaussian(80_000)
        gated = gate.build(bench.site(80_000), source)
        signal, notes = build(bench, gated)
        is_on = on_time(signal).is_on(0, 80_000)
        x, y = samples_of(gated)[is_on], samples_of(signal)[is_on]
        assert np.mean(np.abs(y) ** 2) == pytest.approx(np.mean(np.abs(x) ** 2), rel=1e-6)
        assert signal.drive == pytest.approx(0.5 / np.sqrt(np.mean(np.abs(x) ** 2)), rel=1e-6)
        assert "while it is on" in notes[0].text

    def test_beyond_the_largest_input_nothing_is_made(self, bench):
        short = dataclasses.replace(CURVE, largest=1.0)
        source = bench.gaussian(10_000)
        with pytest.raises(RecipeError) as caught:
            build(bench, source, short)
        peak_db = 10 * math.log10(np.max(np.abs(samples_of(source)) ** 2))
        over_db = float(caught.value.problem.split(" peaks ")[1].split()[0])
        assert over_db == pytest.approx(peak_db + 20 * math.log10(0.5), abs=0.1)  # own mean: 1 %
        made = Amplified(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            amplifier=short,
            drive=0.5,
            scale=1.0,
            where="stages[0]",
        )
        with pytest.raises(SignalError) as seen:
            samples_of(made)
        assert seen.value.where == "stages[0]"


def test_words():
    assert below(2.0) == "6.021 dB below"
    assert below(0.5) == "6.021 dB above"


def test_phase_turns_with_the_amplitude(bench):
    """Two amplitudes: the angle between them is that of the curve."""
    settings = ModifiedRapp(input_back_off_db=0.0)
    source = bench.given([1.0, 0.5])
    signal = settings.build(bench.site(2), source)
    first, second = samples_of(signal).astype(np.complex128)
    amplifier = settings.amplifier()
    gains = amplifier.gain(signal.drive * np.array([1.0, 0.5]))
    assert np.angle(first / second) == pytest.approx(np.angle(gains[0] / gains[1]), abs=1e-6)
    assert abs(np.angle(first / second)) > 0.01
