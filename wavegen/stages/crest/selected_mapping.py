"""Selected mapping: of several turned copies of each symbol the one with the lowest peak is sent.

R. Baeuml, R. Fischer, J. Huber, "Reducing the peak-to-average power ratio of multicarrier
modulation by selected mapping", Electronics Letters 32(22), 1996, 2056-2057: phase sequences from
{1, j, -1, -j} that the receiver knows; which of them was taken is side information.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Annotated, ClassVar

import numpy as np
from annotated_types import Ge, Le
from numpy.typing import NDArray

from wavegen.core.evaluate import evaluate
from wavegen.core.rng import random_words, stream_key
from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.core.symbol_bodies import Grid
from wavegen.dsp.mapping_kernel import read_values, write_values
from wavegen.dsp.symbol_rows import SymbolRows
from wavegen.stages.searchable import Choice, Searchable
from wavegen.stages.symbol_bodies import Reworked, symbols_of, tell_points

STREAM = "selected mapping"
"""Names the fixed words that make the sequences."""
SHOWN_SYMBOLS = 512
"""Symbols on which the effect is told."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Sequences:
    """Phase sequences over the subcarriers in use.

    Parameters
    ----------
    n_candidates : int
        Number of sequences; the first turns nothing.
    indices : intp array, shape (n_active,)
        Subcarriers in use.
    is_data : bool array, shape (n_frame, n_active)
        Where data stand in each symbol of the frame: pilots are never turned.
    """

    n_candidates: int
    indices: NDArray[np.intp]
    is_data: NDArray[np.bool_]

    def __getstate__(self) -> dict[str, object]:
        """Leave out what is drawn again."""
        return {
            "n_candidates": self.n_candidates,
            "indices": self.indices,
            "is_data": self.is_data,
        }

    @cached_property
    def quarter_turns(self) -> NDArray[np.uint8]:
        """Every sequence, shape (n_candidates, n_active): 0 ... 3, indexed words of a stream.

        The word of candidate ``u`` on the ``i``-th subcarrier is ``u n_active + i``, whatever the
        seed of the recipe: a receiver knows the sequences beforehand.
        """
        n = self.indices.size
        words = random_words(stream_key(0, STREAM), 0, self.n_candidates * n, period=1 << 62)
        made = (words & 3).astype(np.uint8).reshape(-1, n)
        made[0] = 0
        return np.asarray(made)

    @cached_property
    def factors(self) -> Samples:
        """Every sequence as powers of j, shape (n_candidates, n_active)."""
        return np.array([1, 1j, -1, -1j], np.complex64)[self.quarter_turns]

    def all_of(self, number: int, symbols: NDArray[np.intp]) -> Samples:
        """Return the factors of one candidate for several symbols, (n, n_active) or (n_active,)."""
        found: Samples = self.factors[number]
        if not self.is_data.all():
            found = np.where(self.is_data[symbols % self.is_data.shape[0]], found, np.complex64(1))
        return found

    def of(self, numbers: NDArray[np.intp], symbols: NDArray[np.intp]) -> Samples:
        """Return the factors of symbols that took some candidates, shape (n, n_active)."""
        found: Samples = self.factors[numbers]
        if not self.is_data.all():
            found = np.where(self.is_data[symbols % self.is_data.shape[0]], found, np.complex64(1))
        return found


def _is_data(grid: Grid) -> NDArray[np.bool_]:
    """Return where data stand, shape (n_frame, n_active)."""
    n_frame = max(stream.presence.on.size for stream in grid.carried) if grid.carried else 1
    place = np.empty(grid.n_fft, np.intp)
    place[grid.indices % grid.n_fft] = np.arange(grid.indices.size)
    found = np.zeros((n_frame, grid.indices.size), np.bool_)
    for stream in grid.carried:
        found[np.ix_(np.flatnonzero(stream.presence.on), place[stream.bins])] = True
    return found


