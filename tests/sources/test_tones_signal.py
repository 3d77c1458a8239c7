from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.evaluate import evaluate
from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.sources.tones import Tone, Tones
from wavegen.sources.tones_signal import HeldTones, LongTones


def site(n: int) -> Site:
    return Site(sample_rate_hz=Fraction(1_000_000), n_samples=n, seed=1, label="a", path="signal")


def at(frequency, level_db=0.0, phase_deg=None):
    return Tone(frequency_offset_hz=Fraction(frequency), level_db=level_db, phase_deg=phase_deg)


LISTED = Tones(tones=(at(101_003), at(-333_337, -10.0), at(77, 3.0, 20.0)))


@pytest.mark.parametrize(
    ("settings", "n", "kind"),
    [
        (LISTED, 2_000_003, LongTones),
        (LISTED, 1_000_003, HeldTones),
        (Tones(count=5, spacing_hz=Fraction(1000)), 3000, HeldTones),
        (Tones(count=1, spacing_hz=Fraction(1000)), 50, HeldTones),
    ],
)
def test_bits_do_not_depend_on_the_cut(settings, n, kind):
    signal = settings.build(site(n))
    assert type(signal) is kind
    whole = samples_of(signal)
    rng = np.random.default_rng(4)
    for _ in range(12):
        start = int(rng.integers(-2 * n, 2 * n))
        count = int(rng.integers(1, min(2 * n, 100_000)))
        got = evaluate({signal: (start, start + count)})[signal]
        expected = whole.take(np.arange(start, start + count), mode="wrap")
        np.testing.assert_array_equal(got.view(np.uint32), expected.view(np.uint32))


@pytest.mark.parametrize("n", [2_000_003, 1_000_003])
def test_tones_are_right_at_any_place_and_their_floor_is_low(n):
    signal = LISTED.build(site(n))
    samples = samples_of(signal).astype(np.complex128)
    spectrum = np.fft.fft(samples) / n
    np.testing.assert_allclose(spectrum[signal.bins], signal.amplitudes, atol=1e-7)
    spectrum[signal.bins] = 0
    assert 20 * np.log10(np.abs(spectrum).max()) < -150  # single spurious line
    assert 10 * np.log10(np.sum(np.abs(spectrum) ** 2)) < -130  # all of the error together


def test_loops_beyond_32_bits_are_exact():
    n = (1 << 34) + 1
    signal = Tones(tones=(at(323_456),), phases="equal").build(site(n))
    start = (n // 1024 - 1) * 1024
    got = signal.compute(start, start + 1024)
    line = int(signal.bins[0])
    expected = [np.exp(2j * np.pi * (line * index % n) / n) for index in range(start, start + 1024)]
    np.testing.assert_allclose(got, expected, atol=3e-7)
