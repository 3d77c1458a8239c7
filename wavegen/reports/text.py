"""Tables as plain text that fits a terminal: columns aligned, long cells folded."""

from __future__ import annotations

import itertools
import re
import unicodedata
from collections.abc import Iterable, Sequence

from wavegen.core.table import Table

WIDTH = 80
INDENT = "  "
GAPS = ("   ", "  ", " ")
"""Between columns: the widest that still fits."""

NARROWEST = 6
"""Characters to which a column of words may be folded."""


SPELT = str.maketrans("\u00b5\u00d7\u2212\u2013\u2500", "ux---")
"""One letter for one: micro, times, minus, dash, rule."""


def held(text: str, encoding: str) -> str:
    r"""Return a text with what an encoding lacks spelt another way.

    Examples
    --------
    >>> held("5 \u00b5s, \u4e2d", "ascii")
    '5 us, \\u4e2d'
    """
    try:
        text.encode(encoding)
    except UnicodeEncodeError:
        text = "".join(
            letter if _holds(letter, encoding) else letter.translate(SPELT) for letter in text
        )
        return text.encode(encoding, "backslashreplace").decode(encoding)
    return text


def _holds(letter: str, encoding: str) -> bool:
    return letter == letter.encode(encoding, "ignore").decode(encoding)


def visible(text: str) -> str:
    r"""Return a text whose control characters cannot act on a terminal: they are spelt out.

    Line breaks and tabs stay. What turns the direction of writing is spelt out too.

    Examples
    --------
    >>> visible("a\x1b[2Jb")
    'a\\x1b[2Jb'
    """
    if text.isascii() and text.isprintable():
        return text
    return "".join(
        character
        if character in "\n\t" or unicodedata.category(character) not in {"Cc", "Cf", "Cs"}
        else character.encode("unicode_escape", "surrogatepass").decode("ascii")
        for character in text
    )


def fold(text: str, width: int = WIDTH, *, indent: str = "") -> str:
    """Return a sentence folded between words; a word longer than a line is broken behind a slash.

    Parameters
    ----------
    text : str
        One paragraph; spaces at its beginning stand before every line.
    width : int
        Columns of the terminal.
    indent : str
        Before every line but the first.

    Examples
    --------
    >>> print(fold("Write it like --sample-rate 20MHz.", 24))
    Write it like
    --sample-rate 20MHz.
    >>> print(fold("/a/long/path/to/some.file", 16))
    /a/long/path/to/
    some.file
    """
    lead = text[: len(text) - len(text.lstrip())][: width // 2]
    lines, line = [], lead
    for word in re.split(r"[ \t\n]+", text.strip(" \t\n")):
        joined = f"{line} {word}" if line.strip() else lead + word
        if len(joined) > width and line.strip():
            lines.append(line)
            joined = indent + lead + word
        line = joined
        while len(line) > width:
            cut = _break(line, width)
            lines.append(line[:cut])
            line = indent + lead + line[cut:]
    return "\n".join([*lines, line])


def _break(line: str, width: int) -> int:
    """Return where to break a line of one long word: behind a slash, else a hyphen."""
    for marks in ("/\\", "-_"):
        cut = max(line.rfind(mark, 0, width) for mark in marks) + 1
        if cut > width // 2:
            return cut
    return width


def text_of(table: Table, *, width: int = WIDTH, rule: str = "") -> str:
    """Return a table as plain text.

    Parameters
    ----------
    table : Table
        Any.
    width : int
        Columns of the terminal.
    rule : str
        The character drawn under the headings; none if empty.

    Examples
    --------
    >>> table = Table(title="Levels", headings=("at", "dB"), rows=(("1 %", "6.63"),))
    >>> print(text_of(table, rule="-"))
    Levels
      at    dB
      ----------
      1 %   6.63
    """
    cells = [[visible(cell) for cell in row] for row in (table.headings, *table.rows)]
    gap, widths = _fitted(cells, table.right, width - len(INDENT))
    lines = fold(visible(table.title), width).splitlines()
    for number, row in enumerate(cells):
        lines.extend(_row_lines(row, widths, gap, table.right))
        if rule and number == 0:
            lines.append(INDENT + rule * (sum(widths) + len(gap) * (len(widths) - 1)))
    return "\n".join(lines)


def _fitted(
    cells: Sequence[Sequence[str]], right: frozenset[int], room: int
) -> tuple[str, list[int]]:
    """Return the gap and the widths of columns that fit; numbers are folded last, words whole."""
    columns = list(zip(*cells, strict=True))
    widths = [_longest(line for cell in column for line in cell.splitlines()) for column in columns]
    for gap in GAPS[:-1]:
        if _needed(widths, gap) <= room:
            return gap, widths
    natural, every = widths, set(range(len(widths)))
    words = [_longest(word for cell in column for word in cell.split()) for column in columns]
    whole = [min(word, room // 3) for word in words]
    least = [NARROWEST] * len(widths)
    for gap in GAPS[-2:]:
        inner, widths = room - _needed([0] * len(natural), gap), natural
        for floors, which in itertools.product((whole, least), (every - right, every)):
            widths = _narrowed(widths, floors, which, inner)
        if sum(widths) <= inner:
            break
    return gap, widths


def _longest(texts: Iterable[str]) -> int:
    return max(map(len, texts), default=0)


def _needed(widths: list[int], gap: str) -> int:
    return sum(widths) + len(gap) * (len(widths) - 1)


def _narrowed(widths: list[int], floors: list[int], which: set[int], room: int) -> list[int]:
    """Return widths of which the widest of some columns were made narrower, not below floors."""
    widths = list(widths)
    while sum(widths) > room:
        left = [number for number in which if widths[number] > max(floors[number], NARROWEST)]
        if not left:
            break
        widths[max(left, key=lambda number: widths[number])] -= 1
    return widths


def _row_lines(
    row: Sequence[str], widths: Sequence[int], gap: str, right: frozenset[int]
) -> list[str]:
    folded = [
        [piece for line in cell.splitlines() or [""] for piece in fold(line, width).split("\n")]
        for cell, width in zip(row, widths, strict=True)
    ]
    lines = []
    for depth in range(max(map(len, folded))):
        pieces = (
            (column[depth] if depth < len(column) else "").rjust(width)
            if number in right
            else (column[depth] if depth < len(column) else "").ljust(width)
            for number, (column, width) in enumerate(zip(folded, widths, strict=True))
        )
        lines.append(INDENT + gap.join(pieces).rstrip())
    return lines
