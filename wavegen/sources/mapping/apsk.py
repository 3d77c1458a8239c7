"""Amplitude and phase-shift keying: points on rings."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import pairwise
from typing import Any

import numpy as np

from wavegen.core.registry import nearest
from wavegen.core.units import DIMENSIONS, QuantityError, parse_quantity
from wavegen.sources.mapping.constellation import LARGEST, Constellation

RATIOS_16: dict[str, tuple[float, ...]] = {
    "2/3": (3.15,),
    "3/4": (2.85,),
    "4/5": (2.75,),
    "5/6": (2.7,),
    "8/9": (2.6,),
    "9/10": (2.57,),
}
"""Outer ring over inner ring by code rate: ETSI EN 302 307-1, table 9, as quoted in public code."""

RATIOS_32: dict[str, tuple[float, ...]] = {
    "3/4": (2.84, 5.27),
    "4/5": (2.72, 4.87),
    "5/6": (2.64, 4.64),
    "8/9": (2.54, 4.33),
    "9/10": (2.53, 4.3),
}
"""Middle and outer ring over inner ring: ETSI EN 302 307-1, table 10, as quoted in public code."""

_TWELVE = (45, 315, 135, 225, 15, 345, 165, 195, 75, 285, 105, 255)
_RINGS_16 = (1,) * 12 + (0,) * 4
_DEGREES_16 = (*_TWELVE, 45, 315, 135, 225)

_RINGS_32 = (1,) * 8 + (2,) * 8 + (1, 0) * 4 + (2,) * 8
_DEGREES_32 = (
    *(45, 75, 315, 285, 135, 105, 225, 255),
    *(22.5, 67.5, 315, 270, 135, 90, 202.5, 247.5),
    *(15, 45, 345, 315, 165, 135, 195, 225),
    *(0, 45, 337.5, 292.5, 157.5, 112.5, 180, 225),
)

TABLES = {
    "16apsk": (RATIOS_16, _RINGS_16, _DEGREES_16),
    "32apsk": (RATIOS_32, _RINGS_32, _DEGREES_32),
}
"""Ratios by code rate; ring and angle in degrees by symbol number."""


def apsk16() -> Constellation:
    """Return the 4+12 points of DVB-S2 at code rate 3/4.

    Returns
    -------
    Constellation
        Labels of the standard.

    Notes
    -----
    Source: ETSI EN 302 307-1, cl. 5.4.3 and table 9, as quoted in public code.

    Examples
    --------
    >>> sorted(set(np.abs(apsk16().points).round(5).tolist()))
    [0.39709, 1.13171]
    """
    return rated_apsk("16apsk", "3/4")


def apsk32() -> Constellation:
    """Return the 4+12+16 points of DVB-S2 at code rate 3/4.

    Returns
    -------
    Constellation
        Labels of the standard.

    Notes
    -----
    Source: ETSI EN 302 307-1, cl. 5.4.4 and table 10, as quoted in public code.

    Examples
    --------
    >>> sorted(set(np.abs(apsk32().points).round(5).tolist()))
    [0.24228, 0.68807, 1.27681]
    """
    return rated_apsk("32apsk", "3/4")


def rated_apsk(name: str, code_rate: str) -> Constellation:
    """Return the points of DVB-S2 at a code rate.

    Parameters
    ----------
    name : str
        ``16apsk`` or ``32apsk``.
    code_rate : str
        One of those in :data:`TABLES`.

    Returns
    -------
    Constellation
        Named with its code rate, if that is not 3/4.

    Notes
    -----
    Source: ETSI EN 302 307-1, cl. 5.4.3 and 5.4.4, as quoted in public code.
    """
    ratios, rings, degrees = TABLES[name]
    radii = np.array((1.0, *ratios[code_rate]))[list(rings)]
    points = radii * np.exp(1j * np.deg2rad(np.array(degrees, dtype=np.float64)))
    called = name if code_rate == "3/4" else f"{name} {code_rate}"
    return Constellation(called, points / np.sqrt(np.mean(radii**2)))


def at_code_rate(text: str) -> Constellation | None:
    """Read ``16apsk 2/3``: a named constellation at a code rate.

    Parameters
    ----------
    text : str
        Name and code rate.

    Returns
    -------
    Constellation or None
        None if the name is none of those with code rates.

    Raises
    ------
    QuantityError
        A code rate that the constellation does not have.

    Examples
    --------
    >>> at_code_rate("32apsk 9/10").name
    '32apsk 9/10'
    """
    name, _, code_rate = text.partition(" ")
    if name not in TABLES:
        return None
    ratios = TABLES[name][0]
    if code_rate.strip() not in ratios:
        guess = nearest(code_rate, tuple(ratios))
        raise QuantityError(
            problem=f"{text[:40]!r} names no code rate of {name}",
            allowed=", ".join(f"{name} {rate}" for rate in ratios) + f"; {name} alone is 3/4",
            remedy=f"Did you mean {name} {guess}?" if guess else "Choose one of these.",
        )
    return rated_apsk(name, code_rate.strip())


def from_rings(value: Mapping[str, Any]) -> Constellation:
    """Make a constellation of rings.

    Parameters
    ----------
    value : mapping
        ``rings``: points on each ring, the inner one first, 2 to 65536 in all, a power of 2.
        ``ratios``: radius of each further ring over the first, rising, above 1. ``phases``:
        angle of the first point of each ring, such as ``45 deg``; half a step if not given.

    Returns
    -------
    Constellation
        Symbol numbers count the points ring by ring, against the clock.

    Raises
    ------
    QuantityError
        Not of that form.

    Examples
    --------
    >>> made = from_rings({"rings": [4, 12], "ratios": [2.85], "phases": ["45 deg", "15 deg"]})
    >>> made.points.round(3)[[0, 4]]
    array([0.281+0.281j, 1.093+0.293j])
    """
    for key in value:
        if key not in {"rings", "ratios", "phases"}:
            guess = nearest(str(key), ("rings", "ratios", "phases"))
            raise QuantityError(
                problem=f"unknown key {str(key)[:40]!r}",
                allowed="the keys rings, ratios, phases",
                remedy=f"Did you mean {guess}?" if guess else "Remove it.",
                key=str(key),
            )
    rings = _counts(value.get("rings"))
    ratios = _ratios(value.get("ratios", []), len(rings) - 1)
    phases = [180.0 / count for count in rings]
    if value.get("phases") is not None:
        phases = _phases(value["phases"], len(rings))
    points = np.concatenate(
        [
            radius * np.exp(2j * np.pi * np.arange(count) / count + 1j * np.deg2rad(phase))
            for count, radius, phase in zip(rings, (1.0, *ratios), phases, strict=True)
        ]
    )
    notation = {key: value[key] for key in ("rings", "ratios", "phases") if key in value}
    return Constellation("rings", points / np.sqrt(np.mean(np.abs(points) ** 2)), notation)


def _counts(value: object) -> list[int]:
    counts = value if isinstance(value, list | tuple) else []
    is_whole = all(isinstance(n, int) and not isinstance(n, bool) and n > 0 for n in counts)
    total = sum(counts) if is_whole else 0
    if not 2 <= total <= LARGEST or total & (total - 1):
        raise QuantityError(
            problem="the rings make no constellation",
            allowed=f"points on each ring, together 2, 4, 8 ... {LARGEST}",
            remedy="Write them from the inner ring out, like [4, 12].",
            key="rings",
        )
    return list(counts)


def _ratios(value: object, count: int) -> list[float]:
    given = value if isinstance(value, list | tuple) else []
    ratios = [
        float(ratio)
        for ratio in given
        if isinstance(ratio, int | float) and not isinstance(ratio, bool) and 1 < ratio <= 1000
    ]
    is_rising = all(low < high for low, high in pairwise(ratios))
    if not (len(given) == len(ratios) == count) or not is_rising:
        raise QuantityError(
            problem="the ratios do not fit the rings",
            allowed=f"{count} rising numbers above 1, up to 1000: each further radius over the "
            "first",
            remedy="Write them like [2.85].",
            key="ratios",
        )
    return ratios


def _phases(value: object, count: int) -> list[float]:
    phases = value if isinstance(value, list | tuple) else []
    if len(phases) != count:
        raise QuantityError(
            problem="the phases do not fit the rings",
            allowed=f"{count} angles, one a ring",
            remedy="Write them like [45 deg, 15 deg].",
            key="phases",
        )
    try:
        return [float(parse_quantity(str(phase), DIMENSIONS["_deg"])) for phase in phases]
    except QuantityError as error:
        raise QuantityError(
            problem=error.problem, allowed=error.allowed, remedy=error.remedy, key="phases"
        ) from error
