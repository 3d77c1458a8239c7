"""What a conversion is asked for: the request, checked, and the datatype that it means."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from wavegen.core.errors import ArgumentsError
from wavegen.files import FORMATS
from wavegen.files.datatypes import DATATYPES, Datatype, real_of
from wavegen.files.format import Format, Recording, pick_datatype
from wavegen.recipe.format_request import default_datatype, formats_of_real

_MOST_DB = 300
"""Beyond, float32 samples run out of range."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Conversion:
    """What is asked for.

    Parameters
    ----------
    format : str
        A member of FORMATS.
    datatype : str or None
        By any name that the format knows; None keeps the source's where the format writes it.
    bits, align
        Of shorter words in 16-bit containers, as in
        :func:`wavegen.files.format.told_word`.
    real_centre_hz : Fraction or None
        Real samples around this intermediate frequency, Hz.
    input_real_centre_hz : Fraction or None
        Where the carrier of a file of real samples stands, Hz; None takes it from its sidecar.
    peak_dbfs : float or None
        Where the peak between samples shall stand, of the channel with the larger one; None
        leaves the level to ``gain_db``.
    gain_db : float
        Change of level, dB, the same for both channels.
    sample_rate_hz : Fraction or None
        Rate wanted, Hz; None keeps that of the source.
    name : str or None
        Stem of the files; None makes it of the source's and the format's.
    """

    format: str
    datatype: str | None = None
    bits: int | None = None
    align: str | None = None
    real_centre_hz: Fraction | None = None
    input_real_centre_hz: Fraction | None = None
    peak_dbfs: float | None = None
    gain_db: float = 0.0
    sample_rate_hz: Fraction | None = None
    name: str | None = None


def check_conversion(wanted: Conversion) -> None:
    """Refuse levels that mean nothing.

    Raises
    ------
    ArgumentsError
        Beyond 300 dB, or a peak over full scale.
    """
    for option, is_wrong, problem, allowed in (
        (
            "--peak",
            wanted.peak_dbfs is not None and not -_MOST_DB <= wanted.peak_dbfs <= 0,
            f"is {wanted.peak_dbfs} dBFS",
            f"from -{_MOST_DB} to 0 dBFS: beyond, the peak would be cut off",
        ),
        (
            "--gain",
            not abs(wanted.gain_db) <= _MOST_DB,
            f"is {wanted.gain_db:g} dB",
            f"from -{_MOST_DB} to {_MOST_DB} dB",
        ),
    ):
        if is_wrong:
            raise ArgumentsError(
                where=option, problem=problem, allowed=allowed, remedy="Correct the level."
            )


def format_named(name: str) -> Format:
    """Return the format of that name.

    Raises
    ------
    ArgumentsError
        There is none.
    """
    if name in FORMATS:
        made: Format = FORMATS.load(name)()
        return made
    guess = FORMATS.nearest(name)
    raise ArgumentsError(
        where="--to",
        problem=f"{name[:60]!r} is no format",
        allowed=", ".join(FORMATS),
        remedy=f"Did you mean {guess}?" if guess else "Choose one of these.",
    )


def datatype_of(form: Format, wanted: Conversion, recording: Recording) -> Datatype:
    """Return the datatype that is written.

    Parameters
    ----------
    form : Format
        Who writes it.
    wanted : Conversion
        Its datatype, else that of the source where the format writes it, else the format's
        default; real samples stay real where the format writes such, and become real where an
        intermediate frequency is given.
    recording : Recording
        The source.

    Raises
    ------
    ArgumentsError
        Real samples are asked for and the datatype or the format has none.
    FileError
        The format does not write the datatype.
    """
    name = wanted.datatype
    if name is None:
        name = _same_datatype(form, recording, is_asked=wanted.real_centre_hz is not None)
    datatype = pick_datatype(form, name, "--datatype", bits=wanted.bits, align=wanted.align)
    if wanted.real_centre_hz is not None and not datatype.is_real:
        real = ", ".join(key for key, one in form.datatypes.items() if one.is_real)
        raise ArgumentsError(
            where="--datatype" if real else "--to",
            problem=f"{datatype.name} holds I and Q, and --real-centre asks for real samples"
            if real
            else f"{form.name} does not write real samples",
            allowed=real or f"real samples in {', '.join(formats_of_real())}",
            remedy="Choose one of these, or leave --real-centre out.",
        )
    return datatype


def _same_datatype(form: Format, recording: Recording, *, is_asked: bool) -> str | None:
    """Return the datatype nearest to that of the source that a format writes."""
    is_real = (is_asked or recording.is_real) and default_datatype(form, is_real=True) is not None
    own = recording.datatype.container
    if is_real and not own.is_real:
        own = real_of(own) if f"r{own.name[1:]}" in DATATYPES else own
    if own.is_real == is_real and own.name in form.datatypes:
        return own.name
    return default_datatype(form, is_real=is_real)
