"""The law of a signal behind a memoryless amplifier."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from wavegen.laws.inversion import law_of_term
from wavegen.laws.law import Law
from wavegen.laws.mapped import GatedLaw, MappedLaw
from wavegen.laws.operations import EnvelopeTerm
from wavegen.laws.own_samples import LONGEST, bend_samples, own_samples
from wavegen.laws.term import NoLaw, Term
from wavegen.stages.amplifier import Amplifier, Complexes, Reals


@dataclass(frozen=True, eq=False, kw_only=True)
class GatedMappedLaw(MappedLaw):
    """The law of the whole of a gated signal behind a curve.

    Parameters
    ----------
    on_time : Law
        Of the time it is fully on, over the mean of that time.
    """

    on_time: Law


def driven_law(
    source: Law, amplifier: Amplifier, rms: float, *, n_samples: int | None = None
) -> Law | NoLaw:
    """Return the law behind an amplifier.

    Parameters
    ----------
    source : Law
        Of the input.
    amplifier : Amplifier
        The model.
    rms : float
        RMS amplitude at its input; of a gated signal, of the on-time.
    n_samples : int, optional
        Samples of the loop; of no more than ``LONGEST`` all of them set the drive, and the law
        may be that of the loop's own samples.

    Returns
    -------
    Law or NoLaw
        None, by name, where the law goes on beyond the amplitudes at which the model is known.
    """
    # Amplitudes of a law are over the RMS value of the whole: sqrt(mean) of the on-time's.
    factor = rms * math.sqrt(source.mean) if isinstance(source, GatedLaw) else rms
    own = own_samples(source) if n_samples and n_samples <= LONGEST else None
    peak = 10 ** (source.peak_db / 20)
    if own is not None:
        peak = math.sqrt(float(own.powers[-1] / own.on_powers.mean()))
    if factor * peak > amplifier.largest * (1 + 1e-6):
        return NoLaw(
            reason=f"{source.name} has amplitudes beyond the largest input of {amplifier.name}"
        )

    def curve(amplitude: Reals) -> Complexes:
        inside: Reals = np.minimum(factor * amplitude, amplifier.largest)
        return np.asarray(inside * amplifier.gain(inside))

    kinks = tuple(kink / factor for kink in amplifier.kinks)
    name = f"{source.name}, then {amplifier.name}"
    if own is not None:
        return bend_samples(own, curve, name=name)
    if isinstance(source, GatedLaw):
        inner = driven_law(source.on_time, amplifier, rms, n_samples=n_samples)
        if isinstance(inner, NoLaw):
            return inner
        return GatedMappedLaw(source=source, curve=curve, kinks=kinks, name=name, on_time=inner)
    return MappedLaw(source=source, curve=curve, kinks=kinks, name=name)


def driven_term(source: Term, amplifier: Amplifier, rms: float) -> Term | NoLaw:
    """Return what a part is to a composite behind an amplifier: lawful if isotropic always.

    Parameters
    ----------
    source : Term
        The part before.
    amplifier, rms
        As in :func:`driven_law`.
    """
    if source.symmetry or source.clock_samples > 1:
        return NoLaw(reason=f"{source.name}, then {amplifier.name}, has no law beside others")
    before = law_of_term(source)
    after = before if isinstance(before, NoLaw) else driven_law(before, amplifier, rms)
    if isinstance(after, NoLaw):
        return after
    return EnvelopeTerm(
        name=after.name,
        holds=after.holds,
        mean_power=source.mean_power,
        peak=math.sqrt(source.mean_power) * 10 ** (after.peak_db / 20),
        data=source.data,
        lowest_probability=source.lowest_probability,
        law=after,
    )
