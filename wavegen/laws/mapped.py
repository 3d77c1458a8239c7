"""Laws through operations: a memoryless curve, a polar clip, a gate, known from the input's law."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.optimize
from numpy.typing import ArrayLike, NDArray

from wavegen.laws.law import Holds, Law, from_db, to_db
from wavegen.laws.level_search import level_by_halving
from wavegen.laws.memoryless import Curve
from wavegen.laws.moments import moment_of
from wavegen.laws.panels import nodes_of, panel_edges, slopes_at_nodes
from wavegen.laws.term import NoLaw

Reals = NDArray[np.float64]

_PANELS = 128
_GRID = 8192
_HALVINGS = 52
_DEEPEST = 1e-12
_NEXT = 1e-12
_BEYOND = 1.5
"""Amplitudes are followed to so many times the one at the probability 1e-12."""


@dataclass(frozen=True, eq=False, kw_only=True)
class MappedLaw:
    """The law of a signal behind a memoryless curve, over its new mean.

    Parameters
    ----------
    source : Law
        Of the input.
    curve : callable
        Output ``g(r)`` for amplitudes over the RMS value of the input; the angle of a complex
        output (AM/PM) does not matter here.
    kinks : tuple of float
        Amplitudes at which the curve is not smooth; it may jump there.
    name : str
        What it is called in results.

    Notes
    -----
    ``P(|g|^2 > L)`` is the probability of the input powers at which it is so: the end points are
    found on the curve, rising or not, and the input's CCDF is taken there (derivation). The mean
    is ``|g(0)|^2`` plus the integral of the CCDF over ``d|g|^2``.
    """

    source: Law
    curve: Curve
    kinks: tuple[float, ...] = ()
    name: str = "memoryless curve"

    @property
    def holds(self) -> Holds:
        """Whether one loop follows it exactly, or only the average over seeds."""
        return self.source.holds

    @cached_property
    def mean(self) -> float:
        """Mean power of the output over that of the input."""
        return self._mean_of(1)

    def moment(self, order: int) -> float:
        """Return ``E[p^k] / E[p]^k`` of the output."""
        return self._mean_of(order) / self.mean**order

    def _mean_of(self, order: int) -> float:
        """Return the mean of a power of the output's power."""

        def raised(amplitude: Reals) -> Reals:
            return self._power(amplitude) ** order

        edges = panel_edges(0.0, self._reach, n_panels=_PANELS, kinks=self.kinks)
        nodes, weights = nodes_of(edges)
        slopes = slopes_at_nodes(raised(nodes), edges)
        above = self.source.ccdf(to_db(nodes**2))
        start = float(raised(np.zeros(1))[0])
        steps = np.array([kink for kink in self.kinks if 0 < kink < self._reach])
        jumps = raised(steps * (1 + _NEXT)) - raised(steps * (1 - _NEXT))
        jumped = math.fsum(jumps * self.source.ccdf(to_db(steps**2)))
        return start + jumped + math.fsum((slopes * above * weights).ravel())

    @property
    def peak_db(self) -> float:
        """Highest level that can occur, dB over the mean; ``inf`` if there is none."""
        if self._is_rising and math.isinf(self.source.peak_db):
            far = self._power(np.array([self._reach, 1e3 * self._reach]))
            if far[1] > far[0]:
                return math.inf
        return float(to_db(self._highest / self.mean))

    def ccdf(self, level_db: ArrayLike) -> Reals:
        """Return the probability that the power is above a level (dB over the mean)."""
        level = from_db(level_db) * self.mean
        flat = np.atleast_1d(level).ravel()
        grid, values = self._grid
        total = np.zeros(flat.size)
        total[values[0] > flat] = 1.0
        is_above = values[None, :] > flat[:, None]
        which, cell = np.nonzero(is_above[:, 1:] != is_above[:, :-1])
        rises = is_above[which, cell + 1]
        low, high = grid[cell], grid[cell + 1]
        for _ in range(_HALVINGS):
            middle = 0.5 * (low + high)
            is_after = (self._power(middle) > flat[which]) == rises
            high = np.where(is_after, middle, high)
            low = np.where(is_after, low, middle)
        if which.size:
            found = self.source.ccdf(to_db(low**2))
            np.add.at(total, which, np.where(rises, found, -found))
        return np.clip(total, 0.0, 1.0).reshape(level.shape)

    def level_db(self, probability: ArrayLike) -> Reals:
        """Return the smallest level whose CCDF is at or below a probability."""
        if self._is_rising:
            amplitude = np.sqrt(from_db(self.source.level_db(probability)))
            known = np.isfinite(amplitude)
            power = self._power(np.where(known, amplitude, 0.0))
            return np.where(known, to_db(power / self.mean), self.peak_db)
        most_db = float(to_db(self._highest / self.mean)) + 1e-9
        return level_by_halving(self.ccdf, probability, most_db=most_db)

    @cached_property
    def _reach(self) -> float:
        """Return the amplitude up to which the curve is followed."""
        return amplitude_reach(self.source)

    @cached_property
    def _grid(self) -> tuple[Reals, Reals]:
        grid = panel_edges(0.0, self._reach, n_panels=_GRID, kinks=self.kinks)
        return grid, self._power(grid)

    @cached_property
    def _is_rising(self) -> bool:
        """Return whether the output never falls with the input."""
        values = self._grid[1]
        return bool(np.all(np.diff(values) >= -1e-15 * values.max()))

    @cached_property
    def _highest(self) -> float:
        return float(self._grid[1].max())

    def _power(self, amplitude: Reals) -> Reals:
        return np.asarray(np.abs(self.curve(amplitude)) ** 2, np.float64)