@dataclass(frozen=True, eq=False, kw_only=True)
class CandidateChoice(Signal):
    """Which candidate has the lowest peak, on the axis of symbols.

    Parameters
    ----------
    view : SymbolRows
        How peaks are seen.
    sequences : Sequences
        Candidates.
    """

    view: SymbolRows
    sequences: Sequences

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the bodies of the same symbols."""
        return ((start * self.view.n_fft, stop * self.view.n_fft),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return the number of the candidate; of equal ones the first."""
        view, bins = self.view, self.view.bins(self.sequences.indices)
        rows = arrays[0].reshape(-1, view.n_fft)
        out = np.empty(rows.shape[0], np.complex64)
        for low, high in view.blocks(rows.shape[0]):
            lines = view.lines(rows[low:high])
            symbols = np.arange(start + low, start + high)
            sent = read_values(lines, bins=(self.sequences.indices % view.n_fft).astype(np.uint32))
            best = view.peaks(view.finer(rows[low:high]))
            chosen = np.zeros(high - low, np.intp)
            placed = np.empty((high - low, view.n_points), np.complex64)
            for number in range(1, self.sequences.n_candidates):
                placed[:] = 0
                write_values(placed, sent * self.sequences.all_of(number, symbols), bins=bins)
                peaks = view.peaks(view.inverse(placed))
                chosen[peaks < best] = number
                np.minimum(best, peaks, out=best)
            out[low:high] = chosen
        return out


def chosen(choice: Signal, start: int = 0, stop: int | None = None) -> NDArray[np.intp]:
    """Return which candidate symbols took: the side information.

    Parameters
    ----------
    choice : CandidateChoice
        ``signal.bodies.choice`` of what the stage built.
    start, stop : int, optional
        Symbols; all of the loop if not given.

    Returns
    -------
    intp array, shape (stop - start,)
    """
    end = choice.n_samples if stop is None else stop
    return evaluate({choice: (start, end)})[choice].real.astype(np.intp)


