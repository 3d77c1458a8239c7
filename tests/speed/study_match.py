"""How often is `match` wrong?  ``python tests/speed/study_match.py [--pairs 1000]``

Pairs of seeded records whose processes are known, compared with a tolerance of 0.2 dB down to
0.1 %. A pair whose curves are within the tolerance everywhere must not be called *differ*, and one
that is 0.3 dB apart at some level must not be called *match*; each in at most 5 % of the pairs.

Noise is complex Gaussian over a quarter of the band; "0.1 dB apart" means that its power is raised
to a power which moves the furthest of its levels by that much, known in closed form. Bursty noise
is switched on and off at random, on for 30 % of the time on the average.
"""

import argparse
import math
import sys
import time
from collections import Counter

import numpy as np
import scipy.fft

from wavegen.comparison.curves import SampledCurve
from wavegen.comparison.difference import ERROR, compare, probabilities
from wavegen.meters.batches import measure_batches
from wavegen.meters.intervals import SampledStatistics

OVERSAMPLING = 4
DOWN_TO = 1e-3
LONG, SHORT = 1 << 18, 1 << 14
BURST_SAMPLES, DUTY = 1 << 11, 0.3


def noise(rng, n):
    spectrum = np.zeros(n, np.complex64)
    lines = n // OVERSAMPLING
    spectrum[:lines] = rng.standard_normal(2 * lines, dtype=np.float32).view(np.complex64)
    return scipy.fft.ifft(spectrum, overwrite_x=True) * np.float32(n / math.sqrt(2 * lines))


def exponent(apart_db):
    """Return the power of the power that moves its furthest level so far: by bisection.

    ``P(p^a / E[p^a] > x)``: the level at q is ``10 log10((-ln q)^a / Gamma(1 + a))``.
    """
    asked = -np.log(probabilities(DOWN_TO))
    low, high = 1.0, 2.0
    for _ in range(60):
        a = (low + high) / 2
        moved = 10 * np.log10(asked ** (a - 1) / math.gamma(1 + a))
        low, high = (a, high) if np.abs(moved).max() < apart_db else (low, a)
    return a


def raised(samples, a):
    return samples * np.abs(samples) ** np.float32(a - 1)


def bursty(rng, n):
    """Bursts and gaps whose lengths are exponential, edges at random places."""
    n_bursts = 4 * n // BURST_SAMPLES
    lengths = np.empty(2 * n_bursts)
    lengths[0::2] = rng.exponential(BURST_SAMPLES, n_bursts)
    lengths[1::2] = rng.exponential(BURST_SAMPLES * (1 - DUTY) / DUTY, n_bursts)
    first = int(rng.integers(0, 2))  # begins on or off
    edges = np.cumsum(lengths[first:]).astype(np.int64)
    is_on = np.searchsorted(edges, np.arange(n), side="right") % 2 == first
    return noise(rng, n) * is_on


SCENARIOS = {
    "equal": (LONG, 0.0, "differ", noise),
    "0.1 dB apart": (LONG, 0.1, "differ", noise),
    "0.3 dB apart": (LONG, 0.3, "match", noise),
    "short": (SHORT, 0.0, "differ", noise),
    "short, 0.3 dB apart": (SHORT, 0.3, "match", noise),
    "bursty": (LONG, 0.0, "differ", bursty),
}


def verdict(rng, n, a, make):
    records = make(rng, n), make(rng, n)
    sides = [
        SampledCurve(sampled=SampledStatistics.of(measure_batches(samples)))
        for samples in (raised(records[0], a) if a != 1 else records[0], records[1])
    ]
    return compare(*sides, down_to=DOWN_TO).verdict


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--pairs", type=int, default=1000)
    parser.add_argument("--only", choices=tuple(SCENARIOS))
    arguments = parser.parse_args()
    is_good = True
    for number, (name, (n, apart_db, wrong, make)) in enumerate(SCENARIOS.items()):
        if arguments.only not in {None, name}:
            continue
        rng = np.random.default_rng([6, number])
        a = exponent(apart_db) if apart_db else 1.0
        start = time.perf_counter()
        found = Counter(verdict(rng, n, a, make) for _ in range(arguments.pairs))
        share = found[wrong] / arguments.pairs
        allowed = ERROR + 3 * math.sqrt(ERROR * (1 - ERROR) / arguments.pairs)
        is_good &= share <= allowed
        counts = ", ".join(f"{word} {found[word]}" for word in ("match", "differ", "undecided"))
        print(
            f"{name}: {counts}; {wrong} is wrong: {share:.3f} "
            f"({time.perf_counter() - start:.0f} s)",
            flush=True,
        )
    return 0 if is_good else 1


if __name__ == "__main__":
    sys.exit(main())
