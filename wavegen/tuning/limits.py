"""What a tuned signal must keep, and by how much it does."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Annotated

from annotated_types import Ge, Gt

from wavegen.core.errors import ArgumentsError
from wavegen.meters.limits import evm_limit, evm_limit_of
from wavegen.tuning.evaluation import Evaluation

UNLIMITED_DB = 60.0
"""Margins are counted up to this: beyond, more says nothing."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Limits:
    """What is to be kept.

    Parameters
    ----------
    evm_percent : float, optional
        Highest RMS EVM of every source, percent.
    evm_standard : str, optional
        Instead: a standard whose limit for its constellation each group keeps.
    reserve_percent : float
        EVM that the rest of the chain adds, percent; taken off by root-sum-square.
    aclr_db : float, optional
        Least ratio in every adjacent channel, dB.
    keeps_channel_limits : bool
        Whether the channels' own limits, those of their standard, are kept.
    keeps_mask : bool
        Whether a mask is kept.
    """

    evm_percent: Annotated[float, Gt(0)] | None = None
    evm_standard: str | None = None
    reserve_percent: Annotated[float, Ge(0)] = 0.0
    aclr_db: float | None = None
    keeps_channel_limits: bool = False
    keeps_mask: bool = False

    def __post_init__(self) -> None:
        """Refuse limits that nothing keeps, and none at all.

        Raises
        ------
        ArgumentsError
            The reserve leaves nothing, two limits of EVM, or no limit.
        """
        if self.evm_percent is not None:
            self.less_reserve(self.evm_percent)
        elif self.reserve_percent and self.evm_standard is None:
            raise _refuse(
                problem="a reserve of EVM without a limit", remedy="Give --evm-limit too."
            )
        if self.is_empty:
            raise _refuse(
                problem="there is no limit", remedy="Give --evm-limit, --aclr-limit or --mask."
            )

    @property
    def is_empty(self) -> bool:
        """Whether nothing is limited."""
        named = (self.evm_percent, self.evm_standard, self.aclr_db)
        return all(item is None for item in named) and not (
            self.keeps_mask or self.keeps_channel_limits
        )

    def less_reserve(self, percent: float) -> float:
        """Return a limit less the reserve, percent.

        Raises
        ------
        ArgumentsError
            Nothing is left.

        Examples
        --------
        >>> Limits(evm_percent=8, reserve_percent=4.8).less_reserve(8)
        6.4
        """
        left = percent**2 - self.reserve_percent**2
        if left <= 0:
            raise _refuse(
                problem=f"a reserve of {self.reserve_percent:g} % leaves nothing of {percent:g} %",
                remedy="Lower the reserve.",
            )
        return round(math.sqrt(left), 12)

    def evm_limits(self, figures: Evaluation) -> list[tuple[float, float]]:
        """Return each EVM that is limited and its limit, percent.

        Raises
        ------
        ArgumentsError
            The standard has no limit for any constellation of the signal.
        """
        if self.evm_percent is not None:
            limit = self.less_reserve(self.evm_percent)
            return [(item.percent, limit) for item in figures.evm if item.is_overall]
        if self.evm_standard is None:
            return []
        pairs = []
        for item in figures.evm:
            found = (
                evm_limit_of(self.evm_standard, item.constellation)
                if item.constellation and not item.is_overall
                else None
            )
            if found is not None:
                pairs.append((item.percent, self.less_reserve(found.percent)))
        if not pairs:
            names = sorted({item.constellation for item in figures.evm if item.constellation})
            raise ArgumentsError(
                where="--evm-limit",
                problem=f"{self.evm_standard} has no limit for {', '.join(names) or 'this signal'}",
                allowed="a standard with limits for the constellations in use, or a number",
                remedy="Give a number with %.",
            )
        return pairs

    def margins(self, figures: Evaluation) -> Margins:
        """Return by how much an evaluation keeps each limit.

        Parameters
        ----------
        figures : Evaluation
            One that did not fail.
        """
        evm = [_ratio_db(limit, percent) for percent, limit in self.evm_limits(figures)]
        aclr = []
        for item in figures.aclr:
            if self.aclr_db is not None:
                aclr.append(item.ratio_db - self.aclr_db)
            elif self.keeps_channel_limits and item.limit_db is not None:
                aclr.append(item.ratio_db - item.limit_db)
        mask = [figures.mask_margin_db] if figures.mask_margin_db is not None else []
        return Margins(
            evm_db=min(evm, default=None),
            aclr_db=min(aclr, default=None),
            mask_db=min(mask, default=None) if self.keeps_mask else None,
        )

    def margin_db(self, figures: Evaluation) -> float:
        """Return the least margin, dB; negative where a limit is passed, ``-inf`` of a failure."""
        return -math.inf if figures.fault else self.margins(figures).least_db

    def shortage_db(self, figures: Evaluation) -> float:
        """Return what is missing of all limits together, dB; ``inf`` of a failure."""
        return math.inf if figures.fault else self.margins(figures).shortage_db

    def words(self) -> str:
        """Return the limits as a sentence has them."""
        told = []
        if self.evm_percent is not None:
            told.append(f"EVM up to {self.evm_percent:g} %")
        if self.evm_standard is not None:
            told.append(f"EVM by {self.evm_standard}")
        if told and self.reserve_percent:
            told.append(f"less {self.reserve_percent:g} % for the rest of the chain")
        if self.aclr_db is not None:
            told.append(f"ACLR from {self.aclr_db:g} dB")
        if self.keeps_channel_limits:
            told.append("ACLR by the standard of the channels")
        if self.keeps_mask:
            told.append("the mask")
        return ", ".join(told)


