"""The names under which statistics of power are shown: two curves that look alike are not one."""

from __future__ import annotations

INSTANTANEOUS = "CCDF of instantaneous envelope power"
"""Share of the *time* that ``|x|^2`` is above a level over the mean."""
PER_SYMBOL = "CCDF of the PAPR of each symbol"
"""Share of the *symbols* whose own peak is above a level: 11.8 against 8.4 dB at 0.1 % for 1024
subcarriers, for each symbol has many chances."""
PASSBAND = "CCDF of instantaneous RF power"
"""Share of the time that the squared voltage itself is above a level over its mean."""
SENSOR = "CCDF of what a sensor of limited bandwidth reads"
"""The power after its video filter."""


def gated_name(name: str, gate_label: str) -> str:
    """Return the name of a statistic over a part of the time.

    Parameters
    ----------
    name : str
        One of this module's.
    gate_label : str
        As :attr:`wavegen.meters.burst_search.FoundBursts.label` says it.

    Examples
    --------
    >>> gated_name(INSTANTANEOUS, "bursts by pattern: 3")
    'CCDF of instantaneous envelope power (bursts by pattern: 3)'
    """
    return f"{name} ({gate_label})"
