"""Unmodulated tones: an evenly spaced comb or a list, with the phases of one's choice."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import Annotated

import numpy as np
from annotated_types import Ge, Gt, Le, MinLen
from numpy.typing import NDArray

from wavegen.core.errors import RecipeError
from wavegen.core.signal import Signal
from wavegen.core.site import Cycle, Note, Site, samples_per
from wavegen.core.units import format_hz
from wavegen.laws.composite import LinesTerm
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.law import Law
from wavegen.laws.periodic import LARGEST_SPAN, PeriodicLaw
from wavegen.laws.phasors import phasor_law
from wavegen.laws.term import NoLaw, Term
from wavegen.sources.tones_phases import Phases, law_phases, note_uneven, optimise
from wavegen.sources.tones_signal import sum_tones

MOST_TONES = 1 << 16


@dataclass(frozen=True, slots=True, kw_only=True)
class Tone:
    """One tone of a list.

    Parameters
    ----------
    frequency_offset_hz : Fraction
        Distance from the centre frequency, Hz; it snaps to the loop's grid.
    level_db : float
        Level against the other tones, dB.
    phase_deg : float, optional
        Phase at sample 0, degrees; by the phase law if not given.
    """

    frequency_offset_hz: Fraction
    level_db: Annotated[float, Ge(-150), Le(150)] = 0.0
    phase_deg: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Notch:
    """A stretch of the spectrum whose tones are left out, for noise-power-ratio tests.

    Parameters
    ----------
    width_hz : Fraction
        Full width, Hz; tones on its edges are left out too.
    centre_hz : Fraction
        Its middle, Hz from the centre frequency.
    """

    width_hz: Annotated[Fraction, Gt(0)]
    centre_hz: Fraction = Fraction(0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Tones:
    """Settings of tones: a comb (``count`` and ``spacing``) or a list (``tones``).

    Parameters
    ----------
    count : int, optional
        Tones of the comb, a notch not yet taken out.
    spacing_hz : Fraction, optional
        Distance between neighbours, Hz, kept exactly. The comb is centred on zero frequency: an
        odd count has a tone there, an even one stands at odd multiples of half the spacing.
    empty_centre : bool
        Only for an even count: tones at whole multiples of the spacing, none at zero.
    tones : tuple of Tone, optional
        The list, in any order. Frequencies snap to the loop's grid.
    phases : {"equal", "random", "newman", "schroeder", "rudin_shapiro", "optimised"}
        Phase law, in the order of frequency, over all tones before a notch; a tone's own phase
        goes before it. ``optimised`` searches low-crest phases for the very tones that are left,
        at any spacing and level: 0.6 dB over the mean for 64 to 128 equal, evenly spaced tones.
    notch : Notch, optional
        Tones in it are left out; the rest is scaled to unit power.
    """

    count: Annotated[int, Ge(1), Le(MOST_TONES)] | None = None
    spacing_hz: Annotated[Fraction, Gt(0)] | None = None
    empty_centre: bool = False
    tones: Annotated[tuple[Tone, ...], MinLen(1)] | None = None
    phases: Phases = "random"
    notch: Notch | None = None

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return the comb's shortest whole loop; a list fits any loop, as it snaps.

        Raises
        ------
        RecipeError
            Neither a comb nor a list, or both, or an odd comb without its centre.
        """
        positions = comb_positions(self, path)
        if positions is None or self.spacing_hz is None:
            return Cycle(n_samples=1)
        unit = math.gcd(*positions)
        if not unit:
            return Cycle(n_samples=1)
        return Cycle(n_samples=samples_per(self.spacing_hz * unit / 2, sample_rate_hz)[0])

    def build(self, site: Site) -> Signal:
        """Return the signal, of unit mean power.

        Raises
        ------
        RecipeError
            As in :meth:`cycle`; a tone at or beyond half the sample rate; two tones of a list on
            one line of the loop's grid; a notch that leaves nothing.
        """
        lines = plan_lines(self, site)
        site.notes.extend(lines.notes)
        return sum_tones(
            sample_rate_hz=site.sample_rate_hz,
            n_samples=site.n_samples,
            bins=lines.bins,
            amplitudes=lines.amplitudes,
        )

    def law(self, site: Site) -> Law | None:
        """Return the exact curve of the tones' own period, or None where it is too intricate.

        Raises
        ------
        RecipeError
            As in :meth:`build`.
        """
        lines = plan_lines(self, site)
        if lines.bins.size == 1:
            return ConstantLaw()
        place = lines.bins - lines.bins.min()
        common = math.gcd(*place.tolist())
        if int(place.max()) // common > LARGEST_SPAN:
            return None
        return PeriodicLaw.of_harmonics(
            place // common,
            lines.amplitudes,
            n_instants=site.n_samples // math.gcd(common, site.n_samples),
            stride=common // math.gcd(common, site.n_samples),
            name=f"{lines.bins.size} tones, own period",
        )

    def ensemble(self, site: Site) -> Law | NoLaw:
        """Return the law over random phases, which is that of no one loop.

        Raises
        ------
        RecipeError
            As in :meth:`build`.

        Notes
        -----
        For comparison alone: a comb is one realisation, and its own law is :meth:`law`. 64 equal
        tones stand 2.6 to 18.1 dB over the mean for 0.1 % of the time, by their phases; the
        ensemble's 8.3 dB describes none of them.
        """
        lines = plan_lines(self, replace(site, notes=[]))
        name = f"random-phase ensemble of {lines.bins.size} tones"
        return phasor_law(np.abs(lines.amplitudes), name=name)

    def term(self, site: Site) -> Term:
        """Return what the tones are to a composite: known at each sample."""
        lines = plan_lines(self, replace(site, notes=[]))
        values = [complex(value) for value in lines.amplitudes]
        return LinesTerm.of(lines.bins.tolist(), values, n_samples=site.n_samples)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Lines:
    """Tones on the grid of a loop.

    Parameters
    ----------
    bins : int64 array, shape (n_tones,)
        Cycles per loop, rising; below half of ``n_samples`` in magnitude.
    amplitudes : complex128 array, shape (n_tones,)
        Unit total power.
    notes : tuple of Note
        What was rounded, left out or is doubtful.
    """

    bins: NDArray[np.int64]
    amplitudes: NDArray[np.complex128]
    notes: tuple[Note, ...]


