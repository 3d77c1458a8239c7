"""A single carrier: symbols of a constellation through a pulse."""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace
from fractions import Fraction
from functools import cached_property
from pathlib import Path
from typing import Annotated, Any, Protocol

import numpy as np
from annotated_types import Gt
from numpy.typing import NDArray

from wavegen.core.evaluate import repeat
from wavegen.core.registry import Member
from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.site import Cycle, Note, Site, samples_per
from wavegen.core.units import QuantityError, format_hz
from wavegen.dsp.arrival import Arrival
from wavegen.dsp.pulse import (
    Pulse,
    PulseSettings,
    Stretched,
    mean_energy,
    residual_evm_percent,
)
from wavegen.dsp.pulse_shaping import Shaper, plan_shaping
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.dsp.pulses.taps import MOST_TAPS, Taps
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term
from wavegen.sources.carrier_law import carrier_law, carrier_term
from wavegen.sources.carrier_reception import JoinedRails, match
from wavegen.sources.data.random import Random
from wavegen.sources.differential import integrate, phase_steps
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.reception import Reception, SymbolClass
from wavegen.sources.rotation import Rotation
from wavegen.sources.small_file import read_numbers
from wavegen.sources.worst_run import Planted, peak_db, worst_run

DOUBTFUL_EVM_PERCENT = 0.1
"""A cut pulse that leaves more interference than this is worth a warning."""

LARGEST_TABLE = 1 << 20
"""Turned points that are kept at hand."""


class SymbolNumbers(Protocol):
    """Symbol numbers by index: what settings of data give when bound to a site."""

    def words(self, first: int, count: int) -> NDArray[np.unsignedinteger]:
        """Return words whose low bits number the symbols ``first ...``."""


def _default_pulse() -> RootRaisedCosine:
    return RootRaisedCosine(roll_off=0.22)


