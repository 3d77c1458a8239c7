"""What a recipe says of the bench: the path, its ratings, and the generator's limits."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Literal

from annotated_types import Ge, Gt, Le, MinLen

from wavegen.core.units import QuantityError

Role = Literal[
    "generator",
    "cable",
    "driver",
    "attenuator",
    "coupler",
    "device",
    "load",
    "sensor",
    "analyser",
]
_ONLY_OF: dict[str, Role] = {
    "energy_limit": "sensor",
    "video_bandwidth": "sensor",
    "input_attenuation": "analyser",
    "mixer_limit": "analyser",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class PathStage:
    """One piece of hardware between the generator and whatever ends the path.

    Parameters
    ----------
    name : str
        What messages and the sidecar call it.
    role : str, optional
        What it is; exactly one stage of a path is the ``device``.
    gain_db : float
        Output over input power, dB; negative where it loses.
    average_limit_dbm, peak_limit_dbm : float, optional
        Ratings at its input, dBm: of average power and of peak envelope power.
    vswr : float, optional
        Largest voltage standing wave ratio at its input.
    energy_limit_j : float, optional
        Of a sensor: the energy of one pulse that it bears, J.
    video_bandwidth_hz : float, optional
        Of a sensor: the bandwidth within which it follows the power, Hz.
    input_attenuation_db : float
        Of an analyser: what is set before its mixer, dB.
    mixer_limit_dbm : float, optional
        Of an analyser: the largest peak envelope power at its mixer, dBm.
    """

    name: str
    role: Role | None = None
    gain_db: float = 0.0
    average_limit_dbm: float | None = None
    peak_limit_dbm: float | None = None
    vswr: Annotated[float, Ge(1)] | None = None
    energy_limit_j: Annotated[float, Gt(0)] | None = None
    video_bandwidth_hz: Annotated[float, Gt(0)] | None = None
    input_attenuation_db: Annotated[float, Ge(0)] = 0.0
    mixer_limit_dbm: float | None = None

    def __post_init__(self) -> None:
        """Refuse a rating that this kind of hardware does not have."""
        given = {
            "energy_limit": self.energy_limit_j is not None,
            "video_bandwidth": self.video_bandwidth_hz is not None,
            "input_attenuation": self.input_attenuation_db != 0.0,
            "mixer_limit": self.mixer_limit_dbm is not None,
        }
        for key, role in _ONLY_OF.items():
            if given[key] and self.role != role:
                raise QuantityError(
                    problem=f"{key} is given for the role {self.role or 'that is not said'}",
                    allowed=f"{key} of the role {role}",
                    remedy=f"Give role: {role}, or leave {key} out.",
                    key=key,
                )


@dataclass(frozen=True, slots=True, kw_only=True)
class Generator:
    """What the generator that plays the file can take.

    Parameters
    ----------
    average_limit_dbm, peak_limit_dbm : float, optional
        Largest average and peak envelope power at its output, dBm.
    clock_least_hz, clock_most_hz : float, optional
        Sample rates that it plays, Hz.
    memory_samples : int, optional
        Longest file, samples.
    least_samples : int
        Shortest file, samples.
    granularity_samples : int
        Lengths are whole multiples of it, samples.
    word_bits : int, optional
        Bits of its converter.
    """

    average_limit_dbm: float | None = None
    peak_limit_dbm: float | None = None
    clock_least_hz: Annotated[float, Gt(0)] | None = None
    clock_most_hz: Annotated[float, Gt(0)] | None = None
    memory_samples: Annotated[int, Ge(1)] | None = None
    least_samples: Annotated[int, Ge(1)] = 1
    granularity_samples: Annotated[int, Ge(1)] = 1
    word_bits: Annotated[int, Ge(2), Le(32)] | None = None

    def __post_init__(self) -> None:
        """Refuse bounds that leave nothing."""
        for low, high, key in (
            (self.clock_least_hz, self.clock_most_hz, "clock_most"),
            (self.least_samples, self.memory_samples, "memory"),
        ):
            if low is not None and high is not None and low > high:
                raise QuantityError(
                    problem=f"{high:.10g} lies below the least, {low:.10g}",
                    allowed="the least up to the most",
                    remedy="Exchange or correct them.",
                    key=key,
                )


@dataclass(frozen=True, slots=True, kw_only=True)
class Bench:
    """The powers on the bench, from which every rating in the path is checked.

    Parameters
    ----------
    average_power_at_device_dbm : float
        Average power at the input of the device, dBm.
    averaged_over : {"period", "burst"}
        Whether that is the average over the whole loop or while a burst is on.
    impedance_ohm : float
        Of the system, ohm.
    level_uncertainty_db : float
        By how much levels may lie higher than they are set, dB; kept free below every rating.
    overshoot_db : float
        By how much a peak may stand higher while levels settle, dB; kept free below peak ratings.
    generator : Generator, optional
        What the generator takes.
    path : tuple of PathStage
        From the generator on, in order.
    """

    average_power_at_device_dbm: float
    averaged_over: Literal["period", "burst"] = "period"
    impedance_ohm: Annotated[float, Gt(0)] = 50.0
    level_uncertainty_db: Annotated[float, Ge(0), Le(20)] = 0.0
    overshoot_db: Annotated[float, Ge(0), Le(20)] = 0.0
    generator: Generator | None = None
    path: Annotated[tuple[PathStage, ...], MinLen(1)]

    def __post_init__(self) -> None:
        """Refuse a path without exactly one device, and names that cannot be told apart."""
        count = sum(stage.role == "device" for stage in self.path)
        if count != 1:
            raise QuantityError(
                problem=f"{count or 'no'} stages of the path have the role device",
                allowed="exactly one",
                remedy="Give role: device to the stage that is tested."
                if not count
                else "Keep role: device on the stage that is tested; call the others driver.",
                key="path",
            )
        names = [stage.name for stage in self.path]
        for number, name in enumerate(names):
            if name in names[:number]:
                raise QuantityError(
                    problem=f"two stages are called {name!r}",
                    allowed="a name of its own for each stage",
                    remedy="Rename one of them.",
                    key=f"path[{number}].name",
                )
