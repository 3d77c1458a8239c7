"""How often does the verdict err?  ``python tests/speed/study_false_alarms.py``

False alarms: records of fourfold-oversampled Gaussian noise against the Gaussian law; designed for
2 in 10 000, at most 4 in 10 000 allowed. Power: the same noise, 2 million samples, with a fault of
its tail of 0.1 dB at 0.1 %, must be found in 80 % of the records. The fault is a soft compression:
powers above the 1 % level are lowered, in proportion to how far they lie above it in dB. For
comparison, the same with a fault in one place only: none at 1 % and at 0.01 %, 0.1 dB at 0.1 %.

``--process qpsk`` or ``8psk`` counts false alarms of such carriers (roll-off 0.22, 4 samples a
symbol) against their own law, whose tail is steep: there a level hangs on the record's own mean.
The whole study of one process takes about 5 minutes on two idle cores (10 of CPU), the fault
included; ``--records N`` and ``--faulty N`` make a shorter one.
"""

import argparse
import functools
import importlib.util
import os
import sys
import time
from fractions import Fraction
from pathlib import Path

import numpy as np
import scipy.fft

from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.pulse_shaped import PulseShapedTerm
from wavegen.laws.tabulated import tabulated
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
    sys.modules[spec.name] = module  # where other processes look its classes up
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


class Carrier:
    """Symbols of a ring through a root-raised-cosine filter, in the spectrum; and their law."""

    per_symbol = 4
    roll_off = 0.22

    def __init__(self, order):
        self.points = np.exp(2j * np.pi * (np.arange(order) + 0.5) / order)

    def record(self, rng, n):
        symbols = self.points[rng.integers(0, self.points.size, n // self.per_symbol)]
        spectrum = scipy.fft.fft(symbols.astype(np.complex64))
        frequency = scipy.fft.fftfreq(n, 1 / self.per_symbol)
        edge = (1 - self.roll_off) / 2
        bent = np.clip((np.abs(frequency) - edge) / self.roll_off, 0, 1)
        shaped = np.tile(spectrum, self.per_symbol) * np.cos(np.pi / 2 * bent).astype(np.float32)
        return scipy.fft.ifft(shaped * np.float32(self.per_symbol), overwrite_x=True)

    @property
    def law(self):
        term = PulseShapedTerm.of(
            name="carrier",
            points=self.points,
            pulse=RootRaisedCosine(roll_off=self.roll_off).design(Fraction(self.per_symbol)),
            ratio=(self.per_symbol, 1),
            period_symbols=1 << 20,
        )
        return tabulated(term.law())


def processes(name):
    """Return a process and its law by name."""
    if name == "noise":
        return PROCESSES.Noise(), LAW
    carrier = Carrier({"qpsk": 4, "8psk": 8}[name])
    return carrier, carrier.law


def difference_in_record(process, law, n_samples, change, seed):
    """Return what is found in one record."""
    return find_difference(sampled(process, seed, n_samples, change), law)


def alarms(n_records, n_samples, *, process=None, law=LAW, first_seed=1, workers=1):
    """Return what was found in records without a fault."""
    process = process or PROCESSES.Noise()
    one = functools.partial(difference_in_record, process, law, n_samples, None)
    seeds = range(first_seed, first_seed + n_records)
    return [item for item in PROCESSES.over_seeds(one, seeds, workers) if item is not None]


def power(n_records, n_samples, size_db, *, everywhere=True, workers=1):
    """Return in which share of records the fault is found."""
    change = functools.partial(compressed, size_db=size_db, everywhere=everywhere)
    one = functools.partial(difference_in_record, PROCESSES.Noise(), LAW, n_samples, change)
    found = PROCESSES.over_seeds(one, range(n_records), workers)
    return sum(item is not None for item in found) / n_records


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--records", type=int, default=10_000)
    parser.add_argument("--samples", type=int, default=1 << 18)
    parser.add_argument("--faulty", type=int, default=400)
    parser.add_argument("--faulty-samples", type=int, default=2_000_000)
    parser.add_argument("--process", choices=("noise", "qpsk", "8psk"), default="noise")
    parser.add_argument("--workers", type=int, default=os.cpu_count() or 1)
    asked = parser.parse_args()
    process, law = processes(asked.process)
    start = time.perf_counter()
    found = alarms(asked.records, asked.samples, process=process, law=law, workers=asked.workers)
    spent = time.perf_counter() - start
    print(
        f"{asked.process}: false alarms: {len(found)} in {asked.records} records of "
        f"{asked.samples}, {spent:.0f} s"
    )
    for item in found:
        print(f"  {item}")
    missed = len(found) * 10_000 > MOST_ALARMS_IN_10000 * asked.records
    if asked.process != "noise" or not asked.faulty:
        return int(missed)
    one = compare_with_law(sampled(PROCESSES.Noise(), 1, asked.faulty_samples), LAW)
    print(f"one record of {asked.faulty_samples}: {one.statement}")
    for row in one.levels:
        print(f"  {row.probability:8.1e}: detectable {row.detectable_db:.3f} dB")
    for everywhere, name in ((True, "of the tail"), (False, "at 0.1 % alone")):
        share = power(
            asked.faulty, asked.faulty_samples, 0.1, everywhere=everywhere, workers=asked.workers
        )
        error = (share * (1 - share) / asked.faulty) ** 0.5
        print(f"0.1 dB fault {name}: found in {share:.3f} +- {error:.3f} of {asked.faulty}")
        missed |= everywhere and share < LEAST_POWER
    return int(missed)


if __name__ == "__main__":
    sys.exit(main())