@dataclass(frozen=True, slots=True, kw_only=True)
class SingleCarrier:
    """Settings of a pulse-shaped single carrier.

    Parameters
    ----------
    constellation : Constellation
        Points of the symbols.
    symbol_rate_hz : Fraction
        Exact, above 0; what the pulse occupies must fit into the sample rate.
    pulse : member of PULSES
        Shape of a symbol; a root raised cosine of roll-off 0.22 if not given.
    data : member of DATA
        Where the symbols come from; random if not given.
    rotation : Rotation, optional
        Angle by which each symbol is turned over the one before: ``pi/4``, ``3 pi/8``. The loop
        holds whole turns.
    stagger : bool
        Whether the Q rail is late by half a symbol: offset QPSK. The constellation must be a
        grid: any point of one rail with any of the other.
    differential : bool
        Whether each symbol turns the last one by the angle from point 0 to its own point: with a
        rotation of ``pi/4``, QPSK is pi/4-DQPSK. The points must lie on one circle at equal
        distances. Where the data of a loop do not add up to whole turns, its last symbol makes
        up for it, which is noted; random data are drawn as phases and always close.
    worst_case : bool
        Whether the run of symbols with the highest peak that the carrier can have stands in the
        middle of the loop: random data, neither staggered nor differential.

    Notes
    -----
    With the default root raised cosine the untouched carrier shows an EVM below 0.01 % behind a
    matched filter at roll-offs from 0.05 to 1, and its spectrum, seam included, lies below
    -120 dB of the passband 0.2 symbol rates beyond the band edge (roll-off 0.22; measured on the
    average -134 dB, tested in ``tests/sources/test_single_carrier.py``). Samples a symbol are
    phases: at four of them the CCDF of the samples differs from continuous time by up to 0.1 dB
    (QPSK, roll-off 0.5).
    """

    constellation: Constellation
    symbol_rate_hz: Annotated[Fraction, Gt(0)]
    pulse: Annotated[Any, Member(("pulse",))] = field(default_factory=_default_pulse)
    data: Annotated[Any, Member(("data",), default="random")] = field(default_factory=Random)
    rotation: Rotation | None = None
    stagger: bool = False
    differential: bool = False
    worst_case: bool = False

    def __post_init__(self) -> None:
        """Refuse what has no meaning together."""
        for key, is_set in (("rotation", self.rotation), ("differential", self.differential)):
            if self.stagger and is_set:
                raise QuantityError(
                    problem=f"stagger is asked together with {key}",
                    allowed="one of the two: a staggered constellation stays where it is",
                    remedy=f"Remove stagger or {key}.",
                    key="stagger",
                )
        if self.worst_case and (self.stagger or self.differential):
            raise QuantityError(
                problem="worst_case is asked together with stagger or differential",
                allowed="carriers whose symbols are the points of their data",
                remedy="Remove worst_case, or the other.",
                key="worst_case",
            )

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return the shortest loop: the fewest samples that hold whole symbols and turns."""
        return self._whole(sample_rate_hz, 1 if self.rotation is None else self.rotation.period)

    def data_cycle(
        self, sample_rate_hz: Fraction, path: str, folder: Path = Path()
    ) -> Cycle | None:
        """Return the shortest loop that also holds whole periods of the data.

        Parameters
        ----------
        sample_rate_hz : Fraction
            Hz.
        path : str
            Path in the recipe, for messages.
        folder : Path
            What the paths of a recipe are relative to.

        Returns
        -------
        Cycle or None
            None for data without a period.

        Raises
        ------
        RecipeError
            Data from a file that cannot be read.
        """
        site = Site(sample_rate_hz=sample_rate_hz, n_samples=1, seed=0, label=path, path=path)
        try:
            period = self.data.period_bits(folder)
        except QuantityError as error:
            raise _at(site, "data.path", error) from error
        if period is None:
            return None
        n_bits = self.constellation.n_bits
        n_symbols = period // math.gcd(period, n_bits)
        cycle = self._whole(
            sample_rate_hz, math.lcm(n_symbols, self.rotation.period if self.rotation else 1)
        )
        return replace(cycle, n_data_periods=cycle.n_symbols * n_bits // period)

    def _whole(self, sample_rate_hz: Fraction, multiple: int) -> Cycle:
        """Return the shortest loop of so many symbols or a multiple of them."""
        a, b = samples_per(self.symbol_rate_hz, sample_rate_hz)
        n_symbols = math.lcm(b, multiple)
        return Cycle(n_samples=n_symbols // b * a, n_symbols=n_symbols)

    def build(self, site: Site) -> ShapedCarrier:
        """Return the carrier, cyclic over the loop of the site, of unit mean power.

        Raises
        ------
        RecipeError
            The pulse occupies more than the sample rate, or is given by taps that are all zero,
            that cannot be read, or that the sample rate, no whole multiple of the symbol rate,
            falls between; a constellation that cannot be staggered or encoded differentially.
        """
        a, b = samples_per(self.symbol_rate_hz, site.sample_rate_hz)
        settings: PulseSettings = self.pulse
        if isinstance(settings, Taps):
            settings = _with_taps(settings, site)
        pulse = settings.design(Fraction(a, b))
        rate_of_axis = self.symbol_rate_hz * (2 if self.stagger else 1)
        n_samples, n_symbols = samples_per(rate_of_axis, site.sample_rate_hz)
        self._check(site, pulse, n_symbols)
        ideal = self._symbols(site, site.n_samples * b // a)
        if self.worst_case:
            ideal = self._with_worst_run(site, ideal, pulse, (a, b))
        inputs: tuple[Signal, ...] = (ideal,)
        if self.stagger:
            pulse = Stretched.of(pulse)
            period = 2 * ideal.n_samples
            inputs = (Rails(sample_rate_hz=rate_of_axis, n_samples=period, inputs=inputs),)
        return ShapedCarrier(
            sample_rate_hz=site.sample_rate_hz,
            n_samples=site.n_samples,
            step=_shaper(pulse, n_samples, n_symbols, inputs[0].n_samples).step,
            inputs=inputs,
            pulse=pulse,
            ratio=(n_samples, n_symbols),
        )

    def law(self, site: Site) -> Law | NoLaw:
        """Return the law of the envelope at the instants that samples fall on.

        Notes
        -----
        Over seeds for independent symbols; the exact curve for a short pattern.
        """
        return carrier_law(self, site)

    def term(self, site: Site) -> Term | NoLaw:
        """Return what the carrier is to a composite."""
        return carrier_term(self, site)

    def _symbols(self, site: Site, period: int) -> Symbols:
        """Return the points sent, encoded and turned."""
        points = self.constellation.points
        if self.stagger and not _is_grid(points):
            raise site.error(
                key="stagger",
                problem=f"{self.constellation.name} is not made of two independent rails",
                allowed="qpsk, square QAM, or a grid of own points with two rails of equal power",
                remedy="Choose such a constellation, or remove stagger.",
            )
        turns = self.rotation.period if self.rotation else 1
        if turns * points.size > LARGEST_TABLE:
            raise site.error(
                key="rotation",
                problem=f"{turns} turns of {points.size} points",
                allowed=f"up to {LARGEST_TABLE} turned points",
                remedy="Choose a rotation that comes round sooner.",
            )
        n_bits = self.constellation.n_bits
        numbers: SymbolNumbers = self.data.bind(site, n_bits=n_bits, period=period)
        constellation = self.constellation
        if self.differential:
            steps = phase_steps(points)
            if steps is None:
                raise site.error(
                    key="differential",
                    problem=f"{self.constellation.name} does not turn a phase by equal steps",
                    allowed="phase-shift keying: points on one circle at equal distances",
                    remedy="Choose bpsk, qpsk or 8psk, or remove differential.",
                )
            circle = points[0] * np.exp(2j * np.pi * np.arange(points.size) / points.size)
            constellation = Constellation("points", circle)
            if not isinstance(self.data, Random):
                numbers = _integrated(site, numbers, steps, period)
        return Symbols(
            sample_rate_hz=self.symbol_rate_hz,
            n_samples=period,
            constellation=constellation,
            numbers=numbers,
            rotation=self.rotation,
        )

    def _with_worst_run(
        self, site: Site, ideal: Symbols, pulse: Pulse, ratio: tuple[int, int]
    ) -> Symbols:
        length = 2 * pulse.span_symbols + 1
        if not isinstance(self.data, Random) or ideal.n_samples < 2 * length:
            is_random = isinstance(self.data, Random)
            raise site.error(
                key="worst_case",
                problem=f"a run of {length} symbols in a loop of {ideal.n_samples}"
                if is_random
                else "a pattern would be broken by it",
                allowed="random data, in loops of twice the run",
                remedy="Lengthen the loop." if is_random else "Remove worst_case or the data.",
            )
        turn = 0.0 if self.rotation is None else 2 * math.pi * float(self.rotation.turns)
        run = worst_run(
            pulse,
            ideal.constellation.points,
            ratio=ratio,
            n_symbols=ideal.n_samples,
            turn_rad=turn,
        )
        mean = mean_energy(pulse, per_symbol=ratio[0], period_symbols=ideal.n_samples)
        text = (
            f"the highest peak that the carrier can have, {peak_db(run.amplitude, mean):.2f} dB "
            f"over its mean, stands at sample {run.sample}: {length} symbols from symbol "
            f"{run.first} on are no random data."
        )
        site.notes.append(Note(kind="info", where=f"{site.path}.worst_case", text=text))
        return replace(ideal, numbers=Planted(numbers=ideal.numbers, run=run))

    def _check(self, site: Site, pulse: Pulse, n_symbols: int) -> None:
        rate, symbol_rate = site.sample_rate_hz, self.symbol_rate_hz
        if pulse.is_sampled and n_symbols != 1:
            raise site.error(
                key="pulse.taps",
                problem=f"{float(rate / symbol_rate):.10g} samples a symbol fall between the taps",
                allowed=f"sample rates that are {'even' if self.stagger else 'whole'} multiples "
                f"of the symbol rate, {format_hz(symbol_rate)}",
                remedy="Choose such a sample rate, or a pulse with a formula.",
            )
        values = pulse.on_lattice(math.floor(rate / symbol_rate)) if pulse.is_sampled else None
        if values is not None and not (np.isfinite(values).all() and values.any()):
            raise site.error(
                key="pulse.taps",
                problem="the taps carry no energy, or no finite one",
                allowed="finite numbers, not all zero",
                remedy="Give the samples of a pulse.",
            )
        occupied = (2 * pulse.half_band if pulse.half_band else 1.0) * symbol_rate
        if occupied > rate:
            shape = f" with roll-off {2 * pulse.half_band - 1:.10g}" if pulse.half_band else ""
            raise site.error(
                key="symbol_rate",
                problem=f"{format_hz(symbol_rate)}{shape} occupies {format_hz(occupied)}",
                allowed=f"up to the sample rate, {format_hz(rate)}",
                remedy="Lower the symbol rate.",
            )
        left = residual_evm_percent(pulse) if pulse.is_matched else 0.0
        if left > DOUBTFUL_EVM_PERCENT:
            text = (
                f"cut at {pulse.span_symbols} symbols to each side, the pulse leaves an EVM of "
                f"{left:.2g} % behind its matched filter; a longer span or a larger roll-off "
                "leaves less."
            )
            site.notes.append(Note(kind="warning", where=f"{site.path}.pulse", text=text))


def _at(site: Site, key: str, error: QuantityError) -> Exception:
    return site.error(key=key, problem=error.problem, allowed=error.allowed, remedy=error.remedy)


def _with_taps(settings: Taps, site: Site) -> Taps:
    """Return taps that stand in the settings, read from their file if need be."""
    if settings.file is None:
        return settings
    try:
        taps = read_numbers(site.folder / settings.file, most=MOST_TAPS)
    except QuantityError as error:
        raise _at(site, "pulse.file", error) from error
    return replace(settings, taps=taps, file=None)


def _is_grid(points: NDArray[np.complex128]) -> bool:
    """Return whether points pair every level of one rail with every one of the other."""
    places = points.round(9)
    levels = np.unique(places.real), np.unique(places.imag)
    is_full = levels[0].size * levels[1].size == np.unique(places).size == points.size
    is_even = abs(float(np.mean(points.real**2) - np.mean(points.imag**2))) < 1e-9
    return is_full and is_even


def _integrated(
    site: Site, numbers: SymbolNumbers, steps: NDArray[np.uint16], period: int
) -> SymbolNumbers:
    """Return the phases that data turn to, with a note where the last symbol closes the loop."""
    states = integrate(numbers, steps, period)
    if states.residue:
        text = (
            f"the data of the loop do not add up to whole turns: its last symbol turns by "
            f"{states.residue}/{steps.size} of a turn more than its data say."
        )
        where = f"{site.path}.differential"
        site.notes.append(Note(kind="warning", where=where, text=text))
    return states


@dataclass(frozen=True, eq=False, kw_only=True)
class Symbols(Signal):
    """The points sent, one sample a symbol: the reference of an EVM.

    Parameters
    ----------
    constellation : Constellation
        Points, of unit mean power.
    numbers : SymbolNumbers
        Which of them.
    rotation : Rotation, optional
        Angle from symbol to symbol; symbol 0 is not turned.
    """

    constellation: Constellation
    numbers: SymbolNumbers
    rotation: Rotation | None = None

    @cached_property
    def turned(self) -> tuple[Samples, NDArray[np.intp]]:
        """Points after each turn of the rotation, one after the other, and where each starts."""
        turns = np.ones(1) if self.rotation is None else self.rotation.factors
        points = self.constellation.points
        table = (turns[:, None] * points).astype(np.complex64)
        return table.ravel(), np.arange(turns.size) * points.size

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return the points of symbols ``[start, stop)``."""
        words = self.numbers.words(start, stop - start)
        if self.rotation is None:
            return self.constellation.wide.take(words)
        table, origins = self.turned
        places = repeat(origins, start, stop)
        places += words & words.dtype.type(self.constellation.points.size - 1)
        return table.take(places)


