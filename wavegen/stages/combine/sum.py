"""Several signals side by side: each at its own frequency, level and phase."""

from __future__ import annotations

import cmath
import math
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cached_property
from typing import Annotated, Any

import numpy as np
from annotated_types import Ge, Le, MinLen

from wavegen.core.registry import Member
from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.core.units import format_hz
from wavegen.laws.composite import Placed, combine_terms
from wavegen.laws.term import NoLaw, Term

CELL_SAMPLES = 1 << 12
"""Grid of the phase: exact at each cell's start, one ramp within; 32 kB of samples."""


@dataclass(frozen=True, slots=True)
class Placement:
    """Where a part stands in the sum.

    Parameters
    ----------
    n_cycles : int
        Frequency offset, whole cycles in one period of the loop; negative below the centre.
    gain : float
        Amplitude ratio.
    phase_rad : float
        Phase at sample 0 of the loop.
    """

    n_cycles: int
    gain: float
    phase_rad: float

    @property
    def is_real(self) -> bool:
        """Whether the part is only scaled."""
        return not self.n_cycles and not self.phase_rad


@dataclass(frozen=True, eq=False, kw_only=True)
class Summed(Signal):
    """A sum of shifted signals.

    Parameters
    ----------
    placements : tuple of Placement
        One for each input.
    """

    placements: tuple[Placement, ...]

    @cached_property
    def _ramps(self) -> list[Samples]:
        """The turning of each part within a cell; complex64, shape (CELL_SAMPLES,)."""
        index = np.arange(min(self.step, self.n_samples))
        ramps = []
        for placement in self.placements:  # |n_cycles| * step stays far inside int64
            turn = placement.n_cycles * index % self.n_samples / self.n_samples
            ramps.append(np.exp(2j * np.pi * turn).astype(np.complex64))
        return ramps

    def _factor(self, placement: Placement, start: int) -> np.complex64:
        """Gain and phase at a cell's start; the phase index is exact (Python integers)."""
        turn = placement.n_cycles * start % self.n_samples / self.n_samples
        return np.complex64(cmath.rect(placement.gain, math.tau * turn + placement.phase_rad))

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Add the parts cell by cell, each cell in cache until all parts are in."""
        out = np.empty(stop - start, np.complex64)
        work = np.empty(min(self.step, out.size), np.complex64)
        ramps = self._ramps
        for cell in range(start, stop, self.step):
            low, high = cell - start, min(cell - start + self.step, out.size)
            total, term = out[low:high], work[: high - low]
            for number, (placement, array) in enumerate(zip(self.placements, arrays, strict=True)):
                into = term if number else total
                part = array[low:high]
                if placement.is_real:
                    gain = np.float32(placement.gain)
                    np.multiply(part.view(np.float32), gain, out=into.view(np.float32))
                elif placement.n_cycles:
                    np.multiply(
                        ramps[number][: high - low], self._factor(placement, cell), out=into
                    )
                    np.multiply(into, part, out=into)
                else:
                    np.multiply(part, self._factor(placement, 0), out=into)
                if number:
                    np.add(total, term, out=total)
        return out


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """Settings of one signal of a sum.

    Parameters
    ----------
    signal : settings
        A source or another sum.
    frequency_offset_hz : Fraction
        Where its centre goes, Hz from the centre of the sum; up to half the sample rate.
    level_db : float
        Power over that of a part at 0 dB, dB.
    phase_deg : float
        Phase at the start of the loop, degrees.
    stages : tuple of settings
        Applied to this part before it is added.
    name : str, optional
        Names its random data (its path does if not given).
    """

    signal: Annotated[Any, Member(("signal",))]
    frequency_offset_hz: Fraction = Fraction(0)
    level_db: Annotated[float, Ge(-200), Le(200)] = 0.0
    phase_deg: Annotated[float, Ge(-36000), Le(36000)] = 0.0
    stages: tuple[Annotated[Any, Member(("stage",))], ...] = ()
    name: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Sum:
    """Settings of a sum of signals.

    Parameters
    ----------
    parts : tuple of Part
        One or more.
    """

    parts: Annotated[tuple[Part, ...], MinLen(1)]

    def combine(self, site: Site, signals: list[Signal]) -> Signal:
        """Return the sum, at unit mean power.

        Parameters
        ----------
        site : Site
            Where it is built. Told what was rounded and by how much the sum was normalised.
        signals : list of Signal
            The parts' signals, their stages included, in the order of ``parts``; all of the
            sum's period and rate.

        Returns
        -------
        Signal
            ``mean_power`` is 1 where every part has a nominal mean power, else None.

        Raises
        ------
        RecipeError
            A frequency offset beyond half the sample rate.

        Notes
        -----
        Powers add: the parts' data are independent, or their frequencies differ. Parts that
        share both add as amplitudes; the mean that is measured on the file shows it.
        """
        powers = [
            10 ** (part.level_db / 10) * (1.0 if signal.mean_power is None else signal.mean_power)
            for part, signal in zip(self.parts, signals, strict=True)
        ]
        total = math.fsum(powers)
        if abs(total - 1) > 1e-9:
            change_db = -10 * math.log10(total)
            text = f"the parts' powers add to {-change_db:+.3f} dB; scaled by {change_db:+.3f} dB"
            site.notes.append(Note(kind="info", where=site.path, text=text))
        return Summed(
            sample_rate_hz=site.sample_rate_hz,
            n_samples=site.n_samples,
            step=CELL_SAMPLES,
            inputs=tuple(signals),
            mean_power=None if any(signal.mean_power is None for signal in signals) else 1.0,
            placements=tuple(
                Placement(
                    _snap(site, number, part.frequency_offset_hz),
                    10 ** (part.level_db / 20) / math.sqrt(total),
                    math.radians(math.fmod(part.phase_deg, 360)),
                )
                for number, part in enumerate(self.parts)
            ),
        )

    def term(self, site: Site, terms: list[Term]) -> Term | NoLaw:
        """Return what the sum is to its law, or to a sum around it.

        Parameters
        ----------
        site : Site
            Where it is built; takes no notes.
        terms : list of Term
            Those of the parts behind their stages, in the order of ``parts``.

        Returns
        -------
        Term or NoLaw
            No law where parts share data or are tied in phase: see
            :func:`wavegen.laws.composite.combine_terms`.

        Raises
        ------
        RecipeError
            As in :meth:`combine`.
        """
        quiet = replace(site, notes=[])
        placed = [
            Placed(
                term=term,
                gain=10 ** (part.level_db / 20),
                turn_rad=math.radians(math.fmod(part.phase_deg, 360)),
                n_cycles=_snap(quiet, number, part.frequency_offset_hz),
            )
            for number, (part, term) in enumerate(zip(self.parts, terms, strict=True))
        ]
        return combine_terms(placed, n_samples=site.n_samples)


def _snap(site: Site, number: int, offset_hz: Fraction) -> int:
    """Return the nearest whole number of cycles in the loop."""
    key = f"parts[{number}].frequency_offset"
    limit = site.sample_rate_hz / 2
    if abs(offset_hz) > limit:
        raise site.error(
            key=key,
            problem=f"{format_hz(offset_hz)} lies outside the sampled band",
            allowed=f"from {format_hz(-limit)} to {format_hz(limit)}, half the sample rate",
            remedy="Lower the offset, or raise the sample rate.",
        )
    grid_hz = site.sample_rate_hz / site.n_samples
    n_cycles = round(offset_hz / grid_hz)
    moved_hz = n_cycles * grid_hz - offset_hz
    if moved_hz:
        site.notes.append(
            Note(
                kind="rounded",
                where=f"{site.path}.{key}",
                text=f"moved by {format_hz(moved_hz)} to whole cycles in the loop",
                asked=format_hz(offset_hz),
                given=format_hz(n_cycles * grid_hz),
            )
        )
    return n_cycles
