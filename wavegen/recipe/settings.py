"""What a recipe says at its top level: the loop, the signal, the bench and the files."""

from __future__ import annotations

import re
from dataclasses import dataclass
from fractions import Fraction
from typing import Annotated, Any, ClassVar, Literal, Self

from annotated_types import Ge, Gt, Le, MinLen

from wavegen.core.registry import Member, nearest
from wavegen.core.units import DIMENSIONS, QuantityError, parse_quantity, split_quantity
from wavegen.meters.mask import SpectralMask
from wavegen.recipe.bench import Bench
from wavegen.recipe.exact import write_quantity
from wavegen.recipe.format_request import FormatRequest

Unit = Literal["seconds", "symbols", "samples", "periods"]

_SUFFIX: dict[Unit, str] = {"seconds": "_s", "symbols": "_symbols", "samples": "_samples"}
_PERIODS = re.compile(r"([1-9][0-9]{0,9})\s*PRBS periods?", re.IGNORECASE)
_EXAMPLES = "Write it like 10 ms, 140 symbols, 12288 samples or 2 PRBS periods."


@dataclass(frozen=True, slots=True, kw_only=True)
class Extent:
    """One stretch of time, exact, in the unit it was asked in.

    Parameters
    ----------
    value : Fraction
        Above zero; whole for symbols and samples.
    unit : {"seconds", "symbols", "samples", "periods"}
        What the value counts; periods are those of the data (a PRBS, a pattern, a file).
    """

    value: Fraction
    unit: Unit

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read ``10 ms``, ``140 symbols``, ``12288 samples`` or ``2 PRBS periods``.

        Raises
        ------
        QuantityError
            No such value, none above zero, or a part of a symbol or sample.
        """
        if not isinstance(value, str):
            raise QuantityError(
                problem=f"{value!r} has no unit"
                if isinstance(value, int | float) and not isinstance(value, bool)
                else f"{str(value)[:40]!r} is no duration",
                allowed="a time, symbols, samples or PRBS periods",
                remedy=_EXAMPLES,
            )
        periods = _PERIODS.fullmatch(value.strip())
        if periods:
            return cls(value=Fraction(periods[1]), unit="periods")
        try:
            number, word = split_quantity(value)
        except QuantityError as error:
            raise QuantityError(
                problem=error.problem,
                allowed="a time, symbols, samples or PRBS periods",
                remedy=_EXAMPLES,
            ) from error
        unit = next((u for u, suffix in _SUFFIX.items() if word in DIMENSIONS[suffix].units), None)
        if unit is None:
            known = [w for suffix in _SUFFIX.values() for w in DIMENSIONS[suffix].units]
            guess = {w.casefold(): w for w in known}.get(word.casefold()) or nearest(word, known)
            raise QuantityError(
                problem=f"{value!r} has the unknown unit {word!r}"
                if word
                else f"{value!r}: no unit",
                allowed="one of: " + ", ".join([*known, "PRBS periods"]),
                remedy=f"Did you mean {guess}?" if guess else _EXAMPLES,
            )
        number = parse_quantity(value, DIMENSIONS[_SUFFIX[unit]])
        if number <= 0 or (unit != "seconds" and number.denominator != 1):
            raise QuantityError(
                problem=f"{value!r} is not above zero"
                if number <= 0
                else f"{value!r} is not a whole number of {unit}",
                allowed="times above zero; whole symbols or samples from 1",
                remedy=_EXAMPLES,
            )
        return cls(value=number, unit=unit)

    def text(self) -> str:
        """Return the value as a recipe writes it."""
        if self.unit == "periods":
            return f"{self.value} PRBS period{'s' if self.value > 1 else ''}"
        return write_quantity(self.value, DIMENSIONS[_SUFFIX[self.unit]])

    def __str__(self) -> str:
        """Read as a recipe writes it."""
        return self.text()


@dataclass(frozen=True, slots=True, kw_only=True)
class Duration:
    """How long the loop is asked to be.

    Parameters
    ----------
    at : Extent
        What is asked; the loop is the nearest length that all parts can close on.
    multiple : Extent, optional
        The loop shall be a whole multiple of this, such as a generator's granularity.
    least, most : Extent, optional
        Bounds of the loop after rounding.
    """

    example: ClassVar[str] = "10 ms"
    at: Extent
    multiple: Extent | None = None
    least: Extent | None = None
    most: Extent | None = None

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read a length, or a mapping ``{at, multiple, least, most}`` of lengths.

        Raises
        ------
        QuantityError
            Not of that form, or bounds (in the same unit) that leave nothing.
        """
        if not isinstance(value, dict):
            return cls(at=Extent.parse(value))
        for key in value:
            if key not in _DURATION_KEYS:
                guess = nearest(str(key), _DURATION_KEYS)
                raise QuantityError(
                    problem=f"unknown key {str(key)[:40]!r}",
                    allowed="the keys " + ", ".join(_DURATION_KEYS),
                    remedy=f"Did you mean {guess}?" if guess else "Remove it.",
                    key=str(key),
                )
        if "at" not in value:
            raise QuantityError(
                problem="the key at is missing",
                allowed="the keys " + ", ".join(_DURATION_KEYS),
                remedy="Add at: 10 ms",
                key="at",
            )
        lengths = {}
        for key, item in value.items():
            try:
                lengths[key] = Extent.parse(item)
            except QuantityError as error:
                raise QuantityError(
                    problem=error.problem, allowed=error.allowed, remedy=error.remedy, key=key
                ) from error
        return cls(**lengths)

    def __post_init__(self) -> None:
        """Refuse bounds that leave nothing."""
        chain = (("least", self.least), ("at", self.at), ("most", self.most))
        given = [(key, length) for key, length in chain if length is not None]
        for index, (_, low) in enumerate(given):
            for key, high in given[index + 1 :]:
                if low.unit == high.unit and low.value > high.value:
                    raise QuantityError(
                        problem=f"{high.text()} is shorter than {low.text()}",
                        allowed="least, at and most in rising order",
                        remedy="Exchange or correct them.",
                        key=key,
                    )

    def text(self) -> object:
        """Return the value as a recipe writes it."""
        if self.multiple is None and self.least is None and self.most is None:
            return self.at.text()
        pairs = ((key, getattr(self, key)) for key in _DURATION_KEYS)
        return {key: length.text() for key, length in pairs if length is not None}


