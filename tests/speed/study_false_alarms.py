"""How often does the verdict err?  ``python tests/speed/study_false_alarms.py``

False alarms: records of fourfold-oversampled Gaussian noise against the Gaussian law; designed for
2 in 10 000, at most 4 in 10 000 allowed. Power: the same noise, 2 million samples, with a fault of
its tail of 0.1 dB at 0.1 %, must be found in 80 % of the records. The fault is a soft compression:
powers above the 1 % level are lowered, in proportion to how far they lie above it in dB. For
comparison, the same with a fault in one place only: none at 1 % and at 0.01 %, 0.1 dB at 0.1 %.
"""

import argparse
import importlib.util
import sys
import time
from pathlib import Path

import numpy as np

from wavegen.laws.gaussian import GaussianLaw
from wavegen.meters.batches import measure_batches
from wavegen.meters.equivalence import compare_with_law, find_difference
from wavegen.meters.intervals import SampledStatistics

LAW = GaussianLaw()
START_DB, MIDDLE_DB, END_DB = (float(LAW.level_db(q)) for q in (1e-2, 1e-3, 1e-4))
MOST_ALARMS_IN_10000 = 4
LEAST_POWER = 0.8


def _processes():
    path = Path(__file__).with_name("study_coverage.py")
    spec = importlib.util.spec_from_file_location("study_coverage", path)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


PROCESSES = _processes()


def compressed(samples, size_db, *, everywhere=True):
    """Return samples whose level at 0.1 % is ``size_db`` lower."""
    power = samples.real**2 + samples.imag**2
    level = 10 * np.log10(power / power.mean(dtype=np.float64) + 1e-12)
    per_db = size_db / (MIDDLE_DB - START_DB)
    rising = np.clip(level - START_DB, 0, None)
    loss = per_db * rising
    if not everywhere:
        falling = (END_DB - level) * size_db / (END_DB - MIDDLE_DB)
        loss = np.clip(np.minimum(loss, falling), 0, None)
    return (samples * 10 ** (-loss / 20)).astype(np.complex64)


def sampled(process, seed, n_samples, change=None):
    samples = process.record(np.random.default_rng([78, seed]), n_samples)
    return SampledStatistics.of(measure_batches(samples if change is None else change(samples)))


def alarms(n_records, n_samples, *, process=None, law=LAW, first_seed=1):
    """Return what was found in records without a fault."""
    process = process or PROCESSES.Noise()
    found = [
        find_difference(sampled(process, seed, n_samples), law)
        for seed in range(first_seed, first_seed + n_records)
    ]
    return [item for item in found if item is not None]


def power(n_records, n_samples, size_db, *, everywhere=True):
    """Return in which share of records the fault is found."""

    def change(samples):
        return compressed(samples, size_db, everywhere=everywhere)

    noise = PROCESSES.Noise()
    found = [
        find_difference(sampled(noise, seed, n_samples, change), LAW) is not None
        for seed in range(n_records)
    ]
    return sum(found) / n_records


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--records", type=int, default=10_000)
    parser.add_argument("--samples", type=int, default=1 << 18)
    parser.add_argument("--faulty", type=int, default=400)
    parser.add_argument("--faulty-samples", type=int, default=2_000_000)
    asked = parser.parse_args()
    start = time.perf_counter()
    found = alarms(asked.records, asked.samples)
    spent = time.perf_counter() - start
    print(
        f"false alarms: {len(found)} in {asked.records} records of {asked.samples}, {spent:.0f} s"
    )
    for item in found:
        print(f"  {item}")
    one = compare_with_law(sampled(PROCESSES.Noise(), 1, asked.faulty_samples), LAW)
    print(f"one record of {asked.faulty_samples}: {one.statement}")
    for row in one.levels:
        print(f"  {row.probability:8.1e}: detectable {row.detectable_db:.3f} dB")
    missed = len(found) * 10_000 > MOST_ALARMS_IN_10000 * asked.records
    for everywhere, name in ((True, "of the tail"), (False, "at 0.1 % alone")):
        share = power(asked.faulty, asked.faulty_samples, 0.1, everywhere=everywhere)
        error = (share * (1 - share) / asked.faulty) ** 0.5
        print(f"0.1 dB fault {name}: found in {share:.3f} +- {error:.3f} of {asked.faulty}")
        missed |= everywhere and share < LEAST_POWER
    return int(missed)


if __name__ == "__main__":
    sys.exit(main())
