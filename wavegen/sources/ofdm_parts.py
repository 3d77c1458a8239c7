"""Groups of subcarriers and pilots: their settings, and what they come to."""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction
from typing import Annotated, Any, Literal

import numpy as np
import scipy.fft
from annotated_types import Ge, Le

from wavegen.core.index_set import IndexSet, SymbolSet
from wavegen.core.registry import Member
from wavegen.core.site import Note, Site
from wavegen.sources.data.random import Random
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm_carried import Carried, Pinned
from wavegen.sources.ofdm_power import Part
from wavegen.sources.ofdm_schedule import present
from wavegen.sources.rotation import Rotation
from wavegen.sources.subcarriers import PilotValues

Level = Annotated[float, Ge(-100), Le(100)]
NO_ROTATION = Rotation(Fraction(0))


@dataclass(frozen=True, slots=True, kw_only=True)
class Group:
    """Subcarriers that carry data with one constellation.

    Parameters
    ----------
    subcarriers : IndexSet
        Which ones, such as ``-600..-1, 1..600``; data go to them in the order listed.
    constellation : Constellation
        Name, or a list of points.
    level_db : float
        Mean power of each subcarrier, dB over a subcarrier at 0 dB.
    symbols : SymbolSet, optional
        In which symbols of the frame the group is on, such as ``0..13 by 2``; in all of them
        unless given. Data are drawn for these symbols only.
    spreading : "dft", optional
        DFT spreading: the points of a symbol go through a DFT of their number, over its root,
        before they are put on the subcarriers (SC-FDMA; 3GPP TS 36.211 cl. 5.3.3, TS 38.211
        cl. 6.3.1.4). Power stays.
    rotation : Rotation
        Point ``i`` of each symbol is turned by ``i`` times this angle before any spreading:
        ``pi/2`` makes BPSK pi/2-BPSK. 0 by default.
    data : member of DATA
        Where the symbols come from.
    """

    subcarriers: IndexSet
    constellation: Constellation
    level_db: Level = 0.0
    symbols: SymbolSet | None = None
    spreading: Literal["dft"] | None = None
    rotation: Rotation = NO_ROTATION
    data: Annotated[Any, Member(("data",), default="random")] = field(default_factory=Random)


@dataclass(frozen=True, slots=True, kw_only=True)
class Pilots:
    """Subcarriers that carry the same values in every symbol.

    Parameters
    ----------
    subcarriers : IndexSet
        Which ones; values go to them in the order listed.
    values : PilotValues
        A list, repeated as often as needed, or ``{random: qpsk}``: one draw per subcarrier.
        For pilots drawn anew in each symbol use a group.
    level_db : float
        Mean power of each subcarrier, dB over a subcarrier at 0 dB: the boost.
    symbols : SymbolSet, optional
        In which symbols of the frame they are on; in all of them unless given.
    """

    subcarriers: IndexSet
    values: PilotValues
    level_db: Level = 0.0
    symbols: SymbolSet | None = None


def part_of_group(site: Site, key: str, group: Group, n_frame: int) -> Part:
    """Return what a group comes to, with notes on its spreading.

    Parameters
    ----------
    site : Site
        Where it is built.
    key : str
        Its place in the settings.
    group : Group
        Settings.
    n_frame : int
        Symbols of a frame.

    Raises
    ------
    RecipeError
        No subcarriers, or symbols out of the frame.
    """
    n, amplitude = _count(site, key, group.subcarriers), _amplitude(group.level_db)
    mean = complex(group.constellation.points.mean())
    mean = mean if abs(mean) > 1e-12 else 0.0  # rounding around zero
    expected = mean * amplitude * group.rotation.over(n)
    if group.spreading == "dft":
        expected = np.asarray(scipy.fft.fft(expected, norm="ortho"), np.complex128)
        _note_spreading(site, key, group.subcarriers)
    return Part(
        key=key,
        indices=np.array(group.subcarriers.indices, np.intp),
        expected=expected,
        variance=n * (1 - abs(mean) ** 2) * amplitude**2,
        presence=present(group.symbols, n_frame=n_frame, where=f"{site.path}.{key}.symbols"),
    )


