"""Input and output of a device put one on the other in time, where they are the same signal.

The gain curve does not need it. It shows what power distributions cannot: a phase that turns with
the level, an output that falls while the input rises, and memory.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.fft
import scipy.optimize
from numpy.typing import NDArray

from wavegen.comparison.side import Side
from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Samples

Reals = NDArray[np.float64]

LONGEST = 1 << 18
"""Samples looked at: a thousand times what the delay's peak needs to stand out."""
SHORTEST = 1 << 10
LONGEST_BASIS = 1 << 16
"""Samples by which memory is looked for."""
ALIGNED = 0.3
"""Correlation from which two captures are of one signal; that of independent noise over a quarter
of the band stays below 0.03 at 2^16 samples (derivation: ``sqrt(ln(lags) / (n / 4))``)."""
BIN_DB = 0.5
FEWEST_IN_BIN = 50
LAGS = (1, 2, 3, 4, 6, 8)
EXPLAINED = 0.3
"""Share of what a memoryless curve leaves, from which its neighbours in time explain it: memory."""
LEAST_MEMORY_DB = -55.0
FOLD_DB = 0.5
"""Fall of the output that is none of noise in a bin of a few peaks."""
_EDGE = 64
_BAND = 1e-3


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Alignment:
    """Two captures of one signal, in front of a device and behind it.

    Parameters
    ----------
    correlation : float
        Of the samples, or of their powers where that is higher (another centre frequency), at
        the best delay, 0 to 1.
    delay_samples : float
        Of the output.
    input_db : float64 array, shape (n_bins,)
        Middles of bins of input power, dB over the mean input, rising.
    gain_db : float64 array, shape (n_bins,)
        Gain in each: that of mean powers.
    phase_deg : float64 array, shape (n_bins,)
        Turn of the phase in each, from that in the lowest.
    left_db : float
        What a memoryless curve leaves, over the output's power.
    memory_db : float
        The part of it that neighbours in time explain, over the output's power.
    explained : float
        Their share of what is left.
    """

    correlation: float
    delay_samples: float
    input_db: Reals
    gain_db: Reals
    phase_deg: Reals
    left_db: float
    memory_db: float
    explained: float

    @property
    def has_memory(self) -> bool:
        """Whether the output depends on earlier or later input."""
        return self.explained >= EXPLAINED and self.memory_db > LEAST_MEMORY_DB

    @property
    def folds_from_db(self) -> float | None:
        """Input level from which the output falls again; None where it does not.

        Only what lies beyond the highest output counts: far below it noise goes up and down.
        """
        output = self.input_db + self.gain_db
        top = int(np.argmax(output))
        fall = output[top] - output[top:].min()
        return float(self.input_db[top]) if fall > FOLD_DB else None


def align(first: Side, second: Side) -> Alignment | None:
    """Put the samples of two sides one on the other.

    Parameters
    ----------
    first, second : Side
        Input and output.

    Returns
    -------
    Alignment or None
        None where they are not of one signal, or have no samples, other rates, or too few.
    """
    found = _samples(first), _samples(second)
    if found[0] is None or found[1] is None:
        return None
    if first.sample_rate_hz != second.sample_rate_hz:
        return None
    delay, correlation = _whole_delay(found[0], found[1], cyclic=_is_cyclic(first, second))
    if correlation < ALIGNED:
        return None
    x, y = _overlap(found[0], found[1], delay, cyclic=_is_cyclic(first, second))
    if x.size < SHORTEST:
        return None
    part = _part_of_delay(x, y)
    x = _delayed(x, part)[_EDGE:-_EDGE]
    y = y[_EDGE:-_EDGE]
    return _examined(x, y, correlation=correlation, delay=delay + part)


def _samples(side: Side) -> Samples | None:
    signal = side.signal
    if signal is None or side.is_power or signal.n_samples < SHORTEST:
        return None
    count = min(signal.n_samples, LONGEST)
    return np.asarray(evaluate({signal: (0, count)})[signal], np.complex64)


def _is_cyclic(first: Side, second: Side) -> bool:
    counts = [side.signal.n_samples if side.signal else 0 for side in (first, second)]
    return first.loops and second.loops and counts[0] == counts[1] <= LONGEST


def _whole_delay(x: Samples, y: Samples, *, cyclic: bool) -> tuple[int, float]:
    """Return by how many samples y comes later, and the correlation there."""
    powers = [np.abs(item) ** 2 for item in (x, y)]
    pairs = ((x, y), tuple(item - item.mean() for item in powers))
    found = [_correlation(*pair, cyclic=cyclic) for pair in pairs]
    return max(found, key=lambda item: item[1])


