"""What goes to the terminal: results to stdout, all talk to stderr."""

from __future__ import annotations

import json
import sys
import textwrap
import time
from typing import TYPE_CHECKING, Any

from wavegen.core.table import Table

if TYPE_CHECKING:
    from rich.progress import Progress as Bar

WIDTH = 80


class Console:
    """The terminal of one run."""

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
        sys.stdout.write(json.dumps(document, ensure_ascii=False, allow_nan=False, indent=1))
        sys.stdout.write("\n")

    def line(self, text: str = "") -> None:
        """Print a sentence of the result on stdout, broken at 80 columns."""
        sys.stdout.write(textwrap.fill(text, WIDTH, break_long_words=False) + "\n")

    def table(self, table: Table) -> None:
        """Print a table on stdout, at most 80 columns wide."""
        from rich.box import SIMPLE_HEAD
        from rich.console import Console as Terminal
        from rich.table import Table as Drawn
        from rich.text import Text

        drawn = Drawn(
            title=Text(table.title), title_justify="left", box=SIMPLE_HEAD, pad_edge=False
        )
        for number, heading in enumerate(table.headings):
            drawn.add_column(
                heading,
                justify="right" if number in table.right else "left",
                overflow="fold",
            )
        for row in table.rows:
            drawn.add_row(*(Text(cell) for cell in row))
        Terminal(width=WIDTH, highlight=False).print(drawn)


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
