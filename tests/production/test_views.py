"""Material for pictures."""

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.production.prepare import prepare
from wavegen.production.views import AROUND_SEAM, views_of
from wavegen.recipe.load import load_text
from wavegen.stages.channel.gate import on_time

GATED = """\
wavegen: 1
sample_rate: 4 MHz
duration: 8 ms
signal:
  kind: single_carrier
  constellation: qpsk
  symbol_rate: 1 MHz
  pulse: {kind: root_raised_cosine, roll_off: 0.22}
stages:
  - {kind: gate, duty: 25 %, period: 1 ms, ramp: 64 samples}
"""


def test_views_of_a_gated_carrier():
    signal = prepare(load_text(GATED, name="x")).built.signal
    views = views_of(signal, loops=True, graph=signal, bursts=on_time(signal))
    assert views.on_times_s == tuple(
        pytest.approx((k * 1e-3, k * 1e-3 + 0.25e-3)) for k in range(8)
    )
    assert views.envelope.duration_s == pytest.approx(8e-3)
    assert views.spectrum is not None
    samples = samples_of(signal)
    power = np.mean(np.abs(samples) ** 2)
    assert views.spectrum.total_power == pytest.approx(power, rel=0.05)
    assert np.array_equal(views.around_seam[:AROUND_SEAM], samples[-AROUND_SEAM:])
    assert np.array_equal(views.around_seam[AROUND_SEAM:], samples[:AROUND_SEAM])


def test_a_recording_has_no_seam_and_few_samples_no_spectrum():
    text = "wavegen: 1\nsample_rate: 1 MHz\nduration: 100 samples\nsignal: {kind: carrier}\n"
    signal = prepare(load_text(text, name="x")).built.signal
    views = views_of(signal, loops=False)
    assert views.around_seam is None
    assert views.spectrum is None
    assert views.clouds == ()


MASKED = """\
wavegen: 1
sample_rate: 8 MHz
duration: 4 ms
signal: {kind: noise, bandwidth: 2 MHz}
mask:
  measurement_bandwidth: 100 kHz
  points: [{offset: 1.2 MHz, level: -30 dB}, {offset: 3 MHz, level: -50 dB}]
"""


def test_channels_and_mask_of_a_recipe():
    loaded = load_text(MASKED, name="x")
    signal = prepare(loaded).built.signal
    views = views_of(signal, loops=True, graph=signal, mask=loaded.recipe.mask)
    assert [item.name for item in views.channels] == ["carrier", "adjacent", "adjacent"]
    places, limits = views.mask
    assert places[-1] == pytest.approx(3e6, abs=1e4)
    assert limits[-1] == pytest.approx(-100)  # -50 dB in 100 kHz
    assert views_of(signal, loops=True).channels == ()


def test_what_was_before_is_measured_alike():
    signal = prepare(load_text(MASKED, name="x")).built.signal
    views = views_of(signal, loops=True, before=("before", signal))
    assert views.before.name == "before"
    assert views.before.power.n_samples == signal.n_samples
    assert np.array_equal(views.before.spectrum.density, views.spectrum.density)


def test_power_without_a_phase_has_its_envelope_alone():
    signal = prepare(load_text(MASKED, name="x")).built.signal
    views = views_of(signal, loops=True, is_power=True)
    assert views.spectrum is None
    assert views.around_seam is None
    assert views.envelope.mean.size == 800