@dataclass(frozen=True, eq=False, kw_only=True)
class Rails(Signal):
    """The rails of symbols in turn, two samples a symbol: I, then Q half a symbol later.

    Notes
    -----
    Scaled by ``sqrt(2)``: each rail of a symbol of unit power has power 1/2.
    """

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range of symbols that hold these rails."""
        return ((start // 2, -(-stop // 2)),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return rails ``[start, stop)``."""
        symbols = arrays[0]
        rails = np.zeros(2 * symbols.size, np.complex64)
        rails.real[0::2] = symbols.real
        rails.imag[1::2] = symbols.imag
        rails *= np.float32(math.sqrt(2.0))
        return rails[start % 2 : start % 2 + stop - start]


@dataclass(frozen=True, eq=False, kw_only=True)
class ShapedCarrier(Signal):
    """Symbols through a pulse; sample 0 stands at the instant of symbol 0.

    Parameters
    ----------
    pulse : Pulse
        Shape of a symbol, on any scale.
    ratio : (int, int)
        Samples and symbols (half symbols where staggered) of the shortest cycle.
    """

    pulse: Pulse
    ratio: tuple[int, int]

    @property
    def ideal(self) -> Signal:
        """Return the symbols sent, a signal on the symbol axis."""
        source = self.inputs[0]
        return source.inputs[0] if isinstance(source, Rails) else source

    def receive(
        self, conditioned: Signal, arrival: Arrival, *, early_samples: int | None = None
    ) -> Reception:
        """Return the symbols sent and those behind the matched filter.

        Parameters
        ----------
        conditioned : Signal
            What a receiver gets, at the sample rate of this carrier.
        arrival : Arrival
            How the carrier stands in it.
        early_samples : int, optional
            Nothing to a single carrier.

        Returns
        -------
        Reception
            Rotated and differential symbols are compared as they were sent, phase included. A
            pulse that leaves interference behind its matched filter by nature is compared with
            what the same filter makes of the untouched carrier.

        Raises
        ------
        SignalError
            Symbols fall between samples and the pulse is not band-limited.
        """
        source, pulse, ratio = self.inputs[0], self.pulse, self.ratio
        matched = match(conditioned, arrival, pulse=pulse, ratio=ratio, axis=source)
        expected, symbols, remarks = source, self.ideal, arrival.remarks
        if not pulse.is_matched:
            still = Arrival(n_samples=self.n_samples)
            expected = match(self, still, pulse=pulse, ratio=ratio, axis=source)
            text = "the reference is the untouched carrier behind the same filter"
            remarks = (*remarks, text)
        name = getattr(getattr(symbols, "constellation", None), "name", "symbols")
        classes = (SymbolClass(name="symbols", constellation=name),)
        if not isinstance(source, Rails):
            return Reception(received=matched, ideal=expected, classes=classes, remarks=remarks)
        joined = [
            JoinedRails(
                sample_rate_hz=symbols.sample_rate_hz,
                n_samples=symbols.n_samples,
                inputs=(rails,),
                mean_power=None,
            )
            for rails in (matched, expected)
        ]
        return Reception(
            received=joined[0],
            ideal=joined[1] if expected is not source else symbols,
            classes=classes,
            rails=(matched, expected),
            remarks=remarks,
        )

    @cached_property
    def shaper(self) -> Shaper:
        """Return what turns ranges of symbols into ranges of samples; made when first used."""
        return _shaper(self.pulse, *self.ratio, self.inputs[0].n_samples)

    def __getstate__(self) -> dict[str, Any]:
        """Leave out what can be made again, so that a worker gets a small description."""
        return {name: value for name, value in self.__dict__.items() if name != "shaper"}

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range of symbols under the pulse of samples ``[start, stop)``."""
        return (self.shaper.needs(start, stop),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Return samples ``[start, stop)``."""
        return self.shaper.shape(start, stop, arrays[0])


def _shaper(pulse: Pulse, n_samples: int, n_symbols: int, period: int) -> Shaper:
    return plan_shaping(pulse, n_samples=n_samples, n_symbols=n_symbols, period_symbols=period)