def part_of_pilots(site: Site, key: str, pilots: Pilots, n_frame: int) -> Part:
    """Return what an entry of pilots comes to, with a note if all have one value.

    Raises
    ------
    RecipeError
        No subcarriers, values that are all zero, or symbols out of the frame.
    """
    n = _count(site, key, pilots.subcarriers)
    drawn = pilots.values.drawn_from
    stream = Random().bind(site, n_bits=drawn.n_bits if drawn else 1, period=n, label=f".{key}")
    values = pilots.values.over(n, stream.words(0, n))
    if not values.any():
        raise site.error(
            key=f"{key}.values",
            problem=f"the first {n} values, all that are used, are zero",
            allowed="at least one value that is not zero",
            remedy="Change the values, or leave the pilots out.",
        )
    if n > 1 and bool(np.all(values == values[0])):
        text = f"All {n} pilots have the same value: they add up to one peak in every symbol."
        site.notes.append(Note(kind="warning", where=f"{site.path}.{key}.values", text=text))
    return Part(
        key=key,
        indices=np.array(pilots.subcarriers.indices, np.intp),
        expected=_amplitude(pilots.level_db) * values,
        variance=0.0,
        presence=present(pilots.symbols, n_frame=n_frame, where=f"{site.path}.{key}.symbols"),
    )


def carry(
    site: Site, group: Group, part: Part, *, n_fft: int, n_symbols: int, scale: float
) -> Carried:
    """Return the data of a group on its bins.

    Parameters
    ----------
    site : Site
        Names the data.
    group : Group
        Settings.
    part : Part
        What :func:`part_of_group` made of them.
    n_fft : int
        FFT length.
    n_symbols : int
        Symbols of the loop, a whole number of frames.
    scale : float
        Amplitude of a subcarrier at 0 dB.
    """
    n = part.indices.size
    points = group.constellation.points * (_amplitude(group.level_db) * scale)
    return Carried(
        data=group.data.bind(
            site,
            n_bits=group.constellation.n_bits,
            period=part.presence.rank(n_symbols) * n,
            label=f".{part.key}",
        ),
        table=points.astype(np.complex64),
        bins=(part.indices % n_fft).astype(np.uint32),
        presence=part.presence,
        rotation=group.rotation.over(n).astype(np.complex64) if group.rotation.turns else None,
        is_spread=group.spreading == "dft",
        name=part.key,
        constellation=group.constellation.name,
    )


def pin(part: Part, *, n_fft: int, scale: float) -> Pinned:
    """Return pilots on their bins, at the amplitude ``scale`` for 0 dB."""
    return Pinned(
        bins=part.indices % n_fft,
        values=(part.expected * scale).astype(np.complex64),
        presence=part.presence,
        name=part.key,
    )


def _amplitude(level_db: float) -> float:
    return float(10 ** (level_db / 20))


def _count(site: Site, key: str, subcarriers: IndexSet) -> int:
    if not len(subcarriers):
        raise site.error(
            key=f"{key}.subcarriers",
            problem="no subcarriers are listed",
            allowed="at least one subcarrier",
            remedy="List some, or leave the entry out.",
        )
    return len(subcarriers)


def _note_spreading(site: Site, key: str, subcarriers: IndexSet) -> None:
    """Tell of a DFT length that no uplink has, and of subcarriers that make no single carrier."""
    indices = np.array(subcarriers.indices)
    where, rest = f"{site.path}.{key}.subcarriers", indices.size
    for factor in (2, 3, 5):
        while rest % factor == 0:
            rest //= factor
    if rest > 1:
        text = (
            f"A DFT of {indices.size} points is not of the form 2^a 3^b 5^c, to which the uplinks "
            "of E-UTRA and NR keep (TS 36.211 cl. 5.3.3, TS 38.211 cl. 6.3.1.4)."
        )
        site.notes.append(Note(kind="info", where=where, text=text))
    steps = np.diff(indices)
    if steps.size and not (steps == steps[0]).all():
        text = (
            "DFT-spread subcarriers that are not evenly spaced in the order listed: the envelope "
            "is not that of a single carrier."
        )
        site.notes.append(Note(kind="info", where=where, text=text))
