"""How a figure was averaged: power, decibels, volts, and what each reads of the same signal."""

from __future__ import annotations

import math
from typing import Literal

import numpy as np

from wavegen.meters.power_statistics import PowerStatistics

Averaging = Literal["power", "log", "voltage"]

GAUSSIAN_OFFSET_DB = {
    "power": 0.0,
    "log": -10 * math.log10(math.e) * 0.5772156649015329,
    "voltage": 10 * math.log10(math.pi / 4),
}
"""What each kind of averaging reads of complex Gaussian noise over the true mean: 0, -2.507
(Euler's constant in dB) and -1.049 dB (the mean of a Rayleigh amplitude squared is pi/4)."""


def average_offset_db(statistics: PowerStatistics, averaging: Averaging) -> float:
    """Return what an averaging of another kind reads over the true mean power.

    Parameters
    ----------
    statistics : PowerStatistics
        Of the signal.
    averaging : {"power", "log", "voltage"}
        Mean of power; of its decibels (exact zeros left out: they have none); of the amplitude.

    Returns
    -------
    float
        dB, never above 0. Only the first is a mean power; the others depend on the signal's own
        statistics.
    """
    if averaging == "power":
        return 0.0
    edges = statistics.edges[:-1].copy()
    edges[0] = statistics.least
    middles = np.sqrt(edges[:-1] * edges[1:]) if edges.size > 1 else np.zeros(0)
    powers = np.concatenate([middles, statistics.top_powers]) / statistics.mean
    counts = np.concatenate([statistics.counts[:-1], statistics.top_counts])
    known = counts > 0
    powers, counts = powers[known], counts[known]
    if averaging == "log":
        return float(np.sum(counts * 10 * np.log10(powers)) / counts.sum())
    amplitude = float(np.sum(counts * np.sqrt(powers)) / statistics.n_samples)
    return 20 * math.log10(amplitude)


def true_mean_db(read_db: float, averaging: Averaging) -> float:
    """Return the mean power behind a figure of a noise-like signal that was averaged otherwise.

    Parameters
    ----------
    read_db : float
        As read, dB over anything.
    averaging : {"power", "log", "voltage"}
        How it was averaged.

    Returns
    -------
    float
        On the same scale. Right for complex Gaussian signals (OFDM of many subcarriers, noise);
        for others :func:`average_offset_db` says how far it is off.
    """
    return read_db - GAUSSIAN_OFFSET_DB[averaging]
