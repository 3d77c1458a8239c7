"""A finite filter: a band by its edges, or taps as they are."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from numbers import Real
from pathlib import Path
from typing import Annotated, ClassVar, Self

import numpy as np
from annotated_types import Ge, Gt, Le
from numpy.typing import NDArray

from wavegen.core.errors import FileError
from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.core.units import QuantityError, format_hz
from wavegen.dsp.overlap_save import Filtered
from wavegen.dsp.pilot import power_gain
from wavegen.dsp.windows import STOPBAND_DB, design_bandpass, design_lowpass, kaiser_transition
from wavegen.laws.law import Law
from wavegen.laws.operations import filtered_law, filtered_term
from wavegen.laws.term import NoLaw, Term
from wavegen.stages.linear import SILENT_DB, tell_power

Filter_ = NDArray[np.float64] | NDArray[np.complex128]

MOST_TAPS = 1 << 16
LARGEST_FILE_BYTES = 1 << 22
LONGEST_HALF_LENGTH = 125_000
"""Longest designed filter, taps each side of its middle: transforms of 2^19 then."""
DEFAULT_TRANSITION = Fraction(1, 20)
"""Width of each edge over the width of the band where it is not given."""


@dataclass(frozen=True, slots=True)
class FilterTaps:
    """Taps of a filter, listed or in a file.

    Parameters
    ----------
    values : tuple of complex
        In the order of time, the first at lag zero; empty where they are in a file.
    path : str, optional
        Text file, relative to the recipe: one tap a line, its real part alone or real and
        imaginary part; ``#`` begins a comment.
    """

    example: ClassVar[str] = "[0.25, 0.5, 0.25]"
    values: tuple[complex, ...] = ()
    path: str | None = None

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read a list of numbers or pairs ``[re, im]``, or the name of a file.

        Parameters
        ----------
        value : object
            Text or list as YAML gives it.

        Returns
        -------
        FilterTaps

        Raises
        ------
        QuantityError
            Neither, no taps, more than 65536, or taps that are all zero.

        Examples
        --------
        >>> FilterTaps.parse([1, [0, -0.5]]).values
        ((1+0j), -0.5j)
        """
        if isinstance(value, str) and value.strip():
            return cls(path=value)
        if not isinstance(value, list | tuple):
            raise _refuse_taps(problem=f"{str(value)[:40]!r} is no list of taps")
        taps = []
        for number, item in enumerate(value):
            pair = item if isinstance(item, list | tuple) else (item, 0)
            if len(pair) != 2 or not all(_is_number(part) for part in pair):
                raise _refuse_taps(problem=f"tap {number} is {str(item)[:40]}", key=f"[{number}]")
            taps.append(complex(float(pair[0]), float(pair[1])))
        if not 1 <= len(taps) <= MOST_TAPS or not any(taps):
            raise _refuse_taps(problem=f"{len(taps)} taps, none above zero" if taps else "no taps")
        return cls(values=tuple(taps))

    @classmethod
    def json_schema(cls) -> dict[str, object]:
        """Return the JSON Schema of what :meth:`parse` reads."""
        pair = {"type": "array", "items": {"type": "number"}, "minItems": 2, "maxItems": 2}
        listed = {
            "type": "array",
            "items": {"anyOf": [{"type": "number"}, pair]},
            "minItems": 1,
            "maxItems": MOST_TAPS,
        }
        named = {"type": "string", "minLength": 1}
        return {"anyOf": [listed, named], "examples": [[0.25, 0.5, 0.25], "taps.txt"]}

    def text(self) -> object:
        """Return the value as a recipe writes it."""
        if self.path is not None:
            return self.path
        if not any(tap.imag for tap in self.values):
            return [tap.real for tap in self.values]
        return [[tap.real, tap.imag] for tap in self.values]

    def read(self, folder: Path) -> tuple[complex, ...]:
        """Return the taps, from their file if they are in one.

        Parameters
        ----------
        folder : Path
            What the path is relative to.

        Raises
        ------
        FileError
            The file is not there, too large, or holds something else than taps.
        """
        if self.path is None:
            return self.values
        path = folder / self.path
        try:
            with path.open("rb") as file:
                data = file.read(LARGEST_FILE_BYTES + 1)
        except (OSError, ValueError) as error:
            reason = getattr(error, "strerror", None) or error
            raise _refuse_file(path, f"cannot be read ({reason})") from error
        if len(data) > LARGEST_FILE_BYTES:
            raise _refuse_file(path, f"is larger than {LARGEST_FILE_BYTES >> 20} MB")
        taps = []
        for number, line in enumerate(data.decode("utf-8", "replace").splitlines(), 1):
            words = line.partition("#")[0].replace(",", " ").split()
            if words:
                taps.append(_tap(path, number, words))
        if not 1 <= len(taps) <= MOST_TAPS or not any(taps):
            raise _refuse_file(path, f"holds {len(taps)} taps" + ", all zero" * bool(taps))
        return tuple(taps)


