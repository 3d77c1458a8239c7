"""Tables of numbers in text, from anybody: separators, decimal commas, headings, comments.

A table is looked through once when it is opened, to count its rows and to remember where every
4096th stands; rows are read, and checked, when they are wanted.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import FileError
from wavegen.files.faults import read_head, regular_size, told

ROWS_PER_MARK = 1 << 12
MOST_BYTES = 4_000_000_000
"""Largest table that is read: beyond it, text is the wrong format (it reads at tens of MB/s)."""

_LONGEST_LINE = 1 << 16
_MOST_COLUMNS = 64
_MOST_COMMENT = 1 << 16
"""Bytes of comments before the first row that are kept."""

_COMMENTS = (b"#", b"%", b"//", b"!")
_FIGURES = frozenset(bytes([item]) for item in b"0123456789-+.")
_SETTING = re.compile(r"[#%!/\s]*([A-Za-z_]\w{0,39})\s*[:=]\s*(.{0,500})")
_BRACKETED = re.compile(r"(.*?)[\s_]*[(\[]([^()\[\]]*)[)\]]")
_DIVIDED = re.compile(r"(.*?)\s*/\s*(\S+)")


@dataclass(frozen=True, slots=True, kw_only=True)
class Dialect:
    """How a table separates its columns.

    Parameters
    ----------
    separator : str
        ``,``, ``;``, tab, or a space for any white space.
    decimal_comma : bool
        Whether ``1,5`` is one and a half.
    """

    separator: str
    decimal_comma: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Heading:
    """One column's heading.

    Parameters
    ----------
    name : str
        Lower case, words joined by ``_``, without its unit.
    unit : str
        As written, empty if none: ``dBm``.
    """

    name: str
    unit: str


@dataclass(frozen=True, eq=False, kw_only=True)
class Table:
    """A table of numbers, and where its rows stand.

    Parameters
    ----------
    path : Path
        The file.
    dialect : Dialect
        How it is written.
    headings : tuple of Heading
        Empty if there are none.
    settings : dict
        ``key: value`` comments before the first row.
    n_rows, n_columns : int
        Its size.
    marks : int64 array, shape (n_marks, 2)
        Byte and line number of every 4096th row.
    """

    path: Path
    dialect: Dialect
    headings: tuple[Heading, ...]
    settings: dict[str, str]
    n_rows: int
    n_columns: int
    marks: NDArray[np.int64]

    def rows(self, start: int, stop: int) -> NDArray[np.float64]:
        """Return the numbers in rows ``[start, stop)``.

        Parameters
        ----------
        start, stop : int
            ``0 <= start < stop <= n_rows``.

        Returns
        -------
        float64 array, shape (stop - start, n_columns)

        Raises
        ------
        FileError
            A row with other columns or with what is no finite number, or a file that changed.
        """
        out = np.empty((stop - start, self.n_columns))
        with told(self.path), self.path.open("rb") as file:
            for mark in range(start // ROWS_PER_MARK, -(-stop // ROWS_PER_MARK)):
                first = mark * ROWS_PER_MARK
                wanted = slice(max(start - first, 0), min(stop - first, ROWS_PER_MARK))
                block, line = self._block(file, mark, wanted.stop)
                place = first + wanted.start - start
                rows = block[wanted]
                if rows:
                    out[place : place + len(rows)] = self._numbers(rows, line + wanted.start)
                if len(block) < wanted.stop:
                    raise self._fault(
                        problem=f"ends after row {first + len(block)}",
                        allowed=f"{self.n_rows} rows",
                    )
        return out

    def _block(self, file: BinaryIO, mark: int, n_wanted: int) -> tuple[list[bytes], int]:
        """Return up to 4096 rows from a mark, and the number of the first one's line."""
        offset, line = (int(item) for item in self.marks[mark])
        file.seek(offset)
        if mark + 1 < len(self.marks):
            content = file.read(int(self.marks[mark + 1, 0]) - offset)
            rows = [item for item in content.split(b"\n") if _is_row(item)]
        else:
            rows = []
            while len(rows) < n_wanted and (item := file.readline(_LONGEST_LINE)):
                if _is_row(item):
                    rows.append(item)
        return rows[:ROWS_PER_MARK], line + 1

    def _numbers(self, block: list[bytes], first: int) -> NDArray[np.float64]:
        """Return the numbers of rows, the first of which is line ``first``."""
        separator = self.dialect.separator.encode()
        try:
            found = _parsed(block, self.dialect, self.n_columns)
        except (ValueError, OverflowError):
            found = None
        if found is not None:
            return found
        for number, line in enumerate(block, first):
            fields = _fields(line, separator)
            try:
                good = _parsed([line], self.dialect, self.n_columns) is not None
            except (ValueError, OverflowError):
                good = False
            if not good:
                shown = ascii(line.strip()[:40].decode("utf-8", "replace"))
                problem = f"the row {shown} at or after line {number}"
                if len(fields) != self.n_columns:
                    problem += f" has {len(fields)} columns"
                raise self._fault(
                    problem=problem, allowed=f"rows of {self.n_columns} finite numbers"
                )
        raise self._fault(
            problem="changed while it was read", allowed="files that stay as they are"
        )

    def _fault(self, *, problem: str, allowed: str) -> FileError:
        return FileError(
            where=str(self.path),
            problem=problem,
            allowed=allowed,
            remedy="Correct the table, or export it again with a point as decimal sign.",
        )


