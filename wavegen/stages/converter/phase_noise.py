"""Phase noise of an oscillator after a mask of its spectrum."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise
from typing import ClassVar, Self

import numpy as np
from numpy.typing import NDArray

from wavegen.core.signal import Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.core.units import (
    DIMENSIONS,
    QuantityError,
    format_hz,
    parse_quantity,
    quantity_pattern,
    split_quantity,
)
from wavegen.dsp.phase_noise import BLOCK_SAMPLES, phase_noise
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term

MOST_POINTS = 64
UNIT = "dBc/Hz"
LOWEST_DBC = -300.0
NEGLIGIBLE_RAD = 1e-8


@dataclass(frozen=True, slots=True)
class PhaseMask:
    """Single-sideband phase noise at some offsets, straight in dB over log frequency between.

    Parameters
    ----------
    points : tuple of (Fraction, Fraction)
        Offset, Hz, rising; level, dBc/Hz.
    """

    example: ClassVar[str] = "[[1 kHz, -90 dBc/Hz], [100 kHz, -110 dBc/Hz]]"
    points: tuple[tuple[Fraction, Fraction], ...]

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read pairs of an offset and a level: ``[[1 kHz, -90 dBc/Hz], [1 MHz, -120 dBc/Hz]]``.

        Raises
        ------
        QuantityError
            Not of that form, offsets that do not rise above 0, or levels outside -300 to 0.
        """
        if not isinstance(value, list | tuple) or not 1 <= len(value) <= MOST_POINTS:
            raise _refuse(problem=f"{str(value)[:40]!r} is no list of points")
        points: list[tuple[Fraction, Fraction]] = []
        for number, item in enumerate(value):
            if not isinstance(item, list | tuple) or len(item) != 2:
                raise _refuse(problem=f"point {number} is {str(item)[:40]}", key=f"[{number}]")
            offset = parse_quantity(str(item[0]), DIMENSIONS["_hz"])
            level, unit = split_quantity(str(item[1]))
            if unit != UNIT or not LOWEST_DBC <= level <= 0:
                raise _refuse(problem=f"the level of point {number} is {item[1]!s:.40}")
            if offset <= (points[-1][0] if points else 0):
                raise _refuse(problem=f"the offset of point {number} does not rise")
            points.append((offset, level))
        return cls(points=tuple(points))

    @classmethod
    def json_schema(cls) -> dict[str, object]:
        """Return the JSON Schema of what :meth:`parse` reads."""
        pair = {
            "type": "array",
            "prefixItems": [
                {"type": "string", "pattern": quantity_pattern(DIMENSIONS["_hz"].units)},
                {"type": "string", "pattern": quantity_pattern([UNIT])},
            ],
            "minItems": 2,
            "maxItems": 2,
        }
        return {
            "type": "array",
            "items": pair,
            "minItems": 1,
            "maxItems": MOST_POINTS,
            "examples": [[["1 kHz", "-90 dBc/Hz"], ["1 MHz", "-120 dBc/Hz"]]],
        }

    def text(self) -> object:
        """Return the value as a recipe writes it."""
        return [[f"{offset} Hz", f"{level} {UNIT}"] for offset, level in self.points]

    def density(self, offset_hz: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return ``10^(L/10)`` at offsets above 0, held beyond the first and last point, 1/Hz."""
        x = np.log10([float(offset) for offset, _ in self.points])
        y = [float(level) for _, level in self.points]
        level_db = np.interp(np.log10(offset_hz), x, y)
        return np.asarray(10 ** (level_db / 10))

    def phase_rad(self, low_hz: float, high_hz: float) -> float:
        """Return the RMS phase of both sidebands between two offsets, radians.

        Notes
        -----
        ``sqrt(2 int L df)``; each piece is a power law ``f^a`` with a closed integral.
        """
        inner = [float(offset) for offset, _ in self.points if low_hz < offset < high_hz]
        edges = np.array([low_hz, *inner, high_hz])
        ends = self.density(edges)
        total = 0.0
        for (f, g), (at_f, at_g) in zip(pairwise(edges), pairwise(ends), strict=True):
            slope = math.log(at_g / at_f) / math.log(g / f)
            is_inverse = abs(slope + 1) < 1e-9
            total += (
                at_f * f * math.log(g / f) if is_inverse else (at_g * g - at_f * f) / (slope + 1)
            )
        return math.sqrt(2 * total)


def _refuse(*, problem: str, key: str = "") -> QuantityError:
    return QuantityError(
        problem=problem,
        allowed=f"1 to {MOST_POINTS} pairs of an offset above 0, rising, and a level from "
        f"{LOWEST_DBC:g} to 0 {UNIT}",
        remedy=f"Write it like {PhaseMask.example}.",
        key=key,
    )


@dataclass(frozen=True, eq=False, kw_only=True)
class Turned(Signal):
    """A signal turned by the real parts of the inputs that follow it."""

    @property
    def acts_on(self) -> Signal:
        """The input that decides when it is on."""
        return self.inputs[0]

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Turn each sample."""
        out = np.empty(stop - start, np.complex64)
        for low in range(0, out.size, BLOCK_SAMPLES):
            part = slice(low, low + BLOCK_SAMPLES)
            i, q = arrays[0][part].real, arrays[0][part].imag
            phase = arrays[1][part].real.astype(np.float64)
            for other in arrays[2:]:
                phase += other[part].real
            cosine, sine = np.cos(phase), np.sin(phase)
            out.real[part] = i * cosine - q * sine
            out.imag[part] = i * sine + q * cosine
        return out


@dataclass(frozen=True, slots=True, kw_only=True)
class PhaseNoise:
    """Settings of phase noise by a mask.

    Parameters
    ----------
    mask : PhaseMask
        Pairs of an offset from the carrier and the single-sideband level there, dBc/Hz; straight
        in dB over the logarithm of the offset between them, held before the first and after the
        last.

    Notes
    -----
    The phase is Gaussian, from the seed by index, and closes at the seam: its spectrum stands on
    the loop's own grid, so that nothing of it is nearer to the carrier than one period of the
    loop (which is told). RMS phase ``sqrt(2 int L df)``; for small phases the sidebands are the
    mask (IEEE Std 1139). Phase leaves the envelope, and so its law, as it is.
    """

    mask: PhaseMask

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the signal with a noisy phase; each sample keeps its power.

        Parameters
        ----------
        site : Site
            Where it is built. Told the RMS phase on this loop.
        source : Signal
            What is turned.

        Returns
        -------
        Signal
            ``source`` itself where the phase is lost in float32, or for a loop of fewer than
            three samples.
        """
        rate, n = float(source.sample_rate_hz), source.n_samples
        lowest, highest = rate / n, rate / 2
        if n < 3:
            return source
        rms = self.mask.phase_rad(lowest / 2, highest)  # each line stands for its own width
        first = float(self.mask.points[0][0])
        text = f"RMS phase {math.degrees(rms):.4g} degrees from {format_hz(lowest)}"
        if first < lowest:
            lost = math.degrees(self.mask.phase_rad(first, lowest))
            text += f"; {lost:.4g} degrees of the mask are slower than the loop and left out"
        site.notes.append(Note(kind="info", where=f"{site.path}.mask", text=text))
        if rms < NEGLIGIBLE_RAD:
            return source
        place = site.path.rpartition(".")[2]
        slow, fast = phase_noise(
            self.mask.density,
            like=source,
            seed=site.seed,
            label=f"{site.label}, {place}, phase noise",
        )
        return Turned(
            sample_rate_hz=source.sample_rate_hz,
            n_samples=n,
            inputs=(source, slow) if fast is None else (source, slow, fast),
            mean_power=source.mean_power,
        )

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law of the input: the envelope stays."""
        return source

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return the part as it is where any turn leaves it so."""
        if source.symmetry:
            return NoLaw(reason=f"{source.name}, with phase noise, has no law beside others")
        return source
