"""Speed of continuous phase modulation, data drawn and encoded.

Run it: ``python tests/speed/bench_phase.py``. Aim: 20 MS/s at eight samples a symbol. CPU time,
one thread, shortest of interleaved repeats; a first call makes the tables.
"""

from __future__ import annotations

import argparse
import time
from fractions import Fraction

from wavegen.core.evaluate import evaluate
from wavegen.core.site import Site
from wavegen.sources.phase_modulation import PhaseModulation

N_SAMPLES = 1 << 20
RATIOS = tuple(Fraction(text) for text in ("8", "4", "120/13", "1234567/123456"))
SCHEMES = (
    {"scheme": "msk"},
    {"scheme": "gmsk", "bt": 0.3},
    {"scheme": "gfsk", "bt": 0.5, "h": Fraction("0.315"), "levels": 4},
    {"scheme": "four_level_fm"},
    {"scheme": "soqpsk_tg"},
    {"scheme": "oqpsk_half_sine"},
)


def carrier(ratio, fields):
    """A carrier of at least ``N_SAMPLES`` samples a loop."""
    made = PhaseModulation(symbol_rate_hz=Fraction(1_000_000), **fields)
    rate = 1_000_000 * ratio
    cycle = made.cycle(rate, "signal").n_samples
    n_samples = -(-N_SAMPLES // cycle) * cycle
    site = Site(sample_rate_hz=rate, n_samples=n_samples, seed=1, label="x", path="signal")
    return made.build(site)


def main():
    """Print rates."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--repeats", type=int, default=5)
    repeats = parser.parse_args().repeats
    cases = {
        (fields["scheme"], str(ratio)): carrier(ratio, fields)
        for fields in SCHEMES
        for ratio in RATIOS
    }
    best = dict.fromkeys(cases, float("inf"))
    for _ in range(repeats + 1):
        for name, signal in cases.items():
            start = time.process_time()
            evaluate({signal: (0, N_SAMPLES)})
            best[name] = min(best[name], time.process_time() - start)
    for (scheme, ratio), seconds in best.items():
        rate = N_SAMPLES / seconds / 1e6
        print(f"{scheme:16s} {ratio:>16s} samples a symbol {rate:8.1f} MS/s")


if __name__ == "__main__":
    main()
