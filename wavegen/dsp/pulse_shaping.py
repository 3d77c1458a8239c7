"""Symbols to samples through a pulse, at any exact rate, whatever range is asked.

``a`` samples hold ``b`` symbols, in lowest terms; sample ``n`` stands at ``n b / a`` symbols. Three
forms, chosen by :func:`plan_shaping`: held symbols are gathered; band-limited and sampled pulses go
through short FFT rows; where those would grow too long (``a`` large), or a pulse bends at symbols
that fall between samples, the pulse is a polynomial between symbols.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from math import log2
from typing import Protocol

import numpy as np
import scipy.fft
import scipy.special
from numpy.typing import NDArray

from wavegen.core.evaluate import fold
from wavegen.core.signal import Range, Samples
from wavegen.dsp.pulse import Pulse, mean_energy
from wavegen.dsp.pulses.rectangular import Hold

LONGEST_ROW = 1 << 18
"""Longest output row of :class:`RowShaper`, samples; beyond, its rows leave every cache."""
LEAST_ROWS = 4
"""Rows a call of the FFT: single rows run several times slower."""
CALL_SAMPLES = 1 << 16
"""Samples a call of the FFT where rows are short: enough to hide the call, inside the cache."""
MOST_DENSITY = 128
"""Points a symbol at which the spectrum of a pulse is taken where its ends are abrupt."""
ROW_OVERHEAD = 10_000
"""Cost of starting a row in units of ``F log2 F`` (measured: about 3 us)."""
SILENT = 1e-7
"""Spectrum of a pulse below this share of its highest value (-140 dB) is left out."""
POLYNOMIAL_ERROR = 1e-9
"""First Chebyshev term left out of the polynomials between symbols."""
HIGHEST_DEGREE = 32
"""Degree that the terms of a pulse without a band limit are looked for in."""
BLOCK_SAMPLES = 1 << 14
"""Samples that :class:`PolynomialShaper` makes at a time, about."""


class Shaper(Protocol):
    """Turns a range of symbols into a range of samples on an absolute grid."""

    @property
    def step(self) -> int:
        """Return the grid, samples: starts are multiples of it."""

    def needs(self, start: int, stop: int) -> Range:
        """Return the symbols wanted for samples ``[start, stop)``; may be negative."""

    def shape(self, start: int, stop: int, symbols: Samples) -> Samples:
        """Return samples ``[start, stop)`` from the symbols of :meth:`needs`."""


def plan_shaping(
    pulse: Pulse,
    *,
    n_samples: int,
    n_symbols: int,
    period_symbols: int,
    longest: int = LONGEST_ROW,
    gain: float | None = None,
) -> Shaper:
    """Choose the form of shaping for a pulse and a rate, scaled to unit mean power.

    Parameters
    ----------
    pulse : Pulse
        The shape, on any scale.
    n_samples, n_symbols : int
        ``n_samples`` samples hold ``n_symbols`` symbols, in lowest terms.
    period_symbols : int
        Symbols in the loop; it enters the scale alone.
    longest : int
        Longest FFT row accepted, samples.
    gain : float, optional
        What the pulse is multiplied by, instead of what gives unit mean power. A hold has none.

    Returns
    -------
    Shaper
    """
    energy = mean_energy(pulse, per_symbol=n_samples, period_symbols=period_symbols)
    if isinstance(pulse, Hold):
        return HoldShaper(n_samples=n_samples, n_symbols=n_symbols)
    if gain is None:
        gain = energy**-0.5
    n_rows = _row_units(pulse, n_samples, n_symbols, longest)
    if n_rows is not None and (pulse.is_smooth or n_symbols == 1):
        return _design_rows(pulse, n_samples, n_symbols, n_rows, gain)
    return _design_polynomials(pulse, n_samples, n_symbols, gain)


@dataclass(frozen=True, eq=False, kw_only=True)
class HoldShaper:
    """Each sample is the symbol held at its instant.

    Parameters
    ----------
    n_samples, n_symbols : int
        Samples and symbols of one cycle, in lowest terms.
    """

    n_samples: int
    n_symbols: int

    @property
    def step(self) -> int:
        """Return the grid, samples: none."""
        return 1

    def needs(self, start: int, stop: int) -> Range:
        """Return the symbols wanted for samples ``[start, stop)``."""
        a, b = self.n_samples, self.n_symbols
        return start * b // a, (stop - 1) * b // a + 1

    def shape(self, start: int, stop: int, symbols: Samples) -> Samples:
        """Return samples ``[start, stop)`` from the symbols of :meth:`needs`."""
        a, b = self.n_samples, self.n_symbols
        if b == 1:
            return np.repeat(symbols, a)[start % a :][: stop - start]
        instants = np.arange(stop - start, dtype=np.int64) * b + start * b % a
        return symbols.take(instants // a)


@dataclass(frozen=True, eq=False, slots=True)
class _Piece:
    """A stretch of the pulse's spectrum: where it reads the symbols', where it adds up."""

    source: int
    target: int
    weight: NDArray[np.complex64]
    is_first: bool


@dataclass(frozen=True, eq=False, kw_only=True)
class RowShaper:
    """Shaping in FFT rows of symbols, each giving a row of samples without interpolation.

    Parameters
    ----------
    n_samples, n_symbols : int
        Samples and symbols of one cycle, in lowest terms.
    span_symbols : int
        Half-length of the pulse.
    units : int
        A row reads ``units`` cycles of symbols.
    pieces : tuple
        The pulse's spectrum on the row's grid, cut where the symbols' or the samples' spectrum
        repeats.
    silent : tuple of (int, int)
        Bins of the samples' spectrum that stay zero.

    Notes
    -----
    A row of ``Q = units n_symbols`` symbols has the spectrum ``A[s]``, periodic in ``Q``; behind
    the pulse its line at ``s / Q`` symbol rates is ``A[s mod Q] H(s / Q)``, and ``F = units
    n_samples`` samples of the row fold line ``s`` on bin ``s mod F``. All lines above -140 dB are
    added, so the folding of a pulse without a band limit is that of its samples. The pulse's
    origin is moved by its span, so that the valid samples come first in the row.
    """

    n_samples: int
    n_symbols: int
    span_symbols: int
    units: int
    pieces: tuple[_Piece, ...]
    silent: tuple[Range, ...]

    @property
    def hop_cycles(self) -> int:
        """Return the cycles by which rows follow each other."""
        return self.units - _lost_units(self.span_symbols, self.n_symbols)

    @property
    def step(self) -> int:
        """Return the grid, samples."""
        return self.hop_cycles * self.n_samples

    def needs(self, start: int, stop: int) -> Range:
        """Return the symbols wanted for samples ``[start, stop)``."""
        n_rows = -(-(stop - start) // self.step)
        first = start // self.n_samples * self.n_symbols - self.span_symbols
        count = ((n_rows - 1) * self.hop_cycles + self.units) * self.n_symbols
        return first, first + count

    def shape(self, start: int, stop: int, symbols: Samples) -> Samples:
        """Return samples ``[start, stop)`` from the symbols of :meth:`needs`."""
        n_in, n_out = self.units * self.n_symbols, self.units * self.n_samples
        windows = np.lib.stride_tricks.sliding_window_view(symbols, n_in)
        windows = windows[:: self.hop_cycles * self.n_symbols]
        total = stop - start
        out = np.empty(total, np.complex64)
        n_rows = min(max(LEAST_ROWS, CALL_SAMPLES // n_out), windows.shape[0])
        buffer = np.empty((n_rows, n_out), np.complex64)
        for first in range(0, windows.shape[0], n_rows):
            spectrum = scipy.fft.fft(windows[first : first + n_rows], axis=1)
            rows = buffer[: spectrum.shape[0]]
            self._fill(rows, spectrum)
            rows = scipy.fft.ifft(rows, axis=1, norm="forward", overwrite_x=True)
            low = first * self.step
            whole = min(rows.shape[0], (total - low) // self.step)
            end = low + whole * self.step
            out[low:end].reshape(whole, self.step)[...] = rows[:whole, : self.step]
            if whole < rows.shape[0]:
                out[end:] = rows[whole, : total - end]
        return out

    def _fill(self, rows: Samples, spectrum: Samples) -> None:
        for low, high in self.silent:
            rows[:, low:high] = 0
        for piece in self.pieces:
            size = piece.weight.size
            source = spectrum[:, piece.source : piece.source + size]
            target = rows[:, piece.target : piece.target + size]
            if piece.is_first:
                np.multiply(source, piece.weight, out=target)
            else:
                target += source * piece.weight


@dataclass(frozen=True, eq=False, kw_only=True)
class PolynomialShaper:
    """Shaping by polynomials between symbols, for rates with a very long cycle.

    Parameters
    ----------
    n_samples, n_symbols : int
        Samples and symbols of one cycle, in lowest terms.
    span_symbols : int
        Half-length of the pulse.
    step : int
        Grid, samples.
    spectra : complex128 array, shape (degree + 1, n_in)
        Spectrum, on the grid of a row of symbols, of each coefficient over the symbols of the
        span; highest power first.

    Notes
    -----
    Between two symbols the sum of shifted pulses is one polynomial in ``u`` in [-1, 1), whose
    coefficients are filters of the symbols: FFT rows at the symbol rate, then Horner's rule at
    each sample's exact instant (idea: C. W. Farrow, "A continuously variable digital delay
    element", ISCAS 1988). Float64 throughout.
    """

    n_samples: int
    n_symbols: int
    span_symbols: int
    step: int
    spectra: NDArray[np.complex128]

    def needs(self, start: int, stop: int) -> Range:
        """Return the symbols wanted for samples ``[start, stop)``."""
        last = (stop - 1) // self.step * self.step
        return self._row_start(start), self._row_start(last) + self.spectra.shape[1]

    def shape(self, start: int, stop: int, symbols: Samples) -> Samples:
        """Return samples ``[start, stop)`` from the symbols of :meth:`needs`."""
        a, b = self.n_samples, self.n_symbols
        first = self._row_start(start)
        out = np.empty(stop - start, np.complex64)
        steps = np.arange(self.step, dtype=np.int64) * b
        for low in range(start, stop, self.step):
            count = min(self.step, stop - low)
            offset = self._row_start(low) - first
            row = symbols[offset : offset + self.spectra.shape[1]].astype(np.complex128)
            filtered = scipy.fft.ifft(scipy.fft.fft(row) * self.spectra, axis=1)
            instants = steps[:count] + low * b % a
            number = instants // a
            u = (2.0 / a) * (instants - number * a) - 1.0
            number += self.span_symbols
            value = filtered[0].take(number)
            for coefficient in filtered[1:]:
                value *= u
                value += coefficient.take(number)
            out[low - start : low - start + count] = value
        return out

    def _row_start(self, low: int) -> int:
        return low * self.n_symbols // self.n_samples - self.span_symbols


def _lost_units(span_symbols: int, n_symbols: int) -> int:
    """Return the cycles of symbols that a row reads beyond those it completes."""
    return -(-2 * span_symbols // n_symbols)


def _row_units(pulse: Pulse, a: int, b: int, longest: int) -> int | None:
    """Return the cycles of symbols in the cheapest row, or None where none is short enough."""
    lost = _lost_units(pulse.span_symbols, b)
    best, least = None, float("inf")
    units = lost + 1
    while units * a <= longest or (pulse.is_sampled and best is None):
        units = scipy.fft.next_fast_len(units)
        cost = (units * a * log2(max(units * a, 2)) + ROW_OVERHEAD) / (units - lost)
        if cost < least:
            best, least = units, cost
        units += 1
    return best


def _design_rows(pulse: Pulse, a: int, b: int, units: int, gain: float) -> RowShaper:
    n_in, n_out = units * b, units * a
    lines = _spectrum(pulse, n_in, a if b == 1 else _density(pulse, a, b)) * (gain / n_in)
    half = lines.size // 2
    is_heard = np.abs(lines) > SILENT * np.abs(lines).max()
    heard = np.flatnonzero(np.roll(is_heard, half))  # from the lowest negative line up
    numbers = np.arange(heard[0], heard[-1] + 1) - half
    weights = lines[numbers] * np.exp(2j * np.pi * (numbers * pulse.span_symbols % n_in) / n_in)
    pieces, silent = _cut(int(numbers[0]), weights.astype(np.complex64), n_in, n_out)
    return RowShaper(
        n_samples=a,
        n_symbols=b,
        span_symbols=pulse.span_symbols,
        units=units,
        pieces=pieces,
        silent=silent,
    )


def _density(pulse: Pulse, a: int, b: int) -> int:
    """Return points a symbol at which no line of the pulse is loud enough to fold."""
    density = max(8, 4 * -(-a // b))
    while density < MOST_DENSITY:
        lines = np.abs(_spectrum(pulse, 2 * pulse.span_symbols + 1, density))
        if np.max(lines[lines.size // 2 - lines.size // 16 :][: lines.size // 8]) < SILENT / 2:
            break
        density *= 2
    return density


def _spectrum(pulse: Pulse, n_symbols: int, per_symbol: int) -> NDArray[np.complex128]:
    """Return the lines of a pulse on a circle of symbols, from samples at a density."""
    half = pulse.span_symbols * per_symbol
    circle = np.zeros(n_symbols * per_symbol)
    values = pulse.on_lattice(per_symbol)
    circle[:half] = values[half:]
    circle[-half:] = values[:half]
    lines: NDArray[np.complex128] = scipy.fft.fft(circle) / per_symbol
    return lines


def _cut(
    first: int, weights: NDArray[np.complex64], n_in: int, n_out: int
) -> tuple[tuple[_Piece, ...], tuple[Range, ...]]:
    """Cut lines ``first ...`` where either spectrum repeats; return the bins left silent too."""
    stop = first + weights.size
    borders = {first, stop, *_multiples(first, stop, n_in, 0), *_multiples(first, stop, n_out, 0)}
    borders |= set(_multiples(first, stop, n_out, first))
    pieces = tuple(
        _Piece(low % n_in, low % n_out, weights[low - first : high - first], low < first + n_out)
        for low, high in pairwise(sorted(borders))
    )
    return pieces, tuple(fold(stop, first + n_out, n_out))


def _multiples(start: int, stop: int, period: int, origin: int) -> range:
    """Return the points ``origin + k period`` inside ``[start, stop)``."""
    return range(start + (origin - start) % period, stop, period)


def _design_polynomials(pulse: Pulse, a: int, b: int, gain: float) -> PolynomialShaper:
    span = pulse.span_symbols
    degree = HIGHEST_DEGREE
    if pulse.half_band is not None:
        reach = np.pi * (pulse.half_band + 0.5)  # the taper widens the band a little
        terms = np.abs(scipy.special.jv(np.arange(40), reach))
        degree = int(np.flatnonzero(terms > POLYNOMIAL_ERROR)[-1])
    nodes = np.polynomial.chebyshev.chebpts1(degree + 1)
    shifts = np.arange(-span, span)
    values = gain * pulse.values(shifts[:, None] + (nodes + 1.0) / 2)
    series = np.polynomial.chebyshev.chebfit(nodes, values.T, degree)
    if pulse.half_band is None:
        sizes = np.max(np.abs(series), axis=1)
        degree = int(np.flatnonzero(sizes > POLYNOMIAL_ERROR * sizes.max())[-1])
        series = series[: degree + 1]
    powers = np.zeros((degree + 1, 2 * span))
    for order, row in enumerate(series):  # each Chebyshev polynomial as powers of u
        basis = np.polynomial.chebyshev.cheb2poly([0.0] * order + [1.0])
        powers[: basis.size] += basis[:, None] * row
    hop = max(16, min(2048, BLOCK_SAMPLES * b // a))
    n_in = scipy.fft.next_fast_len(hop + 2 * span + 2)
    filters = np.zeros((degree + 1, n_in))
    filters[:, shifts] = powers[::-1]
    return PolynomialShaper(
        n_samples=a,
        n_symbols=b,
        span_symbols=span,
        step=max(1, min((n_in - 2 * span - 2) * a // b, 2 * BLOCK_SAMPLES)),
        spectra=scipy.fft.fft(filters, axis=1),
    )