@dataclass(frozen=True, eq=False, kw_only=True)
class Selected(Reworked):
    """Symbols turned by the candidate chosen; the inputs are the bodies and the choice.

    Parameters
    ----------
    sequences : Sequences
        Candidates.
    """

    sequences: Sequences

    @property
    def choice(self) -> Signal:
        """Which candidate each symbol took, on the axis of symbols."""
        return self.inputs[1]

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the bodies, and the choice of the same symbols."""
        n_fft = self.view.n_fft
        return ((start, stop), (start // n_fft, stop // n_fft))

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Turn the subcarriers of those symbols that did not take the first candidate."""
        view, n_fft = self.view, self.view.n_fft
        bins = (self.sequences.indices % n_fft).astype(np.uint32)
        out = arrays[0].copy().reshape(-1, n_fft)
        numbers = arrays[1].real.astype(np.intp)
        turned = np.flatnonzero(numbers)
        for low, high in view.blocks(turned.size):
            rows = turned[low:high]
            lines = view.lines(out[rows])
            factors = self.sequences.of(numbers[rows], start // n_fft + rows)
            write_values(lines, read_values(lines, bins=bins) * factors, bins=bins)
            out[rows] = view.from_lines(lines)
        return out.reshape(-1)


@dataclass(frozen=True, eq=False, kw_only=True)
class TurnedBack(Signal):
    """Received subcarriers, turned back by a receiver that knows the choice.

    Parameters
    ----------
    sequences : Sequences
        Candidates.
    """

    sequences: Sequences

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the subcarriers, and the choice of the same symbols."""
        n = self.sequences.indices.size
        return ((start, stop), (start // n, stop // n))

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Multiply by the conjugate sequences."""
        n = self.sequences.indices.size
        symbols = np.arange(start // n, stop // n)
        factors = self.sequences.of(arrays[1].real.astype(np.intp), symbols)
        made = arrays[0].reshape(-1, n) * np.conj(factors)
        return np.asarray(made, np.complex64).reshape(-1)


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class TurnBack:
    """What a receiver does about selected mapping.

    Parameters
    ----------
    choice : Signal
        On the axis of symbols.
    sequences : Sequences
        Candidates.
    where : str
        Path of the stage in the recipe.
    """

    choice: Signal
    sequences: Sequences
    where: str

    def undo(self, subcarriers: Signal) -> Signal:
        """Return the subcarriers turned back."""
        return TurnedBack(
            sample_rate_hz=subcarriers.sample_rate_hz,
            n_samples=subcarriers.n_samples,
            step=self.sequences.indices.size,
            inputs=(subcarriers, self.choice),
            mean_power=subcarriers.mean_power,
            sequences=self.sequences,
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class SelectedMapping:
    """Settings of selected mapping, for OFDM.

    Parameters
    ----------
    candidates : int
        Copies of each symbol to choose from, the symbol itself among them; 1 to 256. Each costs a
        transform.
    per_band : int
        Points over the band on which peaks are compared, at least; 1 to 16. 1 takes the samples
        of the FFT as they are.

    Notes
    -----
    No distortion and no power: the price is side information, the logarithm of ``candidates`` to
    base 2 in bits a symbol. The number chosen stands in :func:`chosen`; an EVM meter turns the
    subcarriers back by it, as a receiver would, and files carry it beside them for receivers on a
    bench. Pilots are not turned.
    """

    search: ClassVar[Searchable] = Searchable(
        ceiling_db=None,
        choices=(Choice(field="candidates", values=(2, 4, 8, 16, 32)),),
        pairs="candidates",
    )

    candidates: Annotated[int, Ge(1), Le(256)] = 8
    per_band: Annotated[int, Ge(1), Le(16)] = 4

    def build(self, site: Site, source: Signal) -> Signal:
        """Return OFDM with the best candidate for each symbol.

        Parameters
        ----------
        site : Site
            Where it is built. Told of the side information and of the peaks before and after.
        source : Signal
            OFDM; up to 512 symbols are looked at here.

        Returns
        -------
        Signal
            ``source`` itself for one candidate.

        Raises
        ------
        RecipeError
            The source is no OFDM or its waveform has been changed, or it has no data to turn.
        """
        symbols = symbols_of(site, source, per_band=self.per_band)
        grid, view, bodies = symbols.grid, symbols.view, symbols.source.bodies
        sequences = Sequences(
            n_candidates=self.candidates, indices=grid.indices, is_data=_is_data(grid)
        )
        if not sequences.is_data.any():
            raise site.error(
                key="kind",
                problem="there are no data to turn: pilots stay as they are",
                allowed="OFDM with a group",
                remedy="Add a group.",
            )
        if self.candidates == 1:
            return source
        n_fft = grid.n_fft
        choice = CandidateChoice(
            sample_rate_hz=bodies.sample_rate_hz / n_fft,
            n_samples=bodies.n_samples // n_fft,
            inputs=(bodies,),
            mean_power=None,
            view=view,
            sequences=sequences,
        )
        selected = Selected(
            sample_rate_hz=bodies.sample_rate_hz,
            n_samples=bodies.n_samples,
            step=n_fft,
            inputs=(bodies, choice),
            mean_power=bodies.mean_power,
            view=view,
            sequences=sequences,
        )
        tell_points(site, symbols)
        _tell(site, self.candidates, bodies, selected)
        made: Signal = symbols.source.with_bodies(  # type: ignore[assignment] # a Signal too
            selected, undo=TurnBack(choice=choice, sequences=sequences, where=site.path)
        )
        return made


def _tell(site: Site, candidates: int, bodies: Signal, selected: Selected) -> None:
    """Note what it costs, and what it does to the first symbols."""
    view = selected.view
    count = min(selected.choice.n_samples, SHOWN_SYMBOLS)
    got = evaluate(dict.fromkeys((bodies, selected), (0, count * view.n_fft)))
    rows = [got[one].reshape(-1, view.n_fft) for one in (bodies, selected)]
    mean = float(np.mean(rows[0].real.astype(np.float64) ** 2 + rows[0].imag ** 2))
    peaks = [
        np.concatenate([view.peaks(view.finer(some[a:b])) for a, b in view.blocks(count)])
        for some in rows
    ]
    if not mean:
        return
    levels = [10 * math.log10(float(np.quantile(each, 0.9)) / mean) for each in peaks]
    text = (
        f"chooses one of {candidates} sequences for each symbol, {math.log2(candidates):.3g} bits "
        f"of side information; of {count} symbols 10 % peak above {levels[1]:.2f} dB over the "
        f"mean, {levels[0]:.2f} dB before"
    )
    site.notes.append(Note(kind="info", where=f"{site.path}.candidates", text=text))
