"""Loops that are known sample by sample: what a clip, a curve or a gate makes of them, exactly.

A law that holds for every loop is the curve of the loop's own samples, or goes through them. What
acts on each sample alone then gives another such list, over its own mean, and a gate is laid over
the list sample by sample.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from wavegen.laws.constant import ConstantLaw
from wavegen.laws.law import Law
from wavegen.laws.listed import ListedLaw
from wavegen.laws.periodic import PeriodicLaw
from wavegen.laws.term import NoLaw

LONGEST = 1 << 22
"""Samples that are listed, at most."""

Floats = NDArray[np.float64]


def own_samples(law: Law) -> ListedLaw | None:
    """Return the samples of a loop that follows a law for every loop, in their order.

    Parameters
    ----------
    law : Law
        Any.

    Returns
    -------
    ListedLaw or None
        None where its samples are not known one by one, or are more than ``LONGEST``.
    """
    if isinstance(law, ListedLaw):
        return law
    if isinstance(law, ConstantLaw):
        return ListedLaw.of(np.ones(1, np.complex64), name=law.name)
    if not isinstance(law, PeriodicLaw) or not law.n_instants or law.n_instants > LONGEST:
        return None
    powers = law.powers_at_instants()
    return None if powers is None else ListedLaw.of_powers(powers, name=law.name)


def delayed_law(law: Law, lag: int) -> Law:
    """Return the law of a signal some whole samples later: the same, its samples in their order."""
    return law.delayed(lag) if isinstance(law, ListedLaw | PeriodicLaw) else law


def clip_samples(source: ListedLaw, ceiling_db: float) -> ListedLaw | NoLaw:
    """Return the law of a loop that is clipped to a ceiling over its new mean.

    Parameters
    ----------
    source : ListedLaw
        The loop; of a gated one the ceiling is over the mean of the time it is fully on.
    ceiling_db : float
        Highest power of the output over the mean power of the output, dB, above 0.

    Returns
    -------
    ListedLaw or NoLaw
        ``source`` itself where it never reaches the ceiling.

    Notes
    -----
    ``A^2 = ceiling E[min(p, A^2)]`` by Newton's steps from ``ceiling E[p]``: the function is
    convex and piecewise linear, so that they end (derivation).
    """
    powers = np.sort(source.on_powers)
    below = np.concatenate([[0.0], np.cumsum(powers)])
    n, ceiling = powers.size, 10 ** (ceiling_db / 10)
    limit = ceiling * float(below[-1]) / n
    while True:
        count = int(np.searchsorted(powers, limit, side="right"))
        excess = limit - ceiling * (float(below[count]) + (n - count) * limit) / n
        slope = 1 - ceiling * (n - count) / n
        if excess <= 1e-13 * limit:
            break
        step = excess / slope if slope > 0 else limit
        if step >= limit * (1 - 1e-12):
            return NoLaw(
                reason=f"{source.name} is zero so often that it cannot be clipped "
                f"to {ceiling_db:g} dB"
            )
        limit -= step
    if limit >= source.powers[-1]:
        return source
    return source.through(lambda power: np.minimum(power, limit), name=f"{source.name}, clipped")


def bend_samples(
    source: ListedLaw, curve: Callable[[Floats], NDArray[np.complex128]], *, name: str
) -> ListedLaw:
    """Return the law of a loop behind a memoryless curve.

    Parameters
    ----------
    source : ListedLaw
        The loop.
    curve : callable
        Output for amplitudes over the RMS value of the input; of a gated loop, of the time it
        is fully on.
    name : str
        What the law is called.
    """
    mean = float(source.on_powers.mean())
    return source.through(lambda power: np.abs(curve(np.sqrt(power / mean))) ** 2, name=name)


def gate_samples(source: ListedLaw, gains: Floats, is_on: NDArray[np.bool_]) -> ListedLaw | None:
    """Return the law of the whole of a loop behind a gate.

    Parameters
    ----------
    source : ListedLaw
        The loop.
    gains : float64 array, shape (period,)
        Amplitude of the gate at each index.
    is_on : bool array, shape (period,)
        Where the gate is fully open.

    Returns
    -------
    ListedLaw or None
        None where the two meet anew for more than ``LONGEST`` samples.
    """
    n_samples = math.lcm(source.in_order.size, gains.size)
    if n_samples > LONGEST:
        return None
    powers = np.resize(source.in_order, n_samples) * np.resize(gains**2, n_samples)
    if not powers.any():
        return None
    open_now = np.resize(is_on, n_samples)
    if source.is_on is not None:
        open_now &= np.resize(source.is_on, n_samples)
    return ListedLaw.of_powers(powers, name=f"{source.name}, gated, the whole", is_on=open_now)
