"""One trial of a search: what was set, and what was measured."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Self

OVERALL = "all"


@dataclass(frozen=True, slots=True, kw_only=True)
class EvmEntry:
    """EVM of one source, or of one class of its symbols.

    Parameters
    ----------
    source : str
        ``signal``, ``parts[0]``.
    name : str
        ``all``, ``groups[0]``.
    constellation : str
        Empty where there is none, or several.
    percent : float
        RMS, percent.
    """

    source: str
    name: str
    constellation: str
    percent: float

    @property
    def is_overall(self) -> bool:
        """Whether it is that of the whole source."""
        return self.name == OVERALL


@dataclass(frozen=True, slots=True, kw_only=True)
class AclrEntry:
    """Leakage into one channel.

    Parameters
    ----------
    name : str
        ``first``, ``second``.
    offset_hz : float
        From the carrier, Hz.
    ratio_db : float
        Carrier over leakage, dB.
    limit_db : float or None
        Of the channel's standard.
    """

    name: str
    offset_hz: float
    ratio_db: float
    limit_db: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Evaluation:
    """What one set of settings measures.

    Parameters
    ----------
    method : str
        Kind of the stage; empty where there is none.
    text : str
        The stage as a recipe writes it: by it an evaluation is found again.
    settings : mapping
        The settings that were searched, as JSON values.
    level_db : float
        At the probability asked for, dB over the mean.
    peak_db : float
        Highest sample, dB over the mean.
    evm : tuple of EvmEntry
        Of every source and class.
    aclr : tuple of AclrEntry
        Of every channel.
    mask_margin_db : float or None
        Where there is a mask.
    pairs : float
        Pairs of transforms a sample.
    input_dbm, output_dbm : float or None
        Mean power at the amplifier's input, and behind it, where there is one.
    fault : str
        Why there are no figures: empty where there are.
    """

    method: str
    text: str
    settings: Mapping[str, Any]
    level_db: float = 0.0
    peak_db: float = 0.0
    evm: tuple[EvmEntry, ...] = ()
    aclr: tuple[AclrEntry, ...] = ()
    mask_margin_db: float | None = None
    pairs: float = 0.0
    input_dbm: float | None = None
    output_dbm: float | None = None
    fault: str = ""

    @property
    def evm_percent(self) -> float:
        """Highest EVM of any source, percent."""
        return max((item.percent for item in self.evm if item.is_overall), default=0.0)

    @property
    def aclr_db(self) -> float | None:
        """Least ratio of any channel, dB."""
        return min((item.ratio_db for item in self.aclr), default=None)

    @property
    def cost(self) -> float:
        """What a search makes small: the level, or the output power with its sign changed."""
        return self.level_db if self.output_dbm is None else -self.output_dbm

    def row(self) -> dict[str, Any]:
        """Return it as JSON values."""
        return {
            "method": self.method,
            "stage": self.text,
            "settings": dict(self.settings),
            "level_db": self.level_db,
            "peak_db": self.peak_db,
            "evm_percent": self.evm_percent,
            "aclr_db": self.aclr_db,
            "mask_margin_db": self.mask_margin_db,
            "fft_pairs": self.pairs,
            "input_dbm": self.input_dbm,
            "output_dbm": self.output_dbm,
            "fault": self.fault,
            "evm": [
                {
                    "source": item.source,
                    "name": item.name,
                    "constellation": item.constellation,
                    "percent": item.percent,
                }
                for item in self.evm
            ],
            "aclr": [
                {
                    "channel": item.name,
                    "offset_hz": item.offset_hz,
                    "ratio_db": item.ratio_db,
                    "limit_db": item.limit_db,
                }
                for item in self.aclr
            ],
        }

    @classmethod
    def of(cls, row: Mapping[str, Any]) -> Self:
        """Return what :meth:`row` wrote.

        Raises
        ------
        KeyError, TypeError
            No such row.
        """
        return cls(
            method=row["method"],
            text=row["stage"],
            settings=row["settings"],
            level_db=row["level_db"],
            peak_db=row["peak_db"],
            mask_margin_db=row["mask_margin_db"],
            pairs=row["fft_pairs"],
            input_dbm=row["input_dbm"],
            output_dbm=row["output_dbm"],
            fault=row["fault"],
            evm=tuple(EvmEntry(**item) for item in row["evm"]),
            aclr=tuple(
                AclrEntry(
                    name=item["channel"],
                    offset_hz=item["offset_hz"],
                    ratio_db=item["ratio_db"],
                    limit_db=item["limit_db"],
                )
                for item in row["aclr"]
            ),
        )
