"""Bounds hold on their edges, and say what they allow."""

from fractions import Fraction
from typing import Annotated, Any

import pytest
from annotated_types import Ge, Gt, Interval, Le, Len, Lt, MaxLen, MinLen, MultipleOf, Predicate

from wavegen.recipe.bounds import bounds_broken

EVEN = Predicate(lambda n: n % 2 == 0)


@pytest.mark.parametrize(
    ("hint", "within", "outside", "allowed"),
    [
        (Annotated[float, Ge(0), Le(1)], 0.0, -5e-324, "at least 0 s and at most 1 s"),
        (Annotated[float, Gt(0)], 5e-324, 0.0, "above 0 s"),
        (Annotated[Fraction, Lt(1)], Fraction(999, 1000), Fraction(1), "below 1 s"),
        (Annotated[Fraction, Ge(1)], Fraction(1), Fraction(999, 1000), "at least 1 s"),
        (Annotated[int, Le(2**63 - 1)], 2**63 - 1, 2**63, "at most 9223372036854775807 s"),
        (Annotated[float, Interval(gt=0, le=2)], 2.0, 0.0, "above 0 s and at most 2 s"),
        (Annotated[int, MultipleOf(4)], 8, 6, "a multiple of 4 s"),
        (Annotated[tuple[int, ...], MinLen(1)], (1,), (), "a length of at least 1"),
        (Annotated[tuple[int, ...], MaxLen(1)], (1,), (1, 2), "a length of at most 1"),
        (
            Annotated[str, Len(1, 2)],
            "a",
            "abc",
            "a length of at least 1 and a length of at most 2",
        ),
        (Annotated[int, EVEN], 2, 3, "values within the bounds of this key"),
    ],
)
def test_edges(hint: Any, within: object, outside: object, allowed: str) -> None:
    assert bounds_broken(within, hint, "s") is None
    assert bounds_broken(outside, hint, "s") == allowed


def test_without_bounds_all_is_within() -> None:
    assert bounds_broken(3.0, float, "") is None
    assert bounds_broken(3.0, Annotated[float, "a word"], "") is None


def test_without_unit_the_number_stands_alone() -> None:
    assert bounds_broken(3.0, Annotated[float, Le(1)], "") == "at most 1"
