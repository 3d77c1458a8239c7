"""Active constellation extension: outer points move outwards where that brings peaks down.

B. Krongold, D. Jones, "PAR reduction in OFDM via active constellation extension", IEEE Trans.
Broadcasting 49(3), 2003, 258-268: what is clipped, projected onto the moves that no receiver minds,
in "smart" steps. Cones by :mod:`wavegen.dsp.extension_cones`, steps by
:mod:`wavegen.dsp.peak_descent`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import Annotated, ClassVar

import numpy as np
from annotated_types import Ge, Le
from numpy.typing import NDArray

from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.core.symbol_bodies import Grid, Stream
from wavegen.dsp.extension_cones import Cones, cones_of, into_cones
from wavegen.dsp.peak_descent import descend
from wavegen.stages.searchable import Choice, Searchable
from wavegen.stages.symbol_bodies import Reworked, reduce_symbols, symbols_of


@dataclass(frozen=True, eq=False, kw_only=True)
class Extended(Reworked):
    """Symbols with outer points moved outwards.

    Parameters
    ----------
    streams : tuple of Stream
        Groups whose points may move.
    indices : intp array, shape (n,)
        Their subcarriers, ascending.
    n_fft : int
        Samples of a useful symbol.
    amplitude : float
        Ceiling of the envelope, before the gain.
    n_rounds : int
        Steps.
    """

    streams: tuple[Stream, ...]
    indices: NDArray[np.intp]
    n_fft: int
    amplitude: float
    n_rounds: int

    @cached_property
    def _cones(self) -> tuple[Cones, ...]:
        """Cones by symbol number, of each stream."""
        return tuple(cones_of(stream.table) for stream in self.streams)

    @cached_property
    def _columns(self) -> tuple[NDArray[np.intp], ...]:
        """Where the subcarriers of each stream stand among ``indices``."""
        place = np.empty(self.n_fft, np.intp)
        place[self.indices % self.n_fft] = np.arange(self.indices.size)
        return tuple(place[stream.bins] for stream in self.streams)

    def cones(self, first: int, count: int) -> Cones:
        """Return the cones of symbols ``first ...``, shape (count, n); none where nothing is on."""
        shape = (count, self.indices.size)
        axis = np.zeros(shape, np.complex64)
        cosine, sine = np.ones(shape, np.float32), np.zeros(shape, np.float32)
        for stream, table, columns in zip(self.streams, self._cones, self._columns, strict=True):
            words = stream.rows(first, count)
            got = table.of(words & words.dtype.type(stream.table.size - 1))
            places = stream.presence.places(first, count)
            rows = np.arange(count) if places is None else places
            where = np.ix_(rows, columns)
            turned = got.axis if stream.rotation is None else got.axis * stream.rotation
            axis[where], cosine[where], sine[where] = turned, got.cosine, got.sine
        return Cones(axis=axis, cosine=cosine, sine=sine)

    def _rule(self, first: int, count: int) -> Callable[[Samples], Samples]:
        cones = self.cones(first, count)
        return lambda moves: into_cones(moves, cones)

    def rework(self, rows: Samples, first: int) -> Samples:
        """Move outer points so that peaks come down."""
        change = descend(
            self.view.finer(rows),
            bins=self.view.bins(self.indices),
            amplitude=self.amplitude,
            n_rounds=self.n_rounds,
            rule=self._rule(first, rows.shape[0]),
        )
        made = self.view.samples(change, self.indices)
        made += rows
        return made


@dataclass(frozen=True, slots=True, kw_only=True)
class ConstellationExtension:
    """Settings of active constellation extension, for OFDM.

    Parameters
    ----------
    ceiling_db : float
        What peaks are brought down to where the points can, over the mean power of the output, dB;
        0.1 to 60.
    rounds : int
        Steps, each a pair of transforms; 1 to 200. A few are enough.
    per_band : int
        Points over the band on which peaks are seen, at least; 1 to 16.

    Notes
    -----
    Points inside the constellation, pilots and DFT-spread groups stay where they are, and no two
    points come nearer to each other. An EVM meter counts the moves as error all the same: what was
    sent is its reference. The extension costs power, which is told as the change of mean that is
    undone: by as much the distance between points shrinks at the same mean.
    """

    search: ClassVar[Searchable] = Searchable(
        choices=(Choice(field="rounds", values=(3, 6, 12, 24)),), pairs="rounds"
    )

    ceiling_db: Annotated[float, Ge(0.1), Le(60)]
    rounds: Annotated[int, Ge(1), Le(200)] = 6
    per_band: Annotated[int, Ge(1), Le(16)] = 4

    def build(self, site: Site, source: Signal) -> Signal:
        """Return OFDM with extended constellations, at the mean power it had before.

        Parameters
        ----------
        site : Site
            Where it is built. Told of groups that cannot be extended, of the amplitude over the
            mean of the input, the change of mean power that is undone, and the peaks left.
        source : Signal
            OFDM; parts of it are read here.

        Returns
        -------
        Signal
            ``source`` itself where it never reaches the ceiling.

        Raises
        ------
        RecipeError
            The source is no OFDM or its waveform has been changed; selected mapping has turned its
            points; or all its groups are DFT-spread.
        """
        symbols = symbols_of(site, source, per_band=self.per_band)
        if symbols.source.undone_by:
            raise site.error(
                key="kind",
                problem="selected mapping before it has turned the points, and the outward "
                "directions with them",
                allowed="OFDM whose points stand where they were put",
                remedy="Leave one of the two out.",
            )
        grid = symbols.grid
        streams = _streams(site, grid)
        bins = np.concatenate([stream.bins for stream in streams])
        indices = grid.indices[np.isin(grid.indices % grid.n_fft, bins)]

        def rework(amplitude: float, gain: float) -> Signal:
            bodies = symbols.source.bodies
            return Extended(
                sample_rate_hz=bodies.sample_rate_hz,
                n_samples=bodies.n_samples,
                step=grid.n_fft,
                inputs=(bodies,),
                mean_power=bodies.mean_power,
                view=symbols.view,
                gain=gain,
                streams=streams,
                indices=indices,
                n_fft=grid.n_fft,
                amplitude=amplitude,
                n_rounds=self.rounds,
            )

        action = f"extends constellations in {self.rounds} rounds"
        return reduce_symbols(
            site, source, symbols, ceiling_db=self.ceiling_db, rework=rework, action=action
        )


def _streams(site: Site, grid: Grid) -> tuple[Stream, ...]:
    """Return the groups whose points may move, and tell of those that may not."""
    streams = tuple(stream for stream in grid.carried if not stream.is_spread)
    if not streams:
        raise site.error(
            key="kind",
            problem="no group has points of its own on its subcarriers",
            allowed="OFDM with a group that is not DFT-spread",
            remedy="Choose a method that needs no constellation, such as projection.",
        )
    for stream in grid.carried:
        if stream.is_spread:
            text = f"{stream.name} is DFT-spread: its subcarriers carry no points to extend"
            site.notes.append(Note(kind="info", where=site.path, text=text))
    return streams
