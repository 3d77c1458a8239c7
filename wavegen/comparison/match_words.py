"""What a comparison found, as a sentence."""

from __future__ import annotations

import math
from collections.abc import Sequence

from wavegen.comparison.difference import Difference, DifferenceRow
from wavegen.comparison.needed_samples import Needed
from wavegen.comparison.side import Side
from wavegen.core.units import format_s

_MILLION = 10**6


def called(first: Side, second: Side) -> tuple[str, str]:
    """Return what the sides are called: by their names where these tell them apart."""
    if first.name != second.name:
        return first.name, second.name
    return "the stimulus", "the field"


def statement(
    found: Difference,
    recorded: Difference,
    plans: Sequence[Needed],
    sides: tuple[Side, Side],
    *,
    is_of_records: bool = False,
) -> str:
    """Return the verdict as a sentence, the difference as recorded before what is not known.

    Parameters
    ----------
    found : Difference
        What decides.
    recorded : Difference
        Of the records as they stand.
    plans : sequence of Needed
        What would decide, of an undecided one.
    sides : (Side, Side)
        Both.
    is_of_records : bool
        Whether ``found`` is of the records as they stand, too.
    """
    first, second = called(*sides)
    reach = f"within {found.tolerance_db:g} dB down to {percent(found.down_to)}"
    lead = "as recorded, " if is_of_records else ""
    row = found.decisive
    if found.verdict == "match" or row is None:
        return f"match: {lead}{first} and {second} agree {reach}"
    if found.verdict == "differ":
        text = f"differ: {lead}{_stands(row, first, second)}"
        if row.widest_high_db - row.widest_low_db < 5e-3:
            return text
        return f"{text}, surely by {_bound(row.widest_low_db)} to {_bound(row.widest_high_db)} dB"
    text = f"undecided: {_as_recorded(recorded, first, second)}"
    text += f"whether {first} and {second} agree {reach} cannot be told"
    if is_of_records:
        return text
    return "; ".join([text, *(_more(plan, sides) for plan in plans[:2])])


def _as_recorded(recorded: Difference, first: str, second: str) -> str:
    row = recorded.decisive
    if recorded.verdict == "match":
        return f"as recorded they agree within {recorded.tolerance_db:g} dB; "
    if recorded.verdict == "undecided" or row is None:
        return ""
    chance = "which records this short may do by chance"
    return f"as recorded {_stands(row, first, second)}, {chance}; "


def _stands(row: DifferenceRow, first: str, second: str) -> str:
    side = "above" if row.difference_db > 0 else "below"
    size, place = abs(row.difference_db), percent(row.probability)
    return f"{first} stands {size:.2f} dB {side} {second} at {place}"


def _more(plan: Needed, sides: tuple[Side, Side]) -> str:
    """Say how much more would give one verdict, and on what condition."""
    times = float(f"{plan.times:.2g}")
    if plan.shows == "match":
        outcome = "a match, if they are alike"
    else:
        seen = f"{plan.difference_db:+.2f} dB at {percent(plan.at_probability)}"
        outcome = f"that they differ, if the {seen} are not by chance"
    more = [
        f"{_amount(count, side)} of {name}"
        for count, side, name in zip(
            (plan.first_samples, plan.second_samples), sides, called(*sides), strict=True
        )
        if count is not None
    ]
    return f"about {times:g} times as much, {' and '.join(more)} more, would show {outcome}"


def _amount(count: int, side: Side) -> str:
    """Write a number of samples to two figures, with the time that they take."""
    rough = float(f"{count:.2g}")
    text = f"{rough / _MILLION:g} million" if rough >= _MILLION else f"{rough:.0f}"
    text += " samples" if side.duty is None else " samples of on-time"
    if not side.sample_rate_hz:
        return text
    return f"{text} ({format_s(count / side.sample_rate_hz, digits=2)})"


def percent(probability: float) -> str:
    """Write a probability as percent, two figures."""
    return f"{100 * float(f'{probability:.2g}'):g} %"


def _bound(level_db: float) -> str:
    return f"{level_db:+.2f}" if math.isfinite(level_db) else "any"
