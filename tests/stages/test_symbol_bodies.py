"""Where methods on symbols are refused, by name, and what all of them keep."""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.core.symbol_bodies import HasBodies
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.single_carrier import SingleCarrier
from wavegen.stages.channel.scale import Scale
from wavegen.stages.combine.sum import Part, Sum
from wavegen.stages.crest.clip import Clip
from wavegen.stages.crest.constellation_extension import ConstellationExtension
from wavegen.stages.crest.projection import Projection
from wavegen.stages.crest.selected_mapping import SelectedMapping
from wavegen.stages.crest.tone_reservation import ToneReservation
from wavegen.stages.symbol_bodies import symbols_of

METHODS = [
    ConstellationExtension(ceiling_db=6.0),
    Projection(ceiling_db=6.0, acts_on="symbols"),
    SelectedMapping(candidates=2),
    ToneReservation(ceiling_db=6.0, count=2),
]
IDS = [type(each).__name__ for each in METHODS]


@pytest.fixture(scope="module")
def source(ofdm):
    return ofdm.build("-32..-20, -18..-1, 1..8, 10..32")


@pytest.fixture(scope="module")
def elsewhere(ofdm, bench, source):
    """Return signals without symbols to act on, and a word of each refusal."""
    carrier = SingleCarrier(
        constellation=Constellation.parse("qpsk"), symbol_rate_hz=Fraction(250_000)
    ).build(bench.site(4000, path="signal"))
    both = Sum(parts=(Part(signal=None), Part(signal=None, frequency_offset_hz=Fraction(250_000))))
    total = both.combine(bench.site(source.n_samples, path="signal"), [source, source])
    return {
        "has none": carrier,
        "a sum": total,
        "changed the waveform": ofdm.reduce(Clip(ceiling_db=6.0), source)[0],
        "has changed": ofdm.reduce(Scale(gain_db=-1.0), source)[0],
    }


@pytest.mark.parametrize("word", ["has none", "a sum", "changed the waveform", "has changed"])
@pytest.mark.parametrize("method", METHODS, ids=IDS)
def test_elsewhere_it_is_refused_by_name(ofdm, elsewhere, method, word):
    with pytest.raises(RecipeError) as caught:
        ofdm.reduce(method, elsewhere[word])
    assert caught.value.where == "stages[0].kind"
    assert word in caught.value.problem


@pytest.mark.parametrize("method", METHODS, ids=IDS)
def test_what_comes_out_is_ofdm_again(ofdm, source, method):
    signal, notes = ofdm.reduce(method, source)
    assert isinstance(signal, HasBodies)
    assert signal.grid is source.grid
    assert (signal.n_samples, signal.mean_power) == (source.n_samples, source.mean_power)
    assert any("before their prefixes" in note.text for note in notes)
    samples, n_fft = samples_of(signal), signal.layout.n_fft
    prefix, edge = signal.layout.prefixes[0], signal.layout.edge
    rows = samples.reshape(-1, n_fft + prefix)
    assert np.array_equal(rows[:, edge:prefix], rows[:, n_fft + edge :])


@pytest.mark.parametrize("method", METHODS, ids=IDS)
def test_subcarriers_outside_stay_empty(ofdm, source, method):
    bins = ofdm.bins(ofdm.reduce(method, source)[0])
    total = np.sum(np.abs(bins) ** 2)
    bins[:, -32:], bins[:, :33] = 0, 0
    assert 10 * np.log10(np.sum(np.abs(bins) ** 2) / total) < -120


@pytest.mark.parametrize(("per_band", "times"), [(1, 1), (4, 1), (5, 2), (16, 4)])
def test_peaks_are_seen_on_as_many_points_as_asked(bench, source, per_band, times):
    """65 subcarriers from the lowest to the highest, on 256 points or more (2.5 % less will do)."""
    symbols = symbols_of(bench.site(source.n_samples), source, per_band=per_band)
    assert symbols.view.n_points == times * 256
    assert symbols.per_band == symbols.view.n_points / 65


def test_parts_of_a_sum_take_it_under_their_own_stages(ofdm, bench, source):
    signal, _ = ofdm.reduce(SelectedMapping(candidates=4), source)
    both = Sum(parts=(Part(signal=None), Part(signal=None, frequency_offset_hz=Fraction(250_000))))
    total = both.combine(bench.site(source.n_samples, path="signal"), [signal, source])
    assert np.isfinite(samples_of(total, 0, 1000)).all()
