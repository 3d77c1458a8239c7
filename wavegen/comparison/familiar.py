"""Families of laws that a curve may look like, each with one parameter to fit."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import Protocol

import numpy as np
import scipy.special
from numpy.typing import NDArray

from wavegen.core.site import Site
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.law import to_db
from wavegen.laws.mapped import clip_law
from wavegen.laws.phasors import phasor_law
from wavegen.laws.term import NoLaw
from wavegen.sources.mapping import MAPPINGS
from wavegen.sources.single_carrier import SingleCarrier

Reals = NDArray[np.float64]
ROLL_OFFS = (0.1, 0.25, 0.5)
CONSTELLATIONS = ("bpsk", "qpsk", "16qam", "64qam")
TONES = (2, 3, 4, 6, 8, 12, 16, 24, 32)
LOWEST_K_DB, HIGHEST_K_DB = -10.0, 30.0
_PER_SYMBOL = 8
"""Instants of a symbol that a carrier's law is averaged over: four leave 0.07 dB at BPSK, eight
0.02 dB (against sixteen)."""
_SYMBOLS = 2048


class Family(Protocol):
    """Laws that differ in one number."""

    @property
    def name(self) -> str:
        """What it is called in results."""

    @property
    def parameter(self) -> str:
        """Name of its number with the unit, as a JSON key; empty if there is none."""

    @property
    def values(self) -> tuple[float, ...]:
        """Values tried first, rising."""

    @property
    def is_continuous(self) -> bool:
        """Whether values between them make sense."""

    def levels(self, value: float, probability: Reals) -> Reals:
        """Return levels at probabilities, dB over the mean."""


@dataclass(frozen=True, slots=True)
class Gaussian:
    """Complex Gaussian noise, which many subcarriers together are nearly too."""

    name: str = "complex Gaussian"
    parameter: str = ""
    values: tuple[float, ...] = (0.0,)
    is_continuous: bool = False

    def levels(self, value: float, probability: Reals) -> Reals:
        """Return levels at probabilities, dB over the mean."""
        return GaussianLaw().level_db(probability)


@dataclass(frozen=True, slots=True)
class GaussianWithCeiling:
    """Complex Gaussian noise clipped to a ceiling over its new mean."""

    name: str = "complex Gaussian with a ceiling"
    parameter: str = "ceiling_db"
    values: tuple[float, ...] = tuple(np.arange(2.0, 12.01, 0.5).tolist())
    is_continuous: bool = True

    def levels(self, value: float, probability: Reals) -> Reals:
        """Return levels at probabilities, dB over the mean."""
        law = clip_law(GaussianLaw(), value)
        assert not isinstance(law, NoLaw)  # noqa: S101 - noise is never zero
        return law.level_db(probability)


@dataclass(frozen=True, slots=True)
class CarrierPlusNoise:
    """A constant envelope with complex Gaussian noise at a ratio of powers K.

    Notes
    -----
    S. O. Rice, Bell System Technical Journal 24, 1945: with the mean power 1 the doubled power
    ``2 (1 + K) p`` is noncentral chi-square with two degrees of freedom and noncentrality ``2 K``.
    """

    name: str = "carrier plus noise"
    parameter: str = "carrier_to_noise_db"
    values: tuple[float, ...] = tuple(np.arange(LOWEST_K_DB, HIGHEST_K_DB + 0.1, 2.0).tolist())
    is_continuous: bool = True

    def levels(self, value: float, probability: Reals) -> Reals:
        """Return levels at probabilities, dB over the mean."""
        ratio = 10 ** (value / 10)
        doubled = scipy.special.chndtrix(1 - probability, 2, 2 * ratio)
        return to_db(doubled / (2 * (1 + ratio)))


@dataclass(frozen=True, slots=True)
class ShapedCarrier:
    """A single carrier with root-raised-cosine pulses, by its roll-off in hundredths."""

    constellation: str
    parameter: str = "roll_off"
    values: tuple[float, ...] = ROLL_OFFS
    is_continuous: bool = True

    @property
    def name(self) -> str:
        """What it is called in results."""
        return f"single carrier, {self.constellation.upper()}"

    def levels(self, value: float, probability: Reals) -> Reals:
        """Return levels at probabilities, dB over the mean."""
        return np.array(
            _carrier_levels(self.constellation, round(value, 2), tuple(probability.tolist()))
        )


@dataclass(frozen=True, slots=True)
class EqualTones:
    """Equal tones with random phases."""

    name: str = "equal tones, random phases"
    parameter: str = "n_tones"
    values: tuple[float, ...] = (1.0, *map(float, TONES))
    is_continuous: bool = False

    def levels(self, value: float, probability: Reals) -> Reals:
        """Return levels at probabilities, dB over the mean."""
        if value == 1:
            return ConstantLaw().level_db(probability)
        return np.array(_tone_levels(int(value), tuple(probability.tolist())))


FAMILIES: tuple[Family, ...] = (
    Gaussian(),
    GaussianWithCeiling(),
    CarrierPlusNoise(),
    *(ShapedCarrier(name) for name in CONSTELLATIONS),
    EqualTones(),
)


@lru_cache(maxsize=256)
def _carrier_levels(
    constellation: str, roll_off: float, probability: tuple[float, ...]
) -> tuple[float, ...]:
    settings = SingleCarrier(
        constellation=MAPPINGS.load(constellation)(),
        symbol_rate_hz=Fraction(1),
        pulse=RootRaisedCosine(roll_off=roll_off),
    )
    site = Site(
        sample_rate_hz=Fraction(_PER_SYMBOL),
        n_samples=_PER_SYMBOL * _SYMBOLS,
        seed=1,
        label="signal",
        path="signal",
    )
    law = settings.law(site)
    assert not isinstance(law, NoLaw)  # noqa: S101 - random data through a pulse have one
    return tuple(law.level_db(np.array(probability)).tolist())


@lru_cache(maxsize=256)
def _tone_levels(count: int, probability: tuple[float, ...]) -> tuple[float, ...]:
    law = phasor_law(np.ones(count), name=f"{count} tones")
    assert not isinstance(law, NoLaw)  # noqa: S101 - equal phasors have one
    return tuple(law.level_db(np.array(probability)).tolist())
