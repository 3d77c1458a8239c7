"""What methods share that reduce peaks of a waveform: a ceiling, bands, and how they are built."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated, Protocol

from annotated_types import Ge, Gt, Le

from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.stages.ceiling import Process, look, reduce_to, refuse_zero
from wavegen.stages.passband import FilledBand, Passband, filled_band


@dataclass(frozen=True, slots=True, kw_only=True)
class InBand:
    """Settings of a method that keeps its distortion inside the bands of the signal.

    Parameters
    ----------
    ceiling_db : float
        Over the mean power of the output, dB; 0.1 to 60. Of a gated signal, over the mean of the
        on-time.
    passbands : tuple of Passband
        Bands of the signal, where distortion is allowed; found on the signal if not given.
    transition_hz : Fraction, optional
        Width of each edge of the bands, outside them, Hz.
    """

    ceiling_db: Annotated[float, Ge(0.1), Le(60)]
    passbands: tuple[Passband, ...] = ()
    transition_hz: Annotated[Fraction, Gt(0)] | None = None


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Method:
    """A method on one signal.

    Parameters
    ----------
    process : callable
        The signal it makes at an amplitude and a gain.
    action : str
        What it does, as the beginning of a sentence: ``clips 4 times``.
    halo : int
        Samples that it reads on each side beyond what it makes.
    """

    process: Process
    action: str
    halo: int


class Repeated(Protocol):
    """Makes one round of a method."""

    def __call__(self, source: Signal, *, mean_power: float | None, gain: float) -> Signal:
        """Return what a round makes of what the one before it made."""


def repeat_rounds(source: Signal, n_rounds: int, one: Repeated, gain: float) -> Signal:
    """Return a signal after several rounds, the last at a gain.

    Parameters
    ----------
    source : Signal
        What the first round reads.
    n_rounds : int
        1 or more.
    one : callable
        Makes a round; the mean power between rounds is not known.
    gain : float
        Amplitude ratio of the whole.
    """
    made = source
    for number in range(n_rounds):
        is_last = number + 1 == n_rounds
        made = one(
            made,
            mean_power=source.mean_power if is_last else None,
            gain=gain if is_last else 1.0,
        )
    return made


def reduce_in_band(
    site: Site, source: Signal, settings: InBand, method: Callable[[FilledBand], Method]
) -> Signal:
    """Return a signal after a method that was made for its bands.

    Parameters
    ----------
    site : Site
        Told of the band, and by :func:`wavegen.stages.ceiling.reduce_to`.
    source : Signal
        What is reduced; parts of it are read here.
    settings : InBand
        Ceiling and bands.
    method : callable
        Makes the method for the bands found.

    Returns
    -------
    Signal
        ``source`` itself where it never reaches the ceiling.

    Raises
    ------
    RecipeError
        The source is zero, a passband lies outside the sampled band, or no amplitude gives the
        ceiling.
    """
    filled = filled_band(
        site, source, passbands=settings.passbands, transition_hz=settings.transition_hz
    )
    if filled is None:
        raise refuse_zero(site, settings.ceiling_db)
    made = method(filled)
    pilot = look(source, oversampling=filled.oversampling, halo=made.halo)
    return reduce_to(site, pilot, settings.ceiling_db, made.process, made.action) or source
