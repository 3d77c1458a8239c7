"""The law of an OFDM signal, from its settings alone."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from wavegen.core.site import Site
from wavegen.laws.inversion import law_of_characteristic
from wavegen.laws.law import Law
from wavegen.laws.mixture import KnownAmplitudes, MixedTail
from wavegen.laws.papr_symbol import LevelCrossing
from wavegen.laws.radial import RadialLaw, Tail
from wavegen.laws.term import NoLaw
from wavegen.sources.ofdm_carriers import Carriers, is_on_a_line
from wavegen.sources.ofdm_instants import (
    MOST_INSTANTS,
    MOST_SUBCARRIERS,
    MOST_VALUES,
    Instants,
    law_of_instants,
)
from wavegen.sources.ofdm_layout import Layout
from wavegen.sources.ofdm_moments import Drawn, Moments, OfdmTerm, moments_of
from wavegen.sources.ofdm_parts import Group, Pilots, part_of_group, part_of_pilots
from wavegen.sources.ofdm_power import Part, mean_power
from wavegen.sources.ofdm_sums import n_sums

FEWEST_SUBCARRIERS = 48
"""Fewer, counted by their shares of the power, are not isotropic over the samples of a symbol."""
MOST_FACTORS = 8000
"""Instants times subcarriers that are gone through in about two seconds; a quarter of it where
points lie on a line (BPSK), whose functions die out late."""
_ROUNDING = 1e-9
_OCTAVES = 2.0


class Settings(Protocol):
    """What is read of the settings of an OFDM signal."""

    @property
    def groups(self) -> tuple[Group, ...]:
        """Subcarriers with data."""

    @property
    def pilots(self) -> tuple[Pilots, ...]:
        """Subcarriers with fixed values."""

    @property
    def half_subcarrier_shift(self) -> bool:
        """Whether every subcarrier stands half a spacing higher."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Laid:
    """What settings come to."""

    term: OfdmTerm
    on: NDArray[np.bool_]
    scale: float
    uneven: str | None
    """Why the data are not isotropic."""


def ofdm_term(settings: Settings, site: Site, layout: Layout, n_frame: int) -> OfdmTerm | NoLaw:
    """Return what an OFDM signal is to a composite, at unit mean power.

    Parameters
    ----------
    settings : settings of OFDM
        Groups and pilots.
    site : Site
        Where it is built; takes no notes here.
    layout : Layout
        Prefixes and edge in samples.
    n_frame : int
        Symbols of a frame.

    Returns
    -------
    OfdmTerm or NoLaw
        No law where the data of a symbol have the power of fewer than 48 equal subcarriers or
        are DFT-spread, where a constellation is not circular (``E a^2`` or ``E a^3`` is not 0:
        BPSK), or where the data are no independent draws.

    Raises
    ------
    RecipeError
        As raised by a group or an entry of pilots.
    """
    laid = _lay(settings, site, layout, n_frame)
    if isinstance(laid, NoLaw):
        return laid
    return NoLaw(reason=laid.uneven) if laid.uneven else laid.term


def _lay(settings: Settings, site: Site, layout: Layout, n_frame: int) -> _Laid | NoLaw:
    quiet = replace(site, notes=[])
    groups = [
        part_of_group(quiet, f"groups[{i}]", x, n_frame) for i, x in enumerate(settings.groups)
    ]
    pilots = [
        part_of_pilots(quiet, f"pilots[{i}]", x, n_frame) for i, x in enumerate(settings.pilots)
    ]
    parts, is_shifted = [*groups, *pilots], settings.half_subcarrier_shift
    data = _data_of(settings.groups, site)
    if isinstance(data, NoLaw):
        return data
    if any(group.spreading is not None for group in settings.groups):
        return NoLaw(reason="DFT-spread subcarriers have no law")
    scale = 1 / math.sqrt(mean_power(layout, parts, is_shifted=is_shifted))
    moments, on, clock = moments_of(layout, parts, is_shifted=is_shifted, scale=scale)
    drawn = [_drawn_of(settings.groups, row, scale) for row in on]
    names = dict.fromkeys(group.constellation.name for group in settings.groups)
    has_known = any(m.known is not None for m in moments)
    made = OfdmTerm(
        name=f"OFDM, {', '.join(names)}" if names else "OFDM, pilots alone",
        holds="over seeds" if settings.groups else "every loop",
        peak=max(
            _peak(state, row, groups, pilots, scale) for state, row in zip(drawn, on, strict=True)
        ),
        clock_samples=clock,
        symmetry=1 if has_known else 0,
        data=frozenset(name for name, _ in data),
        lowest_probability=max((lowest for _, lowest in data), default=0.0),
        moments=tuple(moments),
        drawn=tuple(drawn),
    )
    term = replace(made, clock_samples=1) if made.is_uniform else made
    reasons = (_uneven(settings.groups, state) for state in drawn)
    return _Laid(term=term, on=on, scale=scale, uneven=next(filter(None, reasons), None))


