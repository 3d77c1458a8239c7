"""Low-crest phases of any list of tones, by descent.

The peak of the envelope is approached by norms of rising order: ``(mean r^p)^(1/p)`` of the power
``r`` tends to its highest value, and is smooth in the phases. P. Guillaume, J. Schoukens,
R. Pintelon, I. Kollar, "Crest-factor minimization using nonlinear Chebyshev approximation
methods", IEEE Trans. Instrumentation and Measurement 40(6), 1991, 982-989 (from memory); each
order by a quasi-Newton descent (L-BFGS).
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
import scipy.fft
from numpy.typing import NDArray
from scipy.optimize import minimize

ORDERS = (4, 8, 16, 32, 64, 128, 256)
"""Orders of the norm of the power; the last is within 0.1 dB of the peak."""
POINTS_A_LINE = 8
"""Points of the envelope for each line between the lowest and the highest tone: 0.17 dB at most
stand between them."""
MOST_STEPS = 60
"""Steps of the descent for each order."""
BUDGET = 1 << 25
"""Points transformed altogether, about two seconds: fewer steps for long periods."""
LONGEST_SPAN = 1 << 18
"""Lines between the lowest and the highest tone, at most."""


def dwelling_phases(places: NDArray[np.int64], powers: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return phases by which the frequency dwells at each tone in proportion to its power.

    Parameters
    ----------
    places : int64 array, shape (n_tones,)
        Lines, rising.
    powers : float64 array, shape (n_tones,)
        On any scale, not all zero.

    Returns
    -------
    float64 array, shape (n_tones,)
        Radians.

    Notes
    -----
    M. R. Schroeder, IEEE Trans. Information Theory 16, 1970, for lines at any distance: the phase
    falls by the group delay, the share of the power below, over the distance.
    """
    share = powers / powers.sum()
    middle = np.cumsum(share) - share / 2
    delays = 0.5 * (middle[:-1] + middle[1:]) * np.diff(places)
    return np.asarray(-2 * np.pi * np.concatenate(([0.0], np.cumsum(delays))))


def optimised_phases(
    places: NDArray[np.int64],
    powers: NDArray[np.float64],
    fixed: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Return phases under which the envelope of a sum of tones has a low peak.

    Parameters
    ----------
    places : int64 array, shape (n_tones,)
        Lines, rising; their span over their common divisor is at most 2^18.
    powers : float64 array, shape (n_tones,)
        On any scale.
    fixed : float64 array, shape (n_tones,)
        Phases that must stay, radians; NaN for those to be found.

    Returns
    -------
    float64 array, shape (n_tones,)
        Radians; the same ones for the same tones.
    """
    near = (places - places.min()) // max(int(np.gcd.reduce(places - places.min())), 1)
    found = _descend(near.tobytes(), powers.tobytes(), fixed.tobytes())
    return np.frombuffer(found).copy()


def peak_over_mean(
    places: NDArray[np.int64], powers: NDArray[np.float64], phases: NDArray[np.float64]
) -> float:
    """Return the highest power of the envelope over its mean, on four times as many points."""
    wave = _Envelope(places - places.min(), powers, 4 * POINTS_A_LINE)
    power = np.abs(wave.of(phases)) ** 2
    return float(power.max() / power.mean())


@lru_cache(maxsize=16)
def _descend(places: bytes, powers: bytes, fixed: bytes) -> bytes:
    lines, held = np.frombuffer(places, np.int64), np.frombuffer(fixed)
    envelope = _Envelope(lines, np.frombuffer(powers))
    is_free = np.isnan(held)
    start = np.where(is_free, dwelling_phases(lines, envelope.powers), held)
    if lines.size < 3 or not is_free.any():
        return start.tobytes()
    steps = min(max(BUDGET // envelope.n // len(ORDERS) // 2, 3), MOST_STEPS)
    phases = start
    for order in ORDERS:
        done = minimize(
            envelope.norm,
            phases,
            args=(order, is_free),
            jac=True,
            method="L-BFGS-B",
            options={"maxiter": steps},
        )
        phases = done.x
    is_lower = peak_over_mean(lines, envelope.powers, phases) < peak_over_mean(
        lines, envelope.powers, start
    )
    return np.where(is_free & is_lower, phases, start).tobytes()


class _Envelope:
    """The envelope of tones over one period, as a function of their phases."""

    def __init__(
        self,
        places: NDArray[np.int64],
        powers: NDArray[np.float64],
        points_a_line: int = POINTS_A_LINE,
    ) -> None:
        self.places, self.powers = places, powers
        self.amplitudes = np.sqrt(powers / powers.sum())
        self.n = int(scipy.fft.next_fast_len(points_a_line * (int(places.max()) + 1)))

    def of(self, phases: NDArray[np.float64]) -> NDArray[np.complex128]:
        """Return one period, shape (n,)."""
        lines = np.zeros(self.n, np.complex128)
        lines[self.places] = self.amplitudes * np.exp(1j * phases)
        return np.asarray(scipy.fft.ifft(lines, norm="forward", overwrite_x=True))

    def norm(
        self, phases: NDArray[np.float64], order: int, is_free: NDArray[np.bool_]
    ) -> tuple[float, NDArray[np.float64]]:
        """Return the logarithm of the norm of the power, and its slope in the phases."""
        wave = self.of(phases)
        power = wave.real**2 + wave.imag**2
        highest = float(power.max())
        ratio = power / highest
        high = ratio ** (order - 1)
        mean = float(np.mean(high * ratio))
        seen = np.asarray(scipy.fft.fft(high * wave, norm="forward"))[self.places]
        turned = 1j * self.amplitudes * np.exp(1j * phases)
        slope = 2 * np.real(np.conj(turned) * seen) / (highest * mean)
        return float(np.log(highest) + np.log(mean) / order), np.where(is_free, slope, 0.0)
