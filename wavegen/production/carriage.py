"""Real samples in a conversion: where their carrier stands, where it goes, what would fold back."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from wavegen.core.errors import ArgumentsError, RecipeError
from wavegen.core.signal import Signal
from wavegen.core.units import format_hz
from wavegen.files.datatypes import Datatype
from wavegen.files.real_if import real_part, turned
from wavegen.meters.peak import Located
from wavegen.production.input_file import InputFile
from wavegen.production.intermediate import (
    folded_db,
    notes_of_folding,
    snapped_centre,
    spectrum_of,
)

OPTION, INPUT_OPTION = "--real-centre", "--input-real-centre"


@dataclass(frozen=True, slots=True, kw_only=True)
class Carriage:
    """Where real samples stand, before and after.

    Parameters
    ----------
    down_hz : Fraction
        What is taken off every frequency of the input, Hz.
    up_hz : Fraction or None
        Where 0 Hz goes then, Hz, before the real part is taken; None if complex samples are
        written.
    from_hz, to_hz : Fraction or None
        Intermediate frequency of what is read and of what is written, Hz; None where samples are
        complex, or where it is not known.
    """

    down_hz: Fraction = Fraction(0)
    up_hz: Fraction | None = None
    from_hz: Fraction | None = None
    to_hz: Fraction | None = None

    @property
    def shift_hz(self) -> Fraction:
        """How far every frequency moves, Hz."""
        return (self.up_hz or 0) - self.down_hz

    @property
    def is_moved_up(self) -> bool:
        """Whether real samples are written around another frequency than they had."""
        return self.to_hz is not None and self.shift_hz != 0

    def lowered(self, signal: Signal) -> Signal:
        """Return the input without its intermediate frequency."""
        return turned(signal, -self.down_hz)

    def raised(self, signal: Signal) -> Signal:
        """Return what is written: real samples in the real part, or the signal itself."""
        return signal if self.up_hz is None else real_part(signal, self.up_hz)


def plan_carriage(
    source: InputFile,
    datatype: Datatype,
    *,
    centre_hz: Fraction | None,
    input_centre_hz: Fraction | None,
    rate_hz: Fraction,
    n_samples: int,
) -> Carriage:
    """Return where real samples come from and go to; the source takes note of what moves.

    Parameters
    ----------
    source : InputFile
        What is read.
    datatype : Datatype
        What is written.
    centre_hz, input_centre_hz : Fraction or None
        Intermediate frequencies as the user states them, Hz: of the output and of the input.
    rate_hz, n_samples : Fraction, int
        Of the output.

    Returns
    -------
    Carriage

    Raises
    ------
    ArgumentsError
        A frequency where there are no real samples, one that is missing, or one that is not
        between 0 and half the rate.
    """
    recording = source.recording
    if input_centre_hz is not None and not recording.is_real:
        raise ArgumentsError(
            where=INPUT_OPTION,
            problem=f"{recording.path.name} holds I and Q, which have no intermediate frequency",
            allowed="this option with a file of real samples",
            remedy="Leave it out.",
        )
    before = _input_centre(source, input_centre_hz)
    if centre_hz is None:
        return _without_centre(source, datatype, before, rate_hz)
    if recording.is_real and before is None:
        raise ArgumentsError(
            where=OPTION,
            problem=f"where the carrier of the real samples of {recording.path.name} stands "
            "is not known",
            allowed=f"this option together with {INPUT_OPTION}",
            remedy=f"Add {INPUT_OPTION} 30MHz, with their own intermediate frequency.",
        )
    after = _centre(source, centre_hz, OPTION, rate_hz=rate_hz, n_samples=n_samples)
    return Carriage(down_hz=before or Fraction(0), up_hz=after, from_hz=before, to_hz=after)


def _without_centre(
    source: InputFile, datatype: Datatype, before: Fraction | None, rate_hz: Fraction
) -> Carriage:
    recording = source.recording
    if datatype.is_real:
        if not recording.is_real:
            raise ArgumentsError(
                where="--datatype",
                problem=f"{datatype.name} holds real samples, {recording.path.name} holds I and Q",
                allowed=f"real datatypes together with {OPTION}",
                remedy=f"Add {OPTION} 30MHz, or choose a complex datatype.",
            )
        if before is not None and before >= rate_hz / 2:
            raise ArgumentsError(
                where="--sample-rate",
                problem=f"the carrier stands at {format_hz(before)}, half of "
                f"{format_hz(rate_hz)} or beyond",
                allowed=f"rates above {format_hz(2 * before)}, with room for the signal",
                remedy=f"Add {OPTION} with a lower frequency, or choose a higher rate.",
            )
        return Carriage(up_hz=Fraction(0), from_hz=before, to_hz=before)
    if not recording.is_real:
        return Carriage()
    if before is None:
        source.tell(
            "real samples become their analytic signal: I is what the file holds, Q its "
            "quadrature, and the carrier stays at its intermediate frequency; "
            f"{INPUT_OPTION} moves it to 0 Hz"
        )
        return Carriage()
    source.tell(
        "real samples become complex baseband: their analytic signal, moved from "
        f"{format_hz(before)} to 0 Hz"
    )
    return Carriage(down_hz=before, from_hz=before)


def _input_centre(source: InputFile, asked_hz: Fraction | None) -> Fraction | None:
    recording, stated_hz = source.recording, source.centre_hz
    if asked_hz is None:
        return stated_hz
    found = _centre(
        source,
        asked_hz,
        INPUT_OPTION,
        rate_hz=recording.sample_rate_hz,
        n_samples=recording.n_samples,
    )
    if stated_hz is not None and stated_hz != found:
        source.warn(
            f"its sidecar states {format_hz(stated_hz)}; read as standing at {format_hz(found)}, "
            f"as {INPUT_OPTION} says"
        )
    return found


def _centre(
    source: InputFile, asked_hz: Fraction, where: str, *, rate_hz: Fraction, n_samples: int
) -> Fraction:
    """Return an intermediate frequency between 0 and half the rate; of a loop on its grid."""
    if not source.loops and 0 < asked_hz < rate_hz / 2:  # no cycle has to be whole there
        return asked_hz
    try:
        found, notes = snapped_centre(
            asked_hz, sample_rate_hz=rate_hz, n_samples=n_samples, where=where
        )
    except RecipeError as error:
        raise _of_option(error) from error
    source.notes.extend(notes)
    return found


def check_folding(
    source: InputFile,
    signals: Sequence[Signal],
    powers: Sequence[Located],
    carriage: Carriage,
) -> None:
    """Refuse what does not fit between 0 and half the rate; the source takes note of a little.

    Parameters
    ----------
    source : InputFile
        What is read.
    signals : sequence of Signal
        Each channel before it is raised.
    powers : sequence of Located
        Their power statistics.
    carriage : Carriage
        Where they go; what stays where it was is not looked at.

    Raises
    ------
    ArgumentsError
        More than -40 dB of the power would fold back.
    """
    centre_hz = carriage.to_hz
    if centre_hz is None or not carriage.is_moved_up:
        return
    for signal, power in zip(signals, powers, strict=True):
        folded = folded_db(
            spectrum_of(signal, power, loops=source.loops),
            centre_hz=centre_hz,
            sample_rate_hz=signal.sample_rate_hz,
        )
        try:
            source.notes.extend(notes_of_folding(folded, centre_hz=centre_hz, where=OPTION))
        except RecipeError as error:
            raise _of_option(error) from error


def _of_option(error: RecipeError) -> ArgumentsError:
    """Return (not raise) what is said of a recipe as said of an option."""
    return ArgumentsError(
        where=error.where, problem=error.problem, allowed=error.allowed, remedy=error.remedy
    )
