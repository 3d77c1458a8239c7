"""Do intervals hold the truth as often as they say?  ``python tests/speed/study_coverage.py``

Seeded records of three processes whose distribution is known: band-limited noise (a quarter of
the band), QPSK with a root-raised-cosine pulse (roll-off 0.22, 4 samples a symbol), OFDM (300
QPSK subcarriers, 1024 points, prefix 72). Of each record the 95 % intervals of the CCDF at the
true level of 10 % ... 0.001 % are taken, and how often they hold the truth is counted. Required:
0.93 to 0.97 where batches serve, at least 0.93 where runs do, each within three standard errors
of what is counted. The whole study takes about 5 minutes on two idle cores (10 of CPU);
``--records N`` makes a shorter one, whose standard errors are stated.
"""

import argparse
import functools
import os
import sys
import time
from concurrent.futures import ProcessPoolExecutor

import numpy as np
import scipy.fft
import scipy.special

from wavegen.meters.batches import measure_batches
from wavegen.meters.intervals import MANY_RUNS, SampledStatistics

PROBABILITIES = (1e-1, 1e-2, 1e-3, 1e-4, 1e-5)
LEAST, MOST = 0.93, 0.97


class Noise:
    """Complex Gaussian noise over a quarter of the band: ``P(p > x) = exp(-x)`` (Rice 1944)."""

    name = "band-limited noise"
    oversampling = 4

    def record(self, rng, n):
        spectrum = np.zeros(n, np.complex64)
        lines = n // self.oversampling
        spectrum[:lines] = rng.standard_normal(2 * lines, dtype=np.float32).view(np.complex64)
        return scipy.fft.ifft(spectrum, overwrite_x=True)

    def ccdf(self, x):
        return np.exp(-np.asarray(x))

    moments = (2.0, 6.0)