def ofdm_law(settings: Settings, site: Site, layout: Layout, n_frame: int) -> Law | NoLaw:
    """Return the law of an OFDM signal on its own.

    Parameters
    ----------
    settings, site, layout, n_frame
        As in :func:`ofdm_term`.

    Returns
    -------
    Law or NoLaw

    Notes
    -----
    Where the data are not isotropic the two-dimensional function is averaged over the samples of
    a symbol: :mod:`wavegen.sources.ofdm_instants`.
    """
    laid = _lay(settings, site, layout, n_frame)
    if isinstance(laid, NoLaw):
        return laid
    if not laid.uneven:
        return law_of_moments(laid.term)
    n_most = sum(len(group.subcarriers) for group in settings.groups)
    used = [k for group in settings.groups for k in group.subcarriers.indices]
    if n_most > MOST_SUBCARRIERS or not all(laid.term.drawn):
        return NoLaw(reason=laid.uneven)
    shift = 0.5 if settings.half_subcarrier_shift else 0.0
    carriers = [
        tuple(
            Carriers.laid(
                turns=(np.array(group.subcarriers.indices) + shift) / layout.n_fft,
                phases=np.angle(group.rotation.over(len(group.subcarriers))),
                points=(group.constellation.points - _mean(group.constellation.points))
                * (10 ** (group.level_db / 20) * laid.scale),
            )
            for group, is_on in zip(settings.groups, row, strict=False)
            if is_on
        )
        for row in laid.on
    ]
    span = max(used) - min(used) + 1
    instants = Instants.of(
        laid.term.moments,
        carriers,
        n_fft=layout.n_fft,
        span=span,
        finest=_finest(carriers),
    )
    most = MOST_FACTORS // 4 if any(map(_is_flat, settings.groups)) else MOST_FACTORS
    if instants is None or instants.weights.size * n_most > most:
        return NoLaw(reason=laid.uneven)
    return law_of_instants(
        instants,
        name=laid.term.name,
        peak=laid.term.peak,
        lowest_probability=laid.term.lowest_probability,
    )


def law_of_moments(term: OfdmTerm) -> Law | NoLaw:
    """Return the law of what is isotropic about what is known.

    Parameters
    ----------
    term : OfdmTerm
        From :func:`ofdm_term`.

    Returns
    -------
    Law or NoLaw

    Notes
    -----
    Moments without data (pilots alone, silent symbols) are counted as they are. The others are
    inverted together where their data have about the same power.
    """
    n_all = sum(moments.count for moments in term.moments)
    weights: list[float] = []
    tails: list[Tail] = []
    radii: list[float] = []
    random: dict[int, list[Moments]] = {}
    for moments in term.moments:
        power = sum(
            gain**2 * part.count * part.power
            for state, gain in moments.sources
            for part in term.drawn[state]
        )
        if power > 0:
            random.setdefault(round(math.log2(power) / _OCTAVES), []).append(moments)
        elif moments.known is not None:
            weights.append(moments.count / n_all)
            tails.append(KnownAmplitudes(amplitudes=np.sort(np.abs(moments.known))))
            radii.append(math.inf)
    for alike in random.values():
        part = replace(term, moments=tuple(alike), _last={})
        total = sum(moments.count for moments in alike)
        law = law_of_characteristic(
            part.characteristic,
            name=term.name,
            holds=term.holds,
            mean_power=_mean_power(part),
            peak=term.peak,
        )
        if isinstance(law, NoLaw):
            return law
        weights.append(total / n_all)
        tails.append(law.tail)
        radii.append(min(law.radius, law.peak))
    return RadialLaw(
        name=term.name,
        holds=term.holds,
        mean_power=1.0,
        peak=term.peak,
        radius=term.peak,
        tail=MixedTail(weights=tuple(weights), tails=tuple(tails), radii=tuple(radii)),
        lowest_probability=term.lowest_probability,
    )


