"""Time to start: `wavegen --help` against importing NumPy. Run it; it is no test.

Budget: at most twice. Each command is run in turn several times, and the medians are compared.
"""

from __future__ import annotations

import statistics
import subprocess
import sys
import time

RUNS = 15
BUDGET = 2.0
HELP = "import sys; from wavegen.cli.main import run; sys.exit(run(['--help']))"


def seconds(code: str) -> float:
    """Return how long a fresh interpreter takes to run a line of code."""
    start = time.perf_counter()
    subprocess.run([sys.executable, "-c", code], check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - start


def main() -> int:
    """Print the ratio; 1 if it is over the budget."""
    pairs = [(seconds(HELP), seconds("import numpy")) for _ in range(RUNS + 1)][1:]
    ours, numpy = (statistics.median(column) for column in zip(*pairs, strict=True))
    ratio = ours / numpy
    sys.stdout.write(
        f"wavegen --help {1e3 * ours:.0f} ms, import numpy {1e3 * numpy:.0f} ms, "
        f"ratio {ratio:.2f} (budget {BUDGET:.1f})\n"
    )
    return int(ratio > BUDGET)


if __name__ == "__main__":
    sys.exit(main())
