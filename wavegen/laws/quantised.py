"""The law of a signal on the steps of a converter: that of its input where the steps are fine."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.law import Holds, Law, from_db, to_db
from wavegen.laws.panels import nodes_of, panel_edges
from wavegen.laws.term import NoLaw

MOST_ERROR_DB = 1e-3
"""A level may move by so much, at every probability and from the mean up."""
MOST_LOST = 2e-5
"""Share of the power that may stand above full scale: it moves the mean by 1e-4 dB at most."""
CIRCLE = 8.0
"""Points of the unit lattice in a circle differ from its area by less than this times the root of
its radius, up to radii of 1500 (the circle problem of Gauss; counted). It grows so slowly, 8.1 at
3000, that finer steps stay far below."""
OTHERS = 4.0
"""Times as much is allowed for where the density is not known to be round: measured on records of
QPSK the steps moved levels by 1.2 times as much as of Gaussian noise at most."""
_DB = 20 / math.log(10)
_PANELS = 64
_NEAR_DB = 1e-3
_RAREST = 1e-9


@dataclass(frozen=True, eq=False, kw_only=True)
class QuantisedLaw:
    """A law that passes a converter. Use :func:`quantised_law`.

    Parameters
    ----------
    source : Law
        Of the input.
    name : str
        What it is called in results.
    peak_db : float
        Highest level that can occur: both rails at full scale, if not lower before.
    lowest_probability : float
        Below, full scale is passed: levels beyond it are not told.
    on_time : Law or None
        Of a gated signal, that of the time it is fully on.
    """

    source: Law
    name: str
    peak_db: float
    lowest_probability: float
    on_time: Law | None = None

    @property
    def holds(self) -> Holds:
        """Whether one loop follows it exactly, or only the average over seeds."""
        return self.source.holds

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return the probability that the power is above a level (dB over the mean)."""
        level = np.asarray(level_db, np.float64)
        return np.where(level < self.peak_db, self.source.ccdf(level), 0.0)

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the level at a probability, dB over the mean."""
        return np.asarray(np.minimum(self.source.level_db(probability), self.peak_db))


def quantised_law(source: Law, *, bits: int, full_scale_db: float) -> Law | NoLaw:
    """Return the law of a signal behind a converter.

    Parameters
    ----------
    source : Law
        Of the input; of a gated signal of the whole, with that of the on-time beside it.
    bits : int
        Of each rail.
    full_scale_db : float
        Full scale of a rail over the RMS envelope, of a gated signal over that of the on-time, dB.

    Returns
    -------
    Law or NoLaw
        None, by name, where steps are too coarse or full scale is passed too often.

    Notes
    -----
    With a step ``d`` and the mean power 1, a level of the amplitude ``r`` moves by three things.
    The rounding noise, uniform and apart from the signal as soon as its rails spread over a step
    or two (B. Widrow, IRE Trans. Circuit Theory 3, 1956), adds ``d^2 / 6`` to the mean, the same to
    a Gaussian signal at every level. A smooth density is counted on the points of a lattice: the
    count within a circle of ``r / d`` steps differs from its area by less than ``8 sqrt(r / d)``,
    which moves the radius by ``8 d sqrt(r / d) / (2 pi r / d)``; that is the larger part, and of
    signals other than Gaussian noise four times as much is allowed for. A wall,
    at which a signal stays for a part of the time, moves by half a diagonal, ``d / sqrt 2``, at
    most. Derivation; held against the exact sum over all codes of Gaussian noise, and against
    records before and behind, in ``tests/truth/test_converter_laws.py``. What is cut at full
    scale stays above every level below full scale.
    """
    if source.holds == "every loop":
        return NoLaw(reason=f"{source.name}, then {bits} bits: a curve of one loop moves by steps")
    on_time: Law | None = getattr(source, "on_time", None)
    if on_time is not None:
        inside = quantised_law(on_time, bits=bits, full_scale_db=full_scale_db)
        if not isinstance(inside, QuantisedLaw):
            return inside
        over_whole_db = source.peak_db - on_time.peak_db if math.isfinite(source.peak_db) else 0.0
        return QuantisedLaw(
            source=source,
            name=f"{source.name}, then {bits} bits",
            peak_db=inside.peak_db + over_whole_db,
            lowest_probability=inside.lowest_probability,
            on_time=inside,
        )
    error_db = step_error_db(source, bits=bits, full_scale_db=full_scale_db)
    if error_db > MOST_ERROR_DB:
        return NoLaw(
            reason=f"{source.name}, then {bits} bits, has no law: steps may move levels by "
            f"{error_db:.2g} dB, and {MOST_ERROR_DB:g} dB are let pass"
        )
    lost = power_above(source, full_scale_db)
    if lost > MOST_LOST:
        return NoLaw(
            reason=f"{source.name}, then {bits} bits, has no law: {lost:.2g} of the power stands "
            "above full scale"
        )
    beyond = float(source.ccdf(full_scale_db))
    return QuantisedLaw(
        source=source,
        name=f"{source.name}, then {bits} bits",
        peak_db=min(source.peak_db, full_scale_db + 10 * math.log10(2)),
        lowest_probability=max(float(getattr(source, "lowest_probability", 0.0)), beyond),
    )


def step_error_db(source: Law, *, bits: int, full_scale_db: float) -> float:
    """Return by how much steps move a level at most, from the mean up, dB.

    Parameters
    ----------
    source, bits, full_scale_db
        As in :func:`quantised_law`.
    """
    step = 10 ** (full_scale_db / 20) / 2 ** (bits - 1)
    circle = CIRCLE if isinstance(source, GaussianLaw) else OTHERS * CIRCLE
    error = step**2 / 6 + circle / (2 * math.pi) * step**1.5
    peak_db = source.peak_db
    if math.isfinite(peak_db) and float(source.ccdf(peak_db - _NEAR_DB)) > _RAREST:
        error = max(error, step / math.sqrt(2) / 10 ** (peak_db / 20))
    return float(_DB * error)


def power_above(source: Law, level_db: float) -> float:
    """Return ``E[max(p - L, 0)]``: the integral of the CCDF from a level on."""
    low = float(from_db(level_db))
    top = min(float(from_db(source.peak_db)), max(3 * low, low + 60))
    if top <= low:
        return 0.0
    nodes, weights = nodes_of(panel_edges(low, top, n_panels=_PANELS))
    return math.fsum((weights * source.ccdf(to_db(nodes))).ravel())
