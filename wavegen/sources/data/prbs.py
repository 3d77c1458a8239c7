"""Pseudo-random binary sequences of ITU-T O.150 as data."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import Annotated, Literal

from annotated_types import Ge, Le

from wavegen.core.site import Site
from wavegen.dsp.prbs import PRBS
from wavegen.sources.bit_symbols import BitSymbols, bind_bits


@dataclass(frozen=True, slots=True, kw_only=True)
class PseudoRandom:
    """Settings of a pseudo-random binary sequence.

    Parameters
    ----------
    sequence : str
        Which one of ITU-T O.150, with its inversion; ``pn20_zs`` suppresses zeros (clause 5.5).
    start : int
        Bit of the sequence at which the loop begins, from 0: the first bit of a register filled
        with ones.
    inverted : bool, optional
        Whether the output is the complement, where that shall differ from the recommendation.

    Notes
    -----
    Symbol i takes bits ``i m`` to ``(i + 1) m - 1``, the first one most significant. Every loop
    begins with the same bit; a loop that is not whole periods cuts the sequence at its seam,
    which is noted.
    """

    sequence: Literal["pn9", "pn11", "pn15", "pn20", "pn20_zs", "pn23", "pn29", "pn31"]
    start: Annotated[int, Ge(0), Le(1 << 31)] = 0
    inverted: bool | None = None

    def period_bits(self, folder: Path = Path()) -> int | None:
        """Return the bits after which the data repeat."""
        return PRBS[self.sequence].period

    def bind(self, site: Site, *, n_bits: int, period: int, label: str = "") -> BitSymbols:
        """Return the symbols of one stream.

        Parameters
        ----------
        site : Site
            Takes a note where the loop cuts the sequence.
        n_bits : int
            Bits a symbol.
        period : int
            Symbols in one loop.
        label : str
            Which stream of the part; all of them begin with the same bit.

        Returns
        -------
        BitSymbols
        """
        made = PRBS[self.sequence]
        if self.inverted is not None:
            made = replace(made, is_inverted=self.inverted)
        return bind_bits(
            site,
            made,
            n_bits=n_bits,
            period=period,
            label=label,
            called=self.sequence,
            start=self.start,
        )
