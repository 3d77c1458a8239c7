from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.site import Site
from wavegen.sources.ofdm_occupancy import check_subcarriers, note_idle
from wavegen.sources.ofdm_power import Part
from wavegen.sources.ofdm_schedule import Presence


def site() -> Site:
    return Site(sample_rate_hz=Fraction(1), n_samples=1, seed=1, label="x", path="signal")


def part(key: str, indices, on=(1, 1, 1)) -> Part:
    return Part(
        key=key,
        indices=np.array(indices),
        expected=np.zeros(len(indices), np.complex128),
        variance=float(len(indices)),
        presence=Presence(on=np.array(on, np.bool_)),
    )


def test_subcarriers_in_use_in_any_symbol() -> None:
    parts = [
        part("groups[0]", [3, -1, 2], (1, 0, 0)),
        part("groups[1]", [2, 5], (0, 1, 1)),
        part("pilots[0]", [0]),
    ]
    assert check_subcarriers(site(), parts, 16).tolist() == [-1, 0, 2, 3, 5]


@pytest.mark.parametrize(
    ("parts", "key", "words"),
    [
        ([], "groups", "neither"),
        ([part("groups[0]", [1, 8])], "groups[0].subcarriers", "outside"),
        ([part("groups[0]", [-9, 1])], "groups[0].subcarriers", "outside"),
        ([part("groups[0]", [4, 1, 4])], "groups[0].subcarriers", "subcarrier 4 is listed twice"),
        (
            [part("groups[0]", [1, 2], (1, 1, 0)), part("pilots[0]", [2, 3], (0, 1, 0))],
            "pilots[0].subcarriers",
            "subcarrier 2 is in use by groups[0] too in symbol 1",
        ),
        (
            [part("groups[0]", [1, 2]), part("groups[1]", [2])],
            "groups[1].subcarriers",
            "groups[0] too",
        ),
    ],
)
def test_what_cannot_be_is_an_error_at_its_key(parts, key, words) -> None:
    with pytest.raises(RecipeError) as caught:
        check_subcarriers(site(), parts, 16)
    assert caught.value.where == f"signal.{key}"
    assert words in caught.value.problem
    assert caught.value.remedy


def test_silent_symbols_are_told() -> None:
    place = site()
    note_idle(place, [part("groups[0]", [1], (1, 0, 1)), part("groups[1]", [1], (0, 1, 0))])
    assert not place.notes
    note_idle(place, [part("groups[0]", [1], (1, 0, 0, 0))])
    (note,) = place.notes
    assert (note.kind, note.where) == ("info", "signal.frame")
    assert "3 of 4 symbols" in note.text
    assert "6.02 dB" in note.text
