"""A signal rendered once and read from scratch ever after, which still says what it is made of."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from wavegen.core.progress import Progress, silent
from wavegen.core.render import render
from wavegen.core.signal import Range, Signal
from wavegen.core.stored import Scratch, Stored
from wavegen.core.symbol_bodies import HasBodies


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Stored):
    """Samples in a file, of a signal that is its input in name only: none of it is computed."""

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return nothing of the input."""
        return ((0, 0),) * len(self.inputs)


@contextmanager
def held(
    signal: Signal,
    *,
    folder: Path,
    workers: int = 1,
    progress: Progress = silent,
    task: str = "rendering",
) -> Iterator[Signal]:
    """Render a signal to scratch and give it back as one that is read from there.

    Parameters
    ----------
    signal : Signal
        Of OFDM before any other stage the symbol bodies are kept, so that stages that act on
        symbols still find them; prefixes are laid anew.
    folder : Path
        Where the scratch file lies until the context ends.
    workers, progress, task
        As in :func:`wavegen.core.render.render`.

    Yields
    ------
    Signal
        The same samples.

    Raises
    ------
    FileError
        The disk has not enough room.
    """
    laid = signal if isinstance(signal, HasBodies) else None
    kept = signal if laid is None else laid.bodies
    with Scratch(
        folder=folder, sample_rate_hz=kept.sample_rate_hz, n_samples=kept.n_samples
    ) as scratch:
        render(kept, sink=scratch.write, workers=workers, progress=progress, task=task)
        stored = scratch.signal()
        made = Held(
            sample_rate_hz=kept.sample_rate_hz,
            n_samples=kept.n_samples,
            step=1,
            inputs=(kept,),
            mean_power=kept.mean_power,
            path=stored.path,
        )
        yield made if laid is None else laid.with_bodies(made)
