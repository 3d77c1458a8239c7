"""Continuous phase modulation: the symbols turn a carrier of constant envelope."""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace
from fractions import Fraction
from pathlib import Path
from typing import Annotated, Any, Literal

import numpy as np
from annotated_types import Ge, Gt, Le
from numpy.typing import NDArray

from wavegen.core.registry import Member
from wavegen.core.site import Cycle, Note, Site, samples_per
from wavegen.core.units import QuantityError, format_hz
from wavegen.dsp.phase_pulses import (
    PhasePulse,
    four_level_phase,
    gaussian_phase,
    rectangular_phase,
    soqpsk_tg_phase,
)
from wavegen.dsp.phase_tables import states_of
from wavegen.laws.composite import ConstantEnvelopeTerm
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.law import Law
from wavegen.laws.term import NoLaw, Term
from wavegen.sources.carrier_law import SHORTEST_PERIOD, finite_pattern
from wavegen.sources.data.random import Random
from wavegen.sources.phase_signal import PhaseSignal, cell_of
from wavegen.sources.phase_symbols import (
    Encoding,
    PhaseSymbols,
    closing_tail,
    scan,
    start_eighths,
)

Scheme = Literal["msk", "gmsk", "gfsk", "cpfsk", "four_level_fm", "soqpsk_tg", "oqpsk_half_sine"]

MOST_STATES = 10_000
"""Closing a loop may take as many symbols; an index of four decimals needs no more."""

MOST_SCANNED = 1 << 24
"""Symbols of data that are read to find how many of their periods close a loop."""

_FIELDS: dict[str, tuple[tuple[str, ...], tuple[str, ...]]] = {
    "msk": ((), ("differential",)),
    "gmsk": (("bt",), ("differential",)),
    "gfsk": (("bt", "h"), ("levels",)),
    "cpfsk": (("h",), ("levels",)),
    "four_level_fm": ((), ("h",)),
    "soqpsk_tg": ((), ()),
    "oqpsk_half_sine": ((), ()),
}
"""Scheme -> keys it must have, and others that it may have."""

_FIXED: dict[str, dict[str, str]] = {
    "bt": {
        "msk": "its frequency is not filtered",
        "cpfsk": "its frequency is not filtered",
        "four_level_fm": "its filter is a raised cosine of fixed roll-off",
    },
    "levels": {"four_level_fm": "it has four levels"},
    "h": {"msk": "its index is 1/2", "gmsk": "its index is 1/2"},
    "differential": {},
}
"""Why a key does not belong to a scheme, where there is more to say than that it is fixed."""

