"""CSV: I and Q in two columns, or power against time; comments carry rate and full scale.

Written: ``# sample_rate_hz: 30720000``, ``# full_scale: 32768`` and the like, the headings
``I,Q`` (``I`` alone for real samples, ``I0,Q0,I1,Q1`` for two channels), then one sample a line.
Read: tables by others too, with ``,``, ``;`` or tab between columns and decimal commas with the
latter two. What is no recording (a CCDF curve, a list of markers) is told apart by its headings.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import ClassVar

import numpy as np

from wavegen.core.errors import FileError
from wavegen.core.units import format_hz
from wavegen.files.analytic import as_complex
from wavegen.files.csv_table import ROWS_PER_MARK, Table, open_table
from wavegen.files.curve import curve_columns
from wavegen.files.datatypes import (
    CF32_LE,
    CI8,
    CI16_LE,
    RF32_LE,
    RF64_LE,
    RI16_LE,
    Codes,
    Datatype,
    real_of,
)
from wavegen.files.digest import sha512_of
from wavegen.files.faults import told
from wavegen.files.format import (
    FileFacts,
    ReadHints,
    Recording,
    Writer,
    check_facts,
    refuse_other_datatype,
    refuse_real_pair,
    told_channel,
    told_rate,
    told_word,
)
from wavegen.files.interleaved import CodedSamples, SampleCount, refuse_misfit
from wavegen.files.power_series import PowerSamples, power_column
from wavegen.files.signatures import signature_of

_WRITTEN = {item.name: item for item in (CI16_LE, CI8, CF32_LE, RI16_LE, RF32_LE)}
_I = re.compile(r"(?:i|re|real|in_?phase)(?:_?(?:sample|data|v|volt))?_?(\d?)")
_Q = re.compile(r"(?:q|im|imag|imaginary|quad|quadrature)(?:_?(?:sample|data|v|volt))?_?(\d?)")
_TIMES = {"time", "t"}
_SECONDS = {"s": 1.0, "": 1.0, "ms": 1e-3, "us": 1e-6, "µs": 1e-6, "μs": 1e-6, "ns": 1e-9}
_LARGE = 4.0
"""Values beyond this are hardly samples of full scale 1.0."""


class CsvIq:
    """Samples in text."""

    name: ClassVar[str] = "csv"
    suffixes: ClassVar[tuple[str, ...]] = (".csv", ".tsv")
    datatypes: ClassVar[Mapping[str, Datatype]] = _WRITTEN
    default_datatype: ClassVar[str] = "ci16_le"

    def files(self, stem: str, datatype: Datatype) -> tuple[str, ...]:
        """Return the name of the file."""
        return (f"{stem}.csv",)

    def check(self, facts: FileFacts, where: str) -> None:
        """Refuse a datatype that is not written, and two real channels."""
        check_facts(self, facts, where)
        refuse_real_pair(facts, where)

    def writer(self, drafts: tuple[Path, ...], facts: FileFacts) -> Writer:
        """Open the file and write its comments and headings."""
        self.check(facts, drafts[0].name)
        return CsvWriter(drafts[0], facts)

    def detect(self, path: Path, head: bytes) -> bool:
        """Return whether the name is that of a table and nothing says otherwise."""
        return path.suffix.lower() in self.suffixes and signature_of(head) is None

    def read(self, path: Path, hints: ReadHints) -> Recording:
        """Open a table of I and Q, of real samples, or of power.

        Raises
        ------
        FileError
            No table, other columns, no sample rate, or what is no recording: a CCDF curve, or
            markers.
        """
        table = open_table(path)
        _refuse_other_tables(table)
        power = power_column(table)
        if power is not None:
            return _power_recording(table, power, hints, self.name)
        return as_complex(_iq_recording(table, hints, self.name))


def _refuse_other_tables(table: Table) -> None:
    names = {item.name for item in table.headings}
    if {"start_sample", "label"} <= names | {f"{item.name}_{item.unit}" for item in table.headings}:
        raise FileError(
            where=str(table.path),
            problem="is a list of markers",
            allowed="recordings",
            remedy="Name the recording that it belongs to.",
        )
    if curve_columns(table) is not None:
        raise FileError(
            where=str(table.path),
            problem="is a CCDF curve, not a recording: it has levels and probabilities",
            allowed="samples, or power against time",
            remedy="Compare it with a recording, or name the recording itself.",
        )


def _iq_recording(table: Table, hints: ReadHints, name: str) -> Recording:
    pairs, is_real = _iq_columns(table)
    stated, warnings = _stated_datatype(table, hints, is_real=is_real)
    refuse_other_datatype(table.path, stated, hints)
    bits, align = (hints.bits, hints.align) if hints.bits else _stated_word(table)
    datatype = told_word(stated, bits=bits, align=align, where=str(table.path))
    channel = told_channel(table.path, n_channels=len(pairs), hints=hints)
    rate, doubts = _rate(table, hints)
    full_scale = hints.full_scale or _setting_number(table, "full_scale") or datatype.full_scale
    if datatype.is_padded and hints.full_scale is None:
        full_scale = datatype.full_scale
    signal = CsvSamples(
        sample_rate_hz=rate,
        n_samples=table.n_rows,
        mean_power=None,
        path=table.path,
        datatype=datatype,
        gain=datatype.full_scale / full_scale,
        table=table,
        columns=pairs[channel],
    )
    first = signal.codes(0, min(ROWS_PER_MARK, table.n_rows))
    largest = float(np.abs(first).max())
    if full_scale == 1.0 and largest > _LARGE:
        text = (
            f"{table.path.name} has values up to {largest:g}, read with full scale 1.0: if they "
            "are codes, add --full-scale, such as --full-scale 32768"
        )
        warnings += (text,)
    return Recording(
        path=table.path,
        files=(table.path,),
        format=name,
        signal=signal,
        sample_rate_hz=rate,
        n_samples=table.n_rows,
        datatype=datatype,
        title=table.settings.get("title", ""),
        reference_level_dbm=hints.reference_level_dbm,
        warnings=warnings + doubts,
        n_channels=len(pairs),
        channel=channel,
    )


def _iq_columns(table: Table) -> tuple[tuple[tuple[int, ...], ...], bool]:
    """Return the columns of each channel, and whether they are real."""
    if not table.headings:
        if table.n_columns == 1:
            return ((0,),), True
        if table.n_columns in {2, 4}:
            return tuple((at, at + 1) for at in range(0, table.n_columns, 2)), False
        raise _columns_fault(table)
    i_rails = _matching(table, _I)
    q_rails = _matching(table, _Q)
    if i_rails and list(i_rails) == list(q_rails):
        return tuple((i_rails[key], q_rails[key]) for key in i_rails), False
    if list(i_rails) == [""] and not q_rails:
        return ((i_rails[""],),), True
    raise _columns_fault(table)


def _matching(table: Table, pattern: re.Pattern[str]) -> dict[str, int]:
    """Return column numbers by the channel number in their heading, in the order of these."""
    found = {}
    for number, heading in enumerate(table.headings):
        match = pattern.fullmatch(heading.name)
        if match and match[1] not in found:
            found[match[1]] = number
    return dict(sorted(found.items()))


def _columns_fault(table: Table) -> FileError:
    names = ", ".join(
        f"{item.name} ({item.unit})" if item.unit else item.name for item in table.headings
    )
    return FileError(
        where=str(table.path),
        problem=f"has the columns {names[:200]}" if names else f"has {table.n_columns} columns",
        allowed="I and Q; I alone (real samples); or power with its unit, such as Power [dBm]",
        remedy="Name the columns in the first line, such as I,Q or time_s,power_dbm.",
    )


def _stated_datatype(
    table: Table, hints: ReadHints, *, is_real: bool
) -> tuple[Datatype, tuple[str, ...]]:
    """Return the datatype that our comment or else the user states; floats if neither does."""
    name = table.settings.get("datatype", hints.datatype)
    known = _WRITTEN.get(name or "")
    if known is not None and known.is_real == is_real:
        return known, ()
    plain = real_of(CF32_LE) if is_real else CF32_LE
    if name is None:
        return plain, ()
    text = f"{table.path.name} states the datatype {name[:40]!r}, which is not known; read as text"
    return plain, (text,)


def _stated_word(table: Table) -> tuple[int | None, str | None]:
    bits, align = table.settings.get("word_bits", ""), table.settings.get("word_align")
    return (int(bits), align) if bits in {"12", "14"} and align else (None, None)


def _setting_number(table: Table, key: str) -> float | None:
    text = table.settings.get(key)
    if text is None:
        return None
    try:
        value = float(text)
    except ValueError:
        value = float("nan")
    if not 0 < value < float("inf"):
        raise FileError(
            where=str(table.path),
            problem=f"states {key}: {text[:40]!r}",
            allowed="numbers above 0",
            remedy="Correct the comment or remove it.",
        )
    return value


def _rate(table: Table, hints: ReadHints) -> tuple[Fraction, tuple[str, ...]]:
    """Return the rate: of our comment, of a column of times, or as told."""
    text = table.settings.get("sample_rate_hz")
    if text is not None:
        found = re.fullmatch(r"([0-9]{1,20}(?:\.[0-9]{1,20})?)(?:/([0-9]{1,20}))?", text)
        if not found or not Fraction(found[1]) or (found[2] and not int(found[2])):
            raise FileError(
                where=str(table.path),
                problem=f"states sample_rate_hz: {text[:40]!r}",
                allowed="a number above 0, in Hz",
                remedy="Correct the comment or remove it.",
            )
        stated = Fraction(found[1]) / int(found[2] or 1)
        return told_rate(table.path, stated_hz=stated, hints=hints)
    stated_by_time = None if hints.sample_rate_hz is not None else _rate_of_times(table)
    rate, warnings = told_rate(table.path, stated_hz=stated_by_time, hints=hints)
    if stated_by_time is not None:
        text = f"the sample rate {format_hz(rate)} is taken from the times in {table.path.name}"
        warnings += (text,)
    return rate, warnings


def _rate_of_times(table: Table) -> Fraction | None:
    """Return the rate that a column of evenly spaced times gives, to 9 digits."""
    column, unit = next(
        (
            (number, _SECONDS[heading.unit])
            for number, heading in enumerate(table.headings)
            if heading.name in _TIMES and heading.unit in _SECONDS
        ),
        (None, 1.0),
    )
    if column is None or table.n_rows < 2:
        return None
    times = table.rows(0, min(ROWS_PER_MARK, table.n_rows))[:, column]
    last = table.rows(table.n_rows - 1, table.n_rows)[0, column]
    step = (last - times[0]) / (table.n_rows - 1)
    places = times[0] + step * np.arange(times.size)
    if not step > 0 or np.abs(times - places).max() > 0.5 * step:
        raise FileError(
            where=str(table.path),
            problem="its times are not evenly spaced",
            allowed="samples at one rate",
            remedy="Resample them, or state the rate with --sample-rate.",
        )
    return Fraction(f"{1 / (step * unit):.9g}")


def _power_recording(
    table: Table, power: tuple[int, str], hints: ReadHints, name: str
) -> Recording:
    column, unit = power
    if hints.full_scale is not None or hints.bits is not None or hints.channel is not None:
        raise FileError(
            where=str(table.path),
            problem=f"holds power in {unit}, which has no codes and no channels",
            allowed="power against time without --full-scale, --bits or --channel",
            remedy="Leave the option out.",
        )
    if hints.reference_level_dbm is not None and unit != "dB":
        raise FileError(
            where=str(table.path),
            problem=f"states its power in {unit}, and --reference-level states it again",
            allowed="one of the two",
            remedy="Leave --reference-level out.",
        )
    rate, warnings = _rate(table, hints)
    signal = PowerSamples(
        sample_rate_hz=rate,
        n_samples=table.n_rows,
        mean_power=None,
        table=table,
        column=column,
        unit=unit,
    )
    signal.compute(0, min(ROWS_PER_MARK, table.n_rows))
    return Recording(
        path=table.path,
        files=(table.path,),
        format=name,
        signal=signal,
        sample_rate_hz=rate,
        n_samples=table.n_rows,
        datatype=RF64_LE,
        title=table.settings.get("title", ""),
        reference_level_dbm=hints.reference_level_dbm if unit == "dB" else 0.0,
        warnings=warnings,
        is_power=True,
    )


@dataclass(frozen=True, eq=False, kw_only=True)
class CsvSamples(CodedSamples):
    """One channel of a table of samples, full scale 1.0.

    Parameters
    ----------
    table : Table
        Where they stand.
    columns : tuple of int
        Of I and Q, or of real samples.
    """

    table: Table
    columns: tuple[int, ...]

    def codes(self, start: int, stop: int) -> Codes:
        """Return the codes of samples ``[start, stop)``, shape (stop - start, n_rails).

        Raises
        ------
        FileError
            A row that is no number, or no code of the datatype.
        """
        numbers = self.table.rows(start, stop)[:, self.columns]
        if self.datatype.is_integer:
            whole = self.datatype.container
            is_code = (numbers == np.rint(numbers)) & (numbers >= whole.lowest)
            is_code &= numbers <= whole.highest
            if not is_code.all():
                row, column = np.unravel_index(int(np.argmin(is_code)), numbers.shape)
                raise FileError(
                    where=str(self.path),
                    problem=f"sample {start + int(row)} holds {numbers[row, column]:g}",
                    allowed=f"whole codes from {whole.lowest} to {whole.highest}",
                    remedy="Correct it, or the datatype in the comments.",
                )
        with np.errstate(over="ignore"):  # beyond float32 reads as infinite, as elsewhere
            codes = numbers.astype(self.datatype.dtype)
        refuse_misfit(self.path, codes, self.datatype, start)
        return codes


class CsvWriter:
    """Writes one table.

    Parameters
    ----------
    draft : Path
        The (temporary) file.
    facts : FileFacts
        What will come.
    """

    def __init__(self, draft: Path, facts: FileFacts) -> None:
        self._path = draft
        self._datatype = facts.datatype
        self._count = SampleCount(draft, facts.n_samples, n_columns=facts.n_columns)
        self._sha512 = ""
        figure = "%d" if facts.datatype.is_integer else "%.9g"  # 9 digits give float32 exactly
        self._row = ",".join([figure] * facts.n_columns) + "\n"
        with told(draft):
            self._file = draft.open("wb", buffering=1 << 16)
        self._append(_preamble(facts).encode())

    def _append(self, content: bytes) -> None:
        with told(self._path):
            self._file.write(content)

    def write(self, codes: Codes) -> None:
        """Append codes, shape (n, n_columns)."""
        refuse_misfit(self._path, codes, self._datatype, self._count.have)
        self._count.add(codes)
        for start in range(0, codes.shape[0], ROWS_PER_MARK):
            block = codes[start : start + ROWS_PER_MARK]
            text = (self._row * block.shape[0]) % tuple(block.reshape(-1).tolist())
            self._append(text.encode())

    def finish(self, statistics: Mapping[str, object] | None = None) -> None:
        """Close the file and hash it; statistics would belong before the samples."""
        self.close()
        self._count.check_complete()
        self._sha512 = sha512_of(self._path)

    def close(self) -> None:
        """Close the file as it is."""
        with told(self._path):
            self._file.close()

    @property
    def sha512(self) -> str:
        """Hex digest of the file's bytes."""
        return self._sha512


def _preamble(facts: FileFacts) -> str:
    datatype = facts.datatype
    lines = {
        "sample_rate_hz": str(facts.sample_rate_hz),
        "datatype": datatype.name,
        "full_scale": f"{datatype.full_scale * (1 << datatype.shift):g}",
        "word_bits": str(datatype.n_bits) if datatype.is_padded else "",
        "word_align": datatype.align or "",
        "title": " ".join(facts.title.split())[:500],
        "generator": " ".join(facts.generator.split())[:100],
    }
    text = "".join(f"# {key}: {value}\n" for key, value in lines.items() if value)
    numbers = range(facts.n_channels) if facts.n_channels > 1 else ("",)
    rails = ("I",) if datatype.is_real else ("I", "Q")
    return text + ",".join(f"{rail}{number}" for number in numbers for rail in rails) + "\n"
