"""Picture of a spectrum."""

import numpy as np
import pytest

from wavegen.meters.spectrum import spectrum_of
from wavegen.reports.figures.spectrum import Channel, frequency_unit, spectrum_figure


def test_unit_suits_the_span():
    assert frequency_unit(5e5)[1] == "kHz"
    assert frequency_unit(2e9)[1] == "GHz"


def test_density_channels_and_mask_are_drawn():
    rng = np.random.default_rng(1)
    noise = (rng.standard_normal(1 << 15) + 1j * rng.standard_normal(1 << 15)).astype(np.complex64)
    spectrum = spectrum_of(noise, sample_rate_hz=1e6, n_fft=256)
    figure = spectrum_figure(
        [("noise", spectrum)],
        title="T",
        channels=[Channel(name="carrier", low_hz=-1e5, high_hz=1e5, remark="-50.0 dB")],
        mask=(np.array([-5e5, 5e5]), np.array([-50.0, -50.0])),
    )
    axes = figure.axes[0]
    density = axes.lines[0].get_ydata()
    assert density.mean() == pytest.approx(-60, abs=0.3)  # 0 dB over 1 MHz
    assert [text.get_text() for text in axes.texts] == ["carrier\n-50.0 dB"]
    assert len([line for line in axes.lines if line.get_label()[0] != "_"]) == 2
    assert axes.get_ylim()[1] > -50  # the limit is in the picture
    assert axes.get_xlabel().endswith("kHz")


def test_names_of_narrow_channels_stand_outwards():
    rng = np.random.default_rng(1)
    noise = (rng.standard_normal(4096) + 1j * rng.standard_normal(4096)).astype(np.complex64)
    spectrum = spectrum_of(noise, sample_rate_hz=1e6, n_fft=256)
    channels = [
        Channel(name="carrier", low_hz=-2e4, high_hz=2e4),
        Channel(name="adjacent", low_hz=-7e4, high_hz=-3e4, remark="-1 dB"),
        Channel(name="adjacent", low_hz=3e4, high_hz=7e4, remark="-2 dB"),
    ]
    figure = spectrum_figure([("noise", spectrum)], title="T", channels=channels)
    figure.draw_without_rendering()
    boxes = [text.get_window_extent() for text in figure.axes[0].texts]
    assert len(boxes) == 2
    assert boxes[0].x1 < boxes[1].x0


def test_real_samples_have_frequencies_from_0():
    noise = np.random.default_rng(1).standard_normal(4096).astype(np.complex64)
    spectrum = spectrum_of(noise, sample_rate_hz=1e6, n_fft=256)
    axes = spectrum_figure([("noise", spectrum)], title="T", is_real=True).axes[0]
    assert axes.get_xlim() == (0, 500)
    assert axes.get_xlabel() == "frequency, kHz"
