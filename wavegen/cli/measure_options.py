"""Arguments of `wavegen measure`, and what they ask for."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING, Any

from wavegen.cli.options import level_dbm, rate, ratio_db
from wavegen.core.errors import ArgumentsError
from wavegen.core.timespan import TimeSpan
from wavegen.core.units import QuantityError, split_quantity

if TYPE_CHECKING:
    from wavegen.production.measure_settings import (
        AskedLevel,
        GateSettings,
        MeasureSettings,
        SensorSettings,
    )

SHAPES = {"one-pole": "one_pole", "brick-wall": "brick_wall"}
LEVEL_UNITS = ("dB", "dBFS", "dBm")


def probability(text: str) -> float:
    """Read a probability such as ``0.0001`` or ``0.01%``.

    Raises
    ------
    argparse.ArgumentTypeError
        None from 1e-15 to below 1.
    """
    try:
        number, unit = split_quantity(text)
    except QuantityError as error:
        raise argparse.ArgumentTypeError(str(error)) from error
    value = float(number) / (100 if unit == "%" else 1)
    if unit not in {"", "%"} or not 1e-15 <= value < 1:
        message = (
            f"{text!r} is no probability; allowed: from 1e-15 to below 1, such as 0.0001 or 0.01%"
        )
        raise argparse.ArgumentTypeError(message)
    return value


def level(text: str) -> tuple[float, str]:
    """Read a level such as ``6dB`` (over the mean), ``-20dBFS`` or ``10dBm``.

    Raises
    ------
    argparse.ArgumentTypeError
        None of the three, or beyond 300 dB.
    """
    try:
        number, unit = split_quantity(text)
    except QuantityError as error:
        raise argparse.ArgumentTypeError(str(error)) from error
    if unit not in LEVEL_UNITS or abs(number) > 300:
        message = f"{text!r} is no level; allowed: 6dB over the mean, -20dBFS, or 10dBm"
        raise argparse.ArgumentTypeError(message)
    return float(number), unit


def span(text: str) -> TimeSpan:
    """Read a time such as ``10ms``, or ``4096 samples``.

    Raises
    ------
    argparse.ArgumentTypeError
        Neither, or a negative one.
    """
    try:
        found = TimeSpan.parse(text)
    except QuantityError as error:
        raise argparse.ArgumentTypeError(str(error)) from error
    if found.value < 0:
        message = f"{text!r} is negative; allowed: from 0. Write it like 10ms or 4096samples."
        raise argparse.ArgumentTypeError(message)
    return found


def gate(text: str) -> str:
    """Read ``auto``, ``markers``, or a pattern of slots such as ``11000000``.

    Raises
    ------
    argparse.ArgumentTypeError
        None of these.
    """
    is_pattern = set(text) == {"0", "1"} and len(text) <= 10_000
    if text not in {"auto", "markers"} and not is_pattern:
        message = (
            f"{text[:40]!r} is no gate; allowed: auto, markers, or a pattern of slots with both "
            "1 (on) and 0 (off), such as 11000000"
        )
        raise argparse.ArgumentTypeError(message)
    return text


def add_part(parser: argparse.ArgumentParser) -> None:
    """Declare which part of a file is meant, and whether it repeats."""
    group = parser.add_argument_group("which part, and whether it repeats")
    group.add_argument(
        "--from", dest="first", type=span, metavar="AT", help="first sample: 10ms or 4096samples"
    )
    group.add_argument(
        "--to", dest="stop", type=span, metavar="AT", help="where to stop (not included)"
    )
    loops = group.add_mutually_exclusive_group()
    loops.add_argument("--loop", action="store_true", help="the file repeats as a whole")
    loops.add_argument(
        "--period",
        type=span,
        metavar="TIME",
        help="it repeats after this time or number of samples: one period is measured",
    )


def add_levels(parser: argparse.ArgumentParser) -> None:
    """Declare which levels are wanted."""
    group = parser.add_argument_group("levels")
    group.add_argument(
        "--at",
        type=probability,
        action="append",
        default=[],
        metavar="PROBABILITY",
        help="show the level exceeded with this probability too: 0.0001 or 0.01%%; repeatable",
    )
    group.add_argument(
        "--above",
        type=level,
        action="append",
        default=[],
        metavar="LEVEL",
        help="show the percentage of time above and below: 6dB over the mean, -20dBFS or 10dBm; "
        "repeatable",
    )
    group.add_argument(
        "--reference-level",
        type=level_dbm,
        metavar="LEVEL",
        help="power at 0 dBFS, such as -20dBm: levels are shown in dBm too",
    )
    group.add_argument(
        "--rf",
        action="store_true",
        help="show the levels of the RF waveform beside those of its envelope (a file of real "
        "samples shows them anyway)",
    )
    group.add_argument(
        "--remove-dc", action="store_true", help="take a DC offset off first, and say how large"
    )
    group.add_argument(
        "--no-faults",
        action="store_true",
        help="do not look for faults of a recording, which takes half of the time",
    )


def add_gate(parser: argparse.ArgumentParser) -> None:
    """Declare the gate."""
    group = parser.add_argument_group("gating: the on-time measured apart, beside all of the time")
    group.add_argument(
        "--gate",
        type=gate,
        metavar="HOW",
        help="auto (bursts found by level), markers (those of the file), or a pattern of slots, "
        "1 on and 0 off, such as 11000000",
    )
    group.add_argument(
        "--threshold",
        type=ratio_db,
        metavar="LEVEL",
        help="auto: a burst begins here, over the on-level, such as -10dB (below 0; default: "
        "halfway between floor and top)",
    )
    group.add_argument(
        "--hysteresis",
        type=ratio_db,
        metavar="LEVEL",
        help="auto: it ends this far below the threshold (default: 3dB, less for low contrast)",
    )
    group.add_argument(
        "--dead-time",
        type=span,
        metavar="TIME",
        help="auto: shorter gaps do not end a burst (default: one window)",
    )
    group.add_argument(
        "--shortest-burst",
        type=span,
        metavar="TIME",
        help="auto: shorter bursts do not count (default: half a window)",
    )
    group.add_argument(
        "--gate-window",
        type=span,
        metavar="TIME",
        help="auto: power is averaged over this before it is compared (default: 16 to 4096 "
        "samples, the first that tells on from off)",
    )
    group.add_argument(
        "--edges",
        choices=("moved", "crossing"),
        help="auto: moved inwards for what the window adds (default), or where it crosses",
    )
    group.add_argument(
        "--guard",
        type=span,
        metavar="TIME",
        help="left out at both ends of each burst, for its ramps (default: auto half a window, "
        "else nothing)",
    )
    group.add_argument("--marker", metavar="LABEL", help="markers: only those of this label")
    group.add_argument("--slot", type=span, metavar="TIME", help="pattern: length of a slot")
    group.add_argument(
        "--gate-delay", type=span, metavar="TIME", help="pattern: where its first slot begins"
    )
    group.add_argument(
        "--bursts",
        choices=("pooled", "each"),
        help="pooled over their common mean (default), or each over its own mean too",
    )


def add_sensor(parser: argparse.ArgumentParser) -> None:
    """Declare the sensor."""
    group = parser.add_argument_group("what a power sensor would read")
    group.add_argument(
        "--video-bandwidth",
        type=rate,
        metavar="WIDTH",
        help="of the filter behind its detector, such as 5MHz; up to half the sample rate",
    )
    group.add_argument(
        "--video-shape",
        choices=tuple(SHAPES),
        help="of that filter (default: one-pole, -3 dB at the bandwidth)",
    )
    group.add_argument(
        "--sensor-rate",
        type=rate,
        metavar="RATE",
        help="rate of its readings, below the sample rate (default: that of the samples)",
    )


_NEEDS = {
    "threshold": ("--gate auto", "auto"),
    "hysteresis": ("--gate auto", "auto"),
    "dead_time": ("--gate auto", "auto"),
    "shortest_burst": ("--gate auto", "auto"),
    "gate_window": ("--gate auto", "auto"),
    "edges": ("--gate auto", "auto"),
    "marker": ("--gate markers", "markers"),
    "slot": ("--gate with a pattern", "pattern"),
    "gate_delay": ("--gate with a pattern", "pattern"),
    "guard": ("--gate", ""),
    "bursts": ("--gate", ""),
}


def settings_of(arguments: argparse.Namespace) -> MeasureSettings:
    """Return what the options ask for.

    Raises
    ------
    ArgumentsError
        Options that do not go together.
    """
    from wavegen.production.measure_settings import AskedLevel, MeasureSettings

    asked: list[AskedLevel] = [
        AskedLevel(level_db=value, unit=unit) for value, unit in arguments.above
    ]
    return MeasureSettings(
        probabilities=tuple(arguments.at),
        above=tuple(asked),
        gate=gate_of(arguments),
        sensor=_sensor_of(arguments),
        removes_offset=arguments.remove_dc,
        finds_faults=not arguments.no_faults,
        shows_rf=arguments.rf,
    )


def gate_of(arguments: argparse.Namespace) -> GateSettings | None:
    """Return the gate that the options of :func:`add_gate` ask for.

    Raises
    ------
    ArgumentsError
        Options that do not go together.
    """
    from wavegen.production.measure_settings import NO_TIME, GateSettings

    how = arguments.gate
    kind = how if how in {None, "auto", "markers"} else "pattern"
    for name, (needed, wanted) in _NEEDS.items():
        if getattr(arguments, name) is not None and (kind is None or wanted not in {"", kind}):
            given = "without --gate" if kind is None else f"with --gate {how[:20]}"
            option = f"--{name.replace('_', '-')}"
            raise _misfit(where=option, problem=f"means nothing {given}", needed=needed)
    if kind is None:
        return None
    if kind == "pattern" and arguments.slot is None:
        text = "is a pattern whose slots have no length"
        raise _misfit(where="--gate", problem=text, needed="--slot, such as 0.5ms")
    by: Any = {"auto": "level"}.get(kind, kind)
    return GateSettings(
        by=by,
        window=arguments.gate_window,
        threshold_db=arguments.threshold,
        hysteresis_db=arguments.hysteresis,
        edges=arguments.edges or "moved",
        dead_time=arguments.dead_time,
        shortest=arguments.shortest_burst,
        guard=arguments.guard,
        label=arguments.marker or "",
        pattern=how if kind == "pattern" else "",
        slot=arguments.slot,
        delay=arguments.gate_delay or NO_TIME,
        each=arguments.bursts == "each",
    )


def _sensor_of(arguments: argparse.Namespace) -> SensorSettings | None:
    from wavegen.production.measure_settings import SensorSettings

    width, sensor_rate = arguments.video_bandwidth, arguments.sensor_rate
    if arguments.video_shape is not None and width is None:
        needed = "--video-bandwidth, such as 5MHz"
        raise _misfit(where="--video-shape", problem="shapes no filter", needed=needed)
    if width is None and sensor_rate is None:
        return None
    shape: Any = SHAPES[arguments.video_shape or "one-pole"]
    return SensorSettings(
        video_bandwidth_hz=None if width is None else float(width),
        shape=shape,
        sensor_rate_hz=sensor_rate,
    )


def _misfit(*, where: str, problem: str, needed: str) -> ArgumentsError:
    return ArgumentsError(
        where=where,
        problem=problem,
        allowed=f"{where} together with {needed}",
        remedy=f"Add {needed}, or leave {where} out.",
    )
