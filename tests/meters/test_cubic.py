import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.render import Tap, render
from wavegen.meters import METERS
from wavegen.meters.cubic import CubicMeter


def measure(signal, **how):
    return render(signal, taps=(Tap(name="x", signal=signal, meter=CubicMeter()),), **how)["x"]


def test_is_in_the_table() -> None:
    assert METERS.load("cubic") is CubicMeter


@pytest.mark.parametrize("scale", [1e-6, 1.0, 3e4])
def test_moments(held, scale) -> None:
    """Tolerance: powers are rounded to float32, 6e-8 each."""
    rng = np.random.default_rng(1)
    samples = (scale * rng.standard_normal((5000, 2))).astype(np.float32).view(np.complex64)[:, 0]
    power = np.abs(samples.astype(complex)) ** 2
    found = measure(held(samples))
    assert found.mean == pytest.approx(power.mean(), rel=1e-6, abs=0)
    assert found.second == pytest.approx(np.mean(power**2), rel=1e-6, abs=0)
    assert found.third == pytest.approx(np.mean(power**3), rel=1e-6, abs=0)
    raw = 10 * np.log10(np.mean(power**3) / power.mean() ** 3)
    assert found.raw_db == pytest.approx(raw, abs=1e-5)
    assert found.cubic_metric_db() == pytest.approx((raw - 1.52) / 1.56, abs=1e-5)
    assert found.cubic_metric_db(1.85) == pytest.approx((raw - 1.52) / 1.85, abs=1e-5)


def test_strips_and_workers_change_nothing(held, band_noise) -> None:
    signal = held(band_noise(1, 150_001, 0.5))
    one = measure(signal)
    assert measure(signal, strip_samples=70_001, workers=2) == one
    assert measure(signal, strip_samples=1_111) == one


def test_tables(held) -> None:
    found = measure(held(np.ones(100)))
    assert found.table().rows == found.rows()
    assert found.rows()[0] == ("raw cubic metric", "0.000 dB")


@pytest.mark.parametrize("samples", [np.zeros(10), np.full(10, np.inf), np.full(10, np.nan)])
def test_refuses_what_has_no_metric(held, samples) -> None:
    with pytest.raises(SignalError):
        measure(held(samples))


def test_nothing_seen() -> None:
    with pytest.raises(SignalError):
        CubicMeter().begin(None).result()
