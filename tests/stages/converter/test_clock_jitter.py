from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.stages.channel.gate import on_time
from wavegen.stages.converter.clock_jitter import ClockJitter

N = 20_000


def tone(bench, line):
    return bench.given(np.exp(2j * np.pi * line * np.arange(N) / N).tolist())


@pytest.mark.parametrize(("line", "centre"), [(4000, 0), (-9000, 0), (2000, 300_000)])
def test_a_tone_is_taken_at_times_that_scatter(bench, line, centre):
    """Its phase is 2 pi (f + centre) tau: from that tau is read back, and taken again."""
    settings = ClockJitter(rms_s=2e-8, centre_hz=Fraction(centre))
    site = bench.site(N)
    signal = settings.build(site, tone(bench, line))
    ratio = samples_of(signal) / samples_of(tone(bench, line))
    frequency = line / N * 1e6 + centre
    late_s = np.angle(ratio.astype(np.complex128)) / (2 * np.pi * frequency)
    assert np.std(late_s) == pytest.approx(2e-8, rel=4 / np.sqrt(2 * N))
    assert abs(np.corrcoef(late_s[1:], late_s[:-1])[0, 1]) < 4 / np.sqrt(N)
    # The third order that is left out turns the tone by less than (2 pi f tau)^3 / 6.
    most = 2 * np.pi * abs(line / N * 1e6) * np.abs(late_s).max()
    assert np.abs(np.abs(ratio) - 1).max() < most**4 / 8 + 1e-5


def test_two_tones_feel_the_same_clock(bench):
    settings = ClockJitter(rms_s=1e-8)
    phases = []
    for line in (2000, 4000):
        ratio = samples_of(settings.build(bench.site(N), tone(bench, line)))
        ratio = ratio / samples_of(tone(bench, line))
        phases.append(np.angle(ratio.astype(np.complex128)))
    np.testing.assert_allclose(phases[1], 2 * phases[0], atol=2e-5)


def test_too_much_is_refused(bench):
    ClockJitter(rms_s=3.1e-8).build(bench.site(N), bench.gaussian(N))
    for settings in (
        ClockJitter(rms_s=3.2e-8),
        ClockJitter(rms_s=2e-10, centre_hz=Fraction(10**9)),
    ):
        with pytest.raises(RecipeError) as caught:
            settings.build(bench.site(N), bench.gaussian(N))
        assert caught.value.where == "stages[0].rms"


def test_what_is_told(bench):
    site = bench.site(N)
    ClockJitter(rms_s=1e-9, centre_hz=Fraction(10**6)).build(site, tone(bench, 9500))
    assert [note.kind for note in site.notes] == ["info", "warning"]
    assert "44.04 dB below a tone at 1 MHz" in site.notes[0].text


def test_it_keeps_time_with_a_gate(bench):
    signal = ClockJitter(rms_s=1e-9).build(bench.site(N), bench.gaussian(N))
    assert on_time(signal) is None
    assert signal.acts_on is signal.inputs[0]
