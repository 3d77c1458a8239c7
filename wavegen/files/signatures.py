"""What the first bytes of a file give away: well-known kinds that are not bare samples."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class Signature:
    """A kind of file known by its first bytes.

    Parameters
    ----------
    what : str
        With its article: ``a gzip archive``.
    start : bytes
        First bytes.
    at : int
        Where ``also`` stands.
    also : bytes
        Further bytes that must be there.
    remedy : str
        What to do if such a file is given as a recording.
    """

    what: str
    start: bytes
    at: int = 0
    also: bytes = b""
    remedy: str = "Name a recording."


_UNPACK = "Unpack it and name the recording inside."
_EXPORT = "Export its samples as SigMF, WAV or raw interleaved."

SIGNATURES = (
    Signature(what="a WAV file", start=b"RIFF", at=8, also=b"WAVE", remedy="Add --format wav."),
    Signature(what="a WAV file", start=b"RF64", at=8, also=b"WAVE", remedy="Add --format wav."),
    Signature(what="a zip archive", start=b"PK\x03\x04", remedy=_UNPACK),
    Signature(what="a gzip archive", start=b"\x1f\x8b\x08", remedy=_UNPACK),
    Signature(what="an xz archive", start=b"\xfd7zXZ\x00", remedy=_UNPACK),
    Signature(what="a bzip2 archive", start=b"BZh", at=4, also=b"1AY&SY", remedy=_UNPACK),
    Signature(what="a zstandard archive", start=b"\x28\xb5\x2f\xfd", remedy=_UNPACK),
    Signature(what="a tar archive", start=b"", at=257, also=b"ustar", remedy=_UNPACK),
    Signature(what="an HDF5 file", start=b"\x89HDF\r\n\x1a\n", remedy=_EXPORT),
    Signature(what="a NumPy array", start=b"\x93NUMPY", remedy=_EXPORT),
    Signature(what="a MATLAB file", start=b"MATLAB 5.0 MAT-file", remedy=_EXPORT),
    Signature(what="a FLAC file", start=b"fLaC", remedy=_EXPORT),
    Signature(what="a program", start=b"\x7fELF"),
    Signature(what="a PDF document", start=b"%PDF-"),
    Signature(what="a PNG image", start=b"\x89PNG\r\n\x1a\n"),
)
"""Sources: RFC 1952 (gzip), PKWARE's application note (zip), POSIX.1-2001 (ustar), the HDF5
file format specification, NumPy's ``npy`` format, EBU Tech 3306 (RF64)."""

TEXT = Signature(
    what="a text file",
    start=b"",
    remedy="Name the recording itself; text is not read as samples.",
)
"""Recognised by :func:`is_text`; samples can look like it by chance, so endings outrank it."""


def signature_of(head: bytes) -> Signature | None:
    r"""Return the kind that the first bytes give away, or None for what may be bare samples.

    Parameters
    ----------
    head : bytes
        The first 4096 bytes, or all of a shorter file.

    Examples
    --------
    >>> signature_of(b"RIFF\x24\x00\x00\x00WAVEfmt ").what
    'a WAV file'
    >>> signature_of(bytes(range(64)))
    """
    for known in SIGNATURES:
        end = known.at + len(known.also)
        if head.startswith(known.start) and head[known.at : end] == known.also:
            return known
    return None


def is_text(head: bytes) -> bool:
    """Return whether 16 bytes or more are printable UTF-8 throughout.

    Parameters
    ----------
    head : bytes
        The first 4096 bytes, or all of a shorter file.

    Notes
    -----
    98 of 256 byte values are printable ASCII or line ends, so 16 random bytes pass with
    probability ``(98/256)^16`` = 2e-7 (and a little for longer characters), a full head never.

    Examples
    --------
    >>> is_text(b'{"a": 1, "title": "a sidecar"}'), is_text(bytes(range(64)))
    (True, False)
    """
    if len(head) < 16:
        return False
    try:
        text = head.decode("utf-8")
    except UnicodeDecodeError as error:
        if error.start < len(head) - 3:  # more than one character cut by the end of the head
            return False
        text = head[: error.start].decode("utf-8")
    return all(letter.isprintable() or letter in "\r\n\t" for letter in text.removeprefix("\ufeff"))
