"""The console command: parses arguments, runs one verb, turns errors into exit statuses."""

from __future__ import annotations

import os
import signal
import sys
import threading
from collections.abc import Sequence
from types import FrameType

from wavegen import __version__
from wavegen.cli.arguments import Parser, add_common, epilogue, join_negative, refuse_unknown
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
        "completion": "wavegen.cli.completion:Completion",
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
COMPLETES = "_ARGCOMPLETE"
"""Set by the shell's completion, which asks the program what may follow."""

EPILOGUE = """\
begin with:
  wavegen list recipes
  wavegen make valley-cell-20mhz

exit status: 0 done, 1 a fault of the program, 2 arguments, 3 recipe, 4 file,
5 differs or a target or rating not met, 6 undecided, 130 interrupted

A stimulus can destroy a device or a sensor by its peaks: check the peak envelope
power against every rating in the path, use a load or an attenuator, radiate
only with a licence and under local rules, keep within the exposure limits that
apply, and leave the decision to qualified people."""


def parser() -> Parser:
    """Return the argument parser with all verbs."""
    return parsers()[0]


def parsers() -> tuple[Parser, dict[str, Parser]]:
    """Return the argument parser of the program, and those of its verbs."""
    top = Parser(
        prog="wavegen",
        description="Make, tune and prove RF test stimuli from recipes.",
        epilog=EPILOGUE,
        example="wavegen make valley-cell-20mhz",
    )
    top.add_argument("--version", action="version", version=f"wavegen {__version__}")
    verbs = top.add_subparsers(dest="verb", metavar="VERB", required=True, title="verbs")
    made = {}
    for name in VERBS:
        verb = VERBS.load(name)
        sub = verbs.add_parser(
            name, help=verb.summary, description=verb.description, example=verb.examples[0]
        )
        verb.arguments(sub)
        add_common(sub)
        sub.epilog = epilogue(verb.examples, sub.epilog)
        sub.set_defaults(run=verb.run)
        made[name] = sub
    return top, made


def status_of(error: WavegenError) -> int:
    """Return the exit status that belongs to an error."""
    return next((status for kind, status in STATUS if isinstance(error, kind)), BUG)


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
    words = join_negative(sys.argv[1:] if argv is None else argv)
    console = Console(is_quiet="--quiet" in words, is_plain="--no-color" in words)
    try:
        return _run(words, console)
    except WavegenError as error:
        console.fail(str(error))
        return status_of(error)
    except KeyboardInterrupt:
        kept = f"; kept: {', '.join(console.kept)}" if console.kept else ""
        console.fail(f"interrupted; nothing half-written is left{kept}")
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


def _run(words: list[str], console: Console) -> int:
    top, verbs = parsers()
    if COMPLETES in os.environ:
        from wavegen.cli.completion import complete

        complete(top, verbs)
    refuse_unknown(top, verbs, words)
    try:
        arguments = top.parse_args(words)
    except SystemExit as stop:  # argparse leaves this way after --help and --version
        sys.stdout.flush()
        return stop.code if isinstance(stop.code, int) else 2
    return int(arguments.run(arguments, console))
