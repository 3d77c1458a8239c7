"""CPU time of rendering OFDM over that of the bare inverse FFTs it contains.

Run it: ``python tests/speed/bench_ofdm.py``. Budget: rendered and power-metered at most 3 times
the bare rows (``scipy.fft``, reused arrays, one thread). Shortest of interleaved repeats.
"""

from __future__ import annotations

import argparse
import time
from collections.abc import Callable
from fractions import Fraction
from importlib.util import find_spec
from typing import Any

import numpy as np
import scipy.fft

from wavegen.core.allocation import keep_large_blocks
from wavegen.core.render import Tap, render
from wavegen.core.site import Site
from wavegen.meters import METERS
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.ofdm import Group, Ofdm
from wavegen.sources.ofdm_layout import CyclicPrefix, Stretch
from wavegen.sources.ofdm_signal import Prefixed
from wavegen.sources.subcarriers import IndexSet, SymbolSet

CASES = {
    "N=2048, 1200 x 64QAM, LTE prefixes": (
        2048,
        "-600..-1, 1..600",
        "64qam",
        ["160/2048", "6 x 144/2048"],
        "0 samples",
    ),
    "the same with an edge window": (
        2048,
        "-600..-1, 1..600",
        "64qam",
        ["160/2048", "6 x 144/2048"],
        "72/2048",
    ),
    "N=64, 52 x QPSK, prefix 1/4": (64, "-26..-1, 1..26", "qpsk", "1/4", "8 samples"),
    "N=128, 72 x 16QAM, LTE prefixes": (
        128,
        "-36..-1, 1..36",
        "16qam",
        ["160/2048", "6 x 144/2048"],
        "0 samples",
    ),
    "N=4096, 3276 x 1024QAM, 14-symbol pattern": (
        4096,
        "-1638..1637",
        "1024qam",
        ["352/4096", "13 x 288/4096"],
        "0 samples",
    ),
    "N=1024, 600 x 64QAM, scattered": (
        1024,
        [k for k in range(-360, 361) if k and k % 6],
        "64qam",
        "72/1024",
        "0 samples",
    ),
    "N=2048, 1200 x 64QAM, DFT-spread": (
        2048,
        "-600..599",
        "64qam",
        ["160/2048", "6 x 144/2048"],
        "0 samples",
        {"spreading": "dft"},
    ),
    "the same shifted by half a subcarrier": (
        2048,
        "-600..599",
        "64qam",
        ["160/2048", "6 x 144/2048"],
        "0 samples",
        {"spreading": "dft"},
        {"half_subcarrier_shift": True},
    ),
    "N=2048, 1200 x 64QAM, on in 12 of 14 symbols": (
        2048,
        "-600..599",
        "64qam",
        ["160/2048", "6 x 144/2048"],
        "0 samples",
        {"symbols": SymbolSet.parse("0..11")},
        {"frame_symbols": 14},
    ),
}
"""FFT length, subcarriers, constellation, prefixes, edge; more of the group; more of the signal."""


def build(case: tuple[Any, ...], n_samples: int) -> Prefixed:
    """Return the signal of a case, about so long."""
    n_fft, subcarriers, constellation, prefix, edge, *more = case
    of_group, of_signal = (*more, {}, {})[:2]
    settings = Ofdm(
        subcarrier_spacing_hz=Fraction(15000),
        groups=(
            Group(
                subcarriers=IndexSet.parse(subcarriers),
                constellation=Constellation.parse(constellation),
                **of_group,
            ),
        ),
        cyclic_prefix=CyclicPrefix.parse(prefix),
        edge_window=Stretch.parse(edge),
        **of_signal,
    )
    rate = Fraction(15000) * n_fft
    cycle = settings.cycle(rate, "signal").n_samples
    return settings.build(
        Site(
            sample_rate_hz=rate,
            n_samples=cycle * (n_samples // cycle),
            seed=1,
            label="carrier",
            path="signal",
        )
    )


def bare(signal: Prefixed) -> Callable[[], None]:
    """Return the inverse FFTs alone, in reused arrays of about 256 kB."""
    n_fft = signal.layout.n_fft
    n_rows = signal.inputs[0].n_samples // n_fft
    block = max((1 << 15) // n_fft, 4)
    room = np.zeros((block, n_fft), np.complex64)

    def run() -> None:
        for _ in range(n_rows // block):
            scipy.fft.ifft(room, axis=1, overwrite_x=True, norm="forward")

    return run


def ratios(signal: Prefixed, repeats: int) -> dict[str, float]:
    """Return CPU seconds of each task, the least of the repeats."""
    tasks: dict[str, Callable[[], object]] = {
        "bare": bare(signal),
        "rendered": lambda: render(signal, sink=lambda _: None),
    }
    if find_spec(METERS["power"].partition(":")[0]):
        taps = (Tap(name="power", signal=signal, meter=METERS.load("power")()),)
        tasks["metered"] = lambda: render(signal, taps=taps)
    best = dict.fromkeys(tasks, float("inf"))
    for _ in range(repeats):
        for name, task in tasks.items():
            start = time.process_time()
            task()
            best[name] = min(best[name], time.process_time() - start)
    return best


def main() -> None:
    """Print the ratios."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--samples", type=int, default=1 << 24)
    parser.add_argument("--repeats", type=int, default=9)
    chosen = parser.parse_args()
    print("large blocks kept:", keep_large_blocks())
    for name, case in CASES.items():
        signal = build(case, chosen.samples)
        best = ratios(signal, chosen.repeats)
        rate = signal.n_samples / best["rendered"] / 1e6
        shown = ", ".join(f"{task} {best[task] / best['bare']:.2f}" for task in list(best)[1:])
        print(f"{name}: {shown} times the bare FFTs; {rate:.0f} MS/s")


if __name__ == "__main__":
    main()
