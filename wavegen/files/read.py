"""Open any recording: by what the user says, else by its name and first bytes."""

from __future__ import annotations

import os
from dataclasses import replace
from pathlib import Path

from wavegen.core.errors import ArgumentsError, FileError
from wavegen.core.registry import nearest
from wavegen.files import FORMATS
from wavegen.files.datatypes import ALIGNMENTS, DATATYPES, WORD_BITS
from wavegen.files.faults import read_head, told
from wavegen.files.format import Format, ReadHints, Recording
from wavegen.files.signatures import TEXT, Signature, is_text, signature_of

SIDECAR = ".ccdf.json"
"""Ending of a sidecar, which describes recordings and is none."""

_NO_HINTS = ReadHints()


def open_recording(path: Path, hints: ReadHints = _NO_HINTS) -> Recording:
    """Open a file, or a pair of files, as a recording.

    Parameters
    ----------
    path : Path
        The file; for SigMF either file of the pair or their common name.
    hints : ReadHints
        What the user says about it.

    Returns
    -------
    Recording
        No sample has been read yet.

    Raises
    ------
    FileError
        Out of reach, unknown, or damaged; the remedy names the option that helps, if one does.
    ArgumentsError
        A hint that means nothing: an unknown format or datatype, a rate or level that is not
        above 0.
    """
    path = Path(path)
    _check_hints(hints)
    if "\0" in os.fspath(path):
        raise FileError(
            where=repr(os.fspath(path)),
            problem="the name holds a NUL character",
            allowed="names that a file can have",
            remedy="Check the name.",
        )
    if hints.format is not None:
        form, hints = _told_format(hints.format, hints)
        return form.read(path, hints)
    return _detected(path).read(path, hints)


def _check_hints(hints: ReadHints) -> None:
    if hints.datatype is not None and hints.datatype not in DATATYPES:
        raise _unknown(hints.datatype, list(DATATYPES))
    for option, value in (
        ("--sample-rate", hints.sample_rate_hz),
        ("--full-scale", hints.full_scale),
    ):
        if value is not None and not 0 < value < float("inf"):
            raise ArgumentsError(
                where=option,
                problem=f"is {value}",
                allowed="finite numbers above 0",
                remedy=f"Correct it or leave {option} out.",
            )
    _check_word(hints)


def _check_word(hints: ReadHints) -> None:
    """Refuse words that are not stated in full, or twice."""
    for option, is_wrong, problem, allowed, remedy in (
        (
            "--bits",
            hints.bits is not None and hints.bits not in WORD_BITS,
            f"is {hints.bits}",
            ", ".join(map(str, WORD_BITS)),
            "Give the bits of the converter's words, or leave --bits out.",
        ),
        (
            "--align",
            hints.align is not None and (hints.align not in ALIGNMENTS or hints.bits is None),
            f"is {hints.align}" + ("" if hints.bits else " without --bits"),
            "left or right, with --bits",
            "Give both --bits and --align, or leave both out.",
        ),
        (
            "--align",
            hints.align is None and hints.bits in {12, 14},
            f"is missing beside --bits {hints.bits}",
            "left or right",
            "Give --align left if the lowest bits of the container are zero, else --align right.",
        ),
        (
            "--full-scale",
            hints.full_scale is not None and hints.bits is not None,
            "says again what --bits says",
            "one of the two",
            "Leave --full-scale or --bits out.",
        ),
    ):
        if is_wrong:
            raise ArgumentsError(where=option, problem=problem, allowed=allowed, remedy=remedy)


def _told_format(name: str, hints: ReadHints) -> tuple[Format, ReadHints]:
    if name in FORMATS:
        return FORMATS.load(name)(), hints
    if name not in DATATYPES:
        raise _unknown(name, [*FORMATS, *DATATYPES])
    if hints.datatype not in {None, name}:
        raise ArgumentsError(
            where="--format",
            problem=f"{name} and {hints.datatype} contradict each other",
            allowed="one datatype",
            remedy="Name the datatype once.",
        )
    return FORMATS.load("raw")(), replace(hints, datatype=name)


def _unknown(name: str, known: list[str]) -> ArgumentsError:
    is_real = name.startswith("r")  # "f32" means cf32_le, not rf32_le
    likely = [item for item in known if is_real or not item.startswith("r") or item in FORMATS]
    guess = nearest(name, likely) or nearest(name, known)
    return ArgumentsError(
        where="--format",
        problem=f"{name!r} is not known",
        allowed=", ".join(known),
        remedy=f"Did you mean {guess}?" if guess else "Use one of these.",
    )


def _detected(path: Path) -> Format:
    """Return the one format whose files look like this."""
    from wavegen.files.sigmf import Sigmf, meta_beside

    with told(path):
        is_stem = not path.exists() and meta_beside(path).exists()
    if is_stem:
        return Sigmf()
    if path.suffix.lower() in Sigmf.suffixes:
        return Sigmf()  # whose reader says which of the two files is missing
    head = read_head(path)
    if path.name.lower().endswith(SIDECAR):
        raise FileError(
            where=str(path),
            problem="is a sidecar, which describes recordings",
            allowed="recordings",
            remedy="Name one of the recordings beside it.",
        )
    if not head:
        raise FileError(
            where=str(path),
            problem="is empty",
            allowed="at least one sample",
            remedy="Check that the recording or the copy finished.",
        )
    forms: list[Format] = [FORMATS.load(name)() for name in FORMATS]
    found = next((form for form in forms if form.detect(path, head)), None)
    if found is None:
        raise _not_known(path, signature_of(head) or (TEXT if is_text(head) else None), forms)
    return found


def _not_known(path: Path, known: Signature | None, forms: list[Format]) -> FileError:
    wav_damaged = path.suffix.lower() == ".wav"
    if known is None and wav_damaged:
        problem = "is named .wav but does not start with RIFF or RF64 and WAVE"
    elif known is None:
        problem = "neither its name nor its first bytes say what it holds"
    else:
        problem = f"is {known.what}"
    return FileError(
        where=str(path),
        problem=problem,
        allowed="files that end in "
        + ", ".join(suffix for form in forms for suffix in form.suffixes),
        remedy=known.remedy
        if known
        else "If it holds bare samples, say which: --format ci16_le --sample-rate 20MHz.",
    )
