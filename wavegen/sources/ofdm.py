"""OFDM: groups of subcarriers with data, pilots, cyclic prefixes and an edge window."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Annotated, ClassVar

from annotated_types import Ge, Gt, Le

from wavegen.core.errors import RecipeError
from wavegen.core.site import Cycle, Site
from wavegen.core.units import QuantityError
from wavegen.laws.law import Law
from wavegen.laws.papr_symbol import LevelCrossing
from wavegen.laws.term import NoLaw
from wavegen.sources.ofdm_law import ofdm_law, ofdm_symbol_law, ofdm_term
from wavegen.sources.ofdm_layout import (
    MOST_SYMBOLS,
    CyclicPrefix,
    Layout,
    Stretch,
    fft_length,
    lay_out,
)
from wavegen.sources.ofdm_moments import OfdmTerm
from wavegen.sources.ofdm_occupancy import check_subcarriers, note_idle
from wavegen.sources.ofdm_parts import Group, Pilots, carry, part_of_group, part_of_pilots, pin
from wavegen.sources.ofdm_power import Part, mean_power
from wavegen.sources.ofdm_signal import Points, Prefixed, Subcarriers, SymbolBodies

NO_EDGE = Stretch(Fraction(0), in_samples=True)
MOST_IN_CYCLE = 100_000
"""Longest common cycle of prefixes and frame, symbols."""


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
    frame_symbols : int, optional
        Symbols after which the schedule of groups and pilots repeats; the list of prefixes
        unless given. Two parts may share subcarriers where they are on in different symbols. A
        symbol in which nothing is on is silent, but for the edge of the one before.
    half_subcarrier_shift : bool
        Subcarrier ``k`` stands at ``k + 1/2`` spacings, so that a set from ``-n`` to ``n - 1``
        is symmetrical and none falls on the centre: the uplink of E-UTRA. Its phase is 0 where
        the useful part of each symbol starts (3GPP TS 36.211 cl. 5.6), so that the loop closes
        as it does without.
    """

    subcarrier_spacing_hz: Annotated[Fraction, Gt(0)]
    groups: tuple[Group, ...]
    pilots: tuple[Pilots, ...] = ()
    cyclic_prefix: CyclicPrefix
    edge_window: Stretch = NO_EDGE
    frame_symbols: Annotated[int, Ge(1), Le(MOST_SYMBOLS)] | None = None
    half_subcarrier_shift: bool = False

    is_framed: ClassVar[bool] = True
    """Cycles are frames: they get markers."""

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return the shortest loop: whole patterns of prefixes and whole frames.

        Raises
        ------
        RecipeError
            The FFT length, a prefix or the edge is not a whole number of samples, the edge is
            longer than the shortest prefix, or prefixes and frame have no common cycle within
            100 000 symbols.
        """
        return self._cycle(self._lay_out(sample_rate_hz, path), path)

    def data_cycle(
        self, sample_rate_hz: Fraction, path: str, folder: Path = Path()
    ) -> Cycle | None:
        """Return the shortest loop that also holds whole periods of every group's data.

        Parameters
        ----------
        sample_rate_hz : Fraction
            Hz.
        path : str
            Path in the recipe, for messages.
        folder : Path
            What the paths of a recipe are relative to.

        Returns
        -------
        Cycle or None
            None where no group's data have a period. Periods are counted in the first that has.

        Raises
        ------
        RecipeError
            Data from a file that cannot be read, or as :meth:`cycle`.
        """
        cycle = self.cycle(sample_rate_hz, path)
        n_cycles, first = 1, Fraction(0)
        for number, group in enumerate(self.groups):
            try:
                period = group.data.period_bits(folder)
            except QuantityError as error:
                raise RecipeError(
                    where=f"{path}.groups[{number}].data.path",
                    problem=error.problem,
                    allowed=error.allowed,
                    remedy=error.remedy,
                ) from error
            if period is not None:
                n_on = self._n_frame if group.symbols is None else len(group.symbols.numbers)
                n_bits = len(group.subcarriers.indices) * group.constellation.n_bits
                n_bits *= n_on * cycle.n_symbols // self._n_frame
                n_cycles = math.lcm(n_cycles, period // math.gcd(period, n_bits))
                first = first or Fraction(n_bits, period)
        if not first:
            return None
        return Cycle(
            n_samples=cycle.n_samples * n_cycles,
            n_symbols=cycle.n_symbols * n_cycles,
            n_data_periods=int(first * n_cycles),
        )

    def build(self, site: Site) -> Prefixed:
        """Return the signal; its expected mean power is 1, silent symbols included.

        Raises
        ------
        RecipeError
            As :meth:`cycle`; or no subcarriers, one out of range or used twice in a symbol, a
            symbol out of the frame, pilots that are all zero, or a loop that holds no whole
            number of cycles.
        """
        layout = self._lay_out(site.sample_rate_hz, site.path)
        cycle = self._cycle(layout, site.path)
        n_cycles, rest = divmod(site.n_samples, cycle.n_samples)
        if rest or not n_cycles:
            raise site.error(
                key="",
                problem=f"a loop of {site.n_samples} samples cuts a cycle of symbols",
                allowed=f"multiples of {cycle.n_samples} samples",
                remedy="Ask for a duration in symbols.",
            )
        n_frame = self._n_frame
        groups = [
            part_of_group(site, f"groups[{i}]", x, n_frame) for i, x in enumerate(self.groups)
        ]
        pilots = [
            part_of_pilots(site, f"pilots[{i}]", x, n_frame) for i, x in enumerate(self.pilots)
        ]
        return self._assemble(site, layout, groups, pilots, n_cycles * cycle.n_symbols)

    def term(self, site: Site) -> OfdmTerm | NoLaw:
        """Return what the signal is to a composite, at unit mean power."""
        layout = self._lay_out(site.sample_rate_hz, site.path)
        return ofdm_term(self, site, layout, self._n_frame)

    def law(self, site: Site) -> Law | NoLaw:
        """Return the law of the envelope over seeds; none by name where there is none."""
        layout = self._lay_out(site.sample_rate_hz, site.path)
        return ofdm_law(self, site, layout, self._n_frame)

    def symbol_papr_law(self, site: Site) -> LevelCrossing | NoLaw:
        """Return the law of the PAPR per symbol, which is not that of the envelope."""
        layout = self._lay_out(site.sample_rate_hz, site.path)
        return ofdm_symbol_law(self, site, layout, self._n_frame)

    def _assemble(
        self,
        site: Site,
        layout: Layout,
        groups: Sequence[Part],
        pilots: Sequence[Part],
        n_symbols: int,
    ) -> Prefixed:
        parts, n_fft, is_shifted = [*groups, *pilots], layout.n_fft, self.half_subcarrier_shift
        indices = check_subcarriers(site, parts, n_fft)
        power = mean_power(layout, parts, is_shifted=is_shifted)
        note_idle(site, parts)
        scale, per_sample = 1 / math.sqrt(power), site.sample_rate_hz * n_symbols / site.n_samples
        bodies = SymbolBodies(
            sample_rate_hz=per_sample * n_fft,
            n_samples=n_symbols * n_fft,
            step=n_fft,
            mean_power=sum(part.mean_power for part in parts) / power,
            n_fft=n_fft,
            carried=tuple(
                carry(site, group, part, n_fft=n_fft, n_symbols=n_symbols, scale=scale)
                for group, part in zip(self.groups, groups, strict=True)
            ),
            pinned=tuple(pin(part, n_fft=n_fft, scale=scale) for part in pilots),
            indices=indices,
            is_shifted=is_shifted,
        )
        ideal = Subcarriers(
            sample_rate_hz=per_sample * indices.size,
            n_samples=n_symbols * indices.size,
            step=indices.size,
            mean_power=sum(part.mean_power for part in parts) / power / indices.size,
            bodies=bodies,
        )
        n_points = sum(part.indices.size for part in groups)
        points = (
            Points(
                sample_rate_hz=per_sample * n_points,
                n_samples=n_symbols * n_points,
                step=n_points,
                mean_power=sum(part.mean_power for part in groups) / power / n_points,
                bodies=bodies,
            )
            if any(part.is_spread for part in bodies.carried)
            else None
        )
        return Prefixed(
            sample_rate_hz=site.sample_rate_hz,
            n_samples=site.n_samples,
            inputs=(bodies,),
            layout=layout,
            ideal=ideal,
            points=points,
            is_shifted=is_shifted,
        )

    @property
    def _n_frame(self) -> int:
        """Symbols of a frame: as asked, else the prefixes listed if there is a schedule."""
        if self.frame_symbols is not None:
            return self.frame_symbols
        listed = [x.symbols for x in self.groups] + [x.symbols for x in self.pilots]
        is_scheduled = any(symbols is not None for symbols in listed)
        return self.cyclic_prefix.n_symbols if is_scheduled else 1

    def _cycle(self, layout: Layout, path: str) -> Cycle:
        n_symbols = math.lcm(layout.n_symbols, self._n_frame)
        if n_symbols > MOST_IN_CYCLE:
            raise RecipeError(
                where=f"{path}.frame",
                problem=f"prefixes of {layout.n_symbols} symbols and a frame of {self._n_frame} "
                f"symbols come round together after {n_symbols} symbols",
                allowed=f"up to {MOST_IN_CYCLE} symbols",
                remedy="Choose a frame that is a multiple of the list of prefixes.",
            )
        n_samples = layout.n_samples * n_symbols // layout.n_symbols
        return Cycle(n_samples=n_samples, n_symbols=n_symbols)

    def _lay_out(self, sample_rate_hz: Fraction, path: str) -> Layout:
        n_fft = fft_length(
            sample_rate_hz=sample_rate_hz,
            spacing_hz=self.subcarrier_spacing_hz,
            where=f"{path}.subcarrier_spacing",
        )
        return lay_out(n_fft=n_fft, prefix=self.cyclic_prefix, edge=self.edge_window, path=path)
