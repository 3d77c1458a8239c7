"""The order of the walk: rates and loops of stages, and who says that there is no law."""

from dataclasses import dataclass, replace
from fractions import Fraction

from wavegen.core.site import Site
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.term import NoLaw
from wavegen.production.law_walk import law_of_recipe
from wavegen.production.prepare import find_loop
from wavegen.recipe.load import load_text

SITE = Site(sample_rate_hz=Fraction(8), n_samples=80, seed=1, label="signal", path="signal")


@dataclass(frozen=True)
class Source:
    seen: list

    def law(self, site):
        self.seen.append(("source", site.sample_rate_hz, site.n_samples, site.path))
        return ConstantLaw()


@dataclass(frozen=True)
class Halves:
    seen: list

    def upstream_rate(self, rate):
        return rate / 2

    def law(self, site, source):
        self.seen.append(("halves", site.sample_rate_hz, site.n_samples, site.path))
        return source

    def term(self, site, source):
        return source


@dataclass(frozen=True)
class Mute:
    pass


@dataclass(frozen=True)
class TwoWords:
    seen: list

    def law(self, site, source):
        self.seen.append("after")
        return source


def test_each_stage_is_asked_at_its_own_rate():
    seen = []
    found = law_of_recipe(Source(seen), (Halves(seen), Halves(seen)), SITE)
    assert isinstance(found, ConstantLaw)
    assert seen == [
        ("source", 2, 20, "signal"),
        ("halves", 4, 40, "stages[0]"),
        ("halves", 8, 80, "stages[1]"),
    ]


def test_a_stage_that_knows_nothing_ends_the_walk():
    seen = []
    found = law_of_recipe(Source([]), (Mute(), TwoWords(seen)), SITE)
    assert isinstance(found, NoLaw)
    assert "mute" in found.reason
    assert seen == []


def test_a_source_without_a_law_is_named_in_words():
    found = law_of_recipe(TwoWordsSource(), (), replace(SITE, n_samples=8))
    assert isinstance(found, NoLaw)
    assert found.reason.startswith("two words source")


@dataclass(frozen=True)
class TwoWordsSource:
    pass


SUM = """\
wavegen: 1
sample_rate: 8 MHz
duration: 1 ms
signal:
  kind: sum
  parts:
    - {frequency_offset: -1 MHz, signal: {kind: noise, bandwidth: 1 MHz}}
    - {frequency_offset: 1 MHz, signal: {kind: carrier}}
stages: [{kind: peak_windowing, ceiling: 6 dB}]
"""


def test_a_sum_that_ends_in_a_mute_stage_is_not_computed(monkeypatch):
    def refuse(term):
        raise AssertionError(term)

    monkeypatch.setattr("wavegen.production.law_walk.law_of_term", refuse)
    loaded = load_text(SUM, name="case")
    found = law_of_recipe(loaded.recipe.signal, loaded.recipe.stages, find_loop(loaded)[1][0][1])
    assert found == NoLaw(reason="complex Gaussian + carrier, then peak windowing, has no law")
