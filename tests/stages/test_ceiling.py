import math

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.stages.ceiling import (
    PILOT_SAMPLES,
    TRIAL_SAMPLES,
    find_amplitude,
    look,
    pilot_power,
    reduce_to,
)
from wavegen.stages.crest.clip import Clipped, find_clip_level


def clipper(source):
    def process(amplitude, gain):
        return Clipped(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=source.n_samples,
            inputs=(source,),
            mean_power=None,
            amplitude=amplitude,
            gain=gain,
            origin="test",
        )

    return process


@pytest.mark.parametrize("ceiling_db", [0.5, 3.0, 6.0, 9.0])
def test_the_amplitude_is_the_one_that_a_clip_finds(bench, ceiling_db):
    source = bench.gaussian(100_000)
    pilot = look(source, oversampling=4.0, halo=0)
    found = find_amplitude(pilot, ceiling_db, clipper(source))
    want = find_clip_level(list(pilot_power(source, None)), 10 ** (ceiling_db / 10))
    assert found.amplitude**2 == pytest.approx(want.power, rel=5e-4 / (1 - want.share_clipped))
    assert found.gain**-2 == pytest.approx(want.output_mean / want.input_mean, rel=1e-3)
    assert found.trial.peak_db == pytest.approx(ceiling_db, abs=0.002)


def test_a_trial_tells_error_and_peaks(bench):
    source = bench.gaussian(50_000)
    pilot = look(source, oversampling=4.0, halo=0)
    made = clipper(source)(1.5, 1.0)
    trial = pilot.try_out(made, peaks=True)
    x, y = (samples_of(each).astype(np.complex128) for each in (source, made))
    gain = np.vdot(x, y) / np.vdot(x, x)
    error = np.sqrt(np.mean(np.abs(y / gain - x) ** 2) / np.mean(np.abs(x) ** 2))
    power = np.abs(y) ** 2
    assert trial.error_fraction == pytest.approx(error, rel=1e-6)
    assert trial.mean_ratio == pytest.approx(power.mean() / np.mean(np.abs(x) ** 2), rel=1e-6)
    assert trial.peak_db == pytest.approx(10 * math.log10(power.max() / power.mean()), abs=1e-5)
    assert trial.between_db >= trial.peak_db


def test_the_peak_between_samples_of_two_tones_at_the_edges(reduction):
    """At 4 times the band the largest sample can stand 0.6877 dB low: 1 / cos(pi / 8)."""
    n = 4_096
    turn = 2 * np.pi * (np.arange(n) + 0.5) / 8
    source = reduction.held(np.cos(turn))
    pilot = look(source, oversampling=4.0, halo=0)
    trial = pilot.try_out(source, peaks=True)
    assert trial.between_db - trial.peak_db == pytest.approx(0.6877, abs=1e-3)


def test_long_loops_are_read_in_stretches(bench):
    source = bench.gaussian(PILOT_SAMPLES + 1)
    pilot = look(source, oversampling=4.0, halo=20_000)
    lengths = {stop - start for start, stop in pilot.stretches}
    assert lengths == {40_000}
    assert not pilot.is_seen_whole
    assert sum(stop - start for start, stop in pilot.stretches) <= TRIAL_SAMPLES
    assert "stretches" in pilot.origin
    assert pilot.mean == pytest.approx(1, rel=0.01)


def test_nothing_to_do_and_nothing_to_do_it_with(bench):
    here = Site(sample_rate_hz=bench.rate_hz, n_samples=4, seed=1, label="x", path="stages[0]")
    source = bench.given([1, 2, 1, 2])
    pilot = look(source, oversampling=1.0, halo=0)
    assert reduce_to(here, pilot, 3.0, clipper(source), "clips") is None
    assert "2.041 dB" in here.notes[0].text
    assert look(bench.given([0, 0]), oversampling=1.0, halo=0) is None
    with pytest.raises(RecipeError) as caught:
        reduce_to(here, None, 3.0, clipper(source), "clips")
    assert caught.value.where == "stages[0].ceiling"


def test_a_ceiling_that_no_amplitude_gives_is_refused(bench):
    """On for one sample in four: the mean lies 6.02 dB under the lowest envelope there is."""
    source = bench.given([1, 0, 0, 0, 2, 0, 0, 0])
    pilot = look(source, oversampling=1.0, halo=0)
    with pytest.raises(RecipeError) as caught:
        reduce_to(bench.site(8), pilot, 5.5, clipper(source), "clips")
    assert caught.value.where == "stages[0].ceiling"
    assert find_amplitude(pilot, 6.5, clipper(source)) is not None
