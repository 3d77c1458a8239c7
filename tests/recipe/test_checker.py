"""Text to settings by type hints: what is read, and what the settings then hold."""

import json
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from typing import Annotated, Any

import pytest
from annotated_types import Ge, Gt, Le, MultipleOf, Predicate
from hypothesis import HealthCheck, given
from hypothesis import settings as hypothesis_settings
from hypothesis import strategies as st

from wavegen.core.registry import Member
from wavegen.recipe.checker import check, fields_of, join
from wavegen.recipe.reader import read_tree
from wavegen.recipe.tables import Tables
from wavegen.recipe.tree import Fault

SHARED = hypothesis_settings(suppress_health_check=[HealthCheck.function_scoped_fixture])


def read(text: str, settings: type[Any], tables: Tables) -> tuple[Any, list[Fault]]:
    return check(read_tree(text)[0], settings, tables=tables)


@dataclass(frozen=True, kw_only=True)
class Holder:
    """A mapping with one member of a table."""

    signal: Annotated[Any, Member(("signal",))]


def carrier(pair: str, tables: Tables) -> Any:
    text = f"signal: {{kind: carrier, symbol_rate: 1 MHz, {pair}}}"
    made, faults = read(text, Holder, tables)
    assert not faults
    return made.signal


@pytest.mark.parametrize(
    ("pair", "field", "value"),
    [
        ("level: -3 dB", "level_db", -3.0),
        ("level: 1/3 dB", "level_db", 1 / 3),
        ('level: "-3 dB"', "level_db", -3.0),
        ("prefix: 144/2048", "prefix_fraction", Fraction(9, 128)),
        ("prefix: 0.1", "prefix_fraction", Fraction(1, 10)),
        ('prefix: "144/2048"', "prefix_fraction", Fraction(9, 128)),
        ("ratio: 13/48", "ratio", Fraction(13, 48)),
        ("ratio: 0.3", "ratio", Fraction(3, 10)),
        ("weight: 10", "weight", 10.0),
        ("order: 1e1", "order", 10),
        ("order: 16/2", "order", 8),
        ("is_offset: True", "is_offset", True),
        ("mode: odd", "mode", "odd"),
        ("note: no", "note", "no"),
        ("note: '12'", "note", "12"),
        ("note: null", "note", None),
        ("note: ~", "note", None),
        ("window: 5 µs", "window_s", Fraction(5, 10**6)),
        ("window: null", "window_s", None),
        ("delays: []", "delays_s", ()),
        ("delays: [1 us, 1/3 s]", "delays_s", (Fraction(1, 10**6), Fraction(1, 3))),
        ("corner: [1, -0.5]", "corner", (1.0, -0.5)),
    ],
)
def test_values_are_read_by_their_type(
    pair: str, field: str, value: object, tables: Tables
) -> None:
    made = getattr(carrier(pair, tables), field)
    assert made == value
    assert type(made) is type(value)


def test_members_by_name_by_mapping_and_by_default(tables: Tables) -> None:
    assert type(carrier("pulse: square", tables).pulse).__name__ == "Square"
    assert carrier("pulse: round", tables).pulse.roll_off == 0.22
    made = carrier("pulse: {kind: round, roll_off: 1, span: 8 symbols}", tables).pulse
    assert (made.roll_off, made.span_symbols) == (1.0, 8)
    assert carrier("data: {share: other}", tables).data.share == "other"
    assert type(carrier("data: {kind: counted, first: 2}", tables).data).__name__ == "Counted"


def test_parsed_types_read_their_notation(tables: Tables) -> None:
    used = carrier("used: -4..6", tables).used
    assert (used.low, used.high) == (-4, 6)


@dataclass(frozen=True, slots=True, kw_only=True)
class Rate:
    """One exact value."""

    symbol_rate_hz: Annotated[Fraction, Gt(0)]
    roll_off: Annotated[float, Ge(0), Le(1)] = 0.22
    count: Annotated[int, MultipleOf(4)] = 4
    odd: Annotated[int, Predicate(lambda n: n % 2 == 1)] = 1


