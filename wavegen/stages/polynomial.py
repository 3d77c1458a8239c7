"""Amplifiers with memory: polynomials of delayed samples and delayed envelopes."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Literal

import numpy as np

from wavegen.core.signal import Range, Samples, Signal
from wavegen.core.site import Note, Site
from wavegen.core.units import format_hz
from wavegen.dsp.aliasing import FACTOR, folded_share
from wavegen.dsp.occupied_bands import band_span, occupied_bands, stretch_spectrum
from wavegen.stages.amplifier import Amplifier, Complexes, Reals, rms_amplitude
from wavegen.stages.ceiling import look
from wavegen.stages.coefficients import Coefficients, Term
from wavegen.stages.drive import (
    BLOCK_SAMPLES,
    below,
    refuse_beyond,
    refuse_peak,
    refuse_silence,
    tell_folded,
)

PolynomialBackOffFrom = Literal["full_scale", "compression"]


@dataclass(frozen=True, eq=False, kw_only=True)
class SteadyCurve(Amplifier):
    """What a polynomial does to a carrier of constant amplitude: all delays act together.

    Parameters
    ----------
    by_order : tuple of complex
        Sum of the coefficients of each order, from 1 on.
    """

    by_order: tuple[complex, ...]

    def gain(self, amplitude: Reals) -> Complexes:
        """Return the sum over the orders of ``c r^(order - 1)``."""
        total = np.zeros(amplitude.shape, np.complex128)
        for coefficient in reversed(self.by_order):
            total = total * amplitude + coefficient
        return total


def steady_curve(coefficients: Coefficients) -> Amplifier:
    """Return the curve of a polynomial at constant amplitude.

    Parameters
    ----------
    coefficients : Coefficients
        From a file.
    """
    top = max(term.order for term in coefficients.terms)
    orders = [0j] * top
    for term in coefficients.terms:
        orders[term.order - 1] += term.coefficient
    return SteadyCurve(
        name=f"polynomial {coefficients.name}",
        saturation=coefficients.largest_amplitude,
        largest=coefficients.largest_amplitude,
        by_order=tuple(orders),
    )


def apply_terms(wide: Complexes, terms: tuple[Term, ...], *, before: int, n_out: int) -> Complexes:
    """Return the sum of terms over a stretch.

    Parameters
    ----------
    wide : complex128 array
        Input from ``before`` samples ahead of the first output on.
    terms : tuple of Term
        Any delays that the stretch holds.
    before : int
        Samples ahead.
    n_out : int
        Samples wanted.

    Returns
    -------
    complex128 array, shape (n_out,)
        Built by elementwise steps in the order of the terms.
    """
    i, q = np.ascontiguousarray(wide.real), np.ascontiguousarray(wide.imag)
    envelope = np.sqrt(i * i + q * q)
    powers = [np.ones(0), envelope]
    for _ in range(max(term.order for term in terms) - 2):
        powers.append(powers[-1] * envelope)
    total_i, total_q = np.zeros(n_out), np.zeros(n_out)
    for delay in sorted({term.delay for term in terms}):
        gain_i, gain_q = np.zeros(n_out), np.zeros(n_out)
        for term in terms:
            if term.delay != delay:
                continue
            c = term.coefficient
            if term.order == 1:
                gain_i += c.real
                gain_q += c.imag
                continue
            start = before - delay - term.lag
            power = powers[term.order - 1][start : start + n_out]
            gain_i += c.real * power
            gain_q += c.imag * power
        start = before - delay
        x, y = i[start : start + n_out], q[start : start + n_out]
        # In real arithmetic: complex products may be fused differently at a block's end.
        total_i += x * gain_i - y * gain_q
        total_q += x * gain_q + y * gain_i
    out = np.empty(n_out, np.complex128)
    out.real, out.imag = total_i, total_q
    return out


@dataclass(frozen=True, eq=False, kw_only=True)
class WithMemory(Signal):
    """A signal behind a polynomial with memory.

    Parameters
    ----------
    coefficients : Coefficients
        The model.
    drive : float
        Amplitude at the model's input over that of the source.
    scale : float
        Output of this signal over that of the model.
    where : str
        Path in the recipe, for errors.
    """

    coefficients: Coefficients
    drive: float
    scale: float
    where: str

    @cached_property
    def reach(self) -> Range:
        """Samples read before and after the one that is made."""
        return reach_of(self.coefficients.terms)

    @cached_property
    def steady(self) -> Amplifier:
        """The curve at constant amplitude, which knows the largest one."""
        return steady_curve(self.coefficients)

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the range with the longest delays on both sides."""
        before, after = self.reach
        return ((start - before, stop + after),)

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Add up the terms, block by block.

        Raises
        ------
        SignalError
            An amplitude beyond those for which the coefficients were found.
        """
        before, after = self.reach
        out = np.empty(stop - start, np.complex64)
        for low in range(0, out.size, BLOCK_SAMPLES):
            n_out = min(BLOCK_SAMPLES, out.size - low)
            piece = arrays[0][low : low + n_out + before + after]
            wide = np.empty(piece.size, np.complex128)
            wide.real, wide.imag = piece.real * self.drive, piece.imag * self.drive
            refuse_beyond(self.where, self.steady, float(np.abs(wide).max()))
            made = apply_terms(wide, self.coefficients.terms, before=before, n_out=n_out)
            out.real[low : low + n_out] = made.real * self.scale
            out.imag[low : low + n_out] = made.imag * self.scale
        return out


def reach_of(terms: tuple[Term, ...]) -> Range:
    """Return how many samples terms read before and after the one they make."""
    lags = [lag for term in terms for lag in (term.delay, term.delay + term.lag)]
    return max(*lags, 0), max(*(-lag for lag in lags), 0)


def drive_polynomial(
    site: Site,
    source: Signal,
    coefficients: Coefficients,
    *,
    back_off_db: float,
    back_off_from: PolynomialBackOffFrom,
) -> Signal:
    """Return a signal behind a polynomial with memory at the mean power it had.

    Parameters
    ----------
    site : Site
        Told of the change of gain, the fitted error, the order and what folds back.
    source : Signal
        What is driven into it; looked at as by :func:`wavegen.stages.ceiling.look`.
    coefficients : Coefficients
        The model.
    back_off_db : float
        How far the mean input power stands below the reference, dB.
    back_off_from : {"full_scale", "compression"}
        The largest amplitude of the coefficients, or the 1 dB point of a steady carrier.

    Returns
    -------
    Signal
        ``source`` itself where the only term is a gain of 1.

    Raises
    ------
    RecipeError
        The source is zero or peaks beyond the largest amplitude, the coefficients belong to
        another rate, or their curve has no 1 dB point.
    """
    _check_rate(site, source, coefficients)
    if [term[:3] for term in coefficients.terms if term.coefficient] == [(1, 0, 0)]:
        site.notes.append(Note(kind="info", where=site.path, text="the polynomial is a plain gain"))
        return source
    before, after = reach_of(coefficients.terms)
    pilot = look(source, oversampling=1.0, halo=before + after)
    if pilot is None:
        raise refuse_silence(site)
    steady = steady_curve(coefficients)
    rms = rms_amplitude(
        site,
        steady,
        back_off_db=back_off_db,
        back_off_from="compression" if back_off_from == "compression" else "saturation",
    )
    factor = rms / math.sqrt(pilot.mean)
    refuse_peak(site, steady, factor * math.sqrt(pilot.highest))
    made = WithMemory(
        sample_rate_hz=source.sample_rate_hz,
        n_samples=source.n_samples,
        inputs=(source,),
        mean_power=source.mean_power,
        coefficients=coefficients,
        drive=factor,
        scale=1 / factor,
        where=site.path,
    )
    trial = pilot.try_out(made, peaks=False)
    if not trial.mean_ratio:
        raise refuse_silence(site)
    compression = steady.compression
    landmark = f" and {below(compression / rms)} the 1 dB point of a carrier" if compression else ""
    text = (
        f"polynomial {coefficients.name}: mean input power {below(steady.saturation / rms)} its "
        f"largest amplitude{landmark}; found on {pilot.origin}: fitted error "
        f"{100 * trial.error_fraction:.2f} %; the gain of the mean power, "
        f"{10 * math.log10(trial.mean_ratio):.4f} dB, is undone"
    )
    site.notes.append(Note(kind="info", where=site.path, text=text))
    _tell_order(site, source, coefficients, factor)
    return replace(made, scale=made.scale / math.sqrt(trial.mean_ratio))


def _check_rate(site: Site, source: Signal, coefficients: Coefficients) -> None:
    rate = coefficients.sample_rate_hz
    if rate is not None and rate != source.sample_rate_hz:
        raise site.error(
            key="path",
            problem=f"the delays of {coefficients.name} count samples at {format_hz(rate)}, "
            f"the signal has {format_hz(source.sample_rate_hz)}",
            allowed="coefficients for the rate of the signal",
            remedy="Put a resample stage before this one, or find coefficients for this rate.",
        )
    if rate is None:
        text = (
            f"{coefficients.name} says no sample_rate: its delays are taken as samples at "
            f"{format_hz(source.sample_rate_hz)}"
        )
        site.notes.append(Note(kind="info", where=site.path, text=text))


def _tell_order(site: Site, source: Signal, coefficients: Coefficients, factor: float) -> None:
    """Tell the order, the oversampling that holds it whole, and what folds back."""
    order = max(term.order for term in coefficients.terms if term.coefficient)
    bands = occupied_bands(stretch_spectrum(source))
    oversampling = 1 / band_span(bands) if bands else math.inf
    terms = tuple(
        Term(term.order, FACTOR * term.delay, FACTOR * term.lag, term.coefficient)
        for term in coefficients.terms
    )
    halo = max(reach_of(coefficients.terms))
    largest = coefficients.largest_amplitude

    def process(samples: Complexes) -> Complexes:
        driven = factor * samples
        driven *= np.minimum(1.0, largest / np.maximum(np.abs(driven), 1e-30))
        n_out = samples.size - 2 * FACTOR * halo
        return apply_terms(driven, terms, before=FACTOR * halo, n_out=n_out)

    spread = (
        f"order {order} spreads the band to {order} times its width, the sample rate is "
        f"{oversampling:.2f} times it: "
    )
    tell_folded(site, source, folded_share(source, process, halo=halo), spread=spread)
