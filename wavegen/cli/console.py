"""What goes to the terminal: results to stdout, all talk to stderr."""

from __future__ import annotations

import io
import json
import os
import sys
import textwrap
import time
from typing import TYPE_CHECKING, Any

from wavegen.core.errors import FileError
from wavegen.core.table import Table

if TYPE_CHECKING:
    from rich.progress import Progress as Bar

WIDTH = 80


class Page(io.StringIO):
    """What will be written to stdout, drawn with the characters that stdout can hold."""

    @property
    def encoding(self) -> str:  # type: ignore[override]
        """Encoding of stdout."""
        return encoding_of_stdout()


def encoding_of_stdout() -> str:
    """Return the encoding of stdout, UTF-8 if it has none."""
    return getattr(sys.stdout, "encoding", None) or "utf-8"


def stdout_is_terminal() -> bool:
    """Return whether stdout is a terminal; one that is closed is none."""
    try:
        return sys.stdout is not None and sys.stdout.isatty()
    except ValueError:
        return False


def discard_stdout() -> None:
    """Send what is still to be flushed nowhere: its reader has gone, or its disk is full."""
    try:
        descriptor = sys.stdout.fileno()
    except (AttributeError, OSError, ValueError):  # closed, or no file of the system
        return
    os.dup2(os.open(os.devnull, os.O_WRONLY), descriptor)


class Console:
    """The terminal of one run."""

    def _put(self, text: str) -> None:
        """Write to stdout; what its encoding cannot hold is escaped.

        Raises
        ------
        FileError
            stdout is closed, or the disk under it is full.
        BrokenPipeError
            Nobody reads it any more.
        """
        encoding = encoding_of_stdout()
        held = text.encode(encoding, "backslashreplace").decode(encoding)
        problem = "is closed"
        if sys.stdout is not None:
            try:
                sys.stdout.write(held)
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
        self._talk(text, "bold red", "error: ")

    def warn(self, text: str) -> None:
        """Say on stderr what the user should know."""
        self._talk(text, "yellow", "note: ")

    def _talk(self, text: str, style: str, lead: str) -> None:
        for line in text.splitlines() or [""]:
            if sys.stderr.isatty():
                from rich.console import Console as Terminal
                from rich.text import Text

                said = Text(lead, style=style)
                said.append(line, style="default")
                Terminal(stderr=True, highlight=False).print(said)
            else:
                sys.stderr.write(f"{lead}{line}\n")

    def document(self, document: Any) -> None:
        """Print one JSON document on stdout."""
        is_ascii = not encoding_of_stdout().casefold().startswith("utf")
        text = json.dumps(document, ensure_ascii=is_ascii, allow_nan=False, indent=1)
        self._put(f"{text}\n")

    def line(self, text: str = "") -> None:
        """Print a sentence of the result on stdout, broken at 80 columns."""
        self._put(textwrap.fill(text, WIDTH, break_long_words=False) + "\n")

    def table(self, table: Table) -> None:
        """Print a table on stdout, at most 80 columns wide."""
        from rich.box import SIMPLE_HEAD
        from rich.console import Console as Terminal
        from rich.table import Table as Drawn
        from rich.text import Text

        drawn = Drawn(box=SIMPLE_HEAD, pad_edge=False)
        for number, heading in enumerate(table.headings):
            drawn.add_column(
                heading,
                justify="right" if number in table.right else "left",
                overflow="fold",
            )
        for row in table.rows:
            drawn.add_row(*(Text(cell) for cell in row))
        page = Page()
        terminal = Terminal(
            file=page, width=WIDTH, highlight=False, force_terminal=stdout_is_terminal()
        )
        terminal.print(Text(table.title, style="italic"), drawn)
        self._put(page.getvalue())


class ConsoleProgress:
    """A bar on stderr with rate and time left, on work over a second.

    Notes
    -----
    It listens to the progress protocol of the core. Nothing is drawn where stderr is no terminal.
    """

    def __init__(self, *, patience_s: float = 1.0) -> None:
        self._patience = patience_s
        self._bar: Bar | None = None
        self._number: Any = None
        self._task = ""
        self._since = 0.0

    def __call__(self, task: str, done: int, total: int) -> None:
        """Take note of ``done`` out of ``total`` samples."""
        if not sys.stderr.isatty():
            return
        now = time.monotonic()
        if task != self._task:
            self.close()
            self._task, self._since = task, now
        if self._bar is None:
            if done >= total or now - self._since < self._patience:
                return
            self._open(task, total)
        assert self._bar is not None  # noqa: S101 - set by _open, told to the type checker
        speed = done / max(now - self._since, 1e-9)
        self._bar.update(self._number, completed=done, total=total, rate=f"{speed / 1e6:.1f} MS/s")
        if done >= total:
            self.close()

    def _open(self, task: str, total: int) -> None:
        from rich.console import Console as Terminal
        from rich.progress import BarColumn, TextColumn, TimeRemainingColumn
        from rich.progress import Progress as Bar

        self._bar = Bar(
            TextColumn("{task.description}"),
            BarColumn(bar_width=30),
            TextColumn("{task.percentage:>3.0f} %"),
            TextColumn("{task.fields[rate]}"),
            TimeRemainingColumn(),
            console=Terminal(stderr=True),
            transient=True,
        )
        self._bar.start()
        self._number = self._bar.add_task(task, total=total, rate="")

    def close(self) -> None:
        """Remove the bar."""
        if self._bar is not None:
            self._bar.stop()
            self._bar = None
        self._task = ""
