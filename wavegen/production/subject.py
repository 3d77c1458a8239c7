"""What is measured: samples, and what is known of them besides."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from wavegen.core.signal import Signal
from wavegen.dsp.bursts import Bursts
from wavegen.files.format import Annotation
from wavegen.laws.papr_symbol import LevelCrossing
from wavegen.recipe.bench import Bench
from wavegen.sources.ofdm_signal import Prefixed


@dataclass(frozen=True, slots=True, kw_only=True)
class SymbolPlan:
    """How the OFDM symbols of a loop are laid.

    Parameters
    ----------
    prefixed : Prefixed
        The source.
    law : LevelCrossing or None
        Of the PAPR per symbol, where there is one.
    """

    prefixed: Prefixed
    law: LevelCrossing | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Subject:
    """What is measured.

    Parameters
    ----------
    name : str
        What it is called.
    signal : Signal
        The samples, full scale 1.0.
    loops : bool
        A loop is read cyclically and its figures are exact; a recording is a sample of its
        process.
    cycle_samples : int or None
        Shortest loop, where known: then the seam is judged.
    reference_level_dbm : float or None
        Power at 0 dBFS, dBm, where known.
    reference_is : str
        Where that comes from.
    bench : Bench or None
        Of a recipe: gives the reference where nothing else does.
    is_power : bool
        The samples are power against time without a phase: then there is no peak between them.
    is_real : bool
        They are the analytic signal of real ones.
    code_scale : float or None
        Codes to full scale, of integers.
    is_described : bool
        A sidecar or a recipe says what it is: its faults are its intent.
    every_loop : str
        Name of a law that holds for every loop of its recipe; empty if there is none.
    bursts : Bursts or None
        When it is on, as its recipe says.
    annotations : tuple of Annotation
        Markers, on the axis of the signal.
    symbols : SymbolPlan or None
        Of OFDM whose symbols stand where its recipe laid them.
    warnings : tuple of str
        What is doubtful already.
    facts : mapping
        Further rows for the document, JSON values.
    """

    name: str
    signal: Signal
    loops: bool
    cycle_samples: int | None = None
    reference_level_dbm: float | None = None
    reference_is: str = "as told"
    bench: Bench | None = None
    is_power: bool = False
    is_real: bool = False
    code_scale: float | None = None
    is_described: bool = False
    every_loop: str = ""
    bursts: Bursts | None = None
    annotations: tuple[Annotation, ...] = ()
    symbols: SymbolPlan | None = None
    warnings: tuple[str, ...] = ()
    facts: Mapping[str, object] = field(default_factory=dict)
