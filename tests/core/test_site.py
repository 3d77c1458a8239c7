import math
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavegen.core.errors import RecipeError
from wavegen.core.site import Cycle, Note, Site, common_cycle, samples_per


@pytest.fixture
def site(lab):
    return Site(sample_rate_hz=lab.rate_hz, n_samples=100, seed=1, label="one", path="signal")


class TestSite:
    def test_another_place_shares_the_loop_and_the_notes(self, site):
        there = site.at("signal.parts[0].signal", "carrier")
        assert (there.path, there.label) == ("signal.parts[0].signal", "carrier")
        assert (there.sample_rate_hz, there.n_samples, there.seed) == (10**6, 100, 1)
        there.notes.append(Note(kind="info", where=there.path, text="Heard."))
        assert [note.text for note in site.notes] == ["Heard."]

    def test_a_place_without_a_name_is_called_by_its_path(self, site):
        assert site.at("signal.parts[0]").label == "signal.parts[0]"

    @pytest.mark.parametrize(("key", "where"), [("level", "signal.level"), ("", "signal")])
    def test_an_error_knows_its_place(self, site, key, where):
        error = site.error(key, problem="p", allowed="a", remedy="R.")
        assert isinstance(error, RecipeError)
        assert (error.where, error.problem, error.allowed, error.remedy) == (where, "p", "a", "R.")

    def test_two_sites_do_not_share_notes(self, lab):
        first, second = (
            Site(sample_rate_hz=lab.rate_hz, n_samples=1, seed=1, label="x", path="x")
            for _ in range(2)
        )
        assert first.notes is not second.notes


def test_a_source_without_symbols_says_none():
    assert Cycle(n_samples=8).n_symbols == 0


@given(st.fractions(Fraction(1, 99), 10**9), st.fractions(Fraction(1, 99), 10**9))
def test_samples_per_is_exact_and_shortest(rate_hz, sample_rate_hz):
    n_samples, n_periods = samples_per(rate_hz, sample_rate_hz)
    assert n_samples / sample_rate_hz == n_periods / rate_hz
    assert math.gcd(n_samples, n_periods) == 1


def test_common_cycle_is_the_shortest_that_all_divide():
    assert common_cycle([120, 16, 9]) == 720
    assert common_cycle([7]) == 7