def _parsed(block: list[bytes], dialect: Dialect, n_columns: int) -> NDArray[np.float64] | None:
    """Return rows of numbers, or None if they are not all finite, or not all as wide."""
    separator = dialect.separator.encode()
    if separator == b" ":
        if any(len(line.split()) != n_columns for line in block):
            return None
    elif any(line.rstrip().rstrip(separator).count(separator) != n_columns - 1 for line in block):
        return None
    text = b"\n".join(block).removeprefix(b"\xef\xbb\xbf")
    if b"_" in text:  # Python would read 1_000
        return None
    if dialect.decimal_comma:
        text = text.replace(b",", b".")
    if separator != b" ":
        text = text.replace(separator, b" ")
    numbers = np.array(list(map(float, text.replace(b'"', b" ").split())))
    if numbers.size != n_columns * len(block) or not np.isfinite(numbers).all():
        return None
    return numbers.reshape(-1, n_columns)


def open_table(path: Path) -> Table:
    """Look through a table.

    Parameters
    ----------
    path : Path
        A file of text.

    Returns
    -------
    Table

    Raises
    ------
    FileError
        Out of reach, too large, no text (UTF-16 is named), without rows, with too many columns,
        or with separators that leave a doubt.
    """
    size = regular_size(path)
    if size > MOST_BYTES:
        raise _refused(path, f"has {size / 1e9:.1f} GB of text", "Convert it to SigMF first.")
    _refuse_no_text(path)
    comments: list[bytes] = []
    heading: bytes | None = None
    sample: list[bytes] = []
    marks: list[tuple[int, int]] = []
    n_rows = n_lines = offset = kept = 0
    with told(path), path.open("rb") as file:
        while line := file.readline(_LONGEST_LINE):
            n_lines += 1
            if len(line) == _LONGEST_LINE:
                problem = f"line {n_lines} is longer than {_LONGEST_LINE} bytes"
                raise _refused(path, problem, "Check that it is a table.")
            if _is_row(line):
                if heading is None and not n_rows and _is_heading(line):
                    heading = line
                else:
                    if n_rows % ROWS_PER_MARK == 0:
                        marks.append((offset, n_lines - 1))
                    if n_rows < ROWS_PER_MARK:
                        sample.append(line)
                    n_rows += 1
            elif not n_rows and kept < _MOST_COMMENT:
                comments.append(line)
                kept += len(line)
            offset += len(line)
    if not n_rows:
        raise _refused(path, "has no row of numbers", "Check that the export finished.")
    dialect = _dialect(path, sample, heading)
    separator = dialect.separator.encode()
    n_columns = len(_fields(sample[0], separator))
    if n_columns > _MOST_COLUMNS:
        raise _refused(path, f"has {n_columns} columns", "Keep the columns that are needed.")
    headings = () if heading is None else _headings(heading, separator, n_columns)
    if headings and len(headings) != n_columns:
        raise _refused(
            path,
            f"has {len(headings)} headings over {n_columns} columns",
            "Separate columns by ; or tab where commas are decimal signs.",
        )
    return Table(
        path=path,
        dialect=dialect,
        headings=headings,
        settings=_settings(comments),
        n_rows=n_rows,
        n_columns=n_columns,
        marks=np.array(marks, np.int64),
    )


def _refuse_no_text(path: Path) -> None:
    head = read_head(path)
    if head.startswith((b"\xff\xfe", b"\xfe\xff")) or (head and head.count(0) * 3 > len(head)):
        raise _refused(path, "is UTF-16 text, or no text", "Save it as CSV in UTF-8.")
    if b"\0" in head:
        raise _refused(path, "is no text: it holds NUL bytes", "Name a table of numbers.")
    if head.lstrip()[:1] in {b"{", b"<"}:
        raise _refused(path, "is JSON or XML, no table", "Export it as CSV.")


