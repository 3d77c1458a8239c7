"""What two sides tell of the device between them."""

from __future__ import annotations

from dataclasses import dataclass

from wavegen.comparison.alignment import Alignment, align
from wavegen.comparison.assumptions import Assumption, assumptions
from wavegen.comparison.curves import Curve
from wavegen.comparison.difference import Difference, compare
from wavegen.comparison.gain import (
    Compression,
    GainPoints,
    RappFit,
    SmallSignal,
    compression,
    fit_rapp,
    gain_points,
    small_signal,
)
from wavegen.comparison.needed_samples import Needed, needed_samples
from wavegen.comparison.side import Side
from wavegen.comparison.spectra import SpectrumDifference
from wavegen.core.errors import SignalError

FALLS_DB = (1.0, 3.0)
FEWEST_POINTS = 4


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DeviceGain:
    """What was found of a device.

    Parameters
    ----------
    source, output : Side
        Both sides.
    curves : (Curve, Curve)
        Their levels on the scales that are compared.
    means_db : (float, float)
        Mean powers on these scales.
    is_absolute : bool
        Whether both are in dBm, so that the gain is absolute.
    points : GainPoints
        The curve.
    small : SmallSignal
        Its gain at low levels.
    falls : tuple of Compression or None
        1 and 3 dB compression points.
    fit : RappFit or None
        A Rapp curve.
    linearity : Difference
        Of both curves over their own means.
    needed : tuple of Needed
        What would decide that, where it is undecided.
    spectra : SpectrumDifference or None
        Of both.
    alignment : Alignment or None
        Of both, where they are of one signal.
    """

    source: Side
    output: Side
    curves: tuple[Curve, Curve]
    means_db: tuple[float, float]
    is_absolute: bool
    points: GainPoints
    small: SmallSignal
    falls: tuple[Compression | None, ...]
    fit: RappFit | None
    linearity: Difference
    needed: tuple[Needed, ...]
    spectra: SpectrumDifference | None
    alignment: Alignment | None

    @property
    def assumptions(self) -> tuple[Assumption, ...]:
        """What the curve rests on."""
        return assumptions(
            (self.source, self.output),
            self.points,
            self.small,
            self.spectra,
            self.alignment,
            mean_db=self.means_db[0],
        )


def device_gain(
    sides: tuple[Side, Side],
    spectra: SpectrumDifference | None,
    *,
    tolerance_db: float,
    down_to: float,
) -> DeviceGain:
    """Return the gain curve of two sides.

    Parameters
    ----------
    sides : (Side, Side)
        Input and output.
    spectra : SpectrumDifference or None
        Of both.
    tolerance_db, down_to : float
        What a linear device is: as in :func:`wavegen.comparison.difference.compare`.

    Raises
    ------
    SignalError
        They resolve too few levels.
    """
    is_absolute = all(side.scale == "dBm" and side.mean_db is not None for side in sides)
    curves = _on_scale(sides[0]), _on_scale(sides[1])
    means = tuple(
        side.mean_db if side.scale_curve is not None and side.mean_db is not None else 0.0
        for side in sides
    )
    points = gain_points(*curves, mean_db=means[0])
    if points.input_db.size < FEWEST_POINTS:
        raise SignalError(
            where=f"{sides[0].name}, {sides[1].name}",
            problem=f"resolve {points.input_db.size} levels in common",
            allowed=f"{FEWEST_POINTS} levels or more, half a dB apart",
            remedy="Take longer records, levels that vary, or curves that reach further down.",
        )
    small = small_signal(points, mean_db=means[0])
    linearity = compare(sides[0].curve, sides[1].curve, tolerance_db=tolerance_db, down_to=down_to)
    return DeviceGain(
        source=sides[0],
        output=sides[1],
        curves=curves,
        means_db=(means[0], means[1]),
        is_absolute=is_absolute,
        points=points,
        small=small,
        falls=tuple(compression(points, small, fall_db=fall) for fall in FALLS_DB),
        fit=fit_rapp(points, small),
        linearity=linearity,
        needed=needed_samples(sides[0].curve, sides[1].curve, linearity),
        spectra=spectra,
        alignment=align(*sides),
    )


def _on_scale(side: Side) -> Curve:
    return side.curve if side.scale_curve is None else side.scale_curve