_DURATION_KEYS = ("at", "multiple", "least", "most")


@dataclass(frozen=True, slots=True, kw_only=True)
class Output:
    """The files of samples, and how far they are filled.

    Parameters
    ----------
    iq : tuple of FormatRequest
        One file each. Of files of one format and another datatype the later ones have the
        datatype in their name.
    peak_dbfs : float, optional
        Peak between samples, dBFS, at most 0. It is -1 if neither level is given.
    average_dbfs : float, optional
        Average power, dBFS, instead of the peak; of two channels that of the first.
    peak_of : {"envelope", "rail"}
        What the peak is of: the envelope, or the larger of the two rails, which are what a
        converter clips.
    """

    iq: Annotated[tuple[FormatRequest, ...], MinLen(1)] = (
        FormatRequest(format="sigmf", datatype="ci16_le"),
    )
    peak_dbfs: Annotated[float, Le(0)] | None = None
    average_dbfs: float | None = None
    peak_of: Literal["envelope", "rail"] = "envelope"

    def __post_init__(self) -> None:
        """Refuse two levels or two files of one name; the peak is -1 dBFS unless said."""
        if self.peak_dbfs is not None and self.average_dbfs is not None:
            raise QuantityError(
                problem="both peak and average are given",
                allowed="one of the two: the other follows from the waveform",
                remedy="Remove one of them.",
                key="average",
            )
        if self.peak_dbfs is None and self.average_dbfs is None:
            object.__setattr__(self, "peak_dbfs", -1.0)
        seen: set[tuple[str, str, str]] = set()
        for index, request in enumerate(self.iq):
            own = request.name
            file = (
                request.format,
                "" if own is None else own.casefold(),
                request.chosen().label if own is None else "",
            )
            if file in seen:
                raise QuantityError(
                    problem=f"{request.format} is asked for twice under the same file name",
                    allowed="each format once a file name, or once a datatype without a name",
                    remedy=f"Give one of them a name: {{format: {request.format}, name: ...}}.",
                    key=f"iq[{index}]",
                )
            seen.add(file)


@dataclass(frozen=True, slots=True, kw_only=True)
class SecondChannel:
    """A second waveform on the same loop, coherent with the first, in the same files.

    Parameters
    ----------
    signal : settings
        A member of the sources or combiners. It draws its own data; ``data: {share: NAME}``
        takes those of a named part of either channel, and ``share: signal`` those of the first
        channel where that is a plain source.
    stages : tuple of settings
        What this signal passes through, in order.
    level_db : float
        Nominal power over that of the first channel, dB; both share one gain to full scale.
    """

    signal: Annotated[Any, Member(("signal",))]
    stages: tuple[Annotated[Any, Member(("stage",))], ...] = ()
    level_db: Annotated[float, Ge(-200), Le(200)] = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Recipe:
    """A whole recipe.

    Parameters
    ----------
    wavegen : int
        Version of the recipe format: 1.
    title : str
        One line for people.
    seed : int
        Seed of all random data, 0 to 2**63 - 1.
    sample_rate_hz : Fraction
        Exact sample rate of the loop, Hz.
    duration : Duration
        Extent that the loop is asked to have.
    signal : settings
        A member of the sources or combiners.
    stages : tuple of settings
        What the signal passes through, in order.
    second_channel : SecondChannel, optional
        A second waveform, coherent with the first: every file then holds two channels.
    mask : SpectralMask, optional
        Limits of the spectrum, around the middle of the band that the signal fills; measured by
        ``fidelity``, kept by ``tune``.
    bench : Bench, optional
        Powers and ratings on the bench; with two channels each has such a path, and the average
        power is that of the first.
    output : Output
        Files and their level.
    """

    wavegen: Literal[1]
    title: str = ""
    seed: Annotated[int, Ge(0), Le(2**63 - 1)] = 1
    sample_rate_hz: Annotated[Fraction, Gt(0)]
    duration: Duration
    signal: Annotated[Any, Member(("signal",))]
    stages: tuple[Annotated[Any, Member(("stage",))], ...] = ()
    second_channel: SecondChannel | None = None
    mask: SpectralMask | None = None
    bench: Bench | None = None
    output: Output = Output()
