"""Cost of `wavegen match`: ``python tests/speed/bench_match.py [--gigabytes 1]``.

Two recordings of one process, as long as told, are written to a temporary folder, read alone (as
the meters read them), and compared by a process of its own. Prints MB/s of both, their ratio, and
the peak memory, which must not grow with the length.
"""

import argparse
import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from bench_measure import HINTS, MOST_MB, report, write_noise

from wavegen.core.render import render
from wavegen.files.read import open_recording

MATCH = "import sys; from wavegen.cli.main import run; sys.exit(run())"
READ = "import sys; from bench_match import read; read(sys.argv[1:])"


def read(names):
    """Read files once, as a render without meters does."""
    for name in names:
        render(open_recording(Path(name), HINTS).signal, taps=())


def timed(code, *arguments):
    """Return seconds and CPU seconds of a process of its own, and what it ended with."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    began = time.perf_counter()
    ended = subprocess.run(
        [sys.executable, "-c", code, *arguments],
        check=False,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        cwd=Path(__file__).parent,
    )
    seconds = time.perf_counter() - began
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    cpu = after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime
    return seconds, cpu, ended.returncode, after.ru_maxrss / 1024


def main() -> int:
    """Print the figures; 1 if the memory budget is missed."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--gigabytes", type=float, default=0.0625)
    n_bytes = int(parser.parse_args().gigabytes * 1e9) // 4 * 4
    with tempfile.TemporaryDirectory() as folder:
        paths = [Path(folder) / f"{name}.ci16_le" for name in ("stimulus", "field")]
        for path in paths:
            write_noise(path, n_bytes)
        names = [str(path) for path in paths]
        megabytes = 2 * n_bytes / 1e6
        seconds, cpu, status, _ = timed(READ, *names)
        if status:
            report("reading ended with an error")
            return 1
        report(f"Two files of {n_bytes / 1e6:.0f} MB each, two workers:")
        report(f"  reading alone {megabytes / seconds:6.0f} MB/s, {cpu:.1f} s CPU")
        alone = seconds
        options = ["match", *names, "--sample-rate", "20MHz", "--down-to", "0.1%", "--json"]
        seconds, cpu, status, most = timed(MATCH, *options)
        report(
            f"  match         {megabytes / seconds:6.0f} MB/s, {cpu:.1f} s CPU, "
            f"{seconds / alone:.1f} times reading, peak memory {most:.0f} MB (budget {MOST_MB}), "
            f"status {status}"
        )
    return int(most > MOST_MB or status not in {0, 5, 6})


if __name__ == "__main__":
    sys.exit(main())
