"""Budgets of a whole stimulus: CPU time to a SigMF file, a second worker, memory.

Run: ``python tests/speed/bench_make.py`` (about two minutes). Prints ratios taken in one run.
"""

from __future__ import annotations

import hashlib
import os
import resource
import subprocess
import sys
import tempfile
import time
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

RECIPE = """\
wavegen: 1
title: One long OFDM carrier
sample_rate: 61.44 MHz
duration: {duration} ms
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups:
    - {{subcarriers: "-600..-1, 1..600", constellation: 64qam}}
  cyclic_prefix: [160/2048, 6 x 144/2048]
  edge_window: 72/2048
"""
N_FFT = 4096
REPEATS = 5
SHARE = 2048 * 7 / (160 + 6 * 144 + 7 * 2048)
"""Of the samples, those that come out of an inverse FFT."""


def cpu_s() -> complex:
    """Return the CPU time of this process so far, all threads: user's, and the system's as j."""
    usage = resource.getrusage(resource.RUSAGE_SELF)
    return complex(usage.ru_utime, usage.ru_stime)


def bare_fft_s(n_samples: int) -> float:
    """Return the CPU time of the bare inverse FFTs of a render, reused arrays, one thread."""
    import numpy as np
    import scipy.fft

    rows = np.ones((16, N_FFT), np.complex64)
    calls = int(n_samples * SHARE) // rows.size
    start = cpu_s()
    for _ in range(calls):
        rows[:] = 1
        scipy.fft.ifft(rows, axis=1, norm="forward", overwrite_x=True)
    return (cpu_s() - start).real


def sha512_s(n_bytes: int) -> float:
    """Return the CPU time of the bare SHA-512 of so many bytes."""
    block = bytes(1 << 21)
    digest = hashlib.sha512()
    start = cpu_s()
    for _ in range(n_bytes // len(block)):
        digest.update(block)
    return (cpu_s() - start).real


def touch_memory(folder: Path, n_bytes: int) -> None:
    """Write and remove a file of so many bytes.

    A virtual machine gets its memory page by page as it is first touched, files' pages too; who
    is first to write to them should not pay for it.
    """
    path = folder / "touched"
    block = bytes(1 << 22)
    with path.open("wb") as file:
        for _ in range(n_bytes // len(block)):
            file.write(block)
    path.unlink()


def child(folder: Path, duration_ms: int) -> None:
    """Time the stages of one recipe in this (fresh) process and print them."""
    from wavegen.core.allocation import keep_large_blocks

    keep_large_blocks()
    from wavegen.core.render import Tap, render
    from wavegen.meters.power import PowerMeter
    from wavegen.production.make import make
    from wavegen.production.prepare import prepare
    from wavegen.recipe.load import load_text

    short = load_text(RECIPE.format(duration=20), name="warm")
    make(short, out=folder, overwrite=True, workers=1)
    loaded = load_text(RECIPE.format(duration=duration_ms), name="long")
    signal = prepare(loaded).built.signal
    tap = Tap(name="power", signal=signal, meter=PowerMeter())
    names = ("rendered, metered", "to SigMF", "of that, the bare SHA-512")
    figures: dict[str, list[complex]] = {name: [] for name in names}
    touch_memory(folder, (8 + 4 + 4) * signal.n_samples)
    for _ in range(REPEATS):
        bare = bare_fft_s(signal.n_samples)
        figures[names[2]].append(sha512_s(4 * signal.n_samples) / bare)
        start = cpu_s()
        render(signal, taps=(tap,), workers=1)
        figures["rendered, metered"].append((cpu_s() - start) / bare)
        start = cpu_s()
        make(loaded, out=folder, overwrite=True, workers=1)
        figures["to SigMF"].append((cpu_s() - start) / bare)
    print(f"bare inverse FFTs: {signal.n_samples * SHARE / bare / 1e6:.0f} MS/s")
    for name, ratios in figures.items():
        best = min(ratios, key=lambda ratio: ratio.real + ratio.imag)
        print(
            f"{name}: {best.real + best.imag:.2f} times the bare inverse FFTs in CPU time, of it "
            f"{best.imag:.2f} in the system (files; best of {REPEATS})"
        )


def workers(n: int, cores: set[int]) -> float:
    """Return the wall time of rendering with ``n`` workers on some cores, s."""
    from wavegen.core.allocation import keep_large_blocks

    keep_large_blocks()
    from wavegen.core.render import render
    from wavegen.production.prepare import prepare
    from wavegen.recipe.load import load_text

    os.sched_setaffinity(0, cores)
    signal = prepare(load_text(RECIPE.format(duration=1000), name="long")).built.signal
    render(signal, workers=n)
    start = time.perf_counter()
    render(signal, workers=n)
    return time.perf_counter() - start


def transforms(n: int, cores: set[int]) -> float:
    """Return the wall time of bare inverse FFTs shared by ``n`` threads on some cores, s."""
    os.sched_setaffinity(0, cores)
    with ThreadPoolExecutor(n) as pool:
        list(pool.map(bare_fft_s, [4 * N_FFT] * n))
        start = time.perf_counter()
        list(pool.map(bare_fft_s, [60_000_000 // n] * n))
        return time.perf_counter() - start


def memory(folder: Path, duration_ms: int) -> int:
    """Make a file in this process and return its peak memory, kB."""
    from wavegen.core.allocation import keep_large_blocks

    keep_large_blocks()
    from wavegen.production.make import make
    from wavegen.recipe.load import load_text

    loaded = load_text(RECIPE.format(duration=duration_ms), name="long")
    make(loaded, out=folder, overwrite=True, workers=2)
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss


def ask(*arguments: str) -> str:
    """Run this file in a fresh process and return what it prints."""
    done = subprocess.run(
        [sys.executable, __file__, *arguments], check=True, capture_output=True, text=True
    )
    return done.stdout.strip()


def main() -> None:
    """Print all ratios."""
    with tempfile.TemporaryDirectory(dir=Path.cwd()) as name:
        print(ask("child", name, "1600"))
        what = [(kind, n) for kind in ("workers", "transforms") for n in ("1", "2")]
        spent = dict.fromkeys(what, float("inf"))
        for _ in range(REPEATS):  # interleaved: what else runs on the machine comes and goes
            for kind, n in what:
                taken = float(ask(kind, n, "0" if n == "1" else "0,1"))
                spent[kind, n] = min(spent[kind, n], taken)
        gained, limit = (spent[kind, "1"] / spent[kind, "2"] for kind in ("workers", "transforms"))
        print(
            f"two workers over one (pinned to one core), rendering: {gained:.2f}; bare inverse "
            f"FFTs on the same cores: {limit:.2f}"
        )
        small, large = (int(ask("memory", name, d)) for d in ("164", "1640"))
        print(
            f"peak memory, two workers: {small / 1e3:.0f} MB for 1.0e7 samples, "
            f"{large / 1e3:.0f} MB for 1.0e8: {100 * (large / small - 1):+.1f} %"
        )


if __name__ == "__main__":
    if len(sys.argv) < 2:
        main()
    elif sys.argv[1] == "child":
        child(Path(sys.argv[2]), int(sys.argv[3]))
    elif sys.argv[1] in {"workers", "transforms"}:
        job = workers if sys.argv[1] == "workers" else transforms
        print(job(int(sys.argv[2]), {int(core) for core in sys.argv[3].split(",")}))
    else:
        print(memory(Path(sys.argv[2]), int(sys.argv[3])))
