"""Error vector magnitude: received symbols against those that were sent.

With ``s`` what was sent and ``y`` what came, ``e = y / g - s`` and ``g = <s, y> / <s, s>``: one
complex gain for the whole carrier, as a receiver would set it. The figure is the RMS of ``e`` over
the RMS of ``s``. Unfitted figures take ``g = 1`` on the scale that the levels of the recipe give;
equalised ones a gain for each subcarrier. Each is named so.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.signal import Range, Samples, Signal
from wavegen.dsp.grid_sums import CellReading, Sums
from wavegen.sources.reception import Reception

CELL_POINTS = 1 << 10
"""Points summed before the tree begins, where a row has fewer."""
BLOCK_POINTS = 1 << 14
N_SUMS = 6
"""Reference, cross (real, imaginary), error, error squared (real, imaginary)."""


@dataclass(frozen=True, eq=False, kw_only=True)
class Paired(Signal):
    """Two signals of one axis in turn: a sample of the first, then one of the second."""

    @classmethod
    def of(cls, first: Signal, second: Signal) -> Paired:
        """Pair what was received (first) with what was sent (second).

        Raises
        ------
        ValueError
            Different lengths.
        """
        if first.n_samples != second.n_samples:
            msg = f"{first.n_samples} samples are paired with {second.n_samples}"
            raise ValueError(msg)
        return cls(
            sample_rate_hz=2 * first.sample_rate_hz,
            n_samples=2 * first.n_samples,
            inputs=(first, second),
            mean_power=None,
        )

    def needs(self, start: int, stop: int) -> tuple[Range, ...]:
        """Return the pairs touched."""
        return ((start // 2, -(-stop // 2)),) * 2

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        """Put them in turn."""
        out = np.empty((arrays[0].size, 2), np.complex64)
        out[:, 0], out[:, 1] = arrays
        return out.reshape(-1)[start % 2 : start % 2 + stop - start]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class EvmSums:
    """Everything that RMS figures need: sums over symbols, by class and subcarrier.

    Parameters
    ----------
    reference : float64 array, shape (n_classes, n_columns)
        Sum of ``|s|^2``.
    cross : complex128 array, same shape
        Sum of ``conj(s) d``, ``d = y - s``.
    error : float64 array, same shape
        Sum of ``|d|^2``.
    square : complex128 array, same shape
        Sum of ``d^2``; used where only one rail of each sample counts.
    is_railed : bool
        Whether that is so.
    """

    reference: NDArray[np.float64]
    cross: NDArray[np.complex128]
    error: NDArray[np.float64]
    square: NDArray[np.complex128]
    is_railed: bool = False

    @property
    def gain(self) -> complex:
        """The one complex gain that fits best, all classes together."""
        return complex(1 + self.cross.sum() / self.reference.sum())

    def column_gains(self, smoothing: int = 1) -> NDArray[np.complex128]:
        """Return the gain of each subcarrier that fits it best: a zero-forcing equaliser.

        Parameters
        ----------
        smoothing : int
            Odd number of neighbouring subcarriers over which gains are averaged, fewer and
            fewer towards the edges.

        Returns
        -------
        complex128 array, shape (n_columns,)
            1 where nothing was sent.
        """
        sent = self.reference.sum(axis=0)
        gains = np.ones(sent.size, np.complex128)
        gains += np.divide(
            self.cross.sum(axis=0), sent, out=np.zeros(sent.size, np.complex128), where=sent > 0
        )
        half = np.minimum(np.arange(sent.size), np.arange(sent.size)[::-1])
        half = np.minimum(half, smoothing // 2)
        summed = np.concatenate(([0], np.cumsum(gains)))
        places = np.arange(sent.size)
        averaged = (summed[places + half + 1] - summed[places - half]) / (2 * half + 1)
        return np.asarray(averaged if smoothing > 1 else gains)

    def error_power(
        self, gains: complex | NDArray[np.complex128], classes: Sequence[int] | None = None
    ) -> float:
        """Return the sum of ``|y / g - s|^2``.

        Parameters
        ----------
        gains : complex or complex128 array, shape (n_columns,)
            ``g``.
        classes : sequence of int, optional
            Which; all if not given.

        Returns
        -------
        float
            Never below 0.
        """
        rows = slice(None) if classes is None else list(classes)
        off = np.asarray(gains) - 1
        left = self.error[rows] - 2 * (np.conj(off) * self.cross[rows]).real
        left = (left + np.abs(off) ** 2 * self.reference[rows]) / np.abs(gains) ** 2
        if self.is_railed:
            turned = self.square[rows] - 2 * off * self.cross[rows] + off**2 * self.reference[rows]
            left = (left + (turned / np.asarray(gains) ** 2).real) / 2
        return max(float(left.sum()), 0.0)

    def percent(
        self, gains: complex | NDArray[np.complex128], classes: Sequence[int] | None = None
    ) -> float:
        """Return the RMS EVM at given gains, percent; 0 where nothing was sent.

        Parameters
        ----------
        gains : complex or complex128 array, shape (n_columns,)
            By which what was received is divided.
        classes : sequence of int, optional
            Which; all if not given.
        """
        rows = slice(None) if classes is None else list(classes)
        sent = float(self.reference[rows].sum())
        return 100 * math.sqrt(self.error_power(gains, classes) / sent) if sent else 0.0

    @property
    def fitted_percent(self) -> float:
        """RMS EVM with the one gain, percent: the figure meant by EVM alone."""
        return self.percent(self.gain)

    @property
    def unfitted_percent(self) -> float:
        """RMS EVM without any fit: a change of level or phase counts as error, percent."""
        return self.percent(1.0)

    @property
    def gain_db(self) -> float:
        """Magnitude of the gain, dB."""
        return 20 * math.log10(abs(self.gain))

    @property
    def phase_deg(self) -> float:
        """Phase of the gain, degrees."""
        return math.degrees(cmath.phase(self.gain))


class EvmReading(CellReading):
    """Running sums of one stretch of pairs.

    Parameters
    ----------
    settings : EvmMeter
        What is measured.
    """

    def __init__(self, settings: EvmMeter) -> None:
        self._settings = settings
        rows = 1
        while 2 * rows * settings.n_columns <= CELL_POINTS:
            rows *= 2
        self._rows = rows
        super().__init__(2 * rows * settings.n_columns)

    def reduce(self, first: int, samples: Samples) -> Sums:
        """Return the sums of each cell, shape (n_cells, n_classes, 6, n_columns)."""
        settings, rows = self._settings, self._rows
        pairs = samples.reshape(-1, rows, settings.n_columns, 2)
        out = np.empty((pairs.shape[0], settings.n_classes, N_SUMS, settings.n_columns))
        per_block = max(BLOCK_POINTS // (rows * settings.n_columns), 1)
        for low in range(0, pairs.shape[0], per_block):
            some = pairs[low : low + per_block]
            terms = self._terms(some)
            if settings.n_classes == 1 and settings.labels is None:
                out[low : low + per_block, 0] = _halved(terms)
                continue
            row = (first + low) * rows
            labels = settings.labels_at(row, some.shape[0] * rows)
            labels = labels.reshape(some.shape[0], 1, rows, -1)
            for number in range(settings.n_classes):
                kept = np.where(labels == number, terms, 0.0)
                out[low : low + per_block, number] = _halved(kept)
        return out

    def _terms(self, pairs: NDArray[np.complex64]) -> NDArray[np.float64]:
        """Return what is summed, shape (n_cells, 6, n_rows, n_columns)."""
        sent = pairs[..., 1].astype(np.complex128)
        off = pairs[..., 0].astype(np.complex128) - sent
        terms = np.zeros((pairs.shape[0], N_SUMS, *pairs.shape[1:3]))
        if self._settings.is_railed:
            for turned in (sent, off):
                turned[:, 1::2] *= -1j  # the Q rail becomes real
            terms[:, 4] = off.real * off.real - off.imag * off.imag
            terms[:, 5] = 2 * off.real * off.imag
        terms[:, 0] = sent.real * sent.real + sent.imag * sent.imag
        terms[:, 1] = sent.real * off.real + sent.imag * off.imag
        terms[:, 2] = sent.real * off.imag - sent.imag * off.real
        terms[:, 3] = off.real * off.real + off.imag * off.imag
        return terms

    def result(self) -> EvmSums:
        """Return the sums.

        Raises
        ------
        SignalError
            No symbols, a sample that is not finite, or nothing sent.
        """
        total = self.total()
        if total is None or not np.isfinite(total).all() or not total[:, 0].any():
            raise SignalError(
                where=self._settings.where,
                problem="no symbols with power were seen, or samples that are not finite",
                allowed="symbols, and finite samples",
                remedy="Check the signal and its level.",
            )
        return EvmSums(
            reference=total[:, 0],
            cross=total[:, 1] + 1j * total[:, 2],
            error=total[:, 3],
            square=total[:, 4] + 1j * total[:, 5],
            is_railed=self._settings.is_railed,
        )


def _halved(terms: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the sum over the rows of each cell by halving, shape (n_cells, 6, n_columns)."""
    while terms.shape[2] > 1:
        half = terms.shape[2] // 2
        terms = terms[:, :, :half] + terms[:, :, half:]
    return terms[:, :, 0]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class EvmMeter:
    """Settings of the EVM meter; it reads a :class:`Paired` of received and sent.

    Parameters
    ----------
    n_columns : int
        Subcarriers of a symbol; 1 for a single carrier or for samples.
    n_classes : int
        Classes apart.
    labels : int16 array, shape (n_frame, n_columns), or None
        Class of each place of a repeating frame, -1 for none; None where there is one class.
    is_railed : bool
        Whether the I rail counts at even rows, the Q rail at odd ones, and nothing else.
    where : str
        What is measured, for messages.
    """

    n_columns: int = 1
    n_classes: int = 1
    labels: NDArray[np.int16] | None = None
    is_railed: bool = False
    where: str = "signal"

    @classmethod
    def of(cls, reception: Reception, *, where: str = "signal") -> EvmMeter:
        """Return the meter for a reception."""
        return cls(
            n_columns=reception.n_columns,
            n_classes=len(reception.classes),
            labels=reception.labels,
            is_railed=reception.rails is not None,
            where=where,
        )

    def labels_at(self, row: int, count: int) -> NDArray[np.int16]:
        """Return the classes of rows, shape (count, n_columns)."""
        if self.labels is None:
            return np.zeros((count, self.n_columns), np.int16)
        return np.asarray(self.labels[np.arange(row, row + count) % self.labels.shape[0]])

    def begin(self, signal: Signal) -> EvmReading:
        """Return an empty reading of a pair."""
        return EvmReading(self)


def pair_of(reception: Reception) -> Paired:
    """Return what the meter reads of a reception: its rails where it has some."""
    if reception.rails is not None:
        return Paired.of(*reception.rails)
    return Paired.of(reception.received, reception.ideal)


def waveform_sums(received: Samples, sent: Samples, **settings: Any) -> EvmSums:
    """Return the sums of two arrays.

    Parameters
    ----------
    received, sent : complex64 array, shape (n,)
        In step.
    **settings
        Of :class:`EvmMeter`.

    Examples
    --------
    >>> sent = np.exp(1j * np.arange(100)).astype(np.complex64)
    >>> sums = waveform_sums(sent * np.complex64(0.5), sent)
    >>> round(sums.unfitted_percent, 4), round(sums.fitted_percent, 4)
    (50.0, 0.0)
    """
    reading = EvmMeter(**settings).begin(Signal(sample_rate_hz=1, n_samples=2 * received.size))  # type: ignore[arg-type]
    reading.feed(0, np.stack([received, sent], axis=1).astype(np.complex64).reshape(-1))
    return reading.result()
