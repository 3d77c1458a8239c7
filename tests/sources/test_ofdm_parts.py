from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.site import Site
from wavegen.recipe.dump import dump
from wavegen.recipe.load import load_text
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm_parts import Group, Pilots, carry, part_of_group, part_of_pilots, pin
from wavegen.sources.rotation import Rotation
from wavegen.sources.subcarriers import IndexSet, PilotValues, SymbolSet


def site() -> Site:
    return Site(sample_rate_hz=Fraction(1), n_samples=1, seed=1, label="x", path="signal")


GROUP = Group(
    subcarriers=IndexSet.parse("-6..5"),
    constellation=Constellation.parse("qpsk"),
    level_db=-3.0,
    symbols=SymbolSet.parse("0, 2"),
)
LOPSIDED = Constellation.of_points([[1, 0], [0, 1]])


@pytest.mark.parametrize("spreading", [None, "dft"])
@pytest.mark.parametrize("rotation", ["0", "pi/2", "pi/3"])
@pytest.mark.parametrize("constellation", [Constellation.parse("qpsk"), LOPSIDED])
def test_moments_are_those_of_what_is_carried(spreading, rotation, constellation) -> None:
    group = replace(
        GROUP,
        spreading=spreading,
        rotation=Rotation.parse(rotation),
        constellation=constellation,
        symbols=None,
    )
    part = part_of_group(site(), "groups[0]", group, 1)
    n_symbols = 20_000
    carried = carry(site(), group, part, n_fft=16, n_symbols=n_symbols, scale=1.0)
    rows = np.zeros((n_symbols, 16), np.complex64)
    carried.write(rows, carried.rows(0, n_symbols), 0)
    values = rows[:, part.indices % 16].astype(complex)
    amplitude = 10 ** (-3 / 20)
    # Means of 20 000 symbols of amplitude 0.71: 5 sigma = 5 * 0.71 / sqrt(20000) = 0.025
    assert np.allclose(values.mean(axis=0), part.expected, atol=0.03)
    total = np.sum(np.abs(part.expected) ** 2) + part.variance
    assert total == pytest.approx(12 * amplitude**2)  # spreading and rotation leave the power
    assert np.allclose(np.sum(np.abs(values) ** 2, axis=1), total, rtol=1e-5)


def test_data_are_drawn_for_symbols_that_are_on() -> None:
    part = part_of_group(site(), "groups[3]", GROUP, 5)
    carried = carry(site(), GROUP, part, n_fft=64, n_symbols=20, scale=2.0)
    assert carried.data.period == 2 * 4 * 12  # type: ignore[attr-defined]
    assert carried.bins.tolist() == [58, 59, 60, 61, 62, 63, 0, 1, 2, 3, 4, 5]
    assert np.allclose(np.abs(carried.table), 2 * 10 ** (-3 / 20))
    assert carried.rotation is None


def test_pilots_on_their_bins() -> None:
    pilots = Pilots(
        subcarriers=IndexSet.parse("-7, 7"),
        values=PilotValues.parse([1, -1]),
        level_db=6.0,
        symbols=SymbolSet.parse(1),
    )
    part = part_of_pilots(site(), "pilots[0]", pilots, 3)
    pinned = pin(part, n_fft=64, scale=0.5)
    assert pinned.bins.tolist() == [57, 7]
    assert np.allclose(pinned.values, np.array([0.5, -0.5]) * 10**0.3, rtol=1e-6)
    assert pinned.presence.on.tolist() == [False, True, False]


@pytest.mark.parametrize(
    ("subcarriers", "n_notes"),
    [("0..11", 0), ("0..1199 by 2", 0), ("0..13", 1), ("-6..-1, 1..6", 1), ("1..3, 5..8", 2)],
)
def test_unusual_spreading_is_told(subcarriers, n_notes) -> None:
    place = site()
    group = replace(GROUP, subcarriers=IndexSet.parse(subcarriers))
    part_of_group(place, "groups[0]", group, 3)
    assert not place.notes
    part_of_group(place, "groups[0]", replace(group, spreading="dft"), 3)
    assert [note.kind for note in place.notes] == ["info"] * n_notes
    assert {note.where for note in place.notes} <= {"signal.groups[0].subcarriers"}


@pytest.mark.parametrize(
    ("change", "key"),
    [
        ({"subcarriers": IndexSet(())}, "subcarriers"),
        ({"symbols": SymbolSet.parse("0..3")}, "symbols"),
    ],
)
def test_what_cannot_be_is_an_error_at_its_key(change, key) -> None:
    with pytest.raises(RecipeError) as caught:
        part_of_group(site(), "groups[1]", replace(GROUP, **change), 3)
    assert caught.value.where == f"signal.groups[1].{key}"


RECIPE = """\
wavegen: 1
sample_rate: 1.92 MHz
duration: 14 symbols
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  cyclic_prefix: [10/128, 6 x 9/128]
  frame: 14 symbols
  half_subcarrier_shift: true
  groups:
    - {subcarriers: "-36..-25", constellation: bpsk, rotation: pi/2, spreading: dft}
    - {subcarriers: "0..35", constellation: 16qam, symbols: "0..2, 4..13 by 3", spreading: dft}
  pilots:
    - {subcarriers: "0..35", values: {random: qpsk}, symbols: 3}
"""


def test_recipes_hold_spreading_schedule_and_shift() -> None:
    recipe = load_text(RECIPE).recipe
    signal = recipe.signal
    assert signal.frame_symbols == 14
    assert signal.half_subcarrier_shift is True
    assert signal.groups[0].rotation == Rotation(Fraction(1, 4))
    assert [group.spreading for group in signal.groups] == ["dft", "dft"]
    assert signal.groups[1].symbols.numbers == (0, 1, 2, 4, 7, 10, 13)
    assert signal.pilots[0].symbols.numbers == (3,)
    text = dump(recipe)
    again = load_text(text).recipe
    assert again == recipe
    assert dump(again) == text
    assert signal.cycle(Fraction(1_920_000), "signal").n_symbols == 14


@pytest.mark.parametrize(
    ("old", "new", "where"),
    [
        ("frame: 14 symbols", "frame: 14", "signal.frame"),
        ("frame: 14 symbols", "frame: 0 symbols", "signal.frame"),
        ("frame: 14 symbols", "frame: 1.5 symbols", "signal.frame"),
        ("spreading: dft}", "spreading: fft}", "signal.groups[0].spreading"),
        ("rotation: pi/2", "rotation: 1/2", "signal.groups[0].rotation"),
        ("symbols: 3", "symbols: -3", "signal.pilots[0].symbols"),
        ("half_subcarrier_shift: true", "half_subcarrier_shift: 1/2", "half_subcarrier_shift"),
    ],
)
def test_odd_values_are_told_at_their_place(old, new, where) -> None:
    with pytest.raises(RecipeError) as caught:
        load_text(RECIPE.replace(old, new, 1))
    assert where in str(caught.value)
