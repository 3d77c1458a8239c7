"""Channels beside a carrier: those of a standard, own ones, and what follows from the band."""

from fractions import Fraction

import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.meters.mask import MaskPoint, SpectralMask
from wavegen.production.neighbours import (
    ChannelRequest,
    OccupiedBand,
    is_held,
    occupied_band,
    plan_channels,
    spectrum_meter,
)
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text

RECIPE = """wavegen: 1
sample_rate: 8 MHz
duration: 4 ms
signal:
  kind: sum
  parts:
    - {frequency_offset: -1 MHz, signal: {kind: noise, bandwidth: 1 MHz}}
    - {frequency_offset: 2 MHz, level: -30 dB, signal: {kind: noise, bandwidth: 500 kHz}}
"""


@pytest.fixture(scope="module")
def prepared():
    return prepare(load_text(RECIPE))


def test_the_band_spans_all_parts_faint_ones_too(prepared):
    band = occupied_band(prepared.site, prepared.built.signal)
    assert band.low_hz == pytest.approx(-1.5e6, abs=40e3)
    assert band.high_hz == pytest.approx(2.25e6, abs=40e3)
    assert band.centre_hz == pytest.approx(0.375e6, abs=40e3)


def test_own_channels_follow_the_band():
    band = OccupiedBand(low_hz=-1e6, high_hz=2.6e6)
    plan = plan_channels(ChannelRequest(), band)
    assert plan.carrier.bandwidth_hz == 3.6e6
    assert [channel.offset_hz for channel in plan.neighbours] == pytest.approx([-4e6, 4e6])
    asked = ChannelRequest(bandwidth_hz=Fraction(3_840_000), spacing_hz=Fraction(5_000_000))
    plan = plan_channels(asked, band)
    assert [channel.offset_hz for channel in plan.neighbours] == [-5e6, 5e6]
    assert {channel.bandwidth_hz for channel in plan.neighbours} == {3.84e6}


@pytest.mark.parametrize(
    ("width", "asked", "given"), [(18.0, None, 20), (20.5, None, 25), (3.0, 10_000_000, 10)]
)
def test_the_narrowest_channel_of_a_standard_that_holds_it(width, asked, given):
    band = OccupiedBand(low_hz=-width / 2 * 1e6, high_hz=width / 2 * 1e6)
    request = ChannelRequest(standard="NR BS FR1", width_hz=asked and Fraction(asked))
    plan = plan_channels(request, band)
    assert plan.name == f"NR BS FR1, {given} MHz"
    assert [c.limit_db for c in plan.neighbours] == [45] * 4


def test_what_is_refused():
    band = OccupiedBand(low_hz=-80e6, high_hz=80e6)
    with pytest.raises(ArgumentsError):
        plan_channels(ChannelRequest(standard="NR BS FR1"), band)
    with pytest.raises(ArgumentsError):
        plan_channels(ChannelRequest(standard="NR BS FR11"), band)
    with pytest.raises(ArgumentsError):
        ChannelRequest(standard="NR BS FR1", spacing_hz=Fraction(1))
    with pytest.raises(ArgumentsError):
        ChannelRequest(width_hz=Fraction(20_000_000))


def test_whether_the_sample_rate_holds_them(prepared):
    signal = prepared.built.signal
    plan = plan_channels(ChannelRequest(), OccupiedBand(low_hz=-1.2e6, high_hz=1.2e6))
    assert is_held(plan, signal, 0.0)  # up to 2.67 + 1.2 MHz of 4
    assert not is_held(plan, signal, 0.2e6)


def test_bins_are_narrow_enough_for_channels_and_masks(prepared):
    signal = prepared.built.signal  # 32000 samples
    assert spectrum_meter(signal, 4e6, None).n_fft == 4096
    assert spectrum_meter(signal, 200e3, None).n_fft == 16384
    mask = SpectralMask(
        points=(MaskPoint(offset_hz=1e6, level_db=-30), MaskPoint(offset_hz=2e6, level_db=-40)),
        measurement_bandwidth_hz=2e3,
    )
    assert spectrum_meter(signal, 4e6, mask).n_fft == 8192
    assert spectrum_meter(signal, 2e3, None).n_fft == 16384, "no longer than the loop"
