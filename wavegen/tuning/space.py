"""What may be set of a method: its ceiling between bounds, and lists of values for the rest."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass, replace
from decimal import Decimal
from fractions import Fraction
from typing import Any

from wavegen.core.site import StageSettings
from wavegen.core.timespan import TimeSpan
from wavegen.core.units import QuantityError
from wavegen.stages import STAGES
from wavegen.stages.searchable import Choice, Searchable
from wavegen.tuning.search import Index

REFERENCE = "projection"
"""The method that the others are compared with: no signal under the same ceiling has less error."""
CEILING = "ceiling_db"
CEILING_DIGITS = 3


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Axis:
    """One setting and the values that it may have.

    Parameters
    ----------
    field : str
        Its name.
    values : tuple
        In order.
    is_ordered : bool
        Whether neighbours are alike.
    """

    field: str
    values: tuple[Any, ...]
    is_ordered: bool


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Space:
    """All that may be set of one method.

    Parameters
    ----------
    kind : str
        Its name in recipes.
    base : stage settings
        What is not searched.
    axes : tuple of Axis
        What is.
    start : tuple of int
        Where the base stands on the axes.
    low_db, high_db : float or None
        Bounds of the ceiling; None for a method without one.
    pairs : str or int
        Pairs of transforms a sample: a number, or the field that counts them.
    """

    kind: str
    base: StageSettings
    axes: tuple[Axis, ...]
    start: Index
    low_db: float | None
    high_db: float | None
    pairs: str | int

    @property
    def has_ceiling(self) -> bool:
        """Whether there is a ceiling to be searched."""
        return self.low_db is not None

    def stage(self, index: Index, ceiling_db: float | None = None) -> StageSettings:
        """Return the settings at a place.

        Raises
        ------
        QuantityError
            Values that do not go together.
        """
        changes: dict[str, Any] = {
            axis.field: axis.values[place] for axis, place in zip(self.axes, index, strict=True)
        }
        if ceiling_db is not None:
            changes[CEILING] = round(float(ceiling_db), CEILING_DIGITS)
        made: StageSettings = replace(self.base, **changes)  # type: ignore[type-var] # a dataclass
        return made

    def told(self, stage: StageSettings) -> dict[str, Any]:
        """Return what was searched of a stage as JSON values, by the names of its fields."""
        names = [CEILING] if self.has_ceiling else []
        names += [axis.field for axis in self.axes]
        return {name: _json(getattr(stage, name)) for name in names}

    def pairs_of(self, stage: StageSettings) -> float:
        """Return how many pairs of transforms a sample takes."""
        return float(getattr(stage, self.pairs) if isinstance(self.pairs, str) else self.pairs)


def searchable_kinds() -> tuple[str, ...]:
    """Return every method that says how it may be searched, by its name in recipes."""
    return tuple(kind for kind in STAGES if hasattr(STAGES.load(kind), "search"))


def space_of(
    kind: str, present: StageSettings | None, *, band_hz: float, highest_db: float
) -> Space | str:
    """Return what may be set of a method for a signal.

    Parameters
    ----------
    kind : str
        Its name in recipes.
    present : stage settings or None
        What the recipe has in that place: of the same kind its other settings are kept.
    band_hz : float
        Width of the band, Hz.
    highest_db : float
        Peak of the untouched signal over its mean, dB: no ceiling need be higher.

    Returns
    -------
    Space or str
        Why there is none: the method needs settings that a search cannot choose.
    """
    method = STAGES.load(kind)
    about: Searchable = method.search
    bounds = about.ceiling_db
    low = high = None
    needed: dict[str, Any] = {}
    if bounds is not None:
        low, high = bounds[0], max(min(bounds[1], highest_db + 0.1), bounds[0])
        needed[CEILING] = high
    if isinstance(present, method):
        base = present
    else:
        try:
            base = method(**needed)
        except (TypeError, QuantityError) as error:
            why = error.problem if isinstance(error, QuantityError) else "it needs more settings"
            return f"{why}: put it into the recipe with the settings that it needs"
    axes, start = [], []
    for choice in about.choices:
        axis, place = _axis(choice, getattr(base, choice.field), method, band_hz)
        axes.append(axis)
        start.append(place)
    return Space(
        kind=kind,
        base=base,
        axes=tuple(axes),
        start=tuple(start),
        low_db=low,
        high_db=high,
        pairs=about.pairs,
    )


def _axis(choice: Choice, held: Any, method: Any, band_hz: float) -> tuple[Axis, int]:
    """Return the axis of a choice with the value held on it, and where that stands."""
    values = list(choice.values)
    if choice.in_reciprocal_bands:
        values = [_span(Fraction(str(value)), band_hz) for value in values]
    if held is None:
        held = values[_default_place(choice, method)]
    if held not in values:
        values.append(held)
        if choice.is_ordered:
            values.sort(key=_size)
    return Axis(field=choice.field, values=tuple(values), is_ordered=choice.is_ordered), (
        values.index(held)
    )


def _default_place(choice: Choice, method: Any) -> int:
    """Return where a setting without a default begins: in the middle of its list."""
    fields = {item.name: item for item in dataclasses.fields(method)}
    default = fields[choice.field].default
    return choice.values.index(default) if default in choice.values else len(choice.values) // 2


def _span(in_bands: Fraction, band_hz: float) -> TimeSpan:
    """Return a length of time in units of one over the band, to three digits."""
    seconds = float(in_bands) / band_hz
    return TimeSpan(Fraction(Decimal(f"{seconds:.2e}")), "s")


def _size(value: Any) -> Any:
    return value.value if isinstance(value, TimeSpan) else value


def _json(value: Any) -> Any:
    if isinstance(value, bool | int | float | str) or value is None:
        return value
    return float(value) if isinstance(value, Fraction) else str(value)
