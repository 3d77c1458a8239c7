"""Gating: what duty does to mean and crest factor, and what a burst's own statistics are.

Elementary: if a signal of mean power P is on for a share d of the time and zero otherwise, the mean
over everything is d P, the peak stays, so that every level over the mean rises by 10 log10(1/d):
3.01, 6.02, 9.03 dB at 1/2, 1/4, 1/8. P(p > x) is d times that of the signal itself.
"""

import math
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.render import Tap, render, samples_of
from wavegen.core.site import Site
from wavegen.core.timespan import TimeSpan
from wavegen.meters.gated import GatedPowerMeter
from wavegen.meters.power import PowerMeter, measure_samples
from wavegen.sources.carrier import Carrier
from wavegen.sources.noise import Noise
from wavegen.stages.channel.gate import Gate, on_time

RATE = Fraction(1_000_000)
N = 1 << 17
SITE = Site(sample_rate_hz=RATE, n_samples=N, seed=3, label="a", path="stages[0]")


def gated(source, duty, ramp="0 samples"):
    settings = Gate(
        duty_percent=Fraction(100) * duty,
        period=TimeSpan.parse("4096 us"),
        ramp=TimeSpan.parse(ramp),
    )
    return settings.build(SITE, source)


def both(signal):
    """Statistics over everything, and over the on-time."""
    meters = {"all": PowerMeter(), "on": GatedPowerMeter(bursts=on_time(signal))}
    taps = tuple(Tap(name=name, signal=signal, meter=meter) for name, meter in meters.items())
    found = render(signal, taps=taps, workers=2)
    return found["all"], found["on"]


@pytest.mark.parametrize(
    ("duty", "rise_db"),
    [(Fraction(1, 2), 3.0103), (Fraction(1, 4), 6.0206), (Fraction(1, 8), 9.0309)],
)
def test_a_carrier_in_bursts(duty, rise_db):
    # Exact but for the rounding of float32 (3e-7) and of the figures given: 1e-4 dB.
    everything, on = both(gated(Carrier().build(SITE), duty))
    assert everything.papr_db == pytest.approx(rise_db, abs=1e-4)
    assert everything.mean_db == pytest.approx(-rise_db, abs=1e-4)
    assert everything.ccdf([0.0, rise_db - 0.02, rise_db + 0.02]) == pytest.approx(
        [float(duty), float(duty), 0.0], abs=1e-12
    )
    assert everything.n_zeros == N * (1 - duty)
    assert (on.papr_db, on.mean_db) == pytest.approx((0, 0), abs=1e-4)
    assert (on.n_samples, on.n_zeros) == (N * duty, 0)


@pytest.mark.parametrize("duty", [Fraction(1, 2), Fraction(1, 4), Fraction(1, 8)])
def test_the_on_time_has_the_statistics_of_the_signal(duty):
    # The same samples are measured: exact, whatever the ramps and the off-time are.
    source = Noise(bandwidth_hz=Fraction(400_000)).build(SITE)
    signal = gated(source, duty, ramp="50 samples")
    everything, on = both(signal)
    want = measure_samples(samples_of(source)[signal.is_on(0, N)])
    assert (on.n_samples, on.peak, on.least) == (want.n_samples, want.peak, want.least)
    assert on.mean == pytest.approx(want.mean, rel=1e-13)
    assert on.counts.tolist() == want.counts.tolist()
    # Complex Gaussian envelope: exp(-g). Samples correlate over 2.5, hence 3 / n;
    # 4 sigma of the share, and a bin of 0.0085 dB: 0.8 % of the share at 6 dB.
    for level_db in (0.0, 3.0, 6.0):
        share = math.exp(-(10 ** (level_db / 10)))
        sigma = math.sqrt(3 * share * (1 - share) / on.n_samples)
        assert abs(float(on.ccdf(level_db)) - share) < 4 * sigma + 0.01 * share
    assert on.n_samples == (4096 * duty - 100) * 32
    assert everything.n_zeros >= N * (1 - duty)


@pytest.mark.parametrize("duty", [Fraction(1, 2), Fraction(1, 4)])
def test_levels_rise_by_the_duty_at_equal_share_of_the_on_time(duty):
    # No ramps: the samples above a power are the same ones, only mean and count differ. Levels
    # may fall anywhere in a bin of 0.0085 dB.
    everything, on = both(gated(Noise(bandwidth_hz=RATE).build(SITE), duty))
    rise_db = 10 * math.log10(1 / duty)
    for probability in (0.1, 0.01, 1e-3):
        got = float(everything.level_db(probability * float(duty)))
        assert got == pytest.approx(float(on.level_db(probability)) + rise_db, abs=1e-6)
    assert everything.papr_db == pytest.approx(on.papr_db + rise_db, abs=1e-9)


@pytest.mark.parametrize("ramp", [1, 2, 5, 100, 511])
def test_mean_power_with_ramps(ramp):
    # On for L samples with two ramps of R in them: L - 2 R + 2 R 3/8 full samples, derivation:
    # sin^4 averages to 3/8 over midpoints (1/4 for a single one). Float32: 1e-6.
    signal = gated(Carrier().build(SITE), Fraction(1, 4), ramp=f"{ramp} samples")
    worth = Fraction(1, 4) if ramp == 1 else Fraction(3, 8)
    want = Fraction(1024 - 2 * ramp, 4096) + 2 * ramp * worth / 4096
    assert signal.mean_power == pytest.approx(float(want), rel=1e-12)
    everything, _ = both(signal)
    assert everything.mean == pytest.approx(float(want), rel=1e-6)


def test_a_ramp_narrows_the_spectrum_of_a_burst():
    # Common practice: switching without ramps splatters. A hard edge falls with the frequency at
    # 6 dB an octave, a raised cosine at 18 dB beyond 1/T of the ramp: here 60 dB at 50/T.
    spectra = []
    for ramp in ("0 samples", "200 samples"):
        signal = gated(Carrier().build(SITE), Fraction(1, 2), ramp=ramp)
        spectra.append(np.abs(np.fft.fft(samples_of(signal).astype(np.complex128))) ** 2)
    frequency = np.abs(np.fft.fftfreq(N))
    far = frequency > 0.25
    hard, soft = (10 * np.log10(spectrum[far].sum()) for spectrum in spectra)
    assert hard - soft > 60