def comb_positions(settings: Tones, path: str) -> list[int] | None:
    """Return the comb's tones in halves of the spacing, rising; None for a list.

    Raises
    ------
    RecipeError
        Neither a comb nor a list, or both, or an odd comb without its centre.
    """
    has_comb = settings.count is not None or settings.spacing_hz is not None
    if settings.tones is not None and not has_comb and not settings.empty_centre:
        return None
    if settings.tones is not None or settings.count is None or settings.spacing_hz is None:
        raise RecipeError(
            where=path,
            problem="the tones are given twice" if settings.tones else "the tones are not given",
            allowed="either count and spacing, or a list of tones",
            remedy="Write count: 64 and spacing: 100 kHz, or tones: [{frequency_offset: 1 MHz}].",
        )
    count = settings.count
    if not settings.empty_centre:
        return list(range(1 - count, count, 2))
    if count % 2:
        raise RecipeError(
            where=f"{path}.empty_centre",
            problem=f"{count} tones cannot stand evenly about an empty centre",
            allowed="an even count",
            remedy=f"Ask for {count + 1} tones or for {count - 1}.",
        )
    return [2 * number for number in range(-(count // 2), count // 2 + 1) if number]


def plan_lines(settings: Tones, site: Site) -> Lines:
    """Place, phase and scale the tones.

    Parameters
    ----------
    settings : Tones
        What is asked.
    site : Site
        The loop; its notes are left alone.

    Returns
    -------
    Lines

    Raises
    ------
    RecipeError
        See :meth:`Tones.build`.
    """
    notes: list[Note] = []
    wanted, keys = _in_order(settings, site)
    frequencies = [tone.frequency_offset_hz for tone in wanted]
    bins = _snapped(settings, site, frequencies, keys, notes)
    powers = np.array([10 ** (tone.level_db / 10) for tone in wanted])
    own = np.array([math.nan if tone.phase_deg is None else tone.phase_deg for tone in wanted])
    own = np.deg2rad(own)
    law = law_phases(settings.phases, site, powers, notes)
    phases = np.where(np.isnan(own), law, own)
    if np.isnan(own).any():
        note_uneven(settings.phases, site, bins, notes)
    keep = _outside_notch(settings, site, frequencies, notes)
    if settings.phases == "optimised":
        phases[keep] = optimise(site, bins[keep], powers[keep], own[keep], notes)
    power = powers[keep]
    amplitudes = np.sqrt(power / power.sum()) * np.exp(1j * phases[keep])
    return Lines(bins=bins[keep], amplitudes=amplitudes, notes=tuple(notes))


def _in_order(settings: Tones, site: Site) -> tuple[list[Tone], list[str]]:
    """Return the tones in the order of frequency, and where each stands in the settings.

    Complains about those that do not fit the sample rate.
    """
    positions = comb_positions(settings, site.path)
    if positions is None:
        listed = sorted(
            enumerate(settings.tones or ()), key=lambda item: item[1].frequency_offset_hz
        )
        keys = [f"tones[{number}].frequency_offset" for number, _ in listed]
        wanted = [tone for _, tone in listed]
    else:
        spacing = settings.spacing_hz or Fraction(0)
        keys = ["spacing"] * len(positions)
        wanted = [Tone(frequency_offset_hz=place * spacing / 2) for place in positions]
    for key, tone in zip(keys, wanted, strict=True):
        frequency = tone.frequency_offset_hz
        if 2 * abs(frequency) >= site.sample_rate_hz:
            raise site.error(
                key=key,
                problem=f"a tone at {format_hz(frequency)}",
                allowed=f"below half the sample rate, {format_hz(site.sample_rate_hz / 2)}",
                remedy="Raise the sample rate or move the tones inwards.",
            )
    return wanted, keys


def _snapped(
    settings: Tones,
    site: Site,
    frequencies: list[Fraction],
    keys: list[str],
    notes: list[Note],
) -> NDArray[np.int64]:
    """Return the lines of the loop's grid that the tones fall on, noting those that moved."""
    grid = site.sample_rate_hz / site.n_samples
    bins = [round(frequency / grid) for frequency in frequencies]
    for number, (frequency, line) in enumerate(zip(frequencies, bins, strict=True)):
        moved = line * grid - frequency
        if moved and settings.tones is None:
            raise site.error(
                key="spacing",
                problem=f"{format_hz(frequency)} is not a whole number of cycles in a loop of "
                f"{site.n_samples} samples",
                allowed=f"multiples of {format_hz(grid)}",
                remedy="Make the loop a whole multiple of the comb's own cycle.",
            )
        if number and (line - bins[number - 1]) % site.n_samples == 0:
            raise site.error(
                key="tones",
                problem=f"{format_hz(frequencies[number - 1])} and {format_hz(frequency)} fall "
                f"on the same line, {format_hz(line * grid)}",
                allowed=f"tones {format_hz(grid)} apart, one over the loop's duration",
                remedy="Move the tones apart or make the loop longer.",
            )
        if moved:
            notes.append(
                Note(
                    kind="rounded",
                    where=f"{site.path}.{keys[number]}",
                    text=f"A tone moved by {format_hz(moved)} to a whole number of cycles in the "
                    "loop.",
                    asked=format_hz(frequency),
                    given=format_hz(line * grid),
                )
            )
    if len(bins) > 1 and (bins[-1] - bins[0]) % site.n_samples == 0:
        raise site.error(
            key="tones",
            problem=f"{format_hz(frequencies[0])} and {format_hz(frequencies[-1])} fall on the "
            "same line",
            allowed="tones on lines of their own",
            remedy="Make the loop longer.",
        )
    return np.array(bins, dtype=np.int64)


def _outside_notch(
    settings: Tones, site: Site, frequencies: list[Fraction], notes: list[Note]
) -> NDArray[np.bool_]:
    """Return which tones stay, and note how many do not."""
    if settings.notch is None:
        return np.ones(len(frequencies), np.bool_)
    centre, half = settings.notch.centre_hz, settings.notch.width_hz / 2
    keep = np.array([abs(frequency - centre) > half for frequency in frequencies])
    removed = int(keep.size - keep.sum())
    if removed == keep.size:
        raise site.error(
            key="notch",
            problem=f"a notch of {format_hz(2 * half)} at {format_hz(centre)} leaves no tone",
            allowed="a notch narrower than the tones",
            remedy="Narrow or move the notch.",
        )
    notes.append(
        Note(
            kind="info" if removed else "warning",
            where=f"{site.path}.notch",
            text=f"The notch leaves out {removed} of {keep.size} tones.",
        )
    )
    return keep
