"""Speed of a pulse-shaped carrier over that of ``scipy.signal.upfirdn`` with the same taps.

Run it: ``python tests/speed/bench_pulse.py``. Budget: root raised cosine 0.22, default span, four
samples a symbol, symbols drawn and mapped, at least 10 times. CPU time, one thread, complex64
symbols, shortest of interleaved repeats. ``upfirdn`` is also given float32 and float64 taps; the
fastest counts.
"""

from __future__ import annotations

import argparse
import time
from fractions import Fraction

import scipy.signal

from wavegen.core.evaluate import evaluate
from wavegen.core.site import Site
from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.single_carrier import SingleCarrier

N_SAMPLES = 1 << 20
N_REFERENCE = 1 << 17
RATIOS = tuple(
    Fraction(text)
    for text in ("4", "2", "8", "5/2", "125/32", "120/13", "147456/325", "1234567/500000")
)


def seconds(run):
    """CPU time of one call."""
    start = time.process_time()
    run()
    return time.process_time() - start


def carrier(ratio):
    """A carrier of at least ``N_SAMPLES`` samples a loop."""
    made = SingleCarrier(
        constellation=Constellation.parse("64qam"),
        symbol_rate_hz=Fraction(1_000_000),
        pulse=RootRaisedCosine(roll_off=0.22),
    )
    n_samples = -(-2 * N_SAMPLES // ratio.numerator) * ratio.numerator
    site = Site(
        sample_rate_hz=1_000_000 * ratio, n_samples=n_samples, seed=1, label="x", path="signal"
    )
    return made.build(site)


def main():
    """Print rates and their ratios."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--repeats", type=int, default=7)
    repeats = parser.parse_args().repeats
    signals = {ratio: carrier(ratio) for ratio in RATIOS}
    first = signals[RATIOS[0]]
    symbols = evaluate({first.ideal: (0, N_REFERENCE // 4)})[first.ideal]
    taps = first.pulse.on_lattice(4)
    runs = {f"upfirdn, {kind} taps": (N_REFERENCE, _filter(taps, kind, symbols)) for kind in "fdF"}
    for ratio, signal in signals.items():
        runs[f"{ratio} samples a symbol"] = (N_SAMPLES, _render(signal))
    best = dict.fromkeys(runs, float("inf"))
    for _ in range(repeats):
        for name, (_, run) in runs.items():
            best[name] = min(best[name], seconds(run))
    rates = {name: count / best[name] for name, (count, _) in runs.items()}
    reference = max(rate for name, rate in rates.items() if "taps" in name)
    for name, rate in rates.items():
        print(f"{name:32s} {rate / 1e6:8.2f} MS/s {rate / reference:8.2f} times")


def _filter(taps, kind, symbols):
    typed = taps.astype(kind)
    return lambda: scipy.signal.upfirdn(typed, symbols, 4)


def _render(signal):
    return lambda: evaluate({signal: (0, N_SAMPLES)})


if __name__ == "__main__":
    main()