@dataclass(frozen=True, slots=True, kw_only=True)
class Margins:
    """By how much limits are kept, each None where nothing is limited.

    Parameters
    ----------
    evm_db : float or None
        ``20 log10`` of limit over EVM, the least of all.
    aclr_db : float or None
        Ratio less its limit.
    mask_db : float or None
        Of the mask.
    """

    evm_db: float | None
    aclr_db: float | None
    mask_db: float | None

    @property
    def least_db(self) -> float:
        """The least, dB, at most 60."""
        known = [item for item in (self.evm_db, self.aclr_db, self.mask_db) if item is not None]
        return min([*known, UNLIMITED_DB])

    @property
    def shortage_db(self) -> float:
        """What is missing of all limits together, dB; 0 where they are kept."""
        known = [item for item in (self.evm_db, self.aclr_db, self.mask_db) if item is not None]
        return -math.fsum(min(item, 0.0) for item in known)

    @property
    def binding(self) -> str:
        """Name of the limit that is kept by least."""
        pairs: Sequence[tuple[str, float | None]] = (
            ("EVM", self.evm_db),
            ("ACLR", self.aclr_db),
            ("mask", self.mask_db),
        )
        return min(((value, name) for name, value in pairs if value is not None))[1]


def read_evm_limit(name: str) -> Limits:
    """Return the limit that a row of a standard, or a whole standard, sets.

    Parameters
    ----------
    name : str
        ``NR BS FR1 64QAM`` for all sources, ``NR BS FR1`` for each group by its constellation.

    Raises
    ------
    ArgumentsError
        Neither.
    """
    try:
        return Limits(evm_percent=float(evm_limit(name).percent))
    except ArgumentsError:
        evm_limit_of(name, "")
        return Limits(evm_standard=name)


def _ratio_db(limit: float, percent: float) -> float:
    if percent <= 0:
        return UNLIMITED_DB
    return min(20 * math.log10(limit / percent), UNLIMITED_DB)


def _refuse(*, problem: str, remedy: str) -> ArgumentsError:
    return ArgumentsError(
        where="limits",
        problem=problem,
        allowed="a limit of EVM, of ACLR or a mask; a reserve below the limit of EVM",
        remedy=remedy,
    )
