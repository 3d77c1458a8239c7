import itertools
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.core.timespan import TimeSpan
from wavegen.sources.noise import Noise
from wavegen.stages.channel.gate import Gate, on_time
from wavegen.stages.crest.clip_filter import ClipFilter
from wavegen.stages.passband import Passband

N = 1 << 16


@pytest.fixture(scope="module")
def source(reduction):
    return reduction.banded(N, (-0.1, 0.1, 0))


def test_one_round_is_a_clip_less_what_falls_outside(reduction, source):
    band = (Passband(low_hz=Fraction(-100_000), high_hz=Fraction(100_000)),)
    settings = ClipFilter(ceiling_db=5.0, rounds=1, passbands=band, transition_hz=Fraction(20_000))
    signal, _ = reduction.build(settings, source)
    x = samples_of(source).astype(np.complex128)
    size = np.abs(x)
    excess = x * np.maximum(1 - signal.amplitude / size, 0)
    taps = np.zeros(N, np.complex128)
    half = signal.band.half_length
    taps[np.arange(-half, half + 1)] = signal.band.taps
    want = x - np.fft.ifft(np.fft.fft(excess) * np.fft.fft(taps))
    assert np.max(np.abs(samples_of(signal) - signal.gain * want)) < 1e-5
    # The ceiling is over the mean of the output, before peaks grow back.
    mean = np.mean(np.abs(want) ** 2)
    assert 10 * np.log10(signal.amplitude**2 / mean) == pytest.approx(5.0, abs=0.002)


def test_rounds_bring_the_peak_down_to_the_ceiling(reduction, source):
    peaks = [
        reduction.papr_db(
            samples_of(reduction.build(ClipFilter(ceiling_db=6.0, rounds=n), source)[0])
        )
        for n in (1, 4, 16)
    ]
    assert all(a > b for a, b in itertools.pairwise(peaks))
    assert peaks[0] > 7.5
    assert 6.0 < peaks[-1] < 6.1


@pytest.mark.parametrize("bands", [[(-0.1, 0.1)], [(-0.2, -0.12), (0.05, 0.15)]])
def test_out_of_band_is_unchanged(reduction, bands):
    source = reduction.banded(N, *((low, high, 0) for low, high in bands))
    signal, _ = reduction.build(ClipFilter(ceiling_db=5.0, rounds=4), source)
    edge = 0.012  # widest edge, and what the band found may be off
    wide = [(low - edge, high + edge) for low, high in bands]
    assert reduction.change_dbc(signal, source, wide) < -100
    assert reduction.change_dbc(signal, source, []) > -40


def test_mean_power_is_kept_and_told(reduction, source):
    signal, notes = reduction.build(ClipFilter(ceiling_db=4.0, rounds=3), source)
    power = np.abs(samples_of(signal).astype(np.complex128)) ** 2
    assert power.mean() == pytest.approx(1, rel=1e-5)
    told = [note for note in notes if note.where == "stages[0].ceiling"]
    (note,) = told
    assert f"{-20 * np.log10(signal.gain):.4f} dB" in note.text
    assert f"{reduction.papr_db(samples_of(signal)):.2f} dB at the peak" in note.text


def test_a_low_peak_is_left(reduction, source):
    ceiling_db = reduction.papr_db(source.samples) + 0.01
    assert reduction.build(ClipFilter(ceiling_db=ceiling_db), source)[0] is source


@pytest.mark.parametrize("duration", [1 << 17, (1 << 22) + (1 << 15)])
def test_of_a_gated_signal_the_ceiling_is_over_the_on_time(duration):
    rate = Fraction(10**6)
    here = Site(sample_rate_hz=rate, n_samples=duration, seed=5, label="x", path="stages[0]")
    noise = Noise(bandwidth_hz=rate / 5).build(here)
    gate = Gate(
        duty_percent=Fraction(25),
        period=TimeSpan.parse("32768 samples"),
        ramp=TimeSpan.parse("64 samples"),
    )
    gated = gate.build(here, noise)
    signal = ClipFilter(ceiling_db=5.0, rounds=4).build(here, gated)
    bursts = on_time(signal)
    is_on = bursts.is_on(0, duration)
    power = np.abs(samples_of(signal).astype(np.complex128)[is_on]) ** 2
    before = np.abs(samples_of(gated).astype(np.complex128)[is_on]) ** 2
    clip_power = (signal.amplitude * signal.gain) ** 2
    assert 10 * np.log10(clip_power / power.mean()) == pytest.approx(5.0, abs=0.03)
    assert power.mean() == pytest.approx(before.mean(), rel=0.005)
    assert power.max() > clip_power  # four rounds let peaks grow back


def test_a_signal_of_zeros_is_refused(bench):
    with pytest.raises(RecipeError) as caught:
        ClipFilter(ceiling_db=5.0).build(bench.site(4), bench.given([0, 0, 0, 0]))
    assert caught.value.where == "stages[0].ceiling"
