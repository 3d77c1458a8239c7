"""Sides that are switched on and off, compared as a whole: what that makes doubtful."""

from __future__ import annotations

from wavegen.comparison.look_alike import plateau_duty
from wavegen.comparison.match_words import called
from wavegen.comparison.side import Side

FEWEST_BURSTS = 10
"""As runs above a level: of fewer nothing is known of how one burst differs from the next."""


def share_of_time_on(side: Side) -> float | None:
    """Return the share of time that a side is on, if its off-times were measured with it.

    None of a gated side, and where there are no samples or no off-times are seen.
    """
    if side.signal is None or side.duty is not None:
        return None
    return plateau_duty(side.curve)


def off_time_doubts(sides: tuple[Side, Side]) -> list[str]:
    """Return what is doubtful about off-times, compared on one side or on both, and few bursts."""
    found = [
        f"{name} holds {len(side.bursts.runs)} bursts only: what changes from burst to burst is "
        "not in its intervals"
        for name, side in zip(called(*sides), sides, strict=True)
        if side.bursts is not None and not side.loops and len(side.bursts.runs) < FEWEST_BURSTS
    ]
    if (sides[0].duty is None) != (sides[1].duty is None):
        gated, whole = sides if sides[0].duty is not None else sides[::-1]
        text = (
            f"of {gated.name} the on-time is compared ({100 * (gated.duty or 0):.3g} % of the "
            f"time), of {whole.name} all of the time"
        )
        return [*found, text]
    shares = [share_of_time_on(side) for side in sides]
    return found + [
        f"{name} is on for {100 * share:.2g} % of the time only, and off-times are compared with "
        "it: --gate auto compares the on-times alone"
        for name, share in zip(called(*sides), shares, strict=True)
        if share is not None
    ]
