"""Data that repeat too soon for the probability that is asked for."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import fields, is_dataclass
from typing import Any

from wavegen.core.site import Note
from wavegen.dsp.prbs import PRBS
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw
from wavegen.production.prepare import Prepared
from wavegen.sources.carrier_law import finite_pattern

EVENTS = 10
"""Places of a pattern that a level needs beyond it, before the pattern speaks for random data."""


def short_patterns(
    channels: Sequence[Prepared], laws: Sequence[Law | NoLaw], *, down_to: float
) -> list[Note]:
    """Return a note for each pattern that is too short for a probability.

    Parameters
    ----------
    channels : sequence of Prepared
        One or two.
    laws : sequence of (Law or NoLaw)
        Of each; a constant envelope is the same for all data.
    down_to : float
        Least probability that the loop shall speak of.

    Returns
    -------
    list of Note
        One for each sequence of bits, where it is met first.

    Notes
    -----
    A pattern of n bits has no more than n different places. What random data do with probability
    q is met at ``q n`` of them, so that it shows the process down to ``10 / n`` at best, whether
    the loop holds it once or a hundred times.
    """
    found: dict[str, Note] = {}
    for channel, law in zip(channels, laws, strict=True):
        if isinstance(law, ConstantLaw):
            continue
        for where, data in _data_in(channel.loaded.recipe.signal, channel.site.path):
            repeats = finite_pattern(data, channel.site.folder)
            if repeats is None or EVENTS / repeats[0] <= down_to:
                continue
            bits, called = repeats
            found.setdefault(
                called, Note(kind="warning", where=where, text=_text(bits, called, down_to))
            )
    return list(found.values())


def _data_in(value: Any, path: str) -> Iterator[tuple[str, Any]]:
    """Give the data of each part, and where they stand in the recipe."""
    if isinstance(value, tuple):
        for number, item in enumerate(value):
            yield from _data_in(item, f"{path}[{number}]")
    elif hasattr(value, "period_bits"):
        yield path, value
    elif is_dataclass(value):
        for field in fields(value):
            yield from _data_in(getattr(value, field.name), f"{path}.{field.name}")


def _text(bits: int, called: str, down_to: float) -> str:
    wanted = EVENTS / down_to
    speaks = (
        f"speak for random data down to {100 * EVENTS / bits:.3g} %"
        if bits > EVENTS
        else "say nothing of random data"
    )
    longer = min(
        ((made.period, name) for name, made in PRBS.items() if made.period >= wanted), default=None
    )
    remedy = (
        f"{longer[1]} has {longer[0]}, and random data never repeat"
        if longer
        else ("only random data do that")
    )
    return (
        f"{called} repeats after {bits} bits: levels of this loop are those of the pattern and "
        f"{speaks}, while {100 * down_to:.3g} % is asked, which takes {wanted:.3g} bits: {remedy}"
    )
