"""Text from files and recipes, made fit to be shown: nothing in it acts, all of it is seen."""

from __future__ import annotations

import unicodedata

_KEPT = "\n\t"
_TURNING = frozenset("\u061c\u200e\u200f\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069")
"""Marks that turn the direction of what follows: a figure behind one would be read backwards."""


def inert(text: str) -> str:
    r"""Return a text in which control characters and marks of direction are named.

    Parameters
    ----------
    text : str
        Anything, lone halves of surrogate pairs too, as names of files hold them.

    Returns
    -------
    str
        Can be written as UTF-8 and as XML; line ends and tabs are kept.

    Notes
    -----
    Marks of direction: Unicode Standard Annex 9, section 2. XML 1.0 (section 2.2) holds no control
    characters but tab and line ends, no surrogates, and neither U+FFFE nor U+FFFF.

    Examples
    --------
    >>> inert("run\u202e7\x07")
    'run<U+202E>7<U+0007>'
    """
    return "".join(f"<U+{ord(mark):04X}>" if _acts(mark) else mark for mark in text)


def one_line(text: str) -> str:
    r"""Return a text on one line, inert.

    Examples
    --------
    >>> one_line("two\n lines")
    'two lines'
    """
    return inert(" ".join(text.split()))


def _acts(mark: str) -> bool:
    kind = unicodedata.category(mark)
    return (
        mark in _TURNING
        or (kind == "Cc" and mark not in _KEPT)
        or kind in {"Cs", "Zl", "Zp"}
        or ord(mark) & 0xFFFE == 0xFFFE
    )
