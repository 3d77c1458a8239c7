import itertools
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.render import Tap, render
from wavegen.core.signal import Signal
from wavegen.meters import METERS
from wavegen.meters.spectrum import SpectrumMeter, spectrum_of

RATE_HZ = 1e6


def described(n):
    return Signal(sample_rate_hz=Fraction(RATE_HZ), n_samples=n)


def noise(seed, n):
    rng = np.random.default_rng(seed)
    return rng.standard_normal((n, 2)).astype(np.float32).view(np.complex64)[:, 0]


def test_is_in_the_table() -> None:
    assert METERS.load("spectrum") is SpectrumMeter


@pytest.mark.parametrize("loops", [True, False])
@pytest.mark.parametrize("n", [64, 1000, 4097, 20_003])
def test_bits_do_not_depend_on_the_cut(n, loops) -> None:
    samples, rng = noise(n, n), np.random.default_rng(n)
    meter = SpectrumMeter(n_fft=64, loops=loops)
    whole = spectrum_of(samples, sample_rate_hz=RATE_HZ, n_fft=64, loops=loops)
    for _ in range(12):
        edges = [0, *np.sort(rng.integers(0, n + 1, 7)).tolist(), n]
        parts = []
        for low, high in itertools.pairwise(edges):
            parts.append(meter.begin(described(n)))
            middle = (low + high) // 2
            parts[-1].feed(low, samples[low:middle])
            parts[-1].feed(middle, samples[middle:high])
        while len(parts) > 1:
            place = int(rng.integers(0, len(parts) - 1))
            parts[place].merge(parts.pop(place + 1))
        assert np.array_equal(parts[0].result().density, whole.density)
        assert np.array_equal(parts[0].result().density, whole.density)  # asking changes nothing


@pytest.mark.parametrize("strip", [70_000, 33_333])
def test_bits_do_not_depend_on_strips_and_workers(held, strip) -> None:
    signal = held(noise(1, 200_000))
    tap = Tap(name="x", signal=signal, meter=SpectrumMeter())
    one = render(signal, taps=(tap,))["x"]
    two = render(signal, taps=(tap,), strip_samples=strip, workers=2)["x"]
    assert np.array_equal(one.density, two.density)


@pytest.mark.parametrize("window", ["kaiser", "blackman_harris", "hann", "rectangular"])
def test_a_line_keeps_its_power_and_place(window) -> None:
    """Tolerance: float32."""
    n = 1 << 14
    tone = 0.5 * np.exp(2j * np.pi * np.arange(n) * (-300 / 1024)).astype(np.complex64)
    found = spectrum_of(tone, sample_rate_hz=1024.0, n_fft=1024, window=window)
    assert found.frequencies_hz[np.argmax(found.density)] == -300
    assert found.total_power == pytest.approx(0.25, rel=1e-5)
    assert found.power(-307, -293) == pytest.approx(0.25, rel=1e-5)
    # the highest density is the power over the noise bandwidth of the window
    assert found.density.max() == pytest.approx(0.25 / found.noise_bandwidth_hz, rel=1e-4)


@pytest.mark.parametrize("n_fft", [48, 1000, 10_000, 20_000])
def test_any_length_of_the_transform(n_fft) -> None:
    """Segments are transformed in groups; the density of white noise is its power over the rate."""
    found = spectrum_of(noise(5, 150_000), sample_rate_hz=RATE_HZ, n_fft=n_fft)
    assert found.density.size == n_fft
    assert found.total_power == pytest.approx(2, rel=0.02)


def test_integral_is_the_mean_power() -> None:
    """A segment of a loop weighs all samples alike within 1 %."""
    samples = noise(3, 50_000)
    found = spectrum_of(samples, sample_rate_hz=RATE_HZ, n_fft=512)
    assert found.total_power == pytest.approx(np.mean(np.abs(samples) ** 2), rel=1e-3)
    assert found.power(-RATE_HZ / 2, RATE_HZ / 2) == pytest.approx(found.total_power, rel=1e-12)
    halves = found.power(-RATE_HZ / 2, 1234.5) + found.power(1234.5, RATE_HZ / 2)
    assert halves == pytest.approx(found.total_power, rel=1e-12)
    assert 10 * np.log10(np.mean(10 ** (found.dbc_per_hz / 10)) * RATE_HZ) == pytest.approx(
        0, abs=1e-6
    )


def test_a_loop_has_no_seam() -> None:
    """What runs over the seam is a line; taken as a record that repeats it is one as well."""
    n = 10_007
    tone = np.exp(2j * np.pi * 1000 * np.arange(n) / n).astype(np.complex64)
    found = spectrum_of(tone, sample_rate_hz=n, n_fft=1024)
    share = 1 - found.power(1000 - 60, 1000 + 60) / found.total_power
    assert share < 1e-10  # Kaiser side lobes


@pytest.mark.parametrize("n", [1, 5, 100])
def test_loops_shorter_than_a_segment_are_repeated(n) -> None:
    samples = np.exp(2j * np.pi * np.arange(n) / n).astype(np.complex64)
    found = spectrum_of(samples, sample_rate_hz=RATE_HZ, n_fft=256)
    assert found.total_power == pytest.approx(1, rel=1e-5)
    want = RATE_HZ / n if n > 2 else 0.0
    at = found.frequencies_hz[np.argmax(found.density)]
    assert at == pytest.approx(want, abs=found.bin_hz)


@pytest.mark.parametrize(
    ("samples", "settings", "fed"),
    [
        (np.zeros(3000, np.complex64), {}, 3000),
        (np.ones(3000, np.complex64), {}, 2999),
        (np.ones(200, np.complex64), {"loops": False}, 200),
        (np.full(3000, np.nan, np.complex64), {}, 3000),
        (np.ones(3000, np.complex64), {}, 0),
    ],
)
def test_refuses_what_it_cannot_state(samples, settings, fed) -> None:
    reading = SpectrumMeter(n_fft=256, **settings).begin(described(samples.size))

    def measure():
        reading.feed(0, samples[:fed])
        return reading.result()

    with pytest.raises(SignalError):
        measure()


@pytest.mark.parametrize(("low", "high"), [(-6e5, 0), (0, 5.1e5), (1e5, 1e5), (2e5, 1e5)])
def test_bands_must_lie_inside_the_rate(low, high) -> None:
    found = spectrum_of(noise(1, 4096), sample_rate_hz=RATE_HZ, n_fft=256)
    with pytest.raises(SignalError):
        found.power(low, high)


def test_table_names_what_it_is() -> None:
    rows = dict(spectrum_of(noise(1, 8192), sample_rate_hz=RATE_HZ).table().rows)
    assert rows["sample rate"] == "1 MHz"
    assert "kaiser" in rows["resolution"]


@pytest.mark.parametrize("n", [1000, 4097, 20_003])
def test_segments_of_a_loop_are_spread_evenly(n) -> None:
    grid = SpectrumMeter(n_fft=64).begin(described(n))._grid
    starts = np.array([grid.start(number) for number in range(grid.count + 1)])
    assert starts[-1] == n  # over the seam as elsewhere
    assert np.ptp(np.diff(starts)) <= 1
