"""Limits of published standards by name, each with its source and how far that is confirmed."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

from wavegen.core.errors import ArgumentsError
from wavegen.core.registry import nearest

_DATA = Path(__file__).with_name("standard_limits.json")


@cache
def _tables() -> Mapping[str, Any]:
    tables: Mapping[str, Any] = json.loads(_DATA.read_text(encoding="utf-8"))
    return tables


@dataclass(frozen=True, slots=True, kw_only=True)
class EvmLimit:
    """A limit on EVM.

    Parameters
    ----------
    standard : str
        Row of the table: ``NR BS FR1``.
    modulation : str
        As the standard writes it: ``64QAM``; for IEEE 802.11 with the code rate.
    percent : float
        Largest RMS EVM allowed, percent.
    source, status : str
        Where it is from, and how far that is confirmed.
    """

    standard: str
    modulation: str
    percent: float
    source: str
    status: str

    @property
    def name(self) -> str:
        """Standard and modulation."""
        return f"{self.standard} {self.modulation}"


def evm_limit_names() -> list[str]:
    """Return every name that :func:`evm_limit` reads."""
    return [
        f"{standard} {modulation}"
        for standard, row in _tables()["evm"].items()
        for modulation in row["limits_percent"]
    ]


def evm_limit(name: str) -> EvmLimit:
    """Return a limit by standard and modulation.

    Parameters
    ----------
    name : str
        ``NR BS FR1 64QAM``, ``IEEE 802.11 64QAM 5/6``; case and hyphens do not matter.

    Returns
    -------
    EvmLimit

    Raises
    ------
    ArgumentsError
        No such row.

    Examples
    --------
    >>> evm_limit("nr bs fr1 64qam").percent
    8
    """
    wanted = _folded(name)
    for standard, row in _tables()["evm"].items():
        for modulation, percent in row["limits_percent"].items():
            if _folded(f"{standard} {modulation}") == wanted:
                return EvmLimit(
                    standard=standard,
                    modulation=modulation,
                    percent=percent,
                    source=row["source"],
                    status=row["status"],
                )
    raise _unknown(name, evm_limit_names(), "EVM limit")


def evm_limit_of(standard: str, constellation: str) -> EvmLimit | None:
    """Return the limit that a standard sets for one of the program's constellations.

    Parameters
    ----------
    standard : str
        ``NR BS FR1``.
    constellation : str
        Name in recipes: ``64qam``.

    Returns
    -------
    EvmLimit or None
        None where the standard has no row for it, or more than one.

    Raises
    ------
    ArgumentsError
        No such standard.
    """
    rows = _tables()["evm"]
    matching = {_folded(known): known for known in rows}
    if _folded(standard) not in matching:
        raise _unknown(standard, list(rows), "standard with EVM limits")
    known = matching[_folded(standard)]
    hits = [m for m in rows[known]["limits_percent"] if _folded(m) == _folded(constellation)]
    return evm_limit(f"{known} {hits[0]}") if len(hits) == 1 else None


def aclr_row_names() -> list[str]:
    """Return every name that :func:`aclr_row` reads."""
    return list(_tables()["aclr"])


def aclr_row(name: str) -> tuple[str, Mapping[str, Any]]:
    """Return a row of the table of adjacent-channel limits, as it stands in the package's data.

    Raises
    ------
    ArgumentsError
        No such row.
    """
    for known, row in _tables()["aclr"].items():
        if _folded(known) == _folded(name):
            return known, row
    raise _unknown(name, aclr_row_names(), "ACLR row")


def evm_window_samples(
    *, frequency_range: str, spacing_khz: int, channel_mhz: int, n_fft: int
) -> int:
    """Return the EVM window of an NR base station at an FFT length.

    Parameters
    ----------
    frequency_range : str
        ``FR1``, ``FR2-1`` ...
    spacing_khz, channel_mhz : int
        Subcarrier spacing and channel width.
    n_fft : int
        FFT length at which it is used; the window keeps its duration and is rounded down to an
        even number of samples.

    Returns
    -------
    int
        Samples.

    Raises
    ------
    ArgumentsError
        The standard has no such channel.

    Notes
    -----
    3GPP TS 38.104 v19.4.0, Annex B.5.2 and C.5.2, normal prefix.

    Examples
    --------
    >>> evm_window_samples(frequency_range="FR1", spacing_khz=15, channel_mhz=20, n_fft=8192)
    232
    """
    rows = [row for row in _tables()["evm_windows"]["rows"] if row["prefix"] == "normal"]
    for row in rows:
        asked = (frequency_range, spacing_khz, channel_mhz)
        if (row["range"], row["spacing_khz"], row["channel_mhz"]) == asked:
            return int(row["window_samples"] * n_fft // row["n_fft"] // 2 * 2)
    names = [f"{r['range']} {r['spacing_khz']} kHz {r['channel_mhz']} MHz" for r in rows]
    asked_for = f"{frequency_range} {spacing_khz} kHz {channel_mhz} MHz"
    raise _unknown(asked_for, names, "EVM window")


def _folded(name: str) -> str:
    return "".join(name.casefold().replace("-", "").split())


def _unknown(name: str, known: list[str], kind: str) -> ArgumentsError:
    guess = nearest(name, known)
    return ArgumentsError(
        where="limit",
        problem=f"{name!r} is no {kind}",
        allowed=", ".join(known),
        remedy=f"Did you mean {guess}?" if guess else "Choose one of these, or give a number.",
    )