class Qpsk:
    """QPSK through a root-raised-cosine filter, exactly: the two rails are independent.

    At timing phase t a rail is ``sum a_k h(t - k)``, a_k = +-1/sqrt(2): its characteristic
    function is ``prod cos(u h / sqrt 2)``, its density the Fourier transform of that.
    """

    name = "QPSK RRC 0.22"
    per_symbol = 4
    roll_off = 0.22

    def __init__(self, order=1):
        self.amplitudes = (2 * np.arange(order) + 1) / np.sqrt(
            2 * np.mean((2 * np.arange(order) + 1.0) ** 2)
        )
        n = 1 << 14
        frequency = scipy.fft.fftfreq(n, 1 / self.per_symbol)
        edge = (1 - self.roll_off) / 2
        bent = np.clip((np.abs(frequency) - edge) / self.roll_off, 0, 1)
        self.pulse = scipy.fft.ifft(np.cos(np.pi / 2 * bent)).real * self.per_symbol
        self.table = [self._density(self.pulse[t :: self.per_symbol]) for t in (0, 1, 2)]

    def _density(self, taps):
        large, small = taps[np.abs(taps) > 3e-4], taps[np.abs(taps) <= 3e-4]
        width, n = 8.0, 1 << 13
        u = 2 * np.pi * scipy.fft.fftfreq(n, width / n)
        parts = [np.mean([np.cos(u * a * h) for a in self.amplitudes], axis=0) for h in large]
        # The many small taps add up to what is Gaussian for every purpose here: 2e-6 of the power.
        rest = np.exp(-(u**2) * np.sum(small**2) / 4)
        density = scipy.fft.ifft(np.prod(parts, axis=0) * rest).real * n / width
        return scipy.fft.fftshift(density) * width / n  # mass on a grid of step width / n

    def record(self, rng, n):
        symbols = n // self.per_symbol
        rails = self.amplitudes[rng.integers(0, self.amplitudes.size, (symbols, 2))]
        rails = rails * rng.choice((-1.0, 1.0), (symbols, 2))
        spectrum = scipy.fft.fft(rails.astype(np.float32).view(np.complex64)[:, 0])
        frequency = scipy.fft.fftfreq(n, 1 / self.per_symbol)
        edge = (1 - self.roll_off) / 2
        bent = np.clip((np.abs(frequency) - edge) / self.roll_off, 0, 1)
        shaped = np.tile(spectrum, self.per_symbol) * np.cos(np.pi / 2 * bent).astype(np.float32)
        return scipy.fft.ifft(shaped * np.float32(self.per_symbol), overwrite_x=True)

    def ccdf(self, x):
        """Average over the timing phases 0, 1/4, 1/2, 3/4, of which 1/4 and 3/4 are alike."""
        x = np.atleast_1d(np.asarray(x, np.float64))
        total = np.zeros(x.size)
        grid = (np.arange(self.table[0].size) - self.table[0].size // 2) * 8.0
        grid /= self.table[0].size
        for density, weight in zip(self.table, (0.25, 0.5, 0.25), strict=True):
            beyond = np.concatenate([np.cumsum(density[::-1])[::-1], [0.0]])
            edges = np.append(grid, grid[-1] + grid[1] - grid[0]) - (grid[1] - grid[0]) / 2
            for k, level in enumerate(x):
                rest = np.sqrt(np.maximum(level - grid**2, 0.0))
                above = 2 * np.interp(rest, edges, beyond)
                above = np.where(grid**2 >= level, 1.0, np.minimum(above, 1.0))
                total[k] += weight * np.sum(density * above)
        return total


class Ofdm:
    """OFDM with QPSK on every subcarrier: N phasors of equal length and independent phase.

    The characteristic function of the plane is ``J0(u / sqrt N)^N``; averaged over the sample
    index the four phases of QPSK stand for all. Inverted on a disk (F. B. Hildebrand's
    Fourier-Bessel series): ``1 - (2 r / L) sum Phi(a_n / L) J1(a_n r / L) / (a_n J1(a_n)^2)``.
    """

    name = "OFDM 300"
    n_points, n_used, n_prefix = 1024, 300, 72

    def record(self, rng, n):
        rows = -(-n // (self.n_points + self.n_prefix))
        data = rng.integers(0, 4, (rows, self.n_used))
        spectrum = np.zeros((rows, self.n_points), np.complex64)
        half = self.n_used // 2
        points = np.exp(1j * np.pi * (np.arange(4) / 2 + 0.25)).astype(np.complex64)
        spectrum[:, 1 : half + 1] = points[data[:, :half]]
        spectrum[:, -half:] = points[data[:, half:]]
        body = scipy.fft.ifft(spectrum, axis=1, overwrite_x=True)
        return np.concatenate([body[:, -self.n_prefix :], body], axis=1).reshape(-1)[:n]

    def ccdf(self, x):
        x = np.atleast_1d(np.asarray(x, np.float64))
        length = 6.5
        zeros = scipy.special.jn_zeros(0, 120)
        phi = scipy.special.j0(zeros / length / np.sqrt(self.n_used)) ** self.n_used
        weights = phi / (zeros * scipy.special.j1(zeros) ** 2)
        r = np.sqrt(x)[:, np.newaxis]
        return 1 - 2 * r[:, 0] / length * (scipy.special.j1(zeros * r / length) @ weights)


def level_db(process, probability):
    """Return the true level by bisection, dB over the mean."""
    low, high = -20.0, 13.0
    for _ in range(60):
        middle = (low + high) / 2
        above = float(np.squeeze(process.ccdf(10 ** (middle / 10))))
        low, high = (middle, high) if above > probability else (low, middle)
    return (low + high) / 2


def held_by_record(process, levels, n_samples, confidence, seed):
    """Return which intervals of one record hold the truth, and its runs at each level."""
    samples = process.record(np.random.default_rng([77, seed]), n_samples)
    sampled = SampledStatistics.of(measure_batches(samples))
    low, high = sampled.ccdf_interval(levels, confidence=confidence)
    return (low <= PROBABILITIES) & (high >= PROBABILITIES), sampled.n_runs(levels)


def over_seeds(function, seeds, workers):
    """Yield what a function returns for each seed, from so many processes."""
    if workers == 1:
        yield from map(function, seeds)
        return
    with ProcessPoolExecutor(workers) as pool:
        yield from pool.map(function, seeds, chunksize=4)


def coverage(process, n_records, n_samples, *, first_seed=1, confidence=0.95, workers=1):
    """Return share of intervals that hold the truth, and mean number of runs, by probability."""
    levels = np.array([level_db(process, q) for q in PROBABILITIES])
    held = np.zeros(levels.size)
    runs = np.zeros(levels.size)
    one = functools.partial(held_by_record, process, levels, n_samples, confidence)
    for is_held, n_runs in over_seeds(one, range(first_seed, first_seed + n_records), workers):
        held += is_held
        runs += n_runs
    return held / n_records, runs / n_records


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--records", type=int, default=1000)
    parser.add_argument("--samples", type=int, default=1 << 20)
    parser.add_argument("--workers", type=int, default=os.cpu_count() or 1)
    asked = parser.parse_args()
    error = (0.95 * 0.05 / asked.records) ** 0.5
    missed = False
    for process in (Noise(), Qpsk(), Ofdm()):
        start = time.perf_counter()
        held, runs = coverage(process, asked.records, asked.samples, workers=asked.workers)
        spent = time.perf_counter() - start
        print(f"{process.name}: {asked.records} records of {asked.samples}, {spent:.0f} s")
        for q, share, count in zip(PROBABILITIES, held, runs, strict=True):
            by = "batches" if count >= MANY_RUNS else "runs"
            low = share < LEAST - 3 * error
            high = share > MOST + 3 * error and by == "batches"
            missed |= low or high
            mark = "  <-- outside" if low or high else ""
            print(f"  {q:7.0e}  {share:.3f} +- {error:.3f}  by {by} ({count:.1f} runs){mark}")
    return int(missed)


if __name__ == "__main__":
    sys.exit(main())
