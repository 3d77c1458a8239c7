"""The order of the walk: rates and loops of stages, and who says that there is no law."""

from dataclasses import dataclass, replace
from fractions import Fraction

import pytest

from wavegen.core.site import Site
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.hoyt import HoytLaw
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


NOISE = "{kind: noise, bandwidth: 1 MHz}"
QPSK = (
    "{kind: single_carrier, constellation: qpsk, symbol_rate: 1 MHz, "
    "pulse: {kind: root_raised_cosine, roll_off: 0.22}}"
)
IMAGE, OFFSET = "{kind: iq_imbalance, gain: 3 dB}", "{kind: dc_offset, level: -10 dB}"


def law_text(signal, *stages):
    text = f"wavegen: 1\nsample_rate: 4 MHz\nduration: 2 ms\nsignal: {signal}\n"
    text += f"stages: [{', '.join(stages)}]\n"
    loaded = load_text(text, name="case", overrides=())
    _, ((channel, site),) = find_loop(loaded)
    return law_of_recipe(channel.recipe.signal, channel.recipe.stages, site)


def summed(*parts):
    rows = [f"{{signal: {one}, frequency_offset: {hz} Hz}}" for one, hz in parts]
    return f"{{kind: sum, parts: [{', '.join(rows)}]}}"


def test_what_treats_rails_apart_is_asked_for_terms():
    filtered = law_text(NOISE, "{kind: filter, bandwidth: 500 kHz}", IMAGE)
    assert isinstance(filtered, HoytLaw)  # the filter tells no power to a part, but a law
    assert isinstance(law_text(NOISE, IMAGE), HoytLaw)
    both = law_text(NOISE, IMAGE, OFFSET, "{kind: clip, ceiling: 7 dB}")
    assert both.name == "complex Gaussian, with its image, with a DC offset, clipped"
    assert both.peak_db == pytest.approx(7.0, abs=1e-9)
    assert law_text(QPSK, OFFSET).name.endswith("with a DC offset")
    assert isinstance(law_text("{kind: carrier}", IMAGE, OFFSET), ConstantLaw)


def test_directions_that_are_not_told_leave_no_law_by_name():
    assert "with its image, has no law" in law_text(QPSK, IMAGE).reason
    turned = summed((QPSK, 500_000))
    assert "with a DC offset, has no law" in law_text(turned, OFFSET).reason
    noisy = summed((NOISE, 500_000), (NOISE, -500_000))
    assert law_text(noisy, OFFSET).name == "complex Gaussian + complex Gaussian, with a DC offset"
    gate = "{kind: gate, duty: 50 %, period: 1 ms}"
    assert "gated, the whole, with its image" in law_text(NOISE, gate, IMAGE).reason


def test_the_steps_of_a_converter_pass_a_law():
    steps = "{kind: quantise, bits: 14, full_scale: 9 dB}"
    law = law_text(NOISE, "{kind: clip, ceiling: 8 dB}", steps)
    assert law.name == "complex Gaussian, clipped, then 14 bits"
    assert law.peak_db == pytest.approx(8.0, abs=1e-9)
    assert "then 8 bits" in law_text(NOISE, "{kind: quantise, bits: 8}").reason