@given(
    number=st.decimals(0, 10**9, allow_nan=False, places=6).filter(bool),
    unit=st.sampled_from([("Hz", 0), ("kHz", 3), ("MHz", 6), ("GHz", 9)]),
)
def test_exact_decimals_stay_exact(number: Decimal, unit: tuple[str, int]) -> None:
    made, faults = read(f"symbol_rate: {number:f} {unit[0]}", Rate, {})
    assert not faults
    assert made.symbol_rate_hz == Fraction(number) * 10 ** unit[1]


@given(above=st.integers(1, 10**12), below=st.integers(1, 10**12))
def test_ratios_stay_exact(above: int, below: int) -> None:
    made, _ = read(f"symbol_rate: {above}/{below} kHz", Rate, {})
    assert made.symbol_rate_hz == Fraction(above, below) * 1000


@given(value=st.floats(-5, 5).filter(lambda x: x == 0 or abs(x) > 1e-90))
def test_bounds_hold_at_every_value(value: float) -> None:
    made, faults = read(f"{{symbol_rate: 1 Hz, roll_off: {value!r}}}", Rate, {})
    if 0 <= value <= 1:
        assert made.roll_off == value
    else:
        assert [fault.path for fault in faults] == ["roll_off"]
        assert faults[0].allowed == "at least 0 and at most 1"


def test_other_bounds_are_kept_too() -> None:
    assert read("{symbol_rate: 1 Hz, count: 8, odd: 3}", Rate, {})[1] == []
    _, faults = read("{symbol_rate: 1 Hz, count: 6, odd: 4}", Rate, {})
    assert [fault.path for fault in faults] == ["count", "odd"]
    assert faults[0].allowed == "a multiple of 4"
    assert faults[1].allowed


def test_nothing_is_made_where_there_is_a_fault() -> None:
    made, faults = read("{symbol_rate: 1}", Rate, {})
    assert made is None
    assert len(faults) == 1


@dataclass(frozen=True, kw_only=True)
class Either:
    """A choice of notations."""

    how: tuple[float, ...] | float | None = None


def test_a_union_takes_the_arm_that_fits() -> None:
    assert read("{how: [1, 2]}", Either, {})[0].how == (1.0, 2.0)
    assert read("{how: 3}", Either, {})[0].how == 3.0
    assert read("{how: }", Either, {})[0].how is None
    _, faults = read("{how: [1, x]}", Either, {})
    assert [fault.path for fault in faults] == ["how[1]"]


@dataclass(frozen=True, kw_only=True)
class Strange:
    """A hint that no recipe can hold."""

    thing: bytes = b""


def test_a_hint_that_no_recipe_holds_is_our_bug() -> None:
    with pytest.raises(TypeError, match="thing"):
        read("thing: x", Strange, {})


def test_keys_and_paths() -> None:
    assert list(fields_of(Rate)) == ["symbol_rate", "roll_off", "count", "odd"]
    assert join("a", "[2]") == "a[2]"


json_like = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=5),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=5), inner),
    max_leaves=6,
)


@SHARED
@given(position=st.integers(0, 16), value=json_like)
def test_any_value_is_read_or_told(position: int, value: object, tables: Tables) -> None:
    keys = [*fields_of(tables["signal"][0].load("carrier")), "kind", "other"]
    key = keys[position % len(keys)]
    text = json.dumps({"signal": {"kind": "carrier", key: value}})
    text = text.replace("NaN", ".nan").replace("Infinity", ".inf")
    made, faults = read(text, Holder, tables)
    assert (made is None) == bool(faults)
    for fault in faults:
        assert fault.path.startswith("signal")
        assert fault.problem
        assert fault.allowed
        assert fault.remedy
