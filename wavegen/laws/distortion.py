"""Which memoryless steps a law has gone through, and what they do to a complex Gaussian signal."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import scipy.optimize
from numpy.typing import NDArray

from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.law import Law, to_db
from wavegen.laws.mapped import ClippedLaw, MappedLaw
from wavegen.laws.memoryless import Curve, MemorylessStep

NEAR_DB = 0.1
"""A signal whose levels stand no further from those of complex Gaussian noise counts as such."""
_COMPARED = (0.1, 1e-2, 1e-3, 1e-4)
_FARTHEST = 9.0
_GRID = 4096
_SMALL = 1e-6


@dataclass(frozen=True, slots=True, kw_only=True)
class MemorylessChain:
    """Memoryless steps in a row.

    Parameters
    ----------
    base : Law
        Of the signal before the first.
    curve : callable
        Output of the last over its own RMS value, for amplitudes of ``base`` over its RMS value.
    kinks : tuple of float
        Amplitudes at which that is not smooth.
    mean_shift_db : float
        Mean power of the output over that of steps which keep their gain at small amplitudes, dB,
        if no step's change of the mean were undone.
    n_steps : int
        How many.
    """

    base: Law
    curve: Curve
    kinks: tuple[float, ...]
    mean_shift_db: float
    n_steps: int

    @property
    def gaussian_error_db(self) -> float:
        """How far levels of the input stand from those of complex Gaussian noise, dB, at most."""
        asked = np.array(_COMPARED)
        return float(np.max(np.abs(self.base.level_db(asked) - GaussianLaw().level_db(asked))))

    def step(self) -> MemorylessStep:
        """Return what the steps together do to a complex Gaussian signal of unit power."""
        return MemorylessStep.of(self.curve, kinks=self.kinks)


def memoryless_chain(law: Law) -> MemorylessChain:
    """Return the memoryless steps that a law has gone through; of a gated signal, its on-time's.

    Parameters
    ----------
    law : Law
        Any; that of a signal without such a step gives a chain of none.
    """
    inner: Law | None = getattr(law, "on_time", None)
    if inner is not None:
        return memoryless_chain(inner)
    if isinstance(law, ClippedLaw):
        limit = math.sqrt(law.ratio)
        return _behind(law, lambda r: np.minimum(r, limit), (limit,))
    if isinstance(law, MappedLaw):
        return _behind(law, law.curve, law.kinks)
    return MemorylessChain(base=law, curve=lambda r: r, kinks=(), mean_shift_db=0.0, n_steps=0)


def _behind(law: ClippedLaw | MappedLaw, curve: Curve, kinks: tuple[float, ...]) -> MemorylessChain:
    before = memoryless_chain(law.source)
    scale = 1 / math.sqrt(law.mean)

    def made(amplitude: NDArray[np.float64]) -> NDArray[np.complex128]:
        inner = np.asarray(before.curve(amplitude), np.complex128)
        size = np.abs(inner)
        phase = np.divide(inner, size, out=np.ones_like(inner), where=size > 0)
        return np.asarray(scale * curve(size) * phase)

    slope = abs(complex(np.asarray(curve(np.array([_SMALL])))[0])) / _SMALL
    met = {kink for own in kinks for kink in _amplitudes_at(before, own)}
    return MemorylessChain(
        base=before.base,
        curve=made,
        kinks=tuple(sorted({*before.kinks, *met})),
        mean_shift_db=before.mean_shift_db + float(to_db(law.mean / slope**2)),
        n_steps=before.n_steps + 1,
    )


def _amplitudes_at(chain: MemorylessChain, output: float) -> list[float]:
    """Return the input amplitudes at which a chain gives an output amplitude."""
    if not chain.n_steps:
        return [output]

    def excess(amplitude: float) -> float:
        return float(np.abs(chain.curve(np.array([amplitude])))[0]) - output

    grid = np.linspace(0.0, _FARTHEST, _GRID)
    over = np.abs(chain.curve(grid)) > output
    return [
        float(scipy.optimize.brentq(excess, grid[at], grid[at + 1]))
        for at in np.flatnonzero(over[1:] != over[:-1])
    ]
