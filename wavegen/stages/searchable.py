"""What a method of crest-factor reduction says of its settings to whoever searches them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True, slots=True, kw_only=True)
class Choice:
    """One setting and the values that a search may give it.

    Parameters
    ----------
    field : str
        Name of the field.
    values : tuple
        What it may be: in rising order of strength or cost where it is ordered.
    is_ordered : bool
        Whether neighbours in the list are alike, so that a search may go step by step.
    in_reciprocal_bands : bool
        Whether the values are lengths of time in units of one over the bandwidth.
    """

    field: str
    values: tuple[Any, ...]
    is_ordered: bool = True
    in_reciprocal_bands: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Searchable:
    """The settings of a method that may be searched, with their bounds.

    Parameters
    ----------
    ceiling_db : (float, float) or None
        Bounds of the field ``ceiling_db``: a lower one gives lower peaks and more distortion.
        None for a method without a ceiling.
    choices : tuple of Choice
        Everything else.
    pairs : str or int
        How many pairs of transforms each sample takes: a number, or the field that counts them.
    """

    ceiling_db: tuple[float, float] | None = (1.0, 20.0)
    choices: tuple[Choice, ...] = ()
    pairs: str | int = 0
