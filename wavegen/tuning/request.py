"""What is asked of a tune."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import Annotated

from annotated_types import Gt, Lt

from wavegen.production.fidelity import FidelityRequest
from wavegen.tuning.limits import Limits


@dataclass(frozen=True, slots=True, kw_only=True)
class TuneRequest:
    """What a tune shall do.

    Parameters
    ----------
    limits : Limits
        What is to be kept.
    fidelity : FidelityRequest
        How it is measured.
    probability : float
        At which the level is made low.
    methods : tuple of str
        Kinds of stages; empty for all that suit the signal, but the projection.
    seconds : float
        For searching.
    device : Path or None
        CSV of an amplifier: then the output power is made high, within the limits behind it.
    """

    limits: Limits
    fidelity: FidelityRequest = field(default_factory=FidelityRequest)
    probability: Annotated[float, Gt(0), Lt(1)] = 1e-4
    methods: tuple[str, ...] = ()
    seconds: Annotated[float, Gt(0)] = 60.0
    device: Path | None = None