def amplitude_reach(law: Law) -> float:
    """Return an amplitude over the RMS value beyond which nothing of a law matters."""
    peak_db = law.peak_db
    if math.isfinite(peak_db):
        return float(10 ** (peak_db / 20))
    return _BEYOND * float(np.sqrt(from_db(law.level_db(_DEEPEST))))


@dataclass(frozen=True, eq=False, kw_only=True)
class ClippedLaw:
    """The law of a signal behind a polar clip, over its new mean. Use :func:`clip_law`.

    Parameters
    ----------
    source : Law
        Of the input.
    ratio : float
        Clip amplitude squared over the mean of the input.
    mean : float
        Mean power of the output over that of the input, before it is scaled back.
    on_time : Law or None
        Of a gated signal, the law of the time it is fully on, over the mean of that time.
    """

    source: Law
    ratio: float
    mean: float
    on_time: Law | None = None

    @property
    def name(self) -> str:
        """What it is called in results."""
        return f"{self.source.name}, clipped"

    @property
    def holds(self) -> Holds:
        """Whether one loop follows it exactly, or only the average over seeds."""
        return self.source.holds

    @property
    def peak_db(self) -> float:
        """The ceiling, dB over the new mean."""
        return float(to_db(self.ratio / self.mean))

    @property
    def share_clipped(self) -> float:
        """Share of time above the clip amplitude: an atom of the law at its peak."""
        return float(self.source.ccdf(to_db(self.ratio)))

    @property
    def mean_shift_db(self) -> float:
        """Change of mean power by clipping, dB."""
        return float(to_db(self.mean))

    def ccdf(self, level_db: ArrayLike) -> Reals:
        """Return the probability that the power is above a level (dB over the new mean)."""
        level = from_db(level_db) * self.mean
        # The wall stands where the ceiling is asked for as a level in dB, rounded.
        is_below = level < self.ratio * (1 - 1e-14)
        return np.where(is_below, self.source.ccdf(to_db(level)), 0.0)

    def level_db(self, probability: ArrayLike) -> Reals:
        """Return the smallest level whose CCDF is at or below a probability."""
        power = from_db(self.source.level_db(probability))
        return to_db(np.minimum(power, self.ratio) / self.mean)


def clip_law(source: Law, ceiling_db: float) -> Law | NoLaw:
    """Return the law of a signal that is clipped to a ceiling over its new mean.

    Of a gated signal the ceiling is over the mean of the time it is fully on.

    Parameters
    ----------
    source : Law
        Of the input.
    ceiling_db : float
        Highest power of the output over the mean power of the output, dB, above 0.

    Returns
    -------
    Law or NoLaw
        ``source`` itself where it never reaches the ceiling. Of a gated signal the law of the
        whole, with that of the on-time beside it. No law where it is zero for so much
        of the time that no amplitude gives the ceiling.

    Notes
    -----
    The clip amplitude solves ``A^2 = ceiling E[min(p, A^2)]``, and the mean is the integral of
    the input's CCDF from 0 to ``A^2`` (derivation). For a complex Gaussian input
    ``ceiling = g / (1 - exp(-g))`` at the ratio ``g``.

    Examples
    --------
    >>> from wavegen.laws.gaussian import GaussianLaw
    >>> law = clip_law(GaussianLaw(), 6.08183)
    >>> round(10 * math.log10(law.ratio), 4), round(law.mean_shift_db, 4)
    (6.0, -0.0818)
    """
    if isinstance(source, GatedLaw):
        on_time = clip_law(source.source, ceiling_db)
        if not isinstance(on_time, ClippedLaw):
            return on_time if isinstance(on_time, NoLaw) else source
        ratio = on_time.ratio / source.mean
        mean = _mean_of_limited(source, ratio)
        return ClippedLaw(source=source, ratio=ratio, mean=mean, on_time=on_time)
    if source.peak_db <= ceiling_db:
        return source
    ceiling = 10 ** (ceiling_db / 10)

    def excess(ratio: float) -> float:
        return ratio - ceiling * _mean_of_limited(source, ratio)

    least = 1e-4
    while excess(least) >= 0:
        least /= 100
        if least < 1e-10:
            return NoLaw(
                reason=f"{source.name} is zero so often that it cannot be clipped "
                f"to {ceiling_db:g} dB"
            )
    ratio = float(scipy.optimize.brentq(excess, least, 1.01 * ceiling, xtol=1e-14, rtol=1e-13))
    return ClippedLaw(source=source, ratio=ratio, mean=_mean_of_limited(source, ratio))