_NUMBERS = {
    2: np.array([0, 1], np.uint8),
    4: np.array([0, 1, 3, 2], np.uint8),
    8: np.array([0, 1, 3, 2, 7, 6, 4, 5], np.uint8),
}
"""Number of a symbol by word: Gray code from the lowest frequency up, all zeros lowest."""
_FOUR_LEVEL_NUMBERS = np.array([2, 3, 1, 0], np.uint8)
"""01: +3, 00: +1, 10: -1, 11: -3 (TIA-102.BAAA)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class PhaseModulation:
    """Settings of a carrier of constant envelope, modulated in phase without jumps.

    Parameters
    ----------
    scheme : str
        ``msk``, ``gmsk``, ``gfsk``, ``cpfsk``, ``four_level_fm``, ``soqpsk_tg`` or
        ``oqpsk_half_sine``.
    symbol_rate_hz : Fraction
        Exact, above 0: symbols a second; bits for ``soqpsk_tg``, chips for ``oqpsk_half_sine``.
    bt : float, optional
        ``gmsk``, ``gfsk``: bandwidth of the Gaussian filter at -3 dB times the duration of a
        symbol, 0.1 to 10.
    h : Fraction, optional
        ``gfsk``, ``cpfsk``: modulation index, exact, up to 16; neighbouring levels lie ``h``
        symbol rates apart. ``four_level_fm``: 1/4 if not given.
    levels : {2, 4, 8}, optional
        ``gfsk``, ``cpfsk``: frequencies, in Gray code with all zeros the lowest; 2 if not given.
    differential : bool
        ``msk``, ``gmsk``: a bit equal to the one before raises the frequency, another lowers it.
    data : member of DATA
        Where the bits come from; random if not given.

    Notes
    -----
    ``x(t) = exp(j 2 pi h sum_i v_i q(t - i))``, times in symbols, levels ``v`` = +-1, +-3, ...;
    sample 0 stands at the instant of symbol 0, the centre of its frequency pulse (for
    ``oqpsk_half_sine`` the peak of its chip). The phase is whole numbers of 2^-32 turns; the
    index is exact, so that a loop closes exactly. Where random symbols do not add up to that, the
    last ones are chosen so, which a note tells.

    The spectrum has no end, and what lies beyond half the sample rate folds back. MSK, whose
    frequency switches at once, falls slowest: its density lies 36, 48 and 60 dB below its middle
    at 2, 4 and 8 symbol rates from it, which is half of 4, 8 and 16 samples a symbol (closed form
    ``(cos(2 pi f) / (1 - 16 f^2))^2``, S. Pasupathy, IEEE Communications Magazine 17(4), 1979).
    """

    scheme: Scheme
    symbol_rate_hz: Annotated[Fraction, Gt(0)]
    bt: Annotated[float, Ge(0.1), Le(10)] | None = None
    h: Annotated[Fraction, Gt(0), Le(16)] | None = None
    levels: Literal[2, 4, 8] | None = None
    differential: bool = False
    data: Annotated[Any, Member(("data",), default="random")] = field(default_factory=Random)

    def cycle(self, sample_rate_hz: Fraction, path: str) -> Cycle:
        """Return the shortest loop: whole symbols, an even number; of four if differential."""
        return self._whole(sample_rate_hz, 1)

    def data_cycle(
        self, sample_rate_hz: Fraction, path: str, folder: Path = Path()
    ) -> Cycle | None:
        """Return the shortest loop of whole periods of the data over which the phase closes.

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
            None for data without a period. Where they are longer than 2^24 symbols, a loop that
            closes whatever they are.

        Raises
        ------
        RecipeError
            Data from a file that cannot be read.
        """
        site = Site(
            sample_rate_hz=sample_rate_hz, n_samples=1, seed=0, label=path, path=path, folder=folder
        )
        try:
            period = self.data.period_bits(folder)
        except QuantityError as error:
            raise site.error(
                key="data.path",
                problem=error.problem,
                allowed=error.allowed,
                remedy=error.remedy,
            ) from error
        if period is None:
            return None
        n_bits = self._word_bits()
        whole = self._whole(sample_rate_hz, period // math.gcd(period, n_bits)).n_symbols
        n_states = states_of(self._index())
        total = 0  # what the others encode closes by itself
        if self._alphabet()[1] == "plain":
            total = self._scan(site, whole)[1] if whole <= MOST_SCANNED else 1
        cycle = self._whole(sample_rate_hz, whole * (n_states // math.gcd(total, n_states)))
        return replace(cycle, n_data_periods=cycle.n_symbols * n_bits // period)

    def _whole(self, sample_rate_hz: Fraction, multiple: int) -> Cycle:
        """Return the shortest loop of so many symbols or a multiple of them."""
        a, b = samples_per(self.symbol_rate_hz, sample_rate_hz)
        n_symbols = math.lcm(b, multiple, 4 if self.differential else 2)
        return Cycle(n_samples=n_symbols // b * a, n_symbols=n_symbols)

    def build(self, site: Site) -> PhaseSignal:
        """Return the carrier, cyclic over the loop of the site, of unit power at all times.

        Raises
        ------
        RecipeError
            A key that the scheme needs is missing, or one is there that it does not have; the
            index has too large a denominator; the band is wider than the sample rate; data that
            are not random do not close the loop.
        """
        self._check_keys(site)
        index = self._index()
        self._check_size(site, index, self._alphabet()[0][-1])
        n_samples, n_symbols = samples_per(self.symbol_rate_hz, site.sample_rate_hz)
        period = site.n_samples * n_symbols // n_samples
        symbols, total = self._scan(site, period)
        if total % states_of(index):
            symbols = self._close(site, symbols, total, states_of(index))
        return PhaseSignal(
            sample_rate_hz=site.sample_rate_hz,
            n_samples=site.n_samples,
            step=cell_of(n_samples),
            symbols=symbols,
            pulse=self._pulse(),
            index=index,
            start_turns=Fraction(start_eighths(symbols.words, symbols.encoding), 8),
            ratio=(n_samples, n_symbols),
        )

    def law(self, site: Site) -> Law:
        """Return the law of a constant envelope."""
        return ConstantLaw()

    def term(self, site: Site) -> Term | NoLaw:
        """Return what the carrier is to a composite: of constant envelope.

        Notes
        -----
        No law for data that repeat soon: beside another part its phase is no random one then.
        """
        repeats = finite_pattern(self.data, site.folder)
        if repeats is not None and repeats[0] < SHORTEST_PERIOD:
            return NoLaw(reason=f"finite pattern: {repeats[1]} repeats after {repeats[0]} bits")
        stream = getattr(self.data, "share", None) or site.label
        return ConstantEnvelopeTerm(
            name=self.scheme.replace("_", " "),
            data=frozenset({stream if repeats is None else repeats[1]}),
            lowest_probability=0.0 if repeats is None else 10 / repeats[0],
        )

    def _index(self) -> Fraction:
        if self.h is not None:
            return self.h
        return Fraction(1, 4) if self.scheme == "four_level_fm" else Fraction(1, 2)

    def _alphabet(self) -> tuple[tuple[int, ...], Encoding]:
        """Return the levels, ascending, and how data become symbols."""
        if self.scheme == "soqpsk_tg":
            return (-1, 0, 1), "shaped_offset"
        if self.scheme == "oqpsk_half_sine":
            return (-1, 1), "half_sine_offset"
        order = 4 if self.scheme == "four_level_fm" else self.levels or 2
        levels = tuple(range(1 - order, order, 2))
        return levels, "differential" if self.differential else "plain"

    def _word_bits(self) -> int:
        """Return the bits of data that one symbol takes."""
        alphabet, encoding = self._alphabet()
        return (len(alphabet) - 1).bit_length() if encoding == "plain" else 1

    def _scan(self, site: Site, period: int) -> tuple[PhaseSymbols, int]:
        """Return the symbols of a loop of so many, and their levels added up."""
        alphabet, encoding = self._alphabet()
        return scan(
            self.data.bind(site, n_bits=self._word_bits(), period=period),
            encoding=encoding,
            numbers=self._numbers(),
            alphabet=alphabet,
            period=period,
        )

    def _numbers(self) -> NDArray[np.uint8]:
        if self.scheme == "four_level_fm":
            return _FOUR_LEVEL_NUMBERS
        return _NUMBERS[self.levels or 2]

    def _pulse(self) -> PhasePulse:
        if self.bt is not None:
            return gaussian_phase(self.bt)
        if self.scheme == "soqpsk_tg":
            return soqpsk_tg_phase()
        if self.scheme == "four_level_fm":
            return four_level_phase()
        # a chip of half a sine peaks where the turn that leads to it ends
        return rectangular_phase(-0.5 if self.scheme == "oqpsk_half_sine" else 0.0)

    def _check_keys(self, site: Site) -> None:
        needed, others = _FIELDS[self.scheme]
        for key in needed:
            if getattr(self, key) is None:
                example = {"bt": "0.3", "h": "1/2"}[key]
                raise site.error(
                    key=key,
                    problem=f"{self.scheme} has no {key}",
                    allowed=f"{self.scheme} with {' and '.join(needed)}",
                    remedy=f"Add it, such as {key}: {example}.",
                )
        for key, reasons in _FIXED.items():
            value = getattr(self, key)
            if key in needed or key in others or value is None or value is False:
                continue
            has = [*needed, *others]
            raise site.error(
                key=key,
                problem=f"{self.scheme} takes no {key}: "
                f"{reasons.get(self.scheme, 'the scheme has none to choose')}",
                allowed=f"{self.scheme} with {' and '.join(has)}" if has else "none of its own",
                remedy=f"Remove {key}, or choose a scheme that has it.",
            )

    def _check_size(self, site: Site, index: Fraction, highest: int) -> None:
        if states_of(index) > MOST_STATES:
            raise site.error(
                key="h",
                problem=f"{index} leaves {states_of(index)} different phases between symbols",
                allowed=f"ratios that leave up to {MOST_STATES}",
                remedy=f"Write {index.limit_denominator(MOST_STATES // 2)}.",
            )
        rate = site.sample_rate_hz
        occupied = (1 + highest * index) * self.symbol_rate_hz
        if occupied > rate:
            raise site.error(
                key="symbol_rate",
                problem=f"{format_hz(self.symbol_rate_hz)} with deviations up to "
                f"{format_hz(highest * index * self.symbol_rate_hz / 2)} occupies "
                f"{format_hz(occupied)} (Carson's rule)",
                allowed=f"up to the sample rate, {format_hz(rate)}",
                remedy="Lower the symbol rate or the index, or raise the sample rate.",
            )

    def _close(self, site: Site, symbols: PhaseSymbols, total: int, n_states: int) -> PhaseSymbols:
        """Return symbols whose loop closes, by choosing the last ones where data are random."""
        period = symbols.period
        tail = None
        if isinstance(self.data, Random):
            count = min(period, 2 * n_states)
            last = symbols.range(period - count, count)
            order = len(symbols.alphabet)
            tail = closing_tail(last, total=total, n_states=n_states, order=order)
        if tail is None:
            cycle = self.data_cycle(site.sample_rate_hz, site.path, site.folder)
            lengths = "even lengths" if cycle is None else f"multiples of {cycle.n_symbols} symbols"
            raise site.error(
                key="data",
                problem=f"over {period} symbols the phase does not close: the levels add up to "
                f"{total}, no multiple of {n_states}",
                allowed=f"{lengths}, which hold whole periods of the data and close",
                remedy="Make the loop so long, or use random data, whose last symbols can be "
                "chosen.",
            )
        which = f"{tail.size} symbols were" if tail.size > 1 else "symbol was"
        site.notes.append(
            Note(
                kind="rounded",
                where=f"{site.path}.data",
                text=f"The last {which} chosen so that the phase closes over the loop of {period}.",
                asked=f"levels that add up to {total}",
                given=f"a multiple of {n_states}",
            )
        )
        return symbols.with_tail(tail)