def _mean_power(term: OfdmTerm) -> float:
    """Return the mean power of the moments of a term."""
    total, n_all = 0.0, 0
    for moments in term.moments:
        power = sum(
            gain**2 * part.count * part.power
            for state, gain in moments.sources
            for part in term.drawn[state]
        )
        if moments.known is not None:
            power += float(np.mean(np.abs(moments.known) ** 2))
        total += moments.count * power
        n_all += moments.count
    return total / n_all


def _data_of(groups: Sequence[Group], site: Site) -> list[tuple[str, float]] | NoLaw:
    """Return the stream of each group and the lowest probability it serves."""
    found: list[tuple[str, float]] = []
    for number, group in enumerate(groups):
        bits = group.data.period_bits(site.folder)
        if bits is None:
            share = getattr(group.data, "share", None)
            found.append((f"{share or site.label}.groups[{number}]", 0.0))
            continue
        name = getattr(group.data, "sequence", None)
        if name is None:
            return NoLaw(reason=f"finite pattern: groups[{number}] repeats {bits} bits")
        if any(name == other for other, _ in found):
            return NoLaw(reason=f"two groups carry the same {name}")
        found.append((name, 10 / bits))
    return found


def _drawn_of(groups: Sequence[Group], on: NDArray[np.bool_], scale: float) -> tuple[Drawn, ...]:
    """Return what the groups that are on draw in a symbol."""
    made = []
    for group, is_on in zip(groups, on, strict=False):  # pilots come after the groups
        points = group.constellation.points
        centred = points - _mean(points)
        if is_on and np.abs(centred).max() > _ROUNDING:
            radii = np.abs(centred) * (10 ** (group.level_db / 20) * scale)
            made.append(Drawn(count=len(group.subcarriers), radii=radii))
    return tuple(made)


def _mean(points: NDArray[np.complex128]) -> complex:
    mean = complex(points.mean())
    return mean if abs(mean) > _ROUNDING else 0j


def _is_flat(group: Group) -> bool:
    points = group.constellation.points
    return is_on_a_line(points - _mean(points))


def _finest(carriers: Sequence[Sequence[Carriers]]) -> int:
    """Return how many samples of a symbol to go through: more, where its sums are few."""
    most = max(n_sums(groups) for groups in carriers)
    return int(min(MOST_VALUES / most, MOST_INSTANTS))


def _uneven(groups: Sequence[Group], state: Sequence[Drawn]) -> str | None:
    """Return why the data of a state are not isotropic, or None."""
    for group in groups:
        points = group.constellation.points - _mean(group.constellation.points)
        skew = max(abs(np.mean(points**2)), abs(np.mean(points**3)))
        if skew > _ROUNDING:
            name = group.constellation.name
            return f"OFDM with {name}: it is not circular, so that samples differ within a symbol"
    total = sum(part.count * part.power for part in state)
    squares = sum(part.count * part.power**2 for part in state)
    if total and total**2 < (FEWEST_SUBCARRIERS - _ROUNDING) * squares:
        return (
            f"OFDM with the power of {total**2 / squares:.0f} subcarriers of data; "
            f"from {FEWEST_SUBCARRIERS} on there is a law"
        )
    return None


def _peak(
    state: Sequence[Drawn],
    on: NDArray[np.bool_],
    groups: Sequence[Part],
    pilots: Sequence[Part],
    scale: float,
) -> float:
    """Return a bound on the envelope of a symbol: all subcarriers at their peaks, in phase."""
    known = sum(
        float(np.sum(np.abs(part.expected))) * scale
        for part, is_on in zip([*groups, *pilots], on, strict=True)
        if is_on
    )
    return known + sum(part.count * float(part.radii.max()) for part in state)


def ofdm_symbol_law(
    settings: Settings, site: Site, layout: Layout, n_frame: int
) -> LevelCrossing | NoLaw:
    """Return the law of the PAPR per symbol: another statistic than the law of the envelope.

    Parameters
    ----------
    settings, site, layout, n_frame
        As in :func:`ofdm_term`.

    Returns
    -------
    LevelCrossing or NoLaw
        No law with a schedule or with pilots, or where the envelope has none.
    """
    if n_frame > 1 or settings.pilots:
        return NoLaw(reason="PAPR per symbol with pilots or a schedule has no law")
    term = ofdm_term(settings, site, layout, n_frame)
    if isinstance(term, NoLaw):
        return term
    return LevelCrossing.of_spectrum(
        np.concatenate([np.array(group.subcarriers.indices) for group in settings.groups]),
        np.concatenate(
            [
                np.full(len(group.subcarriers), 10 ** (group.level_db / 10))
                for group in settings.groups
            ]
        ),
    )