def _correlation(x: NDArray[Any], y: NDArray[Any], *, cyclic: bool) -> tuple[int, float]:
    size = x.size if cyclic else scipy.fft.next_fast_len(x.size + y.size)
    product = np.abs(scipy.fft.ifft(scipy.fft.fft(y, size) * np.conj(scipy.fft.fft(x, size))))
    energies = [float(np.sum(np.abs(item).astype(np.float64) ** 2)) for item in (x, y)]
    scale = float(np.sqrt(energies[0] * energies[1]))
    if not scale > 0:  # powers of constant envelopes say nothing
        return 0, 0.0
    place = int(np.argmax(product))
    lag = place if cyclic or place < y.size else place - size
    return lag, float(product[place]) / scale


def _overlap(x: Samples, y: Samples, delay: int, *, cyclic: bool) -> tuple[Samples, Samples]:
    if cyclic:
        return x, np.roll(y, -delay)
    start = max(-delay, 0)
    count = min(x.size - start, y.size - (start + delay))
    return x[start : start + count], y[start + delay : start + delay + count]


def _part_of_delay(x: Samples, y: Samples) -> float:
    """Return the rest of the delay, up to a sample: where the cross spectrum is in phase."""
    spectra = scipy.fft.fft(x), scipy.fft.fft(y)
    size = np.abs(spectra[0]) ** 2
    used = size > _BAND * size.max()
    cross = (spectra[1] * np.conj(spectra[0]))[used].astype(np.complex128)
    turns = 2 * np.pi * scipy.fft.fftfreq(x.size)[used]

    def out_of_phase(delay: float) -> float:
        return -float(np.abs(np.sum(cross * np.exp(1j * turns * delay))))

    grid = np.linspace(-1, 1, 21)
    best = min(grid, key=out_of_phase)
    found = scipy.optimize.minimize_scalar(
        out_of_phase, bounds=(best - 0.1, best + 0.1), method="bounded", options={"xatol": 1e-5}
    )
    return float(found.x)


def _delayed(x: Samples, delay: float) -> Samples:
    turns = -2j * np.pi * scipy.fft.fftfreq(x.size) * delay
    return np.asarray(scipy.fft.ifft(scipy.fft.fft(x) * np.exp(turns)), np.complex64)


def _examined(x: Samples, y: Samples, *, correlation: float, delay: float) -> Alignment:
    """Fit a memoryless curve and look at what it leaves."""
    power = np.abs(x).astype(np.float64) ** 2
    level = 10 * np.log10(np.maximum(power, 1e-30))
    top = float(level.max())
    number = np.clip(((top - level) / BIN_DB).astype(np.int64), 0, 80)
    counts = np.bincount(number)
    product = y.astype(np.complex128) * np.conj(x)
    inner = np.bincount(number, product.real) + 1j * np.bincount(number, product.imag)
    energy = np.bincount(number, power)
    output = np.bincount(number, np.abs(y).astype(np.float64) ** 2)
    used = (counts >= FEWEST_IN_BIN) & (np.arange(counts.size) < 80)
    used_at = np.flatnonzero(used)[::-1]  # rising level
    gain = (inner / np.maximum(energy, 1e-300))[used_at]
    middle = 10 * np.log10(energy[used_at] / counts[used_at])
    turn = np.unwrap(np.angle(gain))
    curve = np.interp(level, middle, np.abs(gain)) * np.exp(1j * np.interp(level, middle, turn))
    left = y - curve * x
    explained = _explained(left, x)
    total = float(np.mean(np.abs(y) ** 2))
    share = float(np.mean(np.abs(left) ** 2)) / total
    return Alignment(
        correlation=correlation,
        delay_samples=delay,
        input_db=middle - 10 * np.log10(float(power.mean())),
        gain_db=10 * np.log10(output[used_at] / energy[used_at]),
        phase_deg=np.rad2deg(turn - turn[0]),
        left_db=10 * float(np.log10(max(share, 1e-30))),
        memory_db=10 * float(np.log10(max(share * explained, 1e-30))),
        explained=explained,
    )


def _explained(left: Samples, x: Samples) -> float:
    """Return the share of what is left that is linear or cubic in neighbours of the input."""
    reach, x, left = max(LAGS), x[:LONGEST_BASIS], left[:LONGEST_BASIS]
    inside = slice(reach, x.size - reach)
    columns = []
    for lag in (*(-lag for lag in LAGS), 0, *LAGS):
        moved = np.roll(x, lag)[inside].astype(np.complex128)
        columns += [moved, moved * np.abs(moved) ** 2]
    basis = np.stack(columns, axis=1)
    wanted = left[inside].astype(np.complex128)
    rest = wanted - basis @ np.linalg.lstsq(basis, wanted, rcond=1e-9)[0]
    total = float(np.sum(np.abs(wanted) ** 2))
    return 1 - float(np.sum(np.abs(rest) ** 2)) / total if total > 0 else 0.0
