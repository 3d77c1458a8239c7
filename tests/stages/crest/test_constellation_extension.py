import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.index_set import IndexSet, SymbolSet
from wavegen.core.render import samples_of
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Pilots
from wavegen.sources.rotation import Rotation
from wavegen.sources.subcarriers import PilotValues
from wavegen.stages.crest.constellation_extension import ConstellationExtension
from wavegen.stages.crest.selected_mapping import SelectedMapping


def group(subcarriers, constellation, **fields):
    return Group(
        subcarriers=IndexSet.parse(subcarriers),
        constellation=Constellation.parse(constellation),
        **fields,
    )


def moves_of(ofdm, settings, source):
    """Return what was sent and how far each subcarrier moved, before the gain."""
    signal, _ = ofdm.reduce(settings, source)
    got, want = ofdm.subcarriers(signal)
    return want, got / signal.bodies.gain - want


@pytest.mark.parametrize("name", ["qpsk", "16qam", "64qam"])
def test_outer_points_go_outwards_and_inner_ones_stay(ofdm, name):
    source = ofdm.build("-32..-1, 1..32", name)
    want, moves = moves_of(ofdm, ConstellationExtension(ceiling_db=6.0), source)
    edge = np.max(np.abs(want.real))
    for part, sent in ((moves.real, want.real), (moves.imag, want.imag)):
        is_outer = np.abs(sent) > 0.999 * edge
        assert np.max(np.abs(part[~is_outer]), initial=0) < 1e-5 * edge
        outwards = (part * np.sign(sent))[is_outer]
        assert np.min(outwards) > -1e-5 * edge
        assert np.max(outwards) > 0.2 * edge


def test_peaks_fall_and_the_mean_is_kept(ofdm, reduction):
    source = ofdm.build("-32..-1, 1..32")
    signal, notes = ofdm.reduce(ConstellationExtension(ceiling_db=6.0), source)
    before, after = (samples_of(each).astype(np.complex128) for each in (source, signal))
    assert reduction.papr_db(after) < reduction.papr_db(before) - 2
    assert np.mean(np.abs(after) ** 2) == pytest.approx(np.mean(np.abs(before) ** 2), rel=1e-5)
    assert any("6 rounds" in note.text for note in notes)


def test_scheduled_groups_and_rotated_points(ofdm):
    """Distances of points sent at the same place never shrink, and pilots stand still."""
    source = ofdm.build(
        "0",
        groups=(
            group("-32..-1", "qpsk", symbols=SymbolSet.parse("0")),
            group("-20..-1", "8psk", symbols=SymbolSet.parse("1"), rotation=Rotation.parse("pi/8")),
        ),
        pilots=(
            Pilots(subcarriers=IndexSet.parse("1..8"), values=PilotValues.parse([1, -1, [0, 1]])),
        ),
        frame_symbols=2,
        half_subcarrier_shift=True,
    )
    want, moves = moves_of(ofdm, ConstellationExtension(ceiling_db=5.0, rounds=3), source)
    pilots = np.flatnonzero(source.grid.indices > 0)
    assert np.max(np.abs(moves[:, pilots])) < 1e-5
    for first, subcarriers in ((0, range(-32, 0)), (1, range(-20, 0))):
        columns = np.searchsorted(source.grid.indices, list(subcarriers))
        sent, moved = want[first::2, columns], moves[first::2, columns]
        assert np.max(np.abs(moved)) > 0.02
        for column in range(columns.size):
            before = np.abs(sent[:, None, column] - sent[None, :, column])
            there = sent[:, column] + moved[:, column]
            after = np.abs(there[:, None] - there[None, :])
            differ = before > 1e-3
            assert np.min(after[differ] - before[differ]) > -1e-5


def test_spread_groups_stay_and_are_named(ofdm):
    spread = group("-32..-17", "qpsk", spreading="dft")
    source = ofdm.build("0", groups=(spread, group("-16..16", "qpsk")))
    signal, notes = ofdm.reduce(ConstellationExtension(ceiling_db=6.0), source)
    assert any(note.text.startswith("groups[0] is DFT-spread") for note in notes)
    assert signal.bodies.indices.tolist() == list(range(-16, 17))
    alone = ofdm.build("0", groups=(spread,))
    with pytest.raises(RecipeError) as caught:
        ofdm.reduce(ConstellationExtension(ceiling_db=6.0), alone)
    assert caught.value.where == "stages[0].kind"


def test_it_does_not_follow_selected_mapping(ofdm):
    turned, _ = ofdm.reduce(SelectedMapping(candidates=2), ofdm.build("-32..-1, 1..32"))
    with pytest.raises(RecipeError) as caught:
        ofdm.reduce(ConstellationExtension(ceiling_db=6.0), turned)
    assert "selected mapping" in caught.value.problem
