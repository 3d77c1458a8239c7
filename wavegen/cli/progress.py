"""How far work has come: one line on stderr, where that is a terminal."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable

from wavegen.cli.arguments import columns
from wavegen.core.progress import UNITS

PATIENCE_S = 1.0
"""Work that takes less is not shown."""

PAUSE_S = 0.1
"""Between two pictures of the line."""

BAR = 16


class ConsoleProgress:
    """A line with a bar, the rate and the time left.

    Parameters
    ----------
    patience_s : float
        Nothing is drawn before.
    is_shown : bool
        Whether anything is drawn at all.
    now : callable
        The time, s.

    Notes
    -----
    It listens to the progress protocol of the core. A task begins anew where its total changes or
    less is done than before. Nothing is drawn where stderr is no terminal.
    """

    def __init__(
        self,
        *,
        patience_s: float = PATIENCE_S,
        is_shown: bool = True,
        now: Callable[[], float] = time.monotonic,
    ) -> None:
        self._patience = patience_s
        self._is_shown = is_shown
        self._now = now
        self._total = self._done = self._first = -1
        self._since = self._drawn_at = 0.0
        self._n_drawn = 0

    def __call__(self, task: str, done: int, total: int) -> None:
        """Take note of ``done`` out of ``total``."""
        if not self._is_shown or sys.stderr is None or not sys.stderr.isatty():
            return
        now = self._now()
        if total != self._total or done < self._done:
            self.close()
            self._total, self._first, self._since = total, done, now
        self._done = done
        if done >= total:
            self.close()
        elif now - self._since >= self._patience and now - self._drawn_at >= PAUSE_S:
            self._draw(line(task, done - self._first, done, total, now - self._since))
            self._drawn_at = now

    def _draw(self, text: str) -> None:
        shown = text[: columns() - 1]
        encoding = getattr(sys.stderr, "encoding", None) or "ascii"
        held = shown.encode(encoding, "replace").decode(encoding)
        sys.stderr.write("\r" + held.ljust(self._n_drawn))
        sys.stderr.flush()
        self._n_drawn = len(held)

    def close(self) -> None:
        """Remove the line."""
        if self._n_drawn:
            sys.stderr.write("\r" + " " * self._n_drawn + "\r")
            sys.stderr.flush()
            self._n_drawn = 0
        self._total = self._done = -1


def line(task: str, n_new: int, done: int, total: int, elapsed_s: float) -> str:
    """Return what is shown of work: share, time left, rate, task.

    Parameters
    ----------
    task : str
        What is done.
    n_new, done, total : int
        Done since the clock started, done in all, and all of it.
    elapsed_s : float
        Since the clock started, s.

    Examples
    --------
    >>> line("rendering", 25_000_000, 25_000_000, 100_000_000, 2.0)
    ' 25 % [####------------] 0:06 left, 12.5 MS/s, rendering'
    """
    share = min(done / total, 1.0) if total else 1.0
    bar = "#" * round(BAR * share) + "-" * (BAR - round(BAR * share))
    speed = n_new / max(elapsed_s, 1e-9)
    left = clock((total - done) / speed) if speed > 0 else "-:--"
    unit = UNITS.get(task.partition(":")[0], "S")
    rate = f", {speed / 1e6:.1f} M{unit}/s" if unit else ""
    return f"{100 * share:3.0f} % [{bar}] {left} left{rate}, {task}"


def clock(seconds: float) -> str:
    """Return a time as it stands on a clock.

    Examples
    --------
    >>> clock(6.2), clock(3723)
    ('0:06', '1:02:03')
    """
    whole = round(seconds)
    minutes, rest = divmod(whole, 60)
    hours, minutes = divmod(minutes, 60)
    return f"{hours}:{minutes:02}:{rest:02}" if hours else f"{minutes}:{rest:02}"
