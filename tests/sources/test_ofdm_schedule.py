import pickle

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.sources.ofdm_schedule import Presence, present, states
from wavegen.sources.subcarriers import SymbolSet

PATTERN = np.array([True, False, False, True, True])


def test_ranks_and_places_agree_with_counting() -> None:
    presence = Presence(on=PATTERN)
    symbols = np.arange(-20, 60)
    on = PATTERN[symbols % 5]
    for first in range(-17, 30, 3):
        for count in (1, 2, 7, 19):
            window = (symbols >= first) & (symbols < first + count)
            places = presence.places(first, count)
            assert places is not None
            assert places.tolist() == np.flatnonzero(on[window]).tolist()
            assert presence.rank(first + count) - presence.rank(first) == places.size
    assert presence.rank(0) == 0
    assert presence.n_on == 3
    assert not presence.is_always


def test_always_on() -> None:
    presence = present(None, n_frame=4, where="x")
    assert presence.is_always
    assert presence.places(7, 9) is None
    assert presence.rank(9) == 9


def test_it_is_sent_without_what_it_counted() -> None:
    presence = Presence(on=PATTERN)
    before = len(pickle.dumps(presence))
    assert presence.rank(12) == 7
    packed = pickle.dumps(presence)
    assert len(packed) == before
    assert pickle.loads(packed).rank(12) == 7  # noqa: S301 - our own bytes


def test_symbols_of_a_frame() -> None:
    found = present(SymbolSet.parse("3..4, 0"), n_frame=5, where="x")
    assert found.on.tolist() == PATTERN.tolist()


@pytest.mark.parametrize("symbols", ["0..5", "7", "1..3, 2"])
def test_symbols_beyond_the_frame_or_twice_are_refused(symbols) -> None:
    with pytest.raises(RecipeError) as caught:
        present(SymbolSet.parse(symbols), n_frame=5, where="signal.groups[0].symbols")
    assert caught.value.where == "signal.groups[0].symbols"
    assert caught.value.remedy


def test_states_of_parts_together() -> None:
    on = [PATTERN, ~PATTERN, np.ones(5, np.bool_)]
    found, numbers = states([Presence(on=x) for x in on])
    assert found.shape == (2, 3)
    assert np.array_equal(found[numbers].T, on)
