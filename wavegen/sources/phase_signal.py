"""Continuous phase modulation as a signal: any range of it by itself."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples, Signal
from wavegen.dsp.phase_pulses import PhasePulse
from wavegen.dsp.phase_tables import PhaseTables
from wavegen.sources.phase_symbols import PhaseSymbols

CELL_SAMPLES = 1 << 14
"""Samples made at a time, about: their phases stay in the cache."""


@dataclass(frozen=True, eq=False, kw_only=True)
class PhaseSignal(Signal):
    """A carrier of constant envelope whose phase the symbols turn.

    Sample 0 stands at the instant of symbol 0.

    Parameters
    ----------
    symbols : PhaseSymbols
        What is sent; its sum over the loop turns the phase by whole turns.
    pulse : PhasePulse
        Rise of the phase by one symbol.
    index : Fraction
        Modulation index.
    start_turns : Fraction
        Phase before any symbol, turns.
    ratio : (int, int)
        Samples and symbols of one cycle, in lowest terms.
    """

    symbols: PhaseSymbols
    pulse: PhasePulse
    index: Fraction
    start_turns: Fraction
    ratio: tuple[int, int]

    @cached_property
    def tables(self) -> PhaseTables:
        """Phases by pattern; made when first used."""
        return PhaseTables(
            pulse=self.pulse,
            alphabet=self.symbols.alphabet,
            index=self.index,
            start_turns=self.start_turns,
            n_phases=self.ratio[0],
        )

    @cached_property
    def lattice(self) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
        """Symbol interval and place of each sample of a cell that starts with a cycle."""
        a, b = self.ratio
        instants = np.arange(self.step, dtype=np.intp) * b
        interval = instants // a
        return interval, instants - interval * a

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return samples ``[start, stop)``."""
        a, b = self.ratio
        first, last = start * b // a, (stop - 1) * b // a
        codes = self._codes(first, last + 1 - first)
        out = np.empty(stop - start, np.complex64)
        for low in range(start, stop, self.step):
            cell = out[low - start : min(low + self.step, stop) - start]
            begin = low * b // a
            end = (low + cell.size - 1) * b // a + 1
            part = tuple(code[begin - first : end - first] for code in codes)
            if self.tables.is_interpolated:
                self._between(low, part, cell)
            elif b == 1:
                self.tables.whole_symbols(part, cell)
            else:
                interval, place = self.lattice
                self.tables.at_places(part, interval[: cell.size], place[: cell.size], cell)
        return out

    def _codes(self, first: int, count: int) -> tuple[NDArray[np.intp], ...]:
        """Return table rows of symbol intervals; whole numbers, exact from any start."""
        earliest = first - self.pulse.last_symbols + 1
        numbers = self.symbols.range(earliest, count + self.pulse.n_near - 1)
        sums = np.empty(count, np.int64)
        sums[0] = self.symbols.sum_before(earliest)
        sums[1:] = self.symbols.levels(numbers[: count - 1])
        return self.tables.codes(numbers, np.cumsum(sums, out=sums))

    def _between(self, low: int, codes: tuple[NDArray[np.intp], ...], cell: Samples) -> None:
        a, b = self.ratio
        instants = np.arange(cell.size, dtype=np.int64) * b + low * b % a
        interval = instants // a
        time = (instants - interval * a) / a
        self.tables.between_places(codes, interval.astype(np.intp), time, cell)


def cell_of(n_samples: int) -> int:
    """Return the grid for cycles of so many samples: whole cycles where they are short.

    Examples
    --------
    >>> cell_of(8), cell_of(120), cell_of(100_000)
    (16384, 16320, 16384)
    """
    return n_samples * (CELL_SAMPLES // n_samples) if n_samples <= CELL_SAMPLES else CELL_SAMPLES
