"""The console command: parses arguments, runs one verb, turns errors into exit statuses."""

from __future__ import annotations

import argparse
import os
import re
import signal
import sys
import threading
from collections.abc import Sequence
from types import FrameType

from wavegen import __version__
from wavegen.cli.console import Console, discard_stdout
from wavegen.core.errors import (
    ArgumentsError,
    FileError,
    RecipeError,
    SignalError,
    TargetMissed,
    WavegenError,
)
from wavegen.core.registry import Registry

VERBS = Registry(
    "verb",
    {
        "make": "wavegen.cli.make:Make",
        "predict": "wavegen.cli.predict:Predict",
        "measure": "wavegen.cli.measure:Measure",
        "fidelity": "wavegen.cli.fidelity:Fidelity",
        "tune": "wavegen.cli.tune:Tune",
        "match": "wavegen.cli.match:Match",
        "shape": "wavegen.cli.shape:Shape",
        "gain-curve": "wavegen.cli.gain_curve:GainCurve",
        "check": "wavegen.cli.check:Check",
        "show": "wavegen.cli.show:Show",
        "convert": "wavegen.cli.convert:Convert",
        "new": "wavegen.cli.new:New",
        "list": "wavegen.cli.listing:Listing",
        "schema": "wavegen.cli.schema:Schema",
    },
)

STATUS: tuple[tuple[type[WavegenError], int], ...] = (
    (ArgumentsError, 2),
    (RecipeError, 3),
    (FileError, 4),
    (SignalError, 4),
    (TargetMissed, 5),
)
BUG = 1
INTERRUPTED = 130

EPILOGUE = """\
exit status: 0 done, 1 a fault of the program, 2 arguments, 3 recipe, 4 file,
5 differs or a target or rating not met, 6 undecided, 130 interrupted

A stimulus can destroy a device or a sensor by its peaks: check the peak
envelope power against every rating in the path, use a load or an attenuator,
radiate only with a licence and under local rules, keep within the exposure
limits that apply, and leave the decision to qualified people."""


def parser() -> argparse.ArgumentParser:
    """Return the argument parser with all verbs."""
    top = argparse.ArgumentParser(
        prog="wavegen",
        description="Make, tune and prove RF test stimuli from recipes.",
        epilog=EPILOGUE,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    top.add_argument("--version", action="version", version=f"wavegen {__version__}")
    verbs = top.add_subparsers(dest="verb", metavar="VERB", required=True)
    for name in VERBS:
        verb = VERBS.load(name)
        sub = verbs.add_parser(
            name,
            help=verb.summary,
            description=verb.description,
            formatter_class=argparse.RawDescriptionHelpFormatter,
        )
        verb.arguments(sub)
        sub.add_argument("--json", action="store_true", help="one JSON document on stdout")
        sub.set_defaults(run=verb.run)
    return top


def status_of(error: WavegenError) -> int:
    """Return the exit status that belongs to an error."""
    return next((status for kind, status in STATUS if isinstance(error, kind)), BUG)


def join_negative(argv: Sequence[str]) -> list[str]:
    """Join long options with values that start with a minus, which argparse takes for options.

    Examples
    --------
    >>> join_negative(["measure", "a.wav", "--reference-level", "-10dBm"])
    ['measure', 'a.wav', '--reference-level=-10dBm']
    """
    joined: list[str] = []
    for word in argv:
        is_value = re.match(r"-\.?[0-9]", word)
        if is_value and joined and re.fullmatch(r"--[a-z][a-z-]*", joined[-1]):
            joined[-1] = f"{joined[-1]}={word}"
        else:
            joined.append(word)
    return joined


def _end_on_termination() -> None:
    """Let a request to end (by a scheduler, a shell) clean up as an interrupt does."""

    def interrupt(_number: int, _frame: FrameType | None) -> None:
        raise KeyboardInterrupt

    if threading.current_thread() is threading.main_thread():
        signal.signal(signal.SIGTERM, interrupt)


def run(argv: Sequence[str] | None = None) -> int:
    """Run the command and return its exit status.

    Parameters
    ----------
    argv : sequence of str, optional
        Arguments without the program's name; those of the process if not given.

    Returns
    -------
    int
        0 done; 1 our bug; 2 arguments; 3 recipe; 4 file; 5 differs or target not met;
        6 undecided; 130 interrupted.
    """
    if argv is None:
        _end_on_termination()
    try:
        arguments = parser().parse_args(join_negative(sys.argv[1:] if argv is None else argv))
    except SystemExit as stop:  # argparse leaves this way: 0 after --help, 2 after a wrong option
        return stop.code if isinstance(stop.code, int) else 2
    console = Console()
    try:
        status = int(arguments.run(arguments, console))
    except WavegenError as error:
        console.fail(str(error))
        return status_of(error)
    except KeyboardInterrupt:
        console.fail("interrupted; nothing half-written is left")
        return INTERRUPTED
    except BrokenPipeError:  # the reader of our output has gone, as in `wavegen list | head -1`
        discard_stdout()
        return 0
    except Exception as error:
        if os.environ.get("WAVEGEN_TRACEBACK"):
            raise
        console.fail(
            f"a fault of the program: {type(error).__name__}: {error}\n"
            "Set WAVEGEN_TRACEBACK=1 and run it again to see where; please report that."
        )
        return BUG
    return status
