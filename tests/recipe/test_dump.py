"""What is written loads back to equal settings."""

import dataclasses
from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated, Any

import pytest
from hypothesis import HealthCheck, given
from hypothesis import settings as hypothesis_settings
from hypothesis import strategies as st

from wavegen.core.errors import RecipeError
from wavegen.core.registry import Member
from wavegen.recipe.checker import check
from wavegen.recipe.dump import dump
from wavegen.recipe.load import load_text
from wavegen.recipe.names import LONGEST
from wavegen.recipe.reader import read_tree
from wavegen.recipe.settings import Output
from wavegen.recipe.tables import Tables

SHARED = hypothesis_settings(
    suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=60, deadline=None
)

TEXT = """\
wavegen: 1
title: "Two carriers: a test"
seed: 9
sample_rate: 122.88 MHz
duration:
  at: 1/3 ms
  multiple: 16 samples
  most: 200 symbols
signal:
  kind: several
  parts:
    - signal: {kind: carrier, symbol_rate: 1625/6 kHz, level: -3.5 dB, prefix: 9/128}
      name: left
    - signal:
        kind: carrier
        symbol_rate: 1 MHz
        delays: [1 us, 1/3 s]
        used: -4..6
        note: "no: 1"
        pulse: {kind: round, roll_off: 0.35, span: 8 symbols}
        data: {kind: counted, first: 3}
    - signal: {kind: choosy}
stages: [{kind: ceiling, ceiling: 7.25 dB}]
bench:
  average_power_at_device: -10 dBm
  path: [{name: c, gain: -1.2 dB}, {name: dut, role: device, peak_limit: 27 dBm}]
output: {iq: [sigmf, {format: sound, datatype: float32, name: "1e3"}], average: -12.5 dBFS}
"""


def test_a_recipe_comes_back(tables: Tables) -> None:
    recipe = load_text(TEXT, tables=tables).recipe
    text = dump(recipe, tables=tables)
    again = load_text(text, tables=tables).recipe
    assert again == recipe
    assert dump(again, tables=tables) == text
    assert "symbol_rate: 1625/6 kHz" in text
    assert "sample_rate: 122.88 MHz" in text
    assert "averaged_over" not in text  # a default


def test_defaults_that_a_reader_looks_for_are_written(head: str, tables: Tables) -> None:
    recipe = load_text(head + "signal: choosy\n", tables=tables).recipe
    text = dump(recipe, tables=tables)
    assert text.splitlines() == [
        "wavegen: 1",
        "seed: 1",
        "sample_rate: 10 MHz",
        "duration: 1 ms",
        "signal: {kind: choosy}",
        "output: {peak: -1 dBFS}",
    ]
    assert load_text(text, tables=tables).recipe == recipe


@dataclass(frozen=True, slots=True, kw_only=True)
class Holder:
    """One member of a table."""

    signal: Annotated[Any, Member(("signal",))]


def through(signal: Any, tables: Tables) -> Any:
    text = dump(Holder(signal=signal), tables=tables)
    made, faults = check(read_tree(text)[0], Holder, tables=tables)
    assert not faults, (text, faults)
    return made.signal


rationals = st.fractions(Fraction(1, 10**6), 10**12, max_denominator=10**6)
floats = st.floats(-1e20, 1e20).filter(lambda x: x == 0 or abs(x) > 1e-20)


@SHARED
@given(
    rate=rationals,
    level=floats,
    prefix=rationals,
    order=st.integers(-(10**9), 10**9),
    is_offset=st.booleans(),
    mode=st.sampled_from(["even", "odd"]),
    delays=st.lists(rationals, max_size=3).map(tuple),
    corner=st.tuples(floats, floats),
)
def test_any_settings_come_back(tables: Tables, **values: Any) -> None:
    names = {
        "rate": "symbol_rate_hz",
        "level": "level_db",
        "prefix": "prefix_fraction",
        "delays": "delays_s",
    }
    carrier = tables["signal"][0].load("carrier")
    made = carrier(**{names.get(key, key): value for key, value in values.items()})
    assert through(made, tables) == made


printable = st.text(
    st.characters(exclude_categories=["Cc", "Cs", "Zl", "Zp"], exclude_characters="/\\"),
    max_size=LONGEST,
)


@SHARED
@given(note=printable | st.sampled_from(["no", "1", "1e3", "~", "true", "0x1", "", "- a", "a: b"]))
def test_any_text_comes_back(note: str, tables: Tables) -> None:
    if set(note) & set("\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069"):
        return
    carrier = tables["signal"][0].load("carrier")
    made = carrier(symbol_rate_hz=Fraction(1), note=note)
    assert through(made, tables) == made


def test_text_with_lines_comes_back(tables: Tables) -> None:
    carrier = tables["signal"][0].load("carrier")
    made = carrier(symbol_rate_hz=Fraction(1), note='a\n\tb "c" \\ # d\n')
    assert through(made, tables) == made


def test_a_value_without_text_is_told_by_its_place(tables: Tables) -> None:
    recipe = load_text(TEXT, tables=tables).recipe
    (stage,) = recipe.stages
    odd = dataclasses.replace(recipe, stages=(dataclasses.replace(stage, ceiling_db=1e-300),))
    with pytest.raises(RecipeError) as caught:
        dump(odd, tables=tables)
    assert caught.value.where == "stages[0].ceiling"


def test_settings_of_no_table_are_our_bug(tables: Tables) -> None:
    with pytest.raises(TypeError, match="none of the tables"):
        dump(Holder(signal=Output()), tables={**tables, "signal": ()})
