"""One thing that is wrong with a record, as a row of figures and words."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True, slots=True, kw_only=True)
class Fault:
    """One thing that is wrong with a record.

    Parameters
    ----------
    kind : str
        Name for programs: ``dc_offset``, ``iq_imbalance``, ``clipped``, ``fill``, ``start_up``,
        ``not_finite``, ``ends_early``, ``coarse_quantisation``, ``splice``, ``level_step``,
        ``level_drift``, ``constant_start``.
    text : str
        Name for people.
    size : float
        How large.
    unit : str
        Of ``size``.
    where : str
        In which samples.
    effect : str
        What it does to the figures.
    remedy : str
        What to do about it.
    first_sample, stop_sample : int or None
        The same place in numbers, where it is one.
    """

    kind: str
    text: str
    size: float
    unit: str
    where: str
    effect: str
    remedy: str
    first_sample: int | None = None
    stop_sample: int | None = None

    def row(self) -> dict[str, Any]:
        """Return it as JSON values."""
        return {
            "kind": self.kind,
            "fault": self.text,
            "size": round(self.size, 4),
            "unit": self.unit,
            "where": self.where,
            "first_sample": self.first_sample,
            "stop_sample": self.stop_sample,
            "effect": self.effect,
            "remedy": self.remedy,
        }


def stretch_text(start: int, stop: int) -> str:
    """Return ``sample 3`` or ``samples 3 to 7`` for a range.

    Examples
    --------
    >>> stretch_text(3, 8)
    'samples 3 to 7'
    """
    return f"sample {start}" if stop == start + 1 else f"samples {start} to {stop - 1}"
