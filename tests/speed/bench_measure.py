"""Cost of `wavegen measure`: ``python tests/speed/bench_measure.py [--gigabytes 3]``.

Prints CPU time a sample of reading a file alone, of the plain power meter, of the parts of a
measurement and of all of it, as ratios in one run; then rate and peak memory of a large file,
measured by a process of its own.
"""

import argparse
import resource
import subprocess
import sys
import tempfile
import time
from fractions import Fraction
from pathlib import Path

import numpy as np

from wavegen.core.allocation import keep_large_blocks
from wavegen.core.render import Tap, render
from wavegen.files.format import ReadHints
from wavegen.files.read import open_recording
from wavegen.meters.batches import BatchedPowerMeter
from wavegen.meters.faults import FaultSearch, code_scale
from wavegen.meters.power import PowerMeter
from wavegen.production.measure import measure
from wavegen.production.subject_files import open_subject

REPEATS = 5
HINTS = ReadHints(sample_rate_hz=Fraction(20_000_000))
MOST_MB = 400


def report(line: str) -> None:
    sys.stdout.write(line + "\n")
    sys.stdout.flush()


def write_noise(path: Path, n_bytes: int) -> None:
    """Write oversampled noise, tiled, in pieces of 64 MB."""
    rng = np.random.default_rng(1)
    fine = np.convolve(rng.standard_normal(1 << 22), np.hanning(9), "same") * 2000
    piece = np.round(fine).astype("<i2")
    with path.open("wb") as file:
        written = 0
        while written < n_bytes:
            part = np.roll(piece, 2 * int(rng.integers(1 << 20)))[: (n_bytes - written) // 2]
            part.tofile(file)
            written += part.nbytes


def ratios(path: Path) -> None:
    """Print CPU time a sample, best of interleaved repeats, one worker."""
    recording = open_recording(path, HINTS)
    signal, n = recording.signal, recording.n_samples
    search = FaultSearch.of(signal, code_scale=code_scale(recording))

    def rendered(*taps: Tap) -> None:
        render(signal, taps=taps)

    jobs = {
        "reading": rendered,
        "plain power meter": lambda: rendered(Tap(name="p", signal=signal, meter=PowerMeter())),
        "with batches": lambda: rendered(Tap(name="p", signal=signal, meter=BatchedPowerMeter())),
        "faults": lambda: rendered(*search.taps),
        "all of measure": lambda: measure(open_subject(path, HINTS)),
    }
    spent = dict.fromkeys(jobs, np.inf)
    for _ in range(REPEATS):
        for name, job in jobs.items():
            began = time.process_time()
            job()
            spent[name] = min(spent[name], (time.process_time() - began) / n * 1e9)
    plain = spent["plain power meter"]
    for name, cost in spent.items():
        report(f"  {name:18} {cost:6.2f} ns CPU a sample, {cost / plain:5.2f} of the power meter")


def large(path: Path) -> bool:
    """Measure a large file in a process of its own; True if it takes too much memory."""
    command = [
        sys.executable,
        "-c",
        "import sys; from wavegen.cli.main import run; sys.exit(run())",
    ]
    options = ["measure", str(path), "--sample-rate", "20MHz", "--json"]
    began = time.perf_counter()
    subprocess.run([*command, *options], check=True, stdout=subprocess.DEVNULL)
    seconds = time.perf_counter() - began
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    megabytes = used.ru_maxrss / 1024
    size = path.stat().st_size / 1e6
    report(
        f"  {size:.0f} MB in {seconds:.1f} s: {size / seconds:.0f} MB/s, "
        f"{(used.ru_utime + used.ru_stime) / size * 4e3:.1f} ns CPU a sample, "
        f"peak memory {megabytes:.0f} MB (budget {MOST_MB})"
    )
    return megabytes > MOST_MB


def main() -> int:
    """Print the figures; 1 if the memory budget is missed."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--gigabytes", type=float, default=0.0)
    gigabytes = parser.parse_args().gigabytes
    keep_large_blocks()
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "noise.ci16_le"
        write_noise(path, 1 << 26)
        report("A file of 16-bit codes, 16.8 million samples:")
        ratios(path)
        path.unlink()
        if not gigabytes:
            return 0
        write_noise(path, int(gigabytes * 1e9) // 4 * 4)
        report("A large file, two workers:")
        return int(large(path))


if __name__ == "__main__":
    sys.exit(main())
