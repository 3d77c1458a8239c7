import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.units import QuantityError
from wavegen.meters.mask import MaskPoint, SpectralMask, check_mask
from wavegen.meters.spectrum import spectrum_of

N = 1 << 15


@pytest.fixture(scope="module")
def spectrum():
    """A block of density 1 in -0.1 to 0.1, and one of 1e-4 in 0.2 to 0.3, at rate 1."""
    frequency = np.fft.fftfreq(N)
    lines = np.where(np.abs(frequency) < 0.1, 1.0, 0.0)
    lines[(frequency > 0.2) & (frequency < 0.3)] = 1e-2
    lines = lines * np.exp(2j * np.pi * np.random.default_rng(1).random(N))
    samples = (np.fft.ifft(lines) * np.sqrt(N)).astype(np.complex64)
    return spectrum_of(samples, sample_rate_hz=1.0, n_fft=2048)


def mask(*points, **settings):
    return SpectralMask(
        points=tuple(MaskPoint(offset_hz=f, level_db=level) for f, level in points),
        measurement_bandwidth_hz=settings.pop("measurement_bandwidth_hz", 0.01),
        **settings,
    )


def test_margin_to_a_limit(spectrum) -> None:
    """Density 1e-4 in 0.01 over a total of 0.2: -53.01 dB; tolerance: ripple of few segments."""
    found = check_mask(spectrum, mask((0.22, -50.0), (0.28, -50.0), both_sides=False))
    assert found.margin_db == pytest.approx(10 * np.log10(0.2 / 1e-6) - 50, abs=0.2)
    assert found.is_kept
    assert check_mask(spectrum, mask((0.22, -54.0), (0.28, -54.0))).is_kept is False


def test_over_the_highest_density(spectrum) -> None:
    found = check_mask(
        spectrum, mask((0.22, -30.0), (0.28, -30.0), reference="peak_density", both_sides=False)
    )
    assert found.segments[0].level_db == pytest.approx(-40, abs=0.3)


def test_limits_run_straight_between_points(spectrum) -> None:
    """At 0.25 the line from -40 to -60 stands at -50: tightest is the far end."""
    found = check_mask(spectrum, mask((0.22, -40.0), (0.28, -60.0), both_sides=False))
    segment = found.segments[0]
    assert segment.at_hz == pytest.approx(0.28, abs=0.006)
    assert segment.limit_db == pytest.approx(-40 - 20 * (segment.at_hz - 0.22) / 0.06)


def test_both_sides(spectrum) -> None:
    found = check_mask(spectrum, mask((0.15, -20.0), (0.2, -20.0), (0.2, -60.0), (0.3, -60.0)))
    assert [segment.low_hz for segment in found.segments] == [-0.3, -0.2, 0.15, 0.2]
    below, _, _, above = found.segments
    assert below.margin_db > 20
    assert above.margin_db < 0
    assert len(found.table().rows) == 4
    assert found.rows()[0][0] == "mask margin"


def test_a_carrier_that_is_not_in_the_middle(spectrum) -> None:
    moved = check_mask(
        spectrum, mask((-0.03, -50.0), (0.03, -50.0), both_sides=False), centre_hz=0.25
    )
    assert moved.margin_db == pytest.approx(3, abs=0.3)


def test_what_the_rate_does_not_hold_is_refused(spectrum) -> None:
    with pytest.raises(SignalError):
        check_mask(spectrum, mask((0.3, -50.0), (0.5, -50.0)))
    with pytest.raises(SignalError):
        check_mask(spectrum, mask((0.2, 0.0), (0.3, 0.0), measurement_bandwidth_hz=1e-4))


@pytest.mark.parametrize(
    "points", [((2.0, 0.0), (1.0, 0.0)), ((1.0, 0.0), (1.0, 5.0)), ((-1.0, 0.0), (1.0, 0.0))]
)
def test_points_in_order(points) -> None:
    with pytest.raises(QuantityError):
        mask(*points)
