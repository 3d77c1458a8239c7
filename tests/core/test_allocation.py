import ctypes
import subprocess
import sys
import textwrap

from wavegen.core import allocation

PROGRAM = """
import resource, sys
import numpy as np
from wavegen.core.allocation import keep_large_blocks
took = keep_large_blocks() if sys.argv[1] == "keep" else True
def faults():
    return resource.getrusage(resource.RUSAGE_SELF).ru_minflt
for _ in range(2):
    np.ones(1 << 23, np.complex64)
before = faults()
for _ in range(4):
    np.ones(1 << 23, np.complex64)
print(int(took), faults() - before)
"""


def _run(what: str) -> tuple[bool, int]:
    done = subprocess.run(
        [sys.executable, "-c", textwrap.dedent(PROGRAM), what],
        capture_output=True,
        text=True,
        check=True,
    )
    took, faults = done.stdout.split()
    return took == "1", int(faults)


def test_large_blocks_are_used_again() -> None:
    took, kept = _run("keep")
    _, fresh = _run("leave")
    # Where the C library takes the settings, the four 64 MB arrays reuse their pages.
    assert not took or kept < fresh / 10


def test_other_c_libraries_are_left_alone(monkeypatch) -> None:
    def missing(name: str | None) -> object:
        raise OSError(name)

    monkeypatch.setattr(ctypes, "CDLL", missing)
    assert allocation.keep_large_blocks() is False
