"""What a side of a comparison is, and what is known of it."""

from __future__ import annotations

from dataclasses import dataclass

from wavegen.comparison.curves import Curve
from wavegen.core.signal import Signal
from wavegen.dsp.bursts import Bursts
from wavegen.files.format import ReadHints
from wavegen.production.measure_settings import GateSettings
from wavegen.production.subject_files import WHOLE_FILE, FilePart

LOOP, RECORDING = "this loop", "a recording"
LAW, GENERATED = "the law of a recipe", "the loop that a recipe makes"
SIDECAR, POINTS = "a sidecar", "a CCDF curve by its points"
CURVE_FORMAT = "curve"
"""Format by which a table without headings is read as a curve."""


@dataclass(frozen=True, slots=True, kw_only=True)
class SideSettings:
    """What one side is, and how it is read.

    Parameters
    ----------
    subject : str
        A data file, a folder or sidecar of a stimulus, a curve in CSV, or a recipe.
    is_recipe : bool
        Whether it means a recipe, by file or name.
    hints : ReadHints
        How a file without a header is read; the reference level too.
    part : FilePart
        Which part of a data file, and whether it repeats.
    gate : GateSettings or None
        If given, the on-time alone is compared.
    removes_offset : bool
        Whether a DC offset is taken off first.
    overrides : tuple of str
        Of a recipe.
    curve_samples : int or None
        Samples that a curve by points was measured on, where its file does not say.
    reading_db : float
        Half-width of what its levels may be off by reading, dB.
    """

    subject: str
    is_recipe: bool = False
    hints: ReadHints = ReadHints()  # noqa: RUF009 - frozen
    part: FilePart = WHOLE_FILE
    gate: GateSettings | None = None
    removes_offset: bool = False
    overrides: tuple[str, ...] = ()
    curve_samples: int | None = None
    reading_db: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Side:
    """One side, as far as it is known.

    Parameters
    ----------
    name : str
        What it is called.
    is_ : str
        What it is, in words.
    curve : Curve
        Levels over its mean.
    scale_curve : Curve or None
        Levels on ``scale``; None where its mean is not known.
    mean_db, mean_low_db, mean_high_db : float or None
        Mean power on ``scale`` and between what that of the process lies.
    peak_db : float or None
        Peak between samples on ``scale``, else that at the samples.
    scale : {"dBm", "dBFS"}
        dBm where the power at full scale is known.
    sample_rate_hz : float or None
        Of its samples.
    n_samples : int or None
        How many were measured.
    duty : float or None
        Share of time that was measured, of a gated side.
    signal : Signal or None
        Its samples, less an offset that was taken off; None where there are none.
    loops : bool
        Whether they repeat.
    is_power : bool
        Whether they have no phase.
    bursts : Bursts or None
        The on-time that was measured.
    fault_db : float
        By how much fill words, which are no part of any signal, lift the mean.
    warnings : tuple of str
        What is doubtful.
    """

    name: str
    is_: str
    curve: Curve
    scale_curve: Curve | None = None
    mean_db: float | None = None
    mean_low_db: float | None = None
    mean_high_db: float | None = None
    peak_db: float | None = None
    scale: str = "dBFS"
    sample_rate_hz: float | None = None
    n_samples: int | None = None
    duty: float | None = None
    signal: Signal | None = None
    loops: bool = False
    is_power: bool = False
    bursts: Bursts | None = None
    fault_db: float = 0.0
    warnings: tuple[str, ...] = ()
