"""What settings are told when they become a signal, and what they tell back."""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace
from fractions import Fraction
from pathlib import Path
from typing import Literal, Protocol

from wavegen.core.errors import RecipeError
from wavegen.core.signal import Signal


@dataclass(frozen=True, slots=True, kw_only=True)
class Note:
    """Something legal that the user should know: what was rounded, or a doubtful choice.

    Parameters
    ----------
    kind : {"rounded", "warning", "info"}
        ``rounded`` carries old and new value.
    where : str
        Path in the recipe.
    text : str
        One sentence.
    asked, given : str, optional
        Old and new value, with unit.
    """

    kind: Literal["rounded", "warning", "info"]
    where: str
    text: str
    asked: str | None = None
    given: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Cycle:
    """The shortest loop of a source at a sample rate.

    Parameters
    ----------
    n_samples : int
        Samples in it; every loop is a whole multiple.
    n_symbols : int
        Symbols in it; 0 for a source without symbols.
    n_data_periods : int
        Whole periods of the data in it; 0 where that was not asked or they have none.
    """

    n_samples: int
    n_symbols: int = 0
    n_data_periods: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Site:
    """Where a signal is built: the loop, and who it is.

    Parameters
    ----------
    sample_rate_hz : Fraction
        Exact rate, Hz.
    n_samples : int
        Samples in the loop: a whole multiple of the source's own cycle.
    seed : int
        Seed of the recipe.
    label : str
        Name of the part (else its path): names its random data.
    path : str
        Path in the recipe, for messages: ``signal.parts[0].signal``.
    folder : Path
        Folder that paths in the recipe are relative to.
    notes : list of Note
        Filled by whoever builds.
    """

    sample_rate_hz: Fraction
    n_samples: int
    seed: int
    label: str
    path: str
    folder: Path = field(default_factory=Path)
    notes: list[Note] = field(default_factory=list)

    def at(self, path: str, label: str | None = None) -> Site:
        """Return the same site at another place of the recipe."""
        return replace(self, path=path, label=label or path)

    def error(self, key: str, *, problem: str, allowed: str, remedy: str) -> RecipeError:
        """Return (not raise) an error about one key of the settings at this place."""
        where = f"{self.path}.{key}" if key else self.path
        return RecipeError(where=where, problem=problem, allowed=allowed, remedy=remedy)


class SourceSettings(Protocol):
    """What every member of SOURCES is: a frozen dataclass of settings.

    Optional: ``law(site)``, the distribution of the envelope, and ``term(site)``, what the source
    is to a composite; either may be a :class:`wavegen.laws.term.NoLaw` that says why.
    """

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return the shortest loop; raise RecipeError (at ``path``) where none fits."""

    def build(self, site: Site) -> Signal:
        """Return the signal; unit mean power, cyclic over ``site.n_samples``."""


class StageSettings(Protocol):
    """What every member of STAGES is.

    A stage that has a say in the loop's length also has ``cycle``, as sources have; one whose
    input runs at another rate has ``upstream_rate``; one that knows what becomes of a law or of a
    part of a composite has ``law(site, source)`` or ``term(site, source)``: see
    :mod:`wavegen.stages.chain`.
    """

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal after this stage."""


def samples_per(rate_hz: Fraction, sample_rate_hz: Fraction) -> tuple[int, int]:
    """Return ``(a, b)`` in lowest terms: ``a`` samples hold ``b`` periods of a rate.

    Examples
    --------
    >>> samples_per(Fraction(812500, 3), Fraction(2500000))
    (120, 13)
    """
    ratio = sample_rate_hz / rate_hz
    return ratio.numerator, ratio.denominator


def common_cycle(cycles: list[int]) -> int:
    """Return the shortest loop that is whole for all, samples."""
    return math.lcm(*cycles)
