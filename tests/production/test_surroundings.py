"""Channels and a mask beside a spectrum."""

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.meters.mask import MaskPoint, SpectralMask
from wavegen.meters.spectrum import spectrum_of
from wavegen.production.prepare import prepare
from wavegen.production.surroundings import Surroundings, mask_corners
from wavegen.recipe.load import load_text

NOISE = """\
wavegen: 1
sample_rate: RATE MHz
duration: 4 ms
signal: {kind: noise, bandwidth: 2 MHz}
"""


def around(rate):
    return Surroundings.of(prepare(load_text(NOISE.replace("RATE", rate), name="x")).built.signal)


def flat(n=1 << 15):
    rng = np.random.default_rng(3)
    noise = (rng.standard_normal(n) + 1j * rng.standard_normal(n)).astype(np.complex64)
    return spectrum_of(noise, sample_rate_hz=8e6, n_fft=256)


def test_a_carrier_has_neighbours_where_the_rate_holds_them():
    found = around("8")
    assert found.band.width_hz == pytest.approx(2e6, rel=0.1)
    assert found.plan is not None
    names = [item.name for item in found.channels(flat())]
    assert names == ["carrier", "adjacent", "adjacent"]
    assert around("4").plan is None
    assert [item.name for item in around("4").channels(flat())] == ["carrier"]


def test_leakage_of_a_flat_spectrum_is_as_much_as_the_carrier():
    carrier, below, above = around("8").channels(flat())
    assert carrier.leakage_db is None
    # equal widths of one density: 0 dB, within the scatter of a quarter of 32768 samples
    assert below.leakage_db == pytest.approx(0, abs=0.3)
    assert above.low_hz - carrier.high_hz == pytest.approx(carrier.low_hz - below.high_hz)


def test_an_unmodulated_carrier_has_no_neighbours():
    """What stands beside it in a spectrum is the lobe of the window."""
    text = "wavegen: 1\nsample_rate: 1 MHz\nduration: 4 ms\nsignal: {kind: carrier}\n"
    signal = prepare(load_text(text, name="x")).built.signal
    found = Surroundings.of(signal)
    spectrum = spectrum_of(samples_of(signal), sample_rate_hz=1e6, n_fft=256)
    assert found is None or [item.name for item in found.channels(spectrum)] == ["carrier"]


def mask(**more):
    points = (MaskPoint(offset_hz=1e6, level_db=-20), MaskPoint(offset_hz=2e6, level_db=-40))
    return SpectralMask(points=points, measurement_bandwidth_hz=1e5, **more)


def test_a_mask_as_a_density():
    """-20 dB in 100 kHz is -70 dBc/Hz; both sides mirror, parted where the mask has a gap."""
    places, limits = mask_corners(mask(), flat(), centre_hz=5e5)
    assert places == pytest.approx([-1.5e6, -0.5e6, np.nan, 1.5e6, 2.5e6], nan_ok=True)
    assert limits == pytest.approx([-90, -70, np.nan, -70, -90], nan_ok=True)


def test_a_mask_over_the_peak_density():
    """White over 8 MHz: 100 kHz hold an eightieth, 19.03 dB less than the total."""
    _, limits = mask_corners(mask(reference="peak_density", both_sides=False), flat(), centre_hz=0)
    assert limits == pytest.approx([-89.03, -109.03], abs=1.0)  # the highest of 80 scatters upwards


def test_around_an_intermediate_frequency():
    base = around("8")
    moved = base.moved(2e6, sample_rate_hz=8e6)
    assert moved.band.centre_hz == pytest.approx(base.band.centre_hz + 2e6)
    assert moved.band.width_hz == pytest.approx(base.band.width_hz)
    assert moved.plan is None  # neighbours reach below 0 Hz
    assert base.moved(8e6, sample_rate_hz=32e6).plan is base.plan
    assert base.moved(0.0, sample_rate_hz=8e6) is base
