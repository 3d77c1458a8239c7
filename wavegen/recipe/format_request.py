"""Which format of file a recipe asks for."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import Any, ClassVar, Self

from wavegen.core.errors import FileError
from wavegen.core.registry import nearest
from wavegen.core.units import DIMENSIONS, QuantityError, parse_quantity
from wavegen.files import FORMATS
from wavegen.files.datatypes import ALIGNMENTS, WORD_BITS, Alignment, Datatype, takes_words
from wavegen.files.format import Format, pick_datatype
from wavegen.recipe.exact import write_quantity
from wavegen.recipe.names import check_name

KEYS = ("format", "datatype", "name", "bits", "align", "real")


@dataclass(frozen=True, slots=True, kw_only=True)
class RealOutput:
    """One rail of real samples on an intermediate frequency.

    Parameters
    ----------
    centre_hz : Fraction
        Where the baseband's 0 Hz goes, Hz: above 0, below half the sample rate. It is moved to
        whole cycles in the loop, with a note.
    """

    centre_hz: Fraction

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read a mapping ``{centre: 30 MHz}``.

        Raises
        ------
        QuantityError
            Another form, or no frequency above zero.
        """
        if not isinstance(value, dict) or set(value) != {"centre"}:
            raise QuantityError(
                problem=f"{str(value)[:40]!r} is no intermediate frequency",
                allowed="a mapping with the key centre",
                remedy="Write it like real: {centre: 30 MHz}.",
                key="real",
            )
        try:
            text = str(value["centre"])
            centre = parse_quantity(text, DIMENSIONS["_hz"])
        except QuantityError as error:
            raise _at(error, "real.centre") from error
        if centre <= 0:
            raise QuantityError(
                problem=f"{text!r} is not above zero",
                allowed="frequencies above 0 and below half the sample rate",
                remedy="Write it like 30 MHz.",
                key="real.centre",
            )
        return cls(centre_hz=centre)

    def text(self) -> dict[str, object]:
        """Return the value as a recipe writes it."""
        return {"centre": write_quantity(self.centre_hz, DIMENSIONS["_hz"])}


