"""Coefficients of amplifiers with memory from a file: CSV or JSON, read strictly."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import NamedTuple

from wavegen.core.errors import FileError
from wavegen.core.units import DIMENSIONS, QuantityError, parse_quantity
from wavegen.files.strict_json import read_json
from wavegen.stages.numbers_file import MOST_BYTES, Column, read_columns

HIGHEST_ORDER = 15
LONGEST_DELAY = 64
MOST_TERMS = 1024
LARGEST_COEFFICIENT = 1e9
ALIGNED = ("order", "delay", "re", "im")
CROSSED = ("order", "delay", "lag", "re", "im")
_KEYS = ("coefficients", "sample_rate", "largest_amplitude")


class Term(NamedTuple):
    """``coefficient x[n - delay] |x[n - delay - lag]|^(order - 1)``.

    Parameters
    ----------
    order : int
        Of the nonlinearity, 1 to 15.
    delay : int
        Of the sample, 0 to 64.
    lag : int
        Of the envelope behind the sample; negative where it leads.
    coefficient : complex
        Factor.
    """

    order: int
    delay: int
    lag: int
    coefficient: complex


@dataclass(frozen=True, eq=False, slots=True, kw_only=True)
class Coefficients:
    """Terms of a polynomial with memory.

    Parameters
    ----------
    name : str
        Of the file.
    terms : tuple of Term
        No two of the same order, delay and lag.
    largest_amplitude : float
        Largest input amplitude for which they were found.
    sample_rate_hz : Fraction or None
        Rate whose samples the delays count, Hz, if the file says it.
    """

    name: str
    terms: tuple[Term, ...]
    largest_amplitude: float = 1.0
    sample_rate_hz: Fraction | None = None


def read_coefficients(path: Path, columns: tuple[str, ...]) -> Coefficients:
    """Return coefficients from a file.

    Parameters
    ----------
    path : Path
        CSV with these columns by name or in this order, and perhaps comments ``# sample_rate:
        122.88 MHz`` and ``# largest_amplitude: 1.2``; or, if the name ends in ``.json``, an
        object ``{"coefficients": [{"order": 1, ...}], "sample_rate": "122.88 MHz",
        "largest_amplitude": 1.2}``.
    columns : tuple of str
        :data:`ALIGNED` or :data:`CROSSED`.

    Raises
    ------
    FileError
        Out of reach, more than 1 MB, not of that form, numbers that are not whole where they
        count something or beyond the limits, a term twice, or coefficients that are all zero.
    """
    is_json = path.suffix.casefold() == ".json"
    rows, settings = _json(path, columns) if is_json else _csv(path, columns)
    if len(rows) > MOST_TERMS:
        raise _fault(path, f"has {len(rows)} terms", columns)
    terms: list[Term] = []
    for number, row in enumerate(rows, 1):
        term = _term(path, number, row, columns)
        if any(term[:3] == other[:3] for other in terms):
            raise _fault(path, f"term {number} is there twice", columns)
        terms.append(term)
    if not any(term.coefficient for term in terms):
        raise _fault(path, "has no coefficient that is not zero", columns)
    return Coefficients(
        name=path.name,
        terms=tuple(terms),
        largest_amplitude=_largest(path, settings, columns),
        sample_rate_hz=_rate(path, settings, columns),
    )


def _csv(path: Path, columns: tuple[str, ...]) -> tuple[list[list[float]], dict[str, object]]:
    wanted = [Column(names=(name,), units={}) for name in columns]
    values, table = read_columns(path, wanted, least_rows=1)
    return values.T.tolist(), {key: table.settings[key] for key in _KEYS if key in table.settings}


def _json(path: Path, columns: tuple[str, ...]) -> tuple[list[list[float]], dict[str, object]]:
    document = read_json(path, MOST_BYTES)
    unknown = sorted(set(document) - set(_KEYS))
    if unknown:
        raise _fault(path, f"has the unknown key {unknown[0][:40]!r}", columns)
    listed = document.get("coefficients")
    if not isinstance(listed, list) or not listed:
        raise _fault(path, "has no list of coefficients", columns)
    rows = []
    for number, item in enumerate(listed, 1):
        if not isinstance(item, dict) or set(item) != set(columns):
            raise _fault(path, f"term {number} has other keys", columns)
        values = [item[name] for name in columns]
        if any(isinstance(value, bool) or not isinstance(value, int | float) for value in values):
            raise _fault(path, f"term {number} holds something that is no number", columns)
        rows.append(values)
    return rows, document


def _term(path: Path, number: int, row: list[float], columns: tuple[str, ...]) -> Term:
    given = dict(zip(columns, row, strict=True))
    limits = {
        "order": (1, HIGHEST_ORDER),
        "delay": (0, LONGEST_DELAY),
        "lag": (-LONGEST_DELAY, LONGEST_DELAY),
    }
    whole: dict[str, int] = {"lag": 0}
    for name, (low, high) in limits.items():
        if name not in given:
            continue
        if given[name] != round(given[name]) or not low <= given[name] <= high:
            problem = (
                f"the {name} of term {number} is {given[name]:g}, not whole from {low} to {high}"
            )
            raise _fault(path, problem, columns)
        whole[name] = int(given[name])
    if max(abs(given["re"]), abs(given["im"])) > LARGEST_COEFFICIENT:
        raise _fault(path, f"the coefficient of term {number} is beyond 1e9", columns)
    return Term(coefficient=complex(given["re"], given["im"]), **whole)


def _largest(path: Path, settings: dict[str, object], columns: tuple[str, ...]) -> float:
    given = settings.get("largest_amplitude", 1.0)
    try:
        value = float(given) if isinstance(given, int | float | str) else -1.0
    except ValueError:
        value = -1.0
    if isinstance(given, bool) or not 1e-6 <= value <= 1e6:
        raise _fault(path, f"says largest_amplitude: {str(given)[:40]}", columns)
    return value


def _rate(path: Path, settings: dict[str, object], columns: tuple[str, ...]) -> Fraction | None:
    given = settings.get("sample_rate")
    if given is None:
        return None
    try:
        return parse_quantity(str(given), DIMENSIONS["_hz"])
    except QuantityError as error:
        raise _fault(path, f"says sample_rate: {str(given)[:40]}", columns) from error


def _fault(path: Path, problem: str, columns: tuple[str, ...]) -> FileError:
    return FileError(
        where=str(path),
        problem=problem,
        allowed=f"up to {MOST_TERMS} terms of {', '.join(columns)} (orders up to {HIGHEST_ORDER}, "
        f"delays up to {LONGEST_DELAY}), none twice, not all zero; sample_rate like 122.88 MHz, "
        "largest_amplitude from 1e-6 to 1e6",
        remedy="Correct the file.",
    )
