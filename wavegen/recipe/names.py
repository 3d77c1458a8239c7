"""Names in a recipe become names of files and data streams: what they may hold."""

from __future__ import annotations

import unicodedata

from wavegen.core.units import QuantityError

LONGEST = 120
"""Characters; file systems take 255 bytes and suffixes follow."""

NAME_FIELDS = frozenset({"name", "share"})
"""Text fields of settings that are names."""

_REFUSED = frozenset({"Cc", "Cs", "Zl", "Zp"})
_TURNING = frozenset("\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069")


def check_text(text: str) -> None:
    """Refuse characters that no text of a recipe needs.

    Raises
    ------
    QuantityError
        Control characters, halves of surrogate pairs, line and paragraph separators, marks that
        turn the direction of what follows. Line ends and tabs pass.
    """
    for character in text:
        odd = unicodedata.category(character) in _REFUSED or character in _TURNING
        if odd and character not in "\n\t":
            raise QuantityError(
                problem=f"the text holds the control character U+{ord(character):04X}",
                allowed="printable text",
                remedy="Remove the character.",
            )


def check_title(text: str) -> None:
    """Refuse a title that is more than one line; it names no file, so a slash is fine.

    Raises
    ------
    QuantityError
        Tabs, line ends, control characters, or too long.
    """
    check_text(text)
    if "\n" in text or "\t" in text or len(text) > LONGEST:
        raise QuantityError(
            problem=f"the title {text[:40]!r} holds a tab or a line end"
            if len(text) <= LONGEST
            else f"the title {text[:40]!r}... is {len(text)} characters long",
            allowed=f"one line of up to {LONGEST} characters",
            remedy="Shorten it; longer remarks go into comments.",
        )


def check_name(text: str) -> None:
    r"""Refuse a name that could leave its folder or break a line of output.

    Parameters
    ----------
    text : str
        The name of a part, a file or a recipe.

    Raises
    ------
    QuantityError
        Empty, too long, ``.`` or ``..``, or with ``/``, ``\``, control characters or blanks at
        its ends.
    """
    check_text(text)
    allowed = f"one line of up to {LONGEST} characters without / or \\, not . or .."
    if any(character in text for character in "/\\\n\t"):
        raise QuantityError(
            problem=f"the name {text[:40]!r} holds a path separator, a tab or a line end",
            allowed=allowed,
            remedy="Use a hyphen or a space there.",
        )
    if text.strip(". ") == "" or text != text.strip():
        raise QuantityError(
            problem=f"the name {text[:40]!r} is empty, only dots, or has blanks at an end",
            allowed=allowed,
            remedy="Choose a word.",
        )
    if len(text) > LONGEST:
        raise QuantityError(
            problem=f"the name {text[:40]!r}... is {len(text)} characters long",
            allowed=allowed,
            remedy="Shorten it.",
        )
