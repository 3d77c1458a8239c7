"""A field recording as a source: cut where it fits best, closed by a cross-fade."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated

import numpy as np
import scipy.special
from annotated_types import Ge, Gt, Le
from numpy.typing import NDArray

from wavegen.core.errors import ArgumentsError, FileError
from wavegen.core.excerpt import Excerpt
from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.site import Cycle, Note, Site
from wavegen.core.units import format_hz, format_s
from wavegen.files.analytic import as_complex
from wavegen.files.format import ReadHints
from wavegen.files.format import Recording as OpenedFile
from wavegen.files.read import open_recording
from wavegen.laws.term import NoLaw
from wavegen.sources.recording_seam import (
    SpectrumChange,
    counted,
    largest_change,
    spectrum_change,
    strips,
)

_SMOOTH = 8.0
SHORTEST_FADE = 24_576
"""Samples, unless the loop is so short that a quarter of it is less: a shorter fade would be heard
beside the band at the seam."""
MOST_PLACES = 1 << 20
"""Places for the cut that are compared: the first so many, where there are more."""


@dataclass(frozen=True, eq=False, kw_only=True)
class CrossFaded(Signal):
    """A stretch of a recording as a loop: its end fades into what led up to its start.

    Parameters
    ----------
    fade_samples : int
        Length of the fade, at the end of the loop.
    likeness : float
        Correlation of the two, 0 to 1: the weights keep the expected power.
    offset : complex
        Subtracted.
    gain : float
        Applied after that.

    Notes
    -----
    Inputs are the stretch, and the ``fade_samples`` before it. Two parts with the correlation c
    and weights ``cos a``, ``sin a`` have the power ``1 + c sin 2a``, by whose root is divided. The
    angle grows as the incomplete beta function: seven derivatives vanish at the ends, so that the
    fade spreads no spectrum beyond about ten over its length.
    """

    fade_samples: int
    likeness: float
    offset: complex = 0j
    gain: float = 1.0

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the stretch, and of the lead what is faded in."""
        first = self.n_samples - self.fade_samples
        low = min(max(start - first, 0), self.fade_samples - 1)
        return ((start, stop), (low, max(stop - first, low + 1)))

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return samples ``[start, stop)``."""
        body, lead = arrays
        out = body.copy()
        first = self.n_samples - self.fade_samples
        low = max(start, first)
        if stop > low:
            place = np.arange(low - first, stop - first)
            part = scipy.special.betainc(_SMOOTH, _SMOOTH, (place + 0.5) / self.fade_samples)
            angle = np.pi / 2 * part
            scale = 1 / np.sqrt(1 + self.likeness * np.sin(2 * angle))
            tail = out[low - start :]
            tail *= (np.cos(angle) * scale).astype(np.float32)
            tail += lead[: tail.size] * (np.sin(angle) * scale).astype(np.float32)
        if self.offset:
            out -= np.complex64(self.offset)
        if self.gain != 1.0:
            out *= np.float32(self.gain)
        return out


@dataclass(frozen=True, slots=True, kw_only=True)
class Recording:
    """Settings of a recording as a source, at the rate at which it was made.

    Parameters
    ----------
    path : str
        The file, relative to the recipe; any format that is read.
    from_s, to_s : Fraction
        The part of it that may be used, s; all of it if not given.
    cross_fade_s : Fraction, optional
        Length of the fade that closes the loop, s; if not given a hundredth of the loop, or 24576
        samples if that is more, but a quarter of it at most.
    remove_dc : bool
        Whether the mean of the samples is taken away.
    format : str, optional
        Of files without a header: a datatype such as ``ci16_le``.
    sample_rate_hz : Fraction, optional
        Of files without a header, Hz.
    channel : int
        Which of several channels.

    Notes
    -----
    The loop is as long as the recipe says. It is cut where the samples before its start and
    before its end differ least over the length of the fade. A recipe at another rate brings it
    there by ``stages: [{kind: resample, input_rate: ...}]``.
    """

    path: str
    from_s: Annotated[Fraction, Ge(0)] = Fraction(0)
    to_s: Annotated[Fraction, Gt(0)] | None = None
    cross_fade_s: Annotated[Fraction, Gt(0)] | None = None
    remove_dc: bool = False
    format: str | None = None
    sample_rate_hz: Annotated[Fraction, Gt(0)] | None = None
    channel: Annotated[int, Ge(0), Le(63)] = 0

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return one sample: the loop is cut to the length asked for."""
        return Cycle(n_samples=1)

    def build(self, site: Site) -> Signal:
        """Return the signal; unit mean power.

        Raises
        ------
        RecipeError
            A file that cannot be read or has another rate, a part too short for the loop and its
            fade, or one without power.
        """
        source = self._open(site)
        first, stop = self._part(site, source)
        n, fade = site.n_samples, self._fade_samples(site)
        if n + fade > stop - first:
            raise site.error(
                key="to" if self.to_s is not None else "path",
                problem=f"{stop - first} samples of it may be used, the loop and its cross-fade "
                f"take {n} and {fade}",
                allowed=f"a loop of up to {max(stop - first - fade, 0)} samples, "
                f"{format_s(Fraction(max(stop - first - fade, 0)) / site.sample_rate_hz)}",
                remedy="Shorten the duration or the cross-fade, or use more of the recording.",
            )
        start, likeness = best_cut(source, first, stop, n, fade)
        loop = CrossFaded(
            sample_rate_hz=site.sample_rate_hz,
            n_samples=n,
            inputs=(_stretch(source, start, n), _stretch(source, start - fade, fade)),
            mean_power=1.0,
            fade_samples=fade,
            likeness=max(likeness, 0.0),
        )
        return self._levelled(site, loop, start, likeness)

    def law(self, site: Site) -> NoLaw:
        """Return that a recording has none."""
        return NoLaw(reason=f"a recording has no law: {self.path}")

    def term(self, site: Site) -> NoLaw:
        """Return that a recording has none."""
        return self.law(site)

    def _open(self, site: Site) -> Signal:
        hints = ReadHints(
            format=self.format,
            sample_rate_hz=self.sample_rate_hz,
            channel=self.channel or None,
        )
        try:
            opened: OpenedFile = as_complex(open_recording(site.folder / self.path, hints))
        except (FileError, ArgumentsError) as error:
            raise site.error(
                key="path",
                problem=f"{error.where}: {error.problem}",
                allowed=error.allowed,
                remedy=error.remedy.replace("--format", "format").replace(
                    "--sample-rate", "sample_rate"
                ),
            ) from error
        if opened.is_power:
            raise site.error(
                key="path",
                problem="holds power against time, which has no phase",
                allowed="recordings of samples",
                remedy="Record samples, or make a `shaped` stimulus from its CCDF.",
            )
        if opened.sample_rate_hz != site.sample_rate_hz:
            own = format_hz(opened.sample_rate_hz)
            raise site.error(
                key="path",
                problem=f"was recorded at {own}, the recipe runs at "
                f"{format_hz(site.sample_rate_hz)} here",
                allowed="the rate of the recording",
                remedy=f"Add to its stages: {{kind: resample, input_rate: {own}}}",
            )
        return opened.signal

    def _part(self, site: Site, source: Signal) -> Range:
        rate, n = site.sample_rate_hz, source.n_samples
        first = round(self.from_s * rate)
        stop = n if self.to_s is None else round(self.to_s * rate)
        if not first < stop <= n:
            raise site.error(
                key="from" if first >= n or self.to_s is None else "to",
                problem=f"asks for {format_s(self.from_s)} to {format_s(Fraction(stop) / rate)}",
                allowed=f"a part of its {format_s(Fraction(n) / rate)}",
                remedy="Correct from and to.",
            )
        return first, stop

    def _fade_samples(self, site: Site) -> int:
        if self.cross_fade_s is None:
            shortest = min(SHORTEST_FADE, site.n_samples // 4)
            return max(site.n_samples // 100, shortest, 1)
        fade = max(round(self.cross_fade_s * site.sample_rate_hz), 1)
        if fade > site.n_samples // 2:
            raise site.error(
                key="cross_fade",
                problem=f"{format_s(self.cross_fade_s)} is more than half of the loop",
                allowed=f"up to {format_s(Fraction(site.n_samples // 2) / site.sample_rate_hz)}",
                remedy="Shorten the cross-fade or lengthen the loop.",
            )
        return fade

    def _levelled(self, site: Site, loop: CrossFaded, start: int, likeness: float) -> Signal:
        """Bring a loop to unit mean power, and say what the fade did to it."""
        plain, _, _ = counted(loop.inputs[0])
        closed, mean, total = counted(loop)
        offset = total / loop.n_samples if self.remove_dc else 0j
        power = mean - abs(offset) ** 2
        if not power > 0:
            raise site.error(
                key="path",
                problem="is silent in that part",
                allowed="a part with some power",
                remedy="Use another part of it.",
            )
        change, at = largest_change(plain, closed)
        rate = site.sample_rate_hz
        text = (
            f"Cut at {format_s(Fraction(start) / rate)}; the last "
            f"{format_s(Fraction(loop.fade_samples) / rate)} fade into what led up to the start "
            f"(likeness {likeness:.2f}). Levels of the CCDF move by up to {change:.3f} dB"
            + (f" (at {100 * at:g} %)." if change else ".")
            + _spectrum_words(spectrum_change(loop.inputs[0], loop))
        )
        site.notes.append(Note(kind="info", where=site.path, text=text))
        return CrossFaded(
            sample_rate_hz=loop.sample_rate_hz,
            n_samples=loop.n_samples,
            inputs=loop.inputs,
            mean_power=1.0,
            fade_samples=loop.fade_samples,
            likeness=loop.likeness,
            offset=complex(offset),
            gain=1 / math.sqrt(power),
        )


def _spectrum_words(change: SpectrumChange | None) -> str:
    if change is None:
        return " It is too short to tell what becomes of its spectrum."
    text = f" Its spectrum moves by up to {change.largest_db:.2f} dB in a fortieth of its band"
    if change.beside_dbc is None:
        return f"{text}."
    before, after = change.beside_dbc
    return f"{text}; beside it {before:.1f} dBc become {after:.1f} dBc."


def _stretch(source: Signal, first: int, count: int) -> Signal:
    return Excerpt(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=count,
        inputs=(source,),
        mean_power=None,
        first=first,
    )


def best_cut(source: Signal, first: int, stop: int, n: int, fade: int) -> tuple[int, float]:
    """Return where a loop of ``n`` samples begins best, and how alike its ends are there.

    Parameters
    ----------
    source : Signal
        The recording.
    first, stop : int
        The part that may be used; ``n + fade`` samples at least.
    n, fade : int
        Samples of the loop, and of the fade.

    Returns
    -------
    start : int
        First sample of the loop, ``first + fade`` at least.
    likeness : float
        Correlation of the ``fade`` samples before the start with those before the end, -1 to 1.

    Notes
    -----
    Of the first million places the one with the least mean squared difference over the power.
    """
    count = min(stop - first - n, MOST_PLACES + fade)
    early = np.concatenate(list(strips(source, first, first + count))).astype(np.complex128)
    late = np.concatenate(list(strips(source, first + n, first + n + count)))
    product = np.cumsum((early * late.conj()).real)
    power = np.cumsum(np.abs(early) ** 2 + np.abs(late) ** 2)
    common, total = _windows(product, fade), _windows(power, fade)
    likeness = np.divide(2 * common, total, out=np.zeros_like(common), where=total > 0)
    best = int(np.argmax(likeness))
    return first + fade + best, float(likeness[best])


def _windows(sums: NDArray[np.float64], length: int) -> NDArray[np.float64]:
    """Return sums over windows from running ones."""
    before = np.concatenate([[0.0], sums[: sums.size - length]])
    return np.asarray(sums[length - 1 :] - before)
