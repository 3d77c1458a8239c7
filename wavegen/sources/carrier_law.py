"""The law of a pulse-shaped carrier, from its settings."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from pathlib import Path
from typing import Any, Protocol

import numpy as np

from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Signal
from wavegen.core.site import Site, samples_per
from wavegen.core.units import QuantityError
from wavegen.dsp.pulse import Pulse, Stretched
from wavegen.laws.law import Law
from wavegen.laws.listed import ListedLaw
from wavegen.laws.pulse_shaped import PulseShapedTerm
from wavegen.laws.term import NoLaw
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.rotation import Rotation

SHORTEST_PERIOD = 100_000
"""Bits after which data may repeat and stand for random ones down to 10 over as many: 0.01 %."""
LONGEST_LISTED = 1 << 21
"""Samples of a loop that is computed for its curve."""


class Shaped(Protocol):
    """The signal of a pulse-shaped carrier."""

    @property
    def pulse(self) -> Pulse:
        """Shape of a symbol, on the axis of half symbols where staggered."""


class CarrierSettings(Protocol):
    """What is read of the settings of a pulse-shaped carrier."""

    @property
    def constellation(self) -> Constellation:
        """Points."""

    @property
    def symbol_rate_hz(self) -> Fraction:
        """Exact rate, Hz."""

    @property
    def data(self) -> Any:
        """Where the symbols come from."""

    @property
    def pulse(self) -> Any:
        """Shape."""

    @property
    def rotation(self) -> Rotation | None:
        """Turn from symbol to symbol."""

    @property
    def stagger(self) -> bool:
        """Whether Q is half a symbol late."""

    def build(self, site: Site) -> Signal:
        """Return the signal."""


def carrier_term(settings: CarrierSettings, site: Site) -> PulseShapedTerm | NoLaw:
    """Return what a carrier is to its law and to a composite, at unit mean power.

    Parameters
    ----------
    settings : CarrierSettings
        Rotated and differential symbols included: the first turn independent symbols by known
        angles; the second, of equally likely steps around a circle, are independent phases.
    site : Site
        Where it is built; takes no notes.

    Returns
    -------
    PulseShapedTerm or NoLaw
        No law for data that repeat sooner than ``SHORTEST_PERIOD`` bits, nor for a staggered
        constellation whose rails lean to one side.

    Raises
    ------
    RecipeError
        As in ``build``.
    """
    quiet = replace(site, notes=[])
    repeats = finite_pattern(settings.data, site.folder)
    if repeats is not None and repeats[0] < SHORTEST_PERIOD:
        bits, called = repeats
        return NoLaw(reason=f"finite pattern: {called} repeats after {bits} bits")
    points = settings.constellation.points
    if settings.stagger and not all(_is_even(rail) for rail in (points.real, points.imag)):
        return NoLaw(reason="staggered rails that lean to one side have no law")
    signal: Any = settings.build(quiet)
    pulse = signal.pulse.inner if isinstance(signal.pulse, Stretched) else signal.pulse
    a, b = samples_per(settings.symbol_rate_hz, site.sample_rate_hz)
    stream = getattr(settings.data, "share", None) or site.label
    return PulseShapedTerm.of(
        name=carrier_name(settings),
        points=points,
        pulse=pulse,
        ratio=(a, b),
        period_symbols=site.n_samples * b // a,
        turns=settings.rotation.turns if settings.rotation else Fraction(0),
        is_staggered=settings.stagger,
        data=frozenset({stream if repeats is None else repeats[1]}),
        lowest_probability=0.0 if repeats is None else 10 / repeats[0],
    )


def carrier_law(settings: CarrierSettings, site: Site) -> Law | NoLaw:
    """Return the law of a carrier: of its process, or of its pattern where that is short.

    Parameters
    ----------
    settings : CarrierSettings
        The carrier.
    site : Site
        Where it is built; takes no notes.

    Returns
    -------
    Law or NoLaw
        The curve of a finite pattern holds for every loop; it is computed where the loop has no
        more than ``LONGEST_LISTED`` samples.
    """
    term = carrier_term(settings, site)
    if not isinstance(term, NoLaw):
        return term.law()
    if not term.reason.startswith("finite pattern") or site.n_samples > LONGEST_LISTED:
        return term
    signal = settings.build(replace(site, notes=[]))
    samples = evaluate({signal: (0, site.n_samples)})[signal]
    return ListedLaw.of(samples, name=term.reason)


def finite_pattern(data: Any, folder: Path) -> tuple[int, str] | None:
    """Return the bits after which data repeat and what they are called, None if they do not."""
    try:
        period: int | None = data.period_bits(folder) if hasattr(data, "period_bits") else None
    except QuantityError:
        return None  # building says what is wrong with the file
    if period is None:
        return None
    return period, str(getattr(data, "sequence", None) or getattr(data, "path", "the pattern"))


def carrier_name(settings: CarrierSettings) -> str:
    """Return what results call a carrier: ``qpsk, root raised cosine 0.22``."""
    words = [settings.constellation.name]
    if settings.stagger:
        words.insert(0, "staggered")
    if settings.rotation is not None:
        words.insert(0, f"{settings.rotation}-turned")
    kind = type(settings.pulse).__name__
    shape = "".join(f" {one.lower()}" if one.isupper() else one for one in kind).strip()
    roll_off = getattr(settings.pulse, "roll_off", None)
    return " ".join(words) + f", {shape}" + (f" {roll_off:g}" if roll_off is not None else "")


def _is_even(levels: np.ndarray[Any, np.dtype[np.float64]]) -> bool:
    ordered = np.unique(levels.round(9))
    return bool(np.allclose(ordered, -ordered[::-1], atol=1e-8))
