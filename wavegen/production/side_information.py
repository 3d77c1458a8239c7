"""What a receiver must be told beside the samples: which phase sequence each symbol took."""

from __future__ import annotations

import csv
import hashlib
import io
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.evaluate import order
from wavegen.core.render import Tap
from wavegen.core.signal import Samples, Signal
from wavegen.core.symbol_bodies import HasBodies
from wavegen.stages.crest.selected_mapping import Sequences, TurnBack

CHOICES = ".choices.csv"
SEQUENCES = ".sequences.csv"
CHOICES_ARE = (
    "which candidate of selected mapping each OFDM symbol of the loop took: stage, symbol (the "
    "first of the loop is 0), candidate"
)
SEQUENCES_ARE = (
    "by how many quarter turns each candidate turned a subcarrier ahead; a receiver turns the "
    "symbols of the frame that are listed back by as many; subcarriers not listed are not turned"
)
_TAP = "choice at "


class NumbersReading:
    """Whole numbers of one stretch."""

    def __init__(self) -> None:
        self._pieces: list[NDArray[np.int32]] = []

    def feed(self, start: int, samples: Samples) -> None:
        """Take in numbers, in the real part."""
        self._pieces.append(samples.real.astype(np.int32))

    def merge(self, following: Self) -> None:
        """Append the numbers of the stretch that starts where this one ends."""
        self._pieces.extend(following._pieces)

    def result(self) -> NDArray[np.int32]:
        """Return all of them."""
        return np.concatenate(self._pieces)


@dataclass(frozen=True, slots=True, kw_only=True)
class NumbersMeter:
    """Keeps every sample, of signals that are lists of whole numbers."""

    def begin(self, signal: Signal) -> NumbersReading:
        """Return an empty reading."""
        return NumbersReading()


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Choices:
    """What one stage of selected mapping did to a loop.

    Parameters
    ----------
    where : str
        Path of the stage: ``stages[0]``. Of several on one source the last is undone first.
    numbers : int32 array, shape (n_symbols,)
        Candidate that each symbol took.
    sequences : Sequences
        What the candidates turn.
    """

    where: str
    numbers: NDArray[np.int32]
    sequences: Sequences


def _stages_of(signal: Signal) -> list[TurnBack]:
    """Return every selected mapping in a graph, by its place in the recipe."""
    found = {
        id(undo): undo
        for one in order([signal])
        if isinstance(one, HasBodies)
        for undo in one.undone_by
        if isinstance(undo, TurnBack)
    }
    return sorted(found.values(), key=lambda undo: undo.where)


def choice_taps(signal: Signal) -> tuple[Tap, ...]:
    """Return what reads the choices of a graph while it is rendered."""
    return tuple(
        Tap(name=f"{_TAP}{undo.where}", signal=undo.choice, meter=NumbersMeter())
        for undo in _stages_of(signal)
    )


def take_choices(signal: Signal, readings: dict[str, Any]) -> tuple[Choices, ...]:
    """Take what :func:`choice_taps` read out of the readings of a render."""
    return tuple(
        Choices(
            where=undo.where,
            numbers=readings.pop(f"{_TAP}{undo.where}"),
            sequences=undo.sequences,
        )
        for undo in _stages_of(signal)
    )


def choices_text(choices: Sequence[Choices]) -> str:
    """Return the table of choices: ``stage,symbol,candidate``."""
    text = io.StringIO()
    rows = csv.writer(text, lineterminator="\n")
    rows.writerow(["stage", "symbol", "candidate"])
    for one in choices:
        rows.writerows((one.where, symbol, number) for symbol, number in enumerate(one.numbers))
    return text.getvalue()


def sequences_text(choices: Sequence[Choices]) -> str:
    """Return the table of sequences: one row for each candidate and subcarrier that carries data.

    Returns
    -------
    str
        Columns ``stage, candidate, subcarrier, quarter_turns, symbols, frame_symbols``: the
        subcarrier is turned in the symbols whose number modulo ``frame_symbols`` is listed.
    """
    text = io.StringIO()
    rows = csv.writer(text, lineterminator="\n")
    rows.writerow(["stage", "candidate", "subcarrier", "quarter_turns", "symbols", "frame_symbols"])
    for one in choices:
        turned = one.sequences.is_data
        listed = [_runs(np.flatnonzero(column)) for column in turned.T]
        for candidate, turns in enumerate(one.sequences.quarter_turns):
            rows.writerows(
                (one.where, candidate, subcarrier, turn, symbols, turned.shape[0])
                for subcarrier, turn, symbols in zip(
                    one.sequences.indices, turns, listed, strict=True
                )
                if symbols
            )
    return text.getvalue()


def _runs(numbers: NDArray[np.intp]) -> str:
    """Return rising numbers as runs, as a recipe lists them: ``0..2, 4``."""
    pieces = np.split(numbers, np.flatnonzero(np.diff(numbers) > 1) + 1) if numbers.size else []
    return ", ".join(f"{one[0]}" if one.size == 1 else f"{one[0]}..{one[-1]}" for one in pieces)


def side_names(name: str) -> tuple[str, str]:
    """Return the names of the two tables beside a stimulus."""
    return f"{name}{CHOICES}", f"{name}{SEQUENCES}"


def side_tables(choices: Sequence[Choices]) -> tuple[str, str]:
    """Return the texts of the two tables."""
    return choices_text(choices), sequences_text(choices)


def side_rows(texts: Mapping[str, str]) -> list[dict[str, Any]] | None:
    """Return what a sidecar says of the tables, by name; None where there are none."""
    rows = [
        {"name": name, "is": what, "sha512": hashlib.sha512(text.encode()).hexdigest()}
        for (name, text), what in zip(texts.items(), (CHOICES_ARE, SEQUENCES_ARE), strict=False)
    ]
    return rows or None
