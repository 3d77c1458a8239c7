"""OFDM: groups of subcarriers with data, pilots, cyclic prefixes and an edge window."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Annotated, Any

import numpy as np
from annotated_types import Ge, Gt, Le
from numpy.typing import NDArray

from wavegen.core.registry import Member
from wavegen.core.site import Cycle, Note, Site
from wavegen.sources.data.random import Random
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm_layout import CyclicPrefix, Layout, Stretch, fft_length, lay_out
from wavegen.sources.ofdm_signal import Carried, Prefixed, Subcarriers, SymbolBodies
from wavegen.sources.subcarriers import IndexSet, PilotValues

Level = Annotated[float, Ge(-100), Le(100)]
NO_EDGE = Stretch(Fraction(0), in_samples=True)


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
    data : member of DATA
        Where the symbols come from.
    """

    subcarriers: IndexSet
    constellation: Constellation
    level_db: Level = 0.0
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
    """

    subcarriers: IndexSet
    values: PilotValues
    level_db: Level = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Ofdm:
    """Settings of an OFDM signal.

    Parameters
    ----------
    subcarrier_spacing_hz : Fraction
        Sample rate over spacing is the FFT length and must be an integer.
    groups : tuple of Group
        Subcarriers with data. Subcarrier 0, the centre, is empty unless listed.
    pilots : tuple of Pilots
        Subcarriers with fixed values.
    cyclic_prefix : CyclicPrefix
        ``16 samples``, ``144/2048`` of the useful symbol, or a repeating list such as
        ``[160/2048, 6 x 144/2048]``.
    edge_window : Stretch
        Overlap of neighbouring symbols inside the prefix, raised cosine; none by default.
    """

    subcarrier_spacing_hz: Annotated[Fraction, Gt(0)]
    groups: tuple[Group, ...]
    pilots: tuple[Pilots, ...] = ()
    cyclic_prefix: CyclicPrefix
    edge_window: Stretch = NO_EDGE

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return one pattern of prefixes as the shortest loop.

        Raises
        ------
        RecipeError
            The FFT length, a prefix or the edge is not a whole number of samples, or the edge
            is longer than the shortest prefix.
        """
        layout = self._lay_out(sample_rate_hz, path)
        return Cycle(n_samples=layout.n_samples, n_symbols=layout.n_symbols)

    def build(self, site: Site) -> Prefixed:
        """Return the signal; its expected mean power is 1.

        Raises
        ------
        RecipeError
            As :meth:`cycle`; or no subcarriers, one out of range or listed twice, pilots
            that are all zero, or a loop that holds no whole number of patterns.
        """
        layout = self._lay_out(site.sample_rate_hz, site.path)
        n_patterns, rest = divmod(site.n_samples, layout.n_samples)
        if rest or not n_patterns:
            raise site.error(
                key="",
                problem=f"a loop of {site.n_samples} samples cuts a pattern of prefixes",
                allowed=f"multiples of {layout.n_samples} samples",
                remedy="Ask for a duration in symbols.",
            )
        n_symbols = n_patterns * layout.n_symbols
        n_fft = layout.n_fft
        indices = self._check(site, n_fft)
        fixed, variance = np.zeros(n_fft, np.complex128), 0.0
        for number, pilots in enumerate(self.pilots):
            bins = np.array(pilots.subcarriers.indices) % n_fft
            fixed[bins] = _amplitude(pilots.level_db) * _values(site, number, pilots)
        expected = fixed.copy()
        for group in self.groups:
            mean, amplitude = _centre(group.constellation), _amplitude(group.level_db)
            expected[np.array(group.subcarriers.indices) % n_fft] = mean * amplitude
            variance += len(group.subcarriers) * (1 - abs(mean) ** 2) * amplitude**2
        power = layout.mean_power(variance, expected)
        scale = 1 / math.sqrt(power)
        body_power = (variance + float(np.sum(np.abs(expected) ** 2))) / power
        bodies = SymbolBodies(
            sample_rate_hz=site.sample_rate_hz * n_symbols * n_fft / site.n_samples,
            n_samples=n_symbols * n_fft,
            step=n_fft,
            mean_power=body_power,
            n_fft=n_fft,
            carried=tuple(
                _carry(site, number, group, n_fft=n_fft, n_symbols=n_symbols, scale=scale)
                for number, group in enumerate(self.groups)
            ),
            fixed=(fixed * scale).astype(np.complex64),
            indices=indices,
        )
        ideal = Subcarriers(
            sample_rate_hz=site.sample_rate_hz * n_symbols * indices.size / site.n_samples,
            n_samples=n_symbols * indices.size,
            step=indices.size,
            mean_power=body_power / indices.size,
            bodies=bodies,
        )
        return Prefixed(
            sample_rate_hz=site.sample_rate_hz,
            n_samples=site.n_samples,
            inputs=(bodies,),
            layout=layout,
            ideal=ideal,
        )

    def _lay_out(self, sample_rate_hz: Fraction, path: str) -> Layout:
        n_fft = fft_length(
            sample_rate_hz=sample_rate_hz,
            spacing_hz=self.subcarrier_spacing_hz,
            where=f"{path}.subcarrier_spacing",
        )
        return lay_out(n_fft=n_fft, prefix=self.cyclic_prefix, edge=self.edge_window, path=path)

    def _check(self, site: Site, n_fft: int) -> NDArray[np.intp]:
        """Return the subcarriers in use, ascending, each listed once and within the FFT."""
        sets = [
            (f"groups[{i}].subcarriers", part.subcarriers) for i, part in enumerate(self.groups)
        ]
        sets += [
            (f"pilots[{i}].subcarriers", part.subcarriers) for i, part in enumerate(self.pilots)
        ]
        lowest, highest = -(n_fft // 2), (n_fft - 1) // 2
        owner: dict[int, str] = {}
        for key, subcarriers in sets:
            if not len(subcarriers):
                raise site.error(
                    key=key,
                    problem="no subcarriers are listed",
                    allowed="at least one subcarrier",
                    remedy="List some, or leave the entry out.",
                )
            for index in subcarriers.indices:
                if not lowest <= index <= highest:
                    raise site.error(
                        key=key,
                        problem=f"subcarrier {index} is outside an FFT of {n_fft}",
                        allowed=f"{lowest} to {highest}",
                        remedy="Leave it out, or raise the sample rate.",
                    )
                if index in owner:
                    raise site.error(
                        key=key,
                        problem=f"subcarrier {index} is listed before, in {owner[index]}",
                        allowed="each subcarrier once",
                        remedy="Leave it out in one of the two.",
                    )
                owner[index] = key
        if not owner:
            raise site.error(
                key="groups",
                problem="there are neither groups nor pilots",
                allowed="at least one group or one entry of pilots",
                remedy="Add a group with subcarriers and a constellation.",
            )
        return np.array(sorted(owner), np.intp)


def _amplitude(level_db: float) -> float:
    return float(10 ** (level_db / 20))


def _centre(constellation: Constellation) -> complex:
    """Return the mean of the points; rounding around zero counts as zero."""
    mean = complex(constellation.points.mean())
    return mean if abs(mean) > 1e-12 else 0.0


def _values(site: Site, number: int, pilots: Pilots) -> NDArray[np.complex128]:
    """Return the values of one entry of pilots, unit mean power, with a note if all are equal."""
    n, key = len(pilots.subcarriers), f"pilots[{number}]"
    drawn = pilots.values.drawn_from
    n_bits = drawn.n_bits if drawn else 1
    stream = Random().bind(site, n_bits=n_bits, period=n, label=f".{key}")
    values = pilots.values.over(n, stream.words(0, n))
    if not values.any():
        raise site.error(
            key=f"{key}.values",
            problem=f"the first {n} values, all that are used, are zero",
            allowed="at least one value that is not zero",
            remedy="Change the values, or leave the pilots out.",
        )
    if n > 1 and bool(np.all(values == values[0])):
        note = Note(
            kind="warning",
            where=f"{site.path}.{key}.values",
            text=f"All {n} pilots have the same value: they add up to one peak in every symbol.",
        )
        site.notes.append(note)
    return values


def _carry(
    site: Site, number: int, group: Group, *, n_fft: int, n_symbols: int, scale: float
) -> Carried:
    points = group.constellation.points * (_amplitude(group.level_db) * scale)
    n = len(group.subcarriers)
    return Carried(
        data=group.data.bind(
            site,
            n_bits=group.constellation.n_bits,
            period=n_symbols * n,
            label=f".groups[{number}]",
        ),
        table=points.astype(np.complex64),
        bins=(np.array(group.subcarriers.indices) % n_fft).astype(np.uint32),
    )
