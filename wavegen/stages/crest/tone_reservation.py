"""Tone reservation: subcarriers without data carry what brings the peaks of each symbol down.

J. Tellado, J. Cioffi, "Efficient algorithms for reducing PAR in multicarrier systems", IEEE Int.
Symp. Information Theory 1998, 191; J. Tellado, "Multicarrier Modulation with Low PAR", Kluwer,
2000: the gradient of what is clipped, seen through the reserved tones alone (from memory). Steps
by :mod:`wavegen.dsp.peak_descent`.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, ClassVar

import numpy as np
from annotated_types import Ge, Gt, Le
from numpy.typing import NDArray

from wavegen.core.index_set import IndexSet
from wavegen.core.rng import random_words, stream_key
from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.core.units import QuantityError
from wavegen.dsp.peak_descent import descend
from wavegen.stages.searchable import Choice, Searchable
from wavegen.stages.symbol_bodies import Reworked, reduce_symbols, symbols_of

STREAM = "reserved subcarriers"
"""Names the fixed words by which a count of subcarriers is spread."""


def spread_subcarriers(free: NDArray[np.intp], count: int) -> NDArray[np.intp]:
    """Return some of the free subcarriers, the same ones every time, without any regularity.

    Parameters
    ----------
    free : intp array, shape (n_free,)
        Subcarriers to choose from, ascending.
    count : int
        How many; no more than there are.

    Returns
    -------
    intp array, shape (count,)
        Ascending.

    Notes
    -----
    Subcarrier ``k`` has the word ``k - free[0]`` of a fixed stream; those with the smallest words
    are taken. Evenly spaced ones would make a pulse with as many equal peaks as lie between two
    of them (Tellado, 2000: sets drawn at random are good).
    """
    words = random_words(
        stream_key(0, STREAM), 0, int(np.ptp(free)) + 1, period=int(np.ptp(free)) + 1, width_bytes=8
    )
    return np.sort(free[np.argsort(words[free - free[0]], kind="stable")[:count]])


@dataclass(frozen=True, eq=False, kw_only=True)
class ToneReserved(Reworked):
    """Symbols with their reserved tones.

    Parameters
    ----------
    reserved : intp array, shape (n_reserved,)
        Subcarriers without data.
    amplitude : float
        Ceiling of the envelope, before the gain.
    n_rounds : int
        Steps.
    """

    reserved: NDArray[np.intp]
    amplitude: float
    n_rounds: int

    def rework(self, rows: Samples, first: int) -> Samples:
        """Add the tones that bring the peaks down."""
        change = descend(
            self.view.finer(rows),
            bins=self.view.bins(self.reserved),
            amplitude=self.amplitude,
            n_rounds=self.n_rounds,
        )
        made = self.view.samples(change, self.reserved)
        made += rows
        return made


@dataclass(frozen=True, slots=True, kw_only=True)
class ToneReservation:
    """Settings of tone reservation, for OFDM.

    Parameters
    ----------
    ceiling_db : float
        What peaks are brought down to where the tones can, over the mean power of the output, dB;
        0.1 to 60.
    subcarriers : IndexSet, optional
        Reserved subcarriers: none that a group or pilots use in any symbol.
    count : int, optional
        Instead of a list: so many of the subcarriers that are unused between the lowest and the
        highest in use, the centre left out. Those are taken whose words in a fixed random stream
        are smallest, so that they lie irregularly and are always the same.
    rounds : int
        Steps, each a pair of transforms; 1 to 200.
    per_band : int
        Points over the band on which peaks are seen, at least; 1 to 16.

    Notes
    -----
    Data and pilots are not touched: only the tones and, since the mean power is kept, the level of
    all. What the tones cost is told as the change of mean power that is undone.
    """

    search: ClassVar[Searchable] = Searchable(
        choices=(Choice(field="rounds", values=(5, 10, 20, 40)),), pairs="rounds"
    )

    ceiling_db: Annotated[float, Ge(0.1), Le(60)]
    subcarriers: IndexSet | None = None
    count: Annotated[int, Gt(0)] | None = None
    rounds: Annotated[int, Ge(1), Le(200)] = 10
    per_band: Annotated[int, Ge(1), Le(16)] = 4

    def __post_init__(self) -> None:
        """Refuse both ways to say which subcarriers, and neither."""
        if (self.subcarriers is None) == (self.count is None):
            raise QuantityError(
                problem="reserved subcarriers are "
                + ("not stated" if self.count is None else "stated twice"),
                allowed="either subcarriers or count",
                remedy='Write it like subcarriers: "-590, -417, 33" or count: 12.',
                key="subcarriers",
            )

    def build(self, site: Site, source: Signal) -> Signal:
        """Return OFDM with its reserved tones, at the mean power it had before.

        Parameters
        ----------
        site : Site
            Where it is built. Told of the subcarriers, the amplitude over the mean of the input,
            the change of mean power that is undone, and the peaks that are left.
        source : Signal
            OFDM; parts of it are read here.

        Returns
        -------
        Signal
            ``source`` itself where it never reaches the ceiling.

        Raises
        ------
        RecipeError
            The source is no OFDM or its waveform has been changed; a subcarrier is in use, out of
            range or listed twice; there are too few free ones.
        """
        symbols = symbols_of(site, source, per_band=self.per_band)
        grid = symbols.grid
        if self.subcarriers is not None:
            reserved = _listed(site, self.subcarriers, grid.indices, grid.n_fft)
        else:
            reserved = _spread(site, self.count or 0, grid.indices)

        def rework(amplitude: float, gain: float) -> Signal:
            bodies = symbols.source.bodies
            return ToneReserved(
                sample_rate_hz=bodies.sample_rate_hz,
                n_samples=bodies.n_samples,
                step=grid.n_fft,
                inputs=(bodies,),
                mean_power=bodies.mean_power,
                view=symbols.view,
                gain=gain,
                reserved=reserved,
                amplitude=amplitude,
                n_rounds=self.rounds,
            )

        action = f"brings peaks down with {reserved.size} tones in {self.rounds} rounds"
        return reduce_symbols(
            site, source, symbols, ceiling_db=self.ceiling_db, rework=rework, action=action
        )


def _listed(site: Site, listed: IndexSet, used: NDArray[np.intp], n_fft: int) -> NDArray[np.intp]:
    """Return the subcarriers of a list, ascending."""
    found, counts = np.unique(np.array(listed.indices, np.intp), return_counts=True)
    lowest, highest = -(n_fft // 2), (n_fft - 1) // 2
    outside = found[(found < lowest) | (found > highest)]
    shared = np.intersect1d(found, used)
    for problem, wrong in (
        ("lies outside the FFT", outside),
        ("is in use by a group or by pilots", shared),
        ("is listed twice", found[counts > 1]),
    ):
        if wrong.size:
            raise site.error(
                key="subcarriers",
                problem=f"subcarrier {wrong[0]} {problem}",
                allowed=f"unused ones from {lowest} to {highest}, each once",
                remedy="Leave it out here, or in the groups.",
            )
    return found


def _spread(site: Site, count: int, used: NDArray[np.intp]) -> NDArray[np.intp]:
    """Return some of the unused subcarriers inside the band, and tell which."""
    inside = np.arange(int(used[0]), int(used[-1]) + 1)
    free = inside[~np.isin(inside, used) & (inside != 0)]
    if free.size < count:
        raise site.error(
            key="count",
            problem=f"{count} subcarriers are to be reserved, and {free.size} are free between "
            f"{used[0]} and {used[-1]}, the centre left out",
            allowed=f"up to {free.size}",
            remedy="Leave subcarriers out of the groups, or list some beside the band.",
        )
    found = spread_subcarriers(free, count)
    shown = ", ".join(map(str, found[:20].tolist())) + (", ..." if count > 20 else "")
    text = f"reserved subcarriers: {shown}"
    site.notes.append(Note(kind="info", where=f"{site.path}.count", text=text))
    return found
