"""The radio-frequency waveform's own statistics, from those of its envelope.

At a random carrier phase the squared voltage is ``2 p cos^2(phi)`` for an envelope power p. The
peak stands 3.01 dB over the envelope's; a level at a probability rises by less: for a complex
Gaussian signal by 0.70, 1.59, 1.95 and 2.16 dB at 10, 1, 0.1 and 0.01 %.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from wavegen.core.errors import ArgumentsError
from wavegen.meters.power_statistics import PowerStatistics

PEAK_OVER_ENVELOPE_DB = 10 * math.log10(2)
_HALVINGS = 48


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PassbandStatistics:
    """Instantaneous power of the RF waveform, carrier phase random.

    Parameters
    ----------
    envelope : PowerStatistics
        Of the complex envelope.

    Notes
    -----
    ``P_rf(x) = (2/pi) integral over phi from 0 to pi/2 of P_env(x / (2 cos^2 phi))``, done per
    value of the envelope: ``2 p cos^2(phi) > x`` for the share ``(2/pi) arccos sqrt(x / 2p)`` of
    all phases. Derivation; a Gaussian envelope gives ``erfc(sqrt(x/2))``. Values within a bin of
    the histogram (0.0085 dB) are taken as its middle. Levels are over the mean, which is the
    envelope's (of the squared voltage the half).
    """

    envelope: PowerStatistics

    @property
    def papr_db(self) -> float:
        """Peak of the squared voltage over its mean, dB: 3.01 dB over the envelope's."""
        return self.envelope.papr_db + PEAK_OVER_ENVELOPE_DB

    def _values(self) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return envelope powers over the mean, and their shares."""
        envelope = self.envelope
        edges = envelope.edges[:-1].copy()  # the highest bin is resolved: take it as it is
        edges[0] = envelope.least
        middles = (edges[:-1] + edges[1:]) / 2 if edges.size > 1 else np.zeros(0)
        powers = np.concatenate([middles, envelope.top_powers]) / envelope.mean
        counts = np.concatenate([envelope.counts[:-1], envelope.top_counts])
        known = counts > 0
        return powers[known], counts[known] / envelope.n_samples

    def ccdf(self, level_db: ArrayLike) -> NDArray[np.float64]:
        """Return the share of the time that the squared voltage is above a level.

        Parameters
        ----------
        level_db : float or array
            Over the mean, dB.

        Returns
        -------
        float64 array, same shape
        """
        asked = np.power(10.0, np.asarray(level_db, np.float64) / 10)
        return self._ccdf(asked, *self._values())

    @staticmethod
    def _ccdf(
        asked: NDArray[np.float64], powers: NDArray[np.float64], shares: NDArray[np.float64]
    ) -> NDArray[np.float64]:
        flat = np.atleast_1d(asked).ravel()
        found = np.empty(flat.size)
        for k, level in enumerate(flat):
            cosine = np.sqrt(np.minimum(level / (2 * powers), 1.0))
            found[k] = float(np.sum(shares * np.arccos(cosine))) * 2 / np.pi
        return found.reshape(np.shape(asked))

    def level_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return the level that the squared voltage exceeds with a probability.

        Parameters
        ----------
        probability : float or array
            From 0 to 1; 0 gives the peak.

        Returns
        -------
        float64 array, same shape
            Over the mean, dB.

        Raises
        ------
        ArgumentsError
            A probability outside [0, 1].
        """
        asked = np.asarray(probability, np.float64)
        if not np.all((asked >= 0) & (asked <= 1)):
            raise ArgumentsError(
                where="probability",
                problem=f"{asked} is no probability",
                allowed="0 to 1",
                remedy="Give the fraction of the time: 0.0001 for 0.01 %.",
            )
        powers, shares = self._values()
        low = np.full(asked.shape, -120.0)
        high = np.full(asked.shape, self.papr_db)
        for _ in range(_HALVINGS):
            middle = (low + high) / 2
            is_above = self._ccdf(np.power(10.0, middle / 10), powers, shares) > asked
            low, high = np.where(is_above, middle, low), np.where(is_above, high, middle)
        return high

    def over_envelope_db(self, probability: ArrayLike) -> NDArray[np.float64]:
        """Return how far the RF level stands over the envelope's at a probability, dB."""
        return np.asarray(self.level_db(probability) - self.envelope.level_db(probability))
