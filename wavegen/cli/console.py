"""What goes to the terminal: results to stdout, all talk to stderr."""

from __future__ import annotations

import json
import os
import sys
from typing import TYPE_CHECKING, Any, TextIO

from wavegen.cli.arguments import WIDTH, columns
from wavegen.cli.progress import ConsoleProgress
from wavegen.core.errors import FileError
from wavegen.reports.text import fold, held, text_of, visible

if TYPE_CHECKING:
    from wavegen.core.table import Table

BOLD, RED, YELLOW = "1", "1;31", "33"
"""Of the terminal's styles (ECMA-48, "select graphic rendition")."""


def encoding_of_stdout() -> str:
    """Return the encoding of stdout, UTF-8 if it has none."""
    return getattr(sys.stdout, "encoding", None) or "utf-8"


def is_terminal(stream: TextIO | None) -> bool:
    """Return whether a stream is a terminal; one that is closed is none."""
    try:
        return stream is not None and stream.isatty()
    except ValueError:
        return False


def takes_styles(stream: TextIO | None) -> bool:
    """Return whether a stream shows styles: a terminal that knows them, and NO_COLOR is not set."""
    knows = os.environ.get("TERM", "dumb" if os.name == "posix" else "") != "dumb"
    if os.name == "nt":  # an old console there prints the codes
        knows = bool(os.environ.get("WT_SESSION") or os.environ.get("TERM"))
    return knows and not os.environ.get("NO_COLOR") and is_terminal(stream)


def discard_stdout() -> None:
    """Send what is still to be flushed nowhere: its reader has gone, or its disk is full."""
    try:
        descriptor = sys.stdout.fileno()
    except (AttributeError, OSError, ValueError):  # closed, or no file of the system
        return
    os.dup2(os.open(os.devnull, os.O_WRONLY), descriptor)


class Console:
    """The terminal of one run.

    Parameters
    ----------
    is_quiet : bool
        Whether notes and progress are left out.
    is_plain : bool
        Whether everything is without colours.
    """

    def __init__(self, *, is_quiet: bool = False, is_plain: bool = False) -> None:
        self.is_quiet = is_quiet
        self.is_plain = is_plain
        self.kept: list[str] = []

    def progress(self) -> ConsoleProgress:
        """Return what shows the progress of work."""
        return ConsoleProgress(is_shown=not self.is_quiet)

    def keep(self, text: str) -> None:
        """Remember what stays if the run is interrupted from now on."""
        self.kept.append(text)

    def _put(self, text: str) -> None:
        """Write to stdout; what its encoding cannot hold is escaped.

        Raises
        ------
        FileError
            stdout is closed, or the disk under it is full.
        BrokenPipeError
            Nobody reads it any more.
        """
        problem = "is closed"
        if sys.stdout is not None:
            try:
                sys.stdout.write(held(text, encoding_of_stdout()))
                sys.stdout.flush()
            except BrokenPipeError:
                raise
            except (OSError, ValueError) as error:
                problem = f"could not be written ({getattr(error, 'strerror', None) or error})"
                discard_stdout()
            else:
                return
        raise FileError(
            where="standard output",
            problem=problem,
            allowed="an output that takes the results",
            remedy="Free some disk, or write to another file.",
        )

    def fail(self, text: str) -> None:
        """Say on stderr why the run ends."""
        self._talk(text, RED, "error: ")

    def warn(self, text: str) -> None:
        """Say on stderr what the user should know, unless asked to be quiet."""
        if not self.is_quiet:
            self._talk(text, YELLOW, "note: ")

    def _talk(self, text: str, style: str, lead: str) -> None:
        if sys.stderr is None:
            return
        encoding = getattr(sys.stderr, "encoding", None) or "ascii"
        for line in visible(text).splitlines() or [""]:
            said = held(line, encoding)
            if is_terminal(sys.stderr):
                said = fold(lead + said, columns(), indent=" " * len(lead)).removeprefix(lead)
            sys.stderr.write(f"{self._styled(lead, style, sys.stderr)}{said}\n")

    def _styled(self, text: str, style: str, stream: TextIO) -> str:
        if self.is_plain or not takes_styles(stream):
            return text
        return f"\x1b[{style}m{text}\x1b[0m"

    def document(self, document: Any) -> None:
        """Print one JSON document on stdout."""
        is_ascii = not encoding_of_stdout().casefold().startswith("utf")
        text = json.dumps(document, ensure_ascii=is_ascii, allow_nan=False, indent=1)
        self._put(f"{text}\n")

    def text(self, text: str) -> None:
        """Print lines of the result as they are, to be read by another program."""
        self._put(text if text.endswith("\n") else f"{text}\n")

    def line(self, text: str = "") -> None:
        """Print a sentence of the result, broken at 80 columns or a narrower terminal."""
        self._put(f"{fold(visible(text), _width())}\n")

    def table(self, table: Table) -> None:
        """Print a table of the result, at most 80 columns wide."""
        title, break_, rest = text_of(table, width=_width(), rule="─").partition("\n")
        self._put(f"{self._styled(title, BOLD, sys.stdout)}{break_}{rest}\n\n")


def _width() -> int:
    """Return how wide results are: 80 columns, or a terminal that is narrower."""
    return columns() if is_terminal(sys.stdout) else WIDTH