def _is_row(line: bytes) -> bool:
    if line[:1] in _FIGURES:  # most rows, told at once
        return True
    content = line.strip().removeprefix(b"\xef\xbb\xbf")
    return bool(content) and not content.startswith(_COMMENTS)


def _is_heading(line: bytes) -> bool:
    """Return whether a row holds words: a letter that is no exponent."""
    text = line.decode("utf-8", "replace").lower().removeprefix("\ufeff")
    words = re.findall(r"[^\W\d_]+", text)
    return any(word not in {"e", "nan", "inf", "infinity"} for word in words)


def _fields(line: bytes, separator: bytes) -> list[bytes]:
    content = line.strip().removeprefix(b"\xef\xbb\xbf")
    if separator == b" ":
        return content.split()
    return line.rstrip().rstrip(separator).split(separator)


def _dialect(path: Path, sample: list[bytes], heading: bytes | None) -> Dialect:
    """Return how rows are written, from up to 4096 of them."""
    first = sample[0]
    separator = next((item for item in (b";", b"\t") if item in first.strip()), None)
    has_comma = any(b"," in line for line in sample)
    if separator is None and has_comma:
        alone = heading is not None and not re.search(rb"[,;\t]", heading)
        if alone and all(line.count(b",") <= 1 for line in sample):
            return Dialect(separator=" ", decimal_comma=True)  # one column of decimal commas
        spaced = all(re.search(rb"\d,\d+\s+[-+]?\d", line) for line in sample)
        if spaced:
            return Dialect(separator=" ", decimal_comma=True)
        return Dialect(separator=",", decimal_comma=False)
    if has_comma and any(b"." in line for line in sample):
        raise _refused(
            path,
            "has both commas and points inside its numbers",
            "Export without thousands' marks.",
        )
    name = " " if separator is None else separator.decode()
    return Dialect(separator=name, decimal_comma=has_comma)


def _headings(line: bytes, separator: bytes, n_columns: int) -> tuple[Heading, ...]:
    if n_columns == 1 and not re.search(rb"[,;\t]", line.strip()):
        fields = [line]
    elif separator == b" " and not re.search(rb"[,;\t]", line):
        fields = re.split(rb"\s+(?![(\[])", line.strip())
    else:
        fields = _fields(line, separator)
    return tuple(heading_of(item.decode("utf-8", "replace")) for item in fields)


def heading_of(text: str) -> Heading:
    """Return a heading taken apart into name and unit.

    Examples
    --------
    >>> heading_of(' "Power [dBm]"'), heading_of("level_db")
    (Heading(name='power', unit='dBm'), Heading(name='level', unit='dB'))
    >>> heading_of("Q"), heading_of("Prob / %")
    (Heading(name='q', unit=''), Heading(name='prob', unit='%'))
    """
    plain = text.strip().removeprefix("\ufeff").strip().strip("\"'").strip()
    found = _BRACKETED.fullmatch(plain) or _DIVIDED.fullmatch(plain)
    name, unit = (found[1], found[2].strip()) if found else (plain, "")
    words = [word for word in re.split(r"[\s_\-]+", name.strip()) if word]
    if not unit and words and words[-1] == "MW":
        unit = words.pop()  # a milliwatt is another thing
    words = [word.lower() for word in words]
    if not unit and len(words) > 1 and words[-1] in _UNIT_WORDS:
        unit = _UNIT_WORDS[words.pop()]
    return Heading(name="_".join(words), unit=unit)


_UNIT_WORDS = {
    "db": "dB",
    "dbm": "dBm",
    "w": "W",
    "mw": "mW",
    "percent": "%",
    "s": "s",
    "ms": "ms",
    "us": "us",
    "hz": "Hz",
}


def _settings(comments: list[bytes]) -> dict[str, str]:
    found: dict[str, str] = {}
    for line in comments:
        item = _SETTING.fullmatch(line.decode("utf-8", "replace").strip())
        if item:
            found.setdefault(item[1].lower(), item[2].strip())
    return found


def _refused(path: Path, problem: str, remedy: str) -> FileError:
    return FileError(
        where=str(path),
        problem=problem,
        allowed="tables of numbers in UTF-8 text, columns separated by comma, semicolon or tab",
        remedy=remedy,
    )
