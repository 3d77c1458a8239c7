"""What a shaped stimulus is made from: a recipe, and the curve and spectrum that it follows."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from wavegen.comparison.curves import PointsCurve
from wavegen.comparison.side import Side
from wavegen.comparison.spectra import SideSpectrum
from wavegen.core.units import DIMENSIONS
from wavegen.recipe.exact import write_quantity

_POINTS = 1500
_HIGHEST = 0.9999
_STEP_DB = 1e-3


@dataclass(frozen=True, slots=True, kw_only=True)
class RegularGate:
    """The on-times of the field, made regular.

    Parameters
    ----------
    period_samples, on_samples : int
        It repeats after so many, and is on for so many of them, ramps included.
    ramp_samples : int
        Length of each ramp.
    """

    period_samples: int
    on_samples: int
    ramp_samples: int


def curve_text(side: Side, n_samples: int) -> str:
    """Return the curve to follow: rising levels, down to the rarest that either side holds."""
    own = side.n_samples or n_samples
    rarest = 1 / max(own, 2)
    if isinstance(side.curve, PointsCurve):
        level, share = side.curve.levels, side.curve.probabilities
        kept = (share > 0) & (share < 1)
        level, share = level[kept], share[kept]
    else:
        low = 1 - np.geomspace(1 - _HIGHEST, 0.5, _POINTS // 3)
        share = np.concatenate([low, np.geomspace(0.5, rarest, _POINTS)[1:]])
        level = np.asarray(side.curve.level_db(share), np.float64)
    rows = [f"# n_samples: {own}", "level_db,ccdf"]
    last = -math.inf
    for at, probability in zip(level, share, strict=True):
        if np.isfinite(at) and at > last + 1e-6:
            rows.append(f"{at:.6f},{probability:.10g}")
            last = at
    if len(rows) == 3:  # a constant envelope: all of the time below its level, none above
        rows[2:] = [f"{last - _STEP_DB:.6f},1", f"{last:.6f},0"]
    return "\n".join(rows) + "\n"


def spectrum_text(found: SideSpectrum) -> str:
    """Return a density to follow, over all of the band that was sampled."""
    spectrum = found.spectrum
    # the band repeats after the sample rate: its lower end stands at the upper one too
    places = [*spectrum.frequencies_hz, spectrum.sample_rate_hz / 2]
    level = [*spectrum.dbc_per_hz, spectrum.dbc_per_hz[0]]
    rows = ["# density over the total power, dBc/Hz", "frequency_hz,density_db"]
    rows += [f"{place:.3f},{value:.4f}" for place, value in zip(places, level, strict=True)]
    return "\n".join(rows) + "\n"


def recipe_text(
    *,
    name: str,
    title: str,
    seed: int,
    bandwidth_hz: Fraction | None,
    rate_hz: Fraction,
    n_samples: int,
    gate: RegularGate | None,
) -> str:
    """Return a recipe that follows ``NAME.curve.csv``, and ``NAME.spectrum.csv`` or a bandwidth."""
    lines = [
        "wavegen: 1",
        f"title: {_quoted(title)}",
        "# The spectrum and the power statistics of a field signal, none of its content.",
        f"seed: {seed}",
        f"sample_rate: {write_quantity(rate_hz, DIMENSIONS['_hz'])}",
        f"duration: {n_samples} samples",
        "signal:",
        "  kind: shaped",
        f"  curve: {name}.curve.csv",
    ]
    if bandwidth_hz is not None:
        lines.append(f"  bandwidth: {write_quantity(bandwidth_hz, DIMENSIONS['_hz'])}")
    else:
        lines.append(f"  spectrum: {name}.spectrum.csv")
    if gate is not None:
        duty = Fraction(100 * gate.on_samples, gate.period_samples)
        period, ramp = gate.period_samples, gate.ramp_samples
        first, stop = ramp, gate.on_samples - ramp
        lines.append(
            f"  within: {{period: {period} samples, first: {first} samples, stop: {stop} samples}}"
        )
        lines.append("stages:")
        lines.append(
            f"  - {{kind: gate, duty: {duty} %, period: {period} samples, ramp: {ramp} samples}}"
        )
    return "\n".join(lines) + "\n"


def _quoted(text: str) -> str:
    inside = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + "".join(c for c in inside if c.isprintable()) + '"'
