"""Which format of file a recipe asks for."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar, Self

from wavegen.core.registry import nearest
from wavegen.core.units import QuantityError
from wavegen.files import FORMATS
from wavegen.recipe.names import check_name


@dataclass(frozen=True, slots=True, kw_only=True)
class FormatRequest:
    """One file of samples that is asked for.

    Parameters
    ----------
    format : str
        Name in the table of formats.
    datatype : str
        How a sample is stored, one of the format's own.
    name : str, optional
        File name without suffix; the recipe's own if not given.
    """

    example: ClassVar[str] = "sigmf"
    format: str
    datatype: str
    name: str | None = None

    @classmethod
    def parse(cls, value: object) -> Self:
        """Read a format's name, or a mapping ``{format, datatype, name}``.

        Raises
        ------
        QuantityError
            Unknown format, datatype or key, or a name that could leave the folder.
        """
        given = value if isinstance(value, dict) else {"format": value}
        for key in given:
            if key not in {"format", "datatype", "name"}:
                guess = nearest(str(key), ("format", "datatype", "name"))
                raise QuantityError(
                    problem=f"unknown key {str(key)[:40]!r}",
                    allowed="the keys format, datatype, name",
                    remedy=f"Did you mean {guess}?" if guess else "Remove it.",
                    key=str(key),
                )
        name: object = given.get("format")
        datatype: object = given.get("datatype")
        stem: object = given.get("name")
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
        made = FORMATS.load(name)
        if datatype is None:
            datatype = made.default_datatype
        if not isinstance(datatype, str) or datatype not in made.datatypes:
            guess = nearest(str(datatype), made.datatypes)
            raise QuantityError(
                problem=f"{name} has no datatype {str(datatype)[:40]!r}",
                allowed=", ".join(made.datatypes),
                remedy=f"Did you mean {guess}?" if guess else f"Write {made.default_datatype}.",
                key="datatype",
            )
        return cls(format=name, datatype=datatype, name=_checked_stem(stem))

    def text(self) -> object:
        """Return the value as a recipe writes it."""
        if self.name is None and self.datatype == FORMATS.load(self.format).default_datatype:
            return self.format
        written = {"format": self.format, "datatype": self.datatype}
        return written if self.name is None else written | {"name": self.name}


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
        raise QuantityError(
            problem=error.problem, allowed=error.allowed, remedy=error.remedy, key="name"
        ) from error
    return stem
