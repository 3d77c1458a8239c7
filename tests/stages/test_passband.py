from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.site import Site
from wavegen.core.units import QuantityError
from wavegen.dsp.occupied_bands import WHOLE
from wavegen.sources.carrier import Carrier
from wavegen.sources.noise import Noise
from wavegen.stages.combine.sum import Part, Sum
from wavegen.stages.passband import NARROWEST_TRANSITION, Passband, filled_band

N = 1 << 16


def site():
    return Site(
        sample_rate_hz=Fraction(1_000_000), n_samples=N, seed=1, label="x", path="stages[0]"
    )


def test_the_band_of_one_carrier_is_found_and_told(reduction):
    here = site()
    found = filled_band(here, reduction.banded(N, (-0.1, 0.1, 0)))
    (band,) = found.bands
    assert (band.low, band.high) == pytest.approx((-0.1, 0.1), abs=1e-3)
    assert found.oversampling == pytest.approx(5, rel=0.01)
    (note,) = here.notes
    assert note.kind == "info"
    assert f"{found.oversampling:.2f} times" in note.text


def test_a_low_sample_rate_is_warned_of(reduction):
    here = site()
    found = filled_band(here, reduction.banded(N, (-0.2, 0.2, 0)))
    assert found.oversampling == pytest.approx(2.5, rel=0.01)
    assert [note.kind for note in here.notes] == ["info", "warning"]
    assert "2.5" in here.notes[1].text or "2.4" in here.notes[1].text


def test_of_a_sum_each_part_counts_by_itself():
    """A carrier 40 dB under the other, and a tone 30 dB over its density, are all in band."""
    parts = (
        Part(signal=None, frequency_offset_hz=Fraction(-200_000)),
        Part(signal=None, frequency_offset_hz=Fraction(100_000), level_db=-40.0),
        Part(signal=None, frequency_offset_hz=Fraction(200_000), level_db=-10.0),
    )
    here = site()
    noise = Noise(bandwidth_hz=Fraction(100_000))
    signals = [noise.build(here.at("a")), noise.build(here.at("b")), Carrier().build(here)]
    total = Sum(parts=parts).combine(here, signals)
    found = filled_band(here, total)
    assert [band.centre for band in found.bands] == pytest.approx([-0.2, 0.1, 0.2], abs=2e-3)
    assert found.bands[2].width < 0.01
    assert found.width == pytest.approx(0.2, abs=0.01)
    response = np.abs(np.fft.fft(found.band_filter.taps, 1 << 15))
    for place, want in ((-0.2, 1), (0.1, 1), (0.2, 1), (0.0, 0), (0.3, 0)):
        assert response[round(place * (1 << 15))] == pytest.approx(want, abs=1e-4)


def test_edges_fit_into_the_gap_between_bands(reduction):
    close = filled_band(site(), reduction.banded(N, (-0.1, -0.005, 0), (0.005, 0.1, 0)))
    assert len(close.bands) == 2
    assert close.transition == pytest.approx(0.005, rel=0.3)
    joined = filled_band(site(), reduction.banded(N, (-0.1, -0.0005, 0), (0.0005, 0.1, 0)))
    assert len(joined.bands) == 1
    assert joined.transition > joined.width * NARROWEST_TRANSITION


def test_bands_can_be_stated(reduction):
    here = site()
    stated = (Passband(low_hz=Fraction(-50_000), high_hz=Fraction(120_000)),)
    found = filled_band(
        here,
        reduction.banded(N, (-0.02, 0.02, 0)),
        passbands=stated,
        transition_hz=Fraction(10_000),
    )
    assert found.bands[0] == pytest.approx((-0.05, 0.12))
    assert found.transition == pytest.approx(0.01)
    assert "stated" in here.notes[0].text


def test_a_full_band_needs_no_filter(bench):
    here = site()
    found = filled_band(here, bench.gaussian(N))
    assert found.bands == WHOLE
    assert found.band_filter.taps.tolist() == [1]
    assert here.notes[-1].kind == "warning"


def test_a_signal_of_zeros_has_none(bench):
    assert filled_band(site(), bench.given([0])) is None


@pytest.mark.parametrize(
    ("change", "key"),
    [
        ({"passbands": (Passband(low_hz=Fraction(0), high_hz=Fraction(600_000)),)}, "high"),
        ({"transition_hz": Fraction(1)}, "transition"),
    ],
)
def test_refusals_name_the_field(reduction, change, key):
    with pytest.raises(RecipeError) as caught:
        filled_band(site(), reduction.banded(N, (-0.1, 0.1, 0)), **change)
    assert caught.value.where.endswith(f".{key}")
    assert caught.value.where.startswith("stages[0].")


def test_a_band_has_a_width():
    with pytest.raises(QuantityError):
        Passband(low_hz=Fraction(1), high_hz=Fraction(1))