def _is_number(value: object) -> bool:
    if isinstance(value, bool) or not isinstance(value, Real):
        return False
    try:
        return math.isfinite(float(value)) and abs(float(value)) <= 1e9
    except OverflowError:
        return False


def _tap(path: Path, number: int, words: list[str]) -> complex:
    try:
        parts = [float(word) for word in words]
    except ValueError:
        parts = []
    if len(parts) not in {1, 2} or not all(_is_number(part) for part in parts):
        raise _refuse_file(path, f"line {number} is no tap: {' '.join(words)[:40]!r}")
    return complex(parts[0], parts[1] if len(parts) == 2 else 0.0)


def _refuse_taps(*, problem: str, key: str = "") -> QuantityError:
    return QuantityError(
        problem=problem,
        allowed=f"1 to {MOST_TAPS} numbers or pairs [re, im] up to 1e9, not all zero, or a file",
        remedy="Write them like [0.25, 0.5, 0.25], or name a text file of one tap a line.",
        key=key,
    )


def _refuse_file(path: Path, problem: str) -> FileError:
    return FileError(
        where=str(path),
        problem=problem,
        allowed=f"1 to {MOST_TAPS} taps, not all zero, one a line: real part, or real and "
        "imaginary part",
        remedy="Correct the file, or list the taps in the recipe.",
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Filter:
    """Settings of a filter: a band, or taps.

    Parameters
    ----------
    bandwidth_hz : Fraction, optional
        Full width of a lowpass, between its half-amplitude (-6 dB) points, Hz.
    low_hz, high_hz : Fraction, optional
        Half-amplitude points of a bandpass, Hz from the centre, perhaps negative.
    transition_hz : Fraction, optional
        Width of each edge of the band, from flat to rejected, half of it outside, Hz; a
        twentieth of the band if not given.
    stopband_db : float
        Rejection beyond the edges, dB, 30 to 120; the passband ripples by as much.
    taps : FilterTaps, optional
        Instead of a band: ``y[n] = sum_k taps[k] x[n - k]``, as given, delay included.
    keep_mean : bool
        Whether the output is scaled to the mean power of the input, as far as a look at the
        signal tells it (exact for loops up to 2^16 samples).

    Notes
    -----
    Bands have no delay (their taps are symmetric about lag zero); design: J. F. Kaiser, 1974.
    The change of mean power is told in a note, and undone only if asked.
    """

    bandwidth_hz: Annotated[Fraction, Gt(0)] | None = None
    low_hz: Fraction | None = None
    high_hz: Fraction | None = None
    transition_hz: Annotated[Fraction, Gt(0)] | None = None
    stopband_db: Annotated[float, Ge(30), Le(120)] = STOPBAND_DB
    taps: FilterTaps | None = None
    keep_mean: bool = False

    def __post_init__(self) -> None:
        """Refuse anything but one of the three forms."""
        is_low, is_high = self.low_hz is not None, self.high_hz is not None
        n_forms = (self.bandwidth_hz is not None) + (is_low or is_high) + (self.taps is not None)
        if n_forms != 1 or is_low != is_high:
            raise QuantityError(
                problem="it is not said which filter it is",
                allowed="bandwidth, or low with high, or taps",
                remedy="Write it like bandwidth: 5 MHz, or low: -2 MHz, high: 6 MHz.",
            )
        if self.taps is not None and self.transition_hz is not None:
            raise QuantityError(
                problem="taps have no transition to set",
                allowed="transition beside a band",
                remedy="Remove it.",
                key="transition",
            )
        if self.low_hz is not None and self.high_hz is not None and self.low_hz >= self.high_hz:
            raise QuantityError(
                problem=f"{format_hz(self.high_hz)} is not above {format_hz(self.low_hz)}",
                allowed="high above low",
                remedy="Exchange them.",
                key="high",
            )

    def build(self, site: Site, source: Signal) -> Signal:
        """Return the filtered signal.

        Parameters
        ----------
        site : Site
            Where it is built. Told what the filter leaves of the mean power, which is found
            on some of the signal.
        source : Signal
            What is filtered.

        Returns
        -------
        Signal
            Its mean power is that of ``source`` if that is kept, else None: to be measured.
            ``source`` itself where the only tap is 1.

        Raises
        ------
        RecipeError
            The band with its edges does not fit into the sample rate, an edge too steep, or
            nothing left whose mean could be kept.
        FileError
            As raised by :meth:`FilterTaps.read`.
        """
        lag = 0
        taps: Filter_
        if self.taps is None:
            taps = self._design(site, source.sample_rate_hz)
        else:
            given = np.array(self.taps.read(site.folder))
            if given.tolist() == [1]:
                return source
            lag = given.size // 2
            taps = np.append(given, np.zeros(1 - given.size % 2))
            taps = taps if taps.imag.any() else taps.real
        gain = power_gain(source, taps)
        tell_power(site, source, gain, is_undone=self.keep_mean)
        if not self.keep_mean:
            return Filtered.of(source, taps, lag=lag)
        if gain is None or gain < 10 ** (SILENT_DB / 10):
            raise site.error(
                key="keep_mean",
                problem="next to nothing is left behind the filter",
                allowed="a signal with power in the band",
                remedy="Correct the band.",
            )
        return Filtered.of(source, taps * gain**-0.5, lag=lag, mean_power=source.mean_power)

    def law(self, site: Site, source: Law) -> Law | NoLaw:
        """Return the law behind the filter: only complex Gaussian signals keep theirs."""
        return filtered_law(source)

    def term(self, site: Site, source: Term) -> Term | NoLaw:
        """Return the filtered part of a composite; its power must be known."""
        if not self.keep_mean:
            return NoLaw(reason=f"{source.name}, filtered, has a power that is not known")
        return filtered_term(source)

    def _design(self, site: Site, rate: Fraction) -> Filter_:
        if self.bandwidth_hz is not None:
            low, high = -self.bandwidth_hz / 2, self.bandwidth_hz / 2
        else:
            low, high = self.low_hz or Fraction(0), self.high_hz or Fraction(0)
        width = high - low
        transition = self.transition_hz or width * DEFAULT_TRANSITION
        key = "low" if self.bandwidth_hz is None else "bandwidth"
        if transition > width:
            raise site.error(
                key="transition",
                problem=f"edges of {format_hz(transition)} leave nothing flat of a band of "
                f"{format_hz(width)}",
                allowed=f"up to {format_hz(width)}",
                remedy="Narrow the transition.",
            )
        outer = max(high, -low) + transition / 2
        if outer > rate / 2:
            raise site.error(
                key=key if self.bandwidth_hz is not None or -low > high else "high",
                problem=f"the band with its edges reaches {format_hz(outer)} from the centre",
                allowed=f"up to {format_hz(rate / 2)}, half the sample rate",
                remedy="Narrow the band or its transition.",
            )
        narrowest = float(rate) * kaiser_transition(
            half_length=LONGEST_HALF_LENGTH, stopband_db=self.stopband_db + 1
        )
        if transition < narrowest:
            raise site.error(
                key=key if self.transition_hz is None else "transition",
                problem=f"edges of {format_hz(transition)} at {format_hz(rate)} need more than "
                f"{LONGEST_HALF_LENGTH} taps each side",
                allowed=f"edges from {format_hz(narrowest)} on",
                remedy="Widen the transition.",
            )
        flat, reach = float((width - transition) / rate), float((width + transition) / rate)
        centre = float((low + high) / 2 / rate)
        if not centre:
            return design_lowpass(
                passband_edge=flat / 2, stopband_edge=reach / 2, stopband_db=self.stopband_db
            )
        return design_bandpass(
            centre=centre,
            passband_width=flat,
            stopband_width=reach,
            stopband_db=self.stopband_db,
        )
