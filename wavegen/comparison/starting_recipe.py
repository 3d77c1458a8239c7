"""Recipes to start from, for a curve that looks like a familiar law."""

from __future__ import annotations

from wavegen.comparison.familiar import (
    CarrierPlusNoise,
    EqualTones,
    GaussianWithCeiling,
    ShapedCarrier,
)
from wavegen.comparison.look_alike import LookAlike
from wavegen.core.units import DIMENSIONS
from wavegen.recipe.exact import write_quantity

GUESSED_WIDTH_HZ = 1e6
_ROOM = 4
_LENGTH = 20_000
"""Inverse bandwidths in the loop: a level at 0.1 % is exceeded some twenty times."""
_GATES = 10


def starting_recipe(found: LookAlike, *, width_hz: float | None) -> str:
    """Return a recipe that makes a signal of a law, as YAML.

    Parameters
    ----------
    found : LookAlike
        The law and its number.
    width_hz : float or None
        Occupied bandwidth of the curve's signal, Hz; 1 MHz stands in where it is not known.

    Returns
    -------
    str
        A whole recipe at four times the width, 20 000 inverse widths long; its data, and the
        period of a gate (ten in the loop), are guesses.
    """
    width = float(f"{width_hz or GUESSED_WIDTH_HZ:.3g}")
    signal, stages = _parts(found, width)
    length_s = float(f"{_LENGTH / width:.1g}")
    if found.duty < 1:
        period = _s(length_s / _GATES)
        stages.append(f"{{kind: gate, duty: {100 * found.duty:.3g} %, period: {period}}}")
    lines = [
        "wavegen: 1",
        f"sample_rate: {_hz(_ROOM * width)}",
        f"duration: {_s(length_s)}",
        "signal:",
        *(f"  {line}" for line in signal),
    ]
    lines += ["stages:", *(f"  - {stage}" for stage in stages)] if stages else []
    return "\n".join(lines) + "\n"


def _parts(found: LookAlike, width: float) -> tuple[list[str], list[str]]:
    """Return the lines of the source, and the stages."""
    family, value = found.family, found.value
    noise = f"{{kind: noise, bandwidth: {_hz(width)}}}"
    if isinstance(family, CarrierPlusNoise):
        second = [f"  - level: {-value:.2f} dB", f"    signal: {noise}"]
        return ["kind: sum", "parts:", "  - signal: {kind: carrier}", *second], []
    if isinstance(family, ShapedCarrier):
        return [
            "kind: single_carrier",
            f"constellation: {family.constellation}",
            f"symbol_rate: {_hz(float(f'{width / (1 + value / 2):.3g}'))}",
            f"pulse: {{kind: root_raised_cosine, roll_off: {value:.2f}}}",
        ], []
    if isinstance(family, EqualTones) and value == 1:
        return ["kind: carrier"], []
    if isinstance(family, EqualTones):
        spacing = _hz(float(f"{width / value:.2g}"))
        return ["kind: tones", f"count: {value:.0f}", f"spacing: {spacing}", "phases: random"], []
    stages = []
    if isinstance(family, GaussianWithCeiling):
        stages = [f"{{kind: clip, ceiling: {value:.2f} dB}}"]
    return ["kind: noise", f"bandwidth: {_hz(width)}"], stages


def _hz(value: float) -> str:
    """Write a frequency as a recipe does."""
    return write_quantity(float(f"{value:.6g}"), DIMENSIONS["_hz"])


def _s(value: float) -> str:
    """Write a time as a recipe does."""
    return write_quantity(float(f"{value:.6g}"), DIMENSIONS["_s"])