def _mean_of_limited(source: Law, ratio: float) -> float:
    """Return ``E[min(p, ratio)]``: the integral of the CCDF up to there."""
    top = min(math.sqrt(ratio), amplitude_reach(source))
    nodes, weights = nodes_of(panel_edges(0.0, top, n_panels=_PANELS))
    return math.fsum((2 * nodes * weights * source.ccdf(to_db(nodes**2))).ravel())


@dataclass(frozen=True, eq=False, kw_only=True)
class GatedLaw:
    """The law of the whole of a gated signal, over the mean of the whole.

    Parameters
    ----------
    source : Law
        Of the signal, which is that of the time it is fully on.
    duty_fully_on : float
        Share of time with the whole amplitude.
    ramp : float64 array, shape (n,)
        Amplitudes in the ramps.
    ramp_share : float
        Share of time in ramps; each amplitude of ``ramp`` has as much.

    Notes
    -----
    ``P(p > L) = sum_i w_i P_on(p > L m / a_i^2)`` over the amplitudes ``a_i`` of the gate with
    their shares of time ``w_i``, ``m = sum_i w_i a_i^2`` (derivation). Without ramps a level of
    the whole at ``q`` is that of the on-time at ``q / duty``, raised by ``10 log10(1 / duty)``.
    The statistics of the on-time, ramps excluded, are :attr:`on_time`.
    """

    source: Law
    duty_fully_on: float
    ramp: Reals
    ramp_share: float = 0.0

    @property
    def name(self) -> str:
        """What it is called in results."""
        return f"{self.source.name}, gated, the whole"

    @property
    def on_time(self) -> Law:
        """The law of the time the signal is fully on, over the mean of that time."""
        return self.source

    @property
    def holds(self) -> Holds:
        """Whether one loop follows it exactly, or only the average over seeds."""
        return self.source.holds

    @property
    def mean(self) -> float:
        """Mean power of the whole over that of the on-time."""
        ramps = float(np.mean(self.ramp**2)) if self.ramp.size else 0.0
        return self.duty_fully_on + self.ramp_share * ramps

    @property
    def peak_db(self) -> float:
        """Highest level that can occur, dB over the mean of the whole."""
        return self.source.peak_db - float(to_db(self.mean))

    def moment(self, order: int) -> float:
        """Return ``E[p^k] / E[p]^k`` of the whole, from that of the on-time."""
        ramps = float(np.mean(self.ramp ** (2 * order))) if self.ramp.size else 0.0
        share = self.duty_fully_on + self.ramp_share * ramps
        return share * moment_of(self.source, order)[0] / self.mean**order

    def ccdf(self, level_db: ArrayLike) -> Reals:
        """Return the probability that the power is above a level (dB over the mean)."""
        level = np.asarray(level_db, np.float64) + float(to_db(self.mean))
        total = self.duty_fully_on * self.source.ccdf(level)
        if self.ramp.size:
            raised = np.add.outer(level, -to_db(self.ramp**2))
            total = total + self.ramp_share * np.mean(self.source.ccdf(raised), axis=-1)
        return np.asarray(total)

    def level_db(self, probability: ArrayLike) -> Reals:
        """Return the smallest level whose CCDF is at or below a probability."""
        top_db = float(to_db(amplitude_reach(self.source) ** 2 / self.mean)) + 1e-9
        found = level_by_halving(self.ccdf, probability, most_db=top_db)
        return np.where(np.asarray(probability) > 0, found, self.peak_db)
