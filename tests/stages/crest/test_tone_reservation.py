import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.index_set import IndexSet
from wavegen.core.render import samples_of
from wavegen.core.units import QuantityError
from wavegen.stages.crest.tone_reservation import ToneReservation, spread_subcarriers

HOLES = "-31, -18, -4, 9, 25"
GROUP = "-32, -30..-19, -17..-5, -3..-1, 1..8, 10..24, 26..32"


@pytest.fixture(scope="module")
def source(ofdm):
    return ofdm.build(GROUP, "64qam")


@pytest.mark.parametrize("fields", [{"subcarriers": IndexSet.parse(HOLES)}, {"count": 5}])
def test_data_are_untouched_and_peaks_fall(ofdm, reduction, source, fields):
    signal, notes = ofdm.reduce(ToneReservation(ceiling_db=7.0, **fields), source)
    got, want = ofdm.subcarriers(signal)
    gain = np.vdot(want, got) / np.vdot(want, want)
    assert np.sqrt(np.mean(np.abs(got / gain - want) ** 2) / np.mean(np.abs(want) ** 2)) < 1e-5
    before, after = (reduction.papr_db(samples_of(each)) for each in (source, signal))
    assert after < before - 1
    (note,) = [note for note in notes if note.where == "stages[0].ceiling"]
    assert "5 tones in 10 rounds" in note.text
    assert f"{after:.2f} dB at the peak there" in note.text


def test_nothing_stands_beside_data_and_reserved_tones(ofdm, source):
    settings = ToneReservation(ceiling_db=6.0, subcarriers=IndexSet.parse(HOLES))
    bins = ofdm.bins(ofdm.reduce(settings, source)[0])
    holes = np.array(settings.subcarriers.indices)
    power = np.sum(np.abs(bins) ** 2)
    assert np.sum(np.abs(bins[:, holes]) ** 2) > 1e-3 * power
    bins[:, holes] = 0
    bins[:, source.grid.indices] = 0
    assert 10 * np.log10(np.sum(np.abs(bins) ** 2) / power) < -120


def test_mean_power_is_kept(ofdm, source):
    signal, _ = ofdm.reduce(ToneReservation(ceiling_db=6.0, count=5), source)
    powers = [np.mean(np.abs(samples_of(x).astype(np.complex128)) ** 2) for x in (source, signal)]
    assert powers[1] == pytest.approx(powers[0], rel=1e-5)
    assert signal.bodies.gain < 1


def test_free_subcarriers_are_spread_irregularly_and_always_alike():
    free = np.arange(-300, 300, 2)
    found = spread_subcarriers(free, 30)
    assert np.array_equal(found, spread_subcarriers(free, 30))
    assert np.all(np.isin(found, free))
    assert np.all(np.diff(found) > 0)
    assert set(spread_subcarriers(free, 29)) < set(found.tolist())
    # the pulse of the tones: its highest side peak, within the free set's own period
    pulse = np.abs(np.exp(2j * np.pi * np.outer(found / 2, np.arange(1200)) / 1200).sum(axis=0))
    assert np.max(pulse[40:1160]) < 0.6 * 30  # of evenly spaced tones: 30


def test_a_count_leaves_out_the_centre(ofdm, source):
    signal, notes = ofdm.reduce(ToneReservation(ceiling_db=7.0, count=5), source)
    assert signal.bodies.reserved.tolist() == [-31, -18, -4, 9, 25]
    assert any("-31, -18, -4, 9, 25" in note.text for note in notes)


@pytest.mark.parametrize(
    ("fields", "key", "word"),
    [
        ({"subcarriers": IndexSet.parse("9, 10")}, "subcarriers", "in use"),
        ({"subcarriers": IndexSet.parse("9, 200")}, "subcarriers", "outside"),
        ({"subcarriers": IndexSet.parse("9, 25, 9")}, "subcarriers", "twice"),
        ({"count": 6}, "count", "5 are free"),
    ],
)
def test_what_cannot_be_reserved_is_refused(ofdm, source, fields, key, word):
    with pytest.raises(RecipeError) as caught:
        ofdm.reduce(ToneReservation(ceiling_db=7.0, **fields), source)
    assert caught.value.where == f"stages[0].{key}"
    assert word in caught.value.problem


@pytest.mark.parametrize("fields", [{}, {"count": 3, "subcarriers": IndexSet.parse("9")}])
def test_a_list_or_a_count(fields):
    with pytest.raises(QuantityError):
        ToneReservation(ceiling_db=7.0, **fields)
