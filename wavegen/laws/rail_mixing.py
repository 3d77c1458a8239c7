"""Terms behind what treats the rails of a sample apart: an image of the signal, a constant."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import scipy.special

from wavegen.laws.composite import LONGEST_SERIES, LineTerm
from wavegen.laws.hoyt import HoytLaw
from wavegen.laws.inversion import law_of_characteristic
from wavegen.laws.law import Law
from wavegen.laws.operations import EnvelopeTerm, GatedTerm
from wavegen.laws.term import BaseTerm, Complexes, GaussianTerm, NoLaw, Reals, Scaled, Term

MOST_RMS = 8.0
"""Amplitudes over the RMS value beyond which a part is not followed: one rail alone 1e-15."""
_MARGIN = 40
_ROWS = 64


def image_term(source: Term, signal: complex, image: complex) -> Term | NoLaw:
    """Return what a part is with its image beside it: ``signal x + image conj(x)``.

    Parameters
    ----------
    source : Term
        The part, at its own axes: before anything turns it.
    signal, image : complex
        What of the signal and of its conjugate is in the output.

    Returns
    -------
    Term or NoLaw
        At the mean power of the input. None, by name, where the part is not isotropic: a carrier
        whose points lie in some directions mixes with its image differently in each. Nor behind a
        clip or an amplifier, where it would take minutes.

    Notes
    -----
    Of an isotropic part the two are uncorrelated and add in power: the law is exact.
    """
    if isinstance(source, LineTerm):
        value = signal * source.value + image * source.value.conjugate()
        return LineTerm.of(value * (abs(source.value) / abs(value)), name=source.name)
    if _is_gated(source) or source.symmetry or isinstance(source, EnvelopeTerm):
        return NoLaw(reason=f"{source.name}, with its image, has no law")
    size = math.hypot(abs(signal), abs(image))
    return ImageTerm.of(source, signal=signal / size, image=image / size)


def shifted_term(source: Term, constant: complex) -> Term | NoLaw:
    """Return what a part is beside a constant.

    Parameters
    ----------
    source : Term
        The part, at its own axes.
    constant : complex
        What is added, on the scale of the part.

    Returns
    -------
    Term or NoLaw
        None, by name, where directions are not known.
    """
    if isinstance(source, LineTerm):
        return LineTerm.of(source.value + constant, name=source.name)
    probe = source.directional(np.array([1.0]), np.zeros(1))
    if _is_gated(source) or probe is None:
        return NoLaw(reason=f"{source.name}, with a DC offset, has no law")
    name = f"{source.name}, with a DC offset"
    raw = ShiftedTerm.of(source, constant=constant, name=name, mean_power=1.0)
    return ShiftedTerm.of(source, constant=constant, name=name, mean_power=mean_power_of(raw))


def mean_power_of(term: Term) -> float:
    """Return ``E[R^2]`` of a term from its function near 0: ``1 - t^2 P / 4 + t^4 ...``.

    Notes
    -----
    Two places, the fourth power taken out: good to some 1e-8.
    """
    t = np.array([2e-2, 1e-2]) / max(math.sqrt(term.mean_power), 1e-30)
    far, near = 4 * (1 - term.characteristic(t)) / t**2
    return float((4 * near - far) / 3)


def _is_gated(term: Term | None) -> bool:
    """Return whether a part is switched: its levels are over the mean of the on-time then."""
    while term is not None:
        if isinstance(term, GatedTerm):
            return True
        term = getattr(term, "inner", None)
    return False


def _reach(term: Term) -> float:
    """Return the highest amplitude of a part that matters."""
    return min(term.peak, MOST_RMS * math.sqrt(term.mean_power))


@dataclass(frozen=True, eq=False, kw_only=True)
class ImageTerm(BaseTerm):
    """An isotropic part with its image. Use :func:`image_term`.

    Parameters
    ----------
    inner : Term
        The part.
    signal, image : complex
        What of it and of its conjugate is there.

    Notes
    -----
    ``Re(y exp(-j a)) = Re(c x)`` with ``c = signal exp(-j a) + conj(image) exp(j a)``: the
    two-dimensional function in the direction ``a`` is that of the part at ``t |c|``, and
    ``|c|^2 = 1 + 2 |signal| |image| cos(2 a + ...)`` (derivation). As a Fourier series over the
    angle (Graf's addition theorem) it ends soon beyond ``t R |image|``.
    """

    inner: Term
    signal: complex
    image: complex

    @classmethod
    def of(cls, inner: Term, *, signal: complex, image: complex) -> ImageTerm:
        """Return the term; squares of the factors add to 1."""
        return cls(
            name=f"{inner.name}, with its image",
            holds=inner.holds,
            mean_power=inner.mean_power,
            peak=inner.peak * (abs(signal) + abs(image)),
            clock_samples=inner.clock_samples,
            symmetry=2,
            data=inner.data,
            lowest_probability=inner.lowest_probability,
            inner=inner,
            signal=signal,
            image=image,
        )

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``E[J0(t R)]``: the mean of :meth:`directional` over the angle."""
        n = int(1.1 * float(t.max(initial=0.0)) * _reach(self.inner) * abs(self.image)) + _MARGIN
        share = 2 * abs(self.signal) * abs(self.image)
        sizes = np.sqrt(1 + share * np.cos((np.arange(n) + 0.5) * (np.pi / n)))
        out = np.empty(t.size)
        for start in range(0, t.size, _ROWS):
            part = t[start : start + _ROWS]
            flat = self._inner_at(np.outer(part, sizes), residue, modulus)
            out[start : start + part.size] = flat.mean(axis=1)
        return out

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> Complexes:
        """Return the two-dimensional function over the indices that leave a residue."""
        turn = np.exp(1j * angle_rad)
        sizes = np.abs(self.signal / turn + self.image.conjugate() * turn)
        flat = self._inner_at(np.outer(t, sizes), residue, modulus)
        return flat.astype(np.complex128)

    def _inner_at(self, t: Reals, residue: int, modulus: int) -> Reals:
        flat = self.inner.characteristic(t.ravel(), residue=residue, modulus=modulus)
        return flat.reshape(t.shape)

    def law(self) -> Law | NoLaw:
        """Return the law: that of Hoyt of complex Gaussian noise, else by a series."""
        plain = self.inner
        while isinstance(plain, Scaled):
            plain = plain.inner
        if isinstance(plain, GaussianTerm):
            share = 2 * abs(self.signal) * abs(self.image)
            return HoytLaw(impropriety=share, name=self.name, holds=self.holds)
        return _law_of(self)


@dataclass(frozen=True, eq=False, kw_only=True)
class ShiftedTerm(BaseTerm):
    """A part beside a constant. Use :func:`shifted_term`.

    Parameters
    ----------
    inner : Term
        The part.
    constant : complex
        What is added.
    """

    inner: Term
    constant: complex

    @classmethod
    def of(cls, inner: Term, *, constant: complex, name: str, mean_power: float) -> ShiftedTerm:
        """Return the term."""
        return cls(
            name=name,
            holds=inner.holds,
            mean_power=mean_power,
            peak=inner.peak + abs(constant),
            clock_samples=inner.clock_samples,
            symmetry=1,
            data=inner.data,
            lowest_probability=inner.lowest_probability,
            inner=inner,
            constant=constant,
        )

    def characteristic(self, t: Reals, *, residue: int = 0, modulus: int = 1) -> Reals:
        """Return ``E[J0(t R)]``: a product where the part is isotropic."""
        if not self.inner.symmetry:
            flat = self.inner.characteristic(t, residue=residue, modulus=modulus)
            return np.asarray(flat * scipy.special.j0(abs(self.constant) * t))
        out = np.empty(t.size)
        for start in range(0, t.size, _ROWS):
            part = t[start : start + _ROWS]
            n = int(1.1 * float(part.max()) * (_reach(self.inner) + abs(self.constant))) + _MARGIN
            angle = np.asarray((np.arange(n) + 0.5) * (np.pi / n), np.float64)
            found = self.directional(part, angle, residue=residue, modulus=modulus)
            out[start : start + part.size] = found.real.mean(axis=1)
        return out

    def directional(
        self, t: Reals, angle_rad: Reals, *, residue: int = 0, modulus: int = 1
    ) -> Complexes:
        """Return the two-dimensional function over the indices that leave a residue."""
        made = self.inner.directional(t, angle_rad, residue=residue, modulus=modulus)
        assert made is not None  # noqa: S101 - asked before
        along = np.real(self.constant * np.exp(-1j * angle_rad))
        return np.asarray(made * np.exp(1j * np.outer(t, along)))

    def law(self) -> Law | NoLaw:
        """Return the law by a series."""
        return _law_of(self)


def _law_of(term: ImageTerm | ShiftedTerm) -> Law | NoLaw:
    return law_of_characteristic(
        term.characteristic,
        name=term.name,
        holds=term.holds,
        mean_power=term.mean_power,
        peak=term.peak,
        lowest_probability=term.lowest_probability,
        most_terms=LONGEST_SERIES,
    )
