"""Speed of the power meter, as ratios in one run: ``python tests/speed/bench_power.py``.

Budgets: at least 10 times the plain NumPy script (abs, log10, histogram) on one thread; with two
threads at least half the rate of ``np.sum`` over the same memory. Best of interleaved repeats.
"""

import argparse
import sys
import time
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from wavegen.core.signal import Samples, Signal
from wavegen.dsp.power_kernel import compiled_kernel, tally_by_numpy
from wavegen.meters.peak import peak_between_samples
from wavegen.meters.power import PowerMeter, PowerStatistics

REPEATS = 15
SCRIPT_BUDGET = 10.0
SUM_BUDGET = 0.5


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples that are already there."""

    samples: Samples

    def compute(self, start: int, stop: int, *arrays: Samples) -> Samples:
        return self.samples[start:stop].copy()


def script(samples: Samples) -> None:
    """What one would write in a minute."""
    level = 20 * np.log10(np.abs(samples))
    np.histogram(level, bins=2000, range=(-80, 20))


def measure(samples: Samples, threads: int, strip: int = 1 << 20) -> PowerStatistics:
    """Measure in strips, as a render does."""

    def read(start: int):
        reading = PowerMeter().begin(None)
        reading.feed(start, samples[start : start + strip])
        return reading

    with ThreadPoolExecutor(threads) as pool:
        first, *others = pool.map(read, range(0, samples.size, strip))
    for reading in others:
        first.merge(reading)
    return first.result()


def report(line: str) -> None:
    sys.stdout.write(line + "\n")


def main() -> int:
    """Print the figures; 1 if a budget is missed."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--samples", type=int, default=1 << 23)
    n = parser.parse_args().samples
    rng = np.random.default_rng(1)
    gaussian = rng.standard_normal(2 * n, dtype=np.float32).view(np.complex64)
    constant = np.exp(2j * np.pi * 0.2371 * np.arange(n)).astype(np.complex64)
    began = time.perf_counter()
    kernel = compiled_kernel()
    report(f"compiled loop ready in {time.perf_counter() - began:.2f} s: {kernel is not None}")
    missed = False
    for name, samples in (("gaussian", gaussian), ("constant envelope", constant)):
        jobs = {
            "np.sum": lambda data=samples: np.sum(data),
            "two threads": lambda data=samples: measure(data, 2),
            "one thread": lambda data=samples: measure(data, 1),
            "script": lambda data=samples: script(data[: n // 4]),
            "numpy twin": lambda data=samples: tally_by_numpy(data[: n // 4]),
        }
        share = {"script": 0.25, "numpy twin": 0.25}
        wall = dict.fromkeys(jobs, np.inf)
        cpu = dict.fromkeys(jobs, np.inf)
        for _ in range(REPEATS):
            for job, run in jobs.items():
                start, start_cpu = time.perf_counter(), time.process_time()
                run()
                count = n * share.get(job, 1.0)
                wall[job] = min(wall[job], (time.perf_counter() - start) / count)
                cpu[job] = min(cpu[job], (time.process_time() - start_cpu) / count)
        report(f"{name}, {n} samples:")
        for job in jobs:
            report(f"  {job:12} {wall[job] * 1e9:7.2f} ns, CPU {cpu[job] * 1e9:7.2f} ns a sample")
        over_script = wall["script"] / wall["one thread"]
        over_sum = wall["np.sum"] / wall["two threads"]
        report(f"  one thread over the script: {over_script:.1f} (budget {SCRIPT_BUDGET:.0f})")
        report(f"  two threads over np.sum:    {over_sum:.2f} (budget {SUM_BUDGET})")
        two_cores = 2 * cpu["np.sum"] / cpu["two threads"]
        report(f"  the same from CPU time, as two idle cores would: {two_cores:.2f}")
        report(f"  numpy twin over the script: {wall['script'] / wall['numpy twin']:.1f}")
        missed |= over_script < SCRIPT_BUDGET or over_sum < SUM_BUDGET
        statistics = measure(samples, 1)
        signal = Held(sample_rate_hz=Fraction(1), n_samples=n, samples=samples, mean_power=None)
        start_cpu = time.process_time()
        peak = peak_between_samples(signal, statistics)
        spent = (time.process_time() - start_cpu) / n * 1e9
        report(f"  peak between samples: {spent:.1f} ns a sample, +{peak.gained_db:.3f} dB")
    return int(missed)


if __name__ == "__main__":
    sys.exit(main())