@dataclass(frozen=True, slots=True, kw_only=True)
class FormatRequest:
    """One file of samples that is asked for.

    Parameters
    ----------
    format : str
        Name in the table of formats.
    datatype : str
        How a sample is stored, one of the format's own; a real one needs ``real``.
    name : str, optional
        File name without suffix; the recipe's own if not given.
    bits : int, optional
        Bits of the words in 16-bit containers: 12, 14 or 16.
    align : {"left", "right"}, optional
        Where shorter words stand: ``left`` leaves the lowest bits of the container zero.
    real : RealOutput, optional
        Real samples on an intermediate frequency in place of I and Q.
    """

    example: ClassVar[str] = "sigmf"
    format: str
    datatype: str
    name: str | None = None
    bits: int | None = None
    align: Alignment | None = None
    real: RealOutput | None = None

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read a format's name, or a mapping ``{format, datatype, name, bits, align, real}``.

        Raises
        ------
        QuantityError
            Unknown format, datatype or key, words that the datatype does not hold, real samples
            without a frequency or a frequency without real samples, or a name that could leave
            the folder.
        """
        given: dict[str, Any] = value if isinstance(value, dict) else {"format": value}
        for key in given:
            if key not in KEYS:
                guess = nearest(str(key), KEYS)
                raise QuantityError(
                    problem=f"unknown key {str(key)[:40]!r}",
                    allowed="the keys " + ", ".join(KEYS),
                    remedy=f"Did you mean {guess}?" if guess else "Remove it.",
                    key=str(key),
                )
        name: object = given.get("format")
        if not isinstance(name, str) or name not in FORMATS:
            guess = FORMATS.nearest(str(name))
            raise QuantityError(
                problem=f"unknown format {str(name)[:40]!r}"
                if name is not None
                else "the key format is missing",
                allowed=", ".join(FORMATS),
                remedy=f"Did you mean {guess}?" if guess else f"Write {next(iter(FORMATS))}.",
                key="format" if isinstance(value, dict) else "",
            )
        made: Format = FORMATS.load(name)
        real = None if given.get("real") is None else RealOutput.parse(given["real"])
        datatype = _checked_datatype(made, name, given.get("datatype"), is_real=real is not None)
        _check_word(made, datatype, given)
        return cls(
            format=name,
            datatype=datatype,
            name=_checked_stem(given.get("name")),
            bits=given.get("bits"),
            align=given.get("align"),
            real=real,
        )

    def chosen(self) -> Datatype:
        """Return the datatype that is asked for, its word included."""
        form: Format = FORMATS.load(self.format)
        return pick_datatype(form, self.datatype, "", bits=self.bits, align=self.align)

    def text(self) -> object:
        """Return the value as a recipe writes it."""
        optional = {
            "name": self.name,
            "bits": self.bits,
            "align": self.align,
            "real": self.real and self.real.text(),
        }
        written = {key: item for key, item in optional.items() if item is not None}
        if not written and self.datatype == FORMATS.load(self.format).default_datatype:
            return self.format
        return {"format": self.format, "datatype": self.datatype, **written}


def default_datatype(form: Format, *, is_real: bool) -> str | None:
    """Return the datatype of a request that names none.

    Parameters
    ----------
    form : Format
        Which format.
    is_real : bool
        Whether real samples are asked for: then the first real one, which has the rail of the
        format's own default where it can.

    Returns
    -------
    str or None
        None where the format has no real one.

    Examples
    --------
    >>> from wavegen.files.npy import Npy
    >>> default_datatype(Npy(), is_real=False), default_datatype(Npy(), is_real=True)
    ('cf32_le', 'rf32_le')
    """
    if not is_real:
        return form.default_datatype
    real = [name for name, datatype in form.datatypes.items() if datatype.is_real]
    same = "r" + form.datatypes[form.default_datatype].name[1:]
    return same if same in real else next(iter(real), None)


def _checked_datatype(form: Format, name: str, datatype: object, *, is_real: bool) -> str:
    default = default_datatype(form, is_real=is_real)
    if default is None:
        raise QuantityError(
            problem=f"{name} does not write real samples",
            allowed=f"real samples in {', '.join(formats_of_real())}",
            remedy="Choose another format, or leave real out.",
            key="real",
        )
    fitting = [key for key, item in form.datatypes.items() if item.is_real == is_real]
    if datatype is None:
        return default
    if not isinstance(datatype, str) or datatype not in form.datatypes:
        guess = nearest(str(datatype), fitting)
        raise QuantityError(
            problem=f"{name} has no datatype {str(datatype)[:40]!r}",
            allowed=", ".join(form.datatypes),
            remedy=f"Did you mean {guess}?" if guess else f"Write {default}.",
            key="datatype",
        )
    if datatype not in fitting:
        raise QuantityError(
            problem=f"{datatype} holds {'I and Q' if is_real else 'real samples'}",
            allowed=f"one of {', '.join(fitting)} " + ("with real" if is_real else "without real"),
            remedy=f"Write {default}."
            if is_real
            else f"Add real: {{centre: 30 MHz}}, or write {default}.",
            key="datatype",
        )
    return datatype


def formats_of_real() -> list[str]:
    """Return the names of the formats that write real samples."""
    return [
        name
        for name in FORMATS
        if any(item.is_real for item in FORMATS.load(name).datatypes.values())
    ]


def _check_word(form: Format, datatype: str, given: Mapping[str, Any]) -> None:
    """Refuse words that the datatype does not hold."""
    bits, align = given.get("bits"), given.get("align")
    is_bits_wrong = (bits is None or type(bits) is not int or bits not in WORD_BITS) or (
        not takes_words(form.datatypes[datatype])
    )
    key = "bits" if "bits" in given and is_bits_wrong else "align"
    if bits is not None and type(bits) is not int:
        raise QuantityError(
            problem=f"{str(bits)[:40]!r} is no number of bits",
            allowed=", ".join(map(str, WORD_BITS)),
            remedy="Write bits: 14.",
            key="bits",
        )
    if align is not None and align not in ALIGNMENTS:
        align = str(align)[:40]
    try:
        pick_datatype(form, datatype, "", bits=bits, align=align)
    except FileError as error:
        raise QuantityError(
            problem=error.problem, allowed=error.allowed, remedy=error.remedy, key=key
        ) from error


def _at(error: QuantityError, key: str) -> QuantityError:
    return QuantityError(problem=error.problem, allowed=error.allowed, remedy=error.remedy, key=key)


def _checked_stem(stem: object) -> str | None:
    if stem is None:
        return None
    if not isinstance(stem, str):
        raise QuantityError(
            problem=f"{str(stem)[:40]!r} is no text",
            allowed="a file name without folder and suffix",
            remedy="Put the name in quotes.",
            key="name",
        )
    try:
        check_name(stem)
    except QuantityError as error:
        raise _at(error, "name") from error
    return stem
