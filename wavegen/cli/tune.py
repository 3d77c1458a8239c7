"""`wavegen tune`: the settings of crest-factor reduction that serve best within limits."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from wavegen.cli.console import Console
from wavegen.cli.fidelity import add_fidelity, request_of
from wavegen.cli.options import add_overrides, add_workers, positive, ratio_db
from wavegen.cli.report_options import add_reports, are_wanted, report_comparison
from wavegen.core.errors import ArgumentsError
from wavegen.core.units import DIMENSIONS, QuantityError, parse_quantity

if TYPE_CHECKING:
    from wavegen.tuning.limits import Limits
    from wavegen.tuning.results import Tuned

MISSED, UNDECIDED = 5, 6


class Tune:
    """The verb ``tune``."""

    summary = "search the crest-factor reduction that serves best within limits"
    description = (
        "Search the settings of crest-factor reduction for the lowest level at a\n"
        "probability (or, with the points of an amplifier, for the highest average output\n"
        "power) within limits of EVM, of adjacent channels and of a mask. Every trial is\n"
        "made on the same data; the best is confirmed on other data. Then OUT/NAME/ holds\n"
        "the tuned recipe NAME-tuned.yaml, comments kept, and every evaluation in\n"
        "NAME.tuning.json, with which a tune that was interrupted goes on."
    )
    examples = ("wavegen tune valley-cell-20mhz --evm-limit 8% --method clip --seconds 5",)

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument("recipe", metavar="RECIPE", help="a file, or a shipped recipe's name")
        group = parser.add_argument_group("limits")
        group.add_argument(
            "--evm-limit",
            metavar="LIMIT",
            help="8%%, or a standard: 'NR BS FR1 64QAM', or 'NR BS FR1' for each group its own",
        )
        group.add_argument(
            "--evm-reserve",
            type=share,
            metavar="PERCENT",
            default=0.0,
            help="EVM of the rest of the chain, taken off by root-sum-square, such as 2%%",
        )
        group.add_argument(
            "--aclr-limit",
            type=ratio_db,
            metavar="DB",
            help="such as 45dB (default: those of --channels, where given)",
        )
        parser.add_argument(
            "--at",
            type=probability,
            metavar="PROBABILITY",
            default=1e-4,
            help="where the level is read (default: 0.01%%)",
        )
        parser.add_argument(
            "--method",
            action="append",
            default=[],
            metavar="NAME",
            help="a method; more than once for several (default: all that suit, the "
            "projection apart, which is the reference)",
        )
        parser.add_argument(
            "--device",
            type=Path,
            metavar="CSV",
            help="points of an amplifier: input_dbm,output_dbm,phase_deg",
        )
        parser.add_argument(
            "--seconds",
            type=positive,
            metavar="S",
            default=60.0,
            help="for searching (default: 60)",
        )
        parser.add_argument(
            "--out", type=Path, default=Path("output"), metavar="DIR", help="default: output"
        )
        parser.add_argument("--overwrite", action="store_true", help="replace files that exist")
        add_reports(parser, has_overwrite=True)
        add_fidelity(parser)
        add_overrides(parser)
        add_workers(parser)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Tune and print."""
        from wavegen.recipe.find import find_recipe
        from wavegen.recipe.load import load_recipe
        from wavegen.tuning.request import TuneRequest
        from wavegen.tuning.tune import tune

        are_wanted(arguments)
        loaded = load_recipe(find_recipe(arguments.recipe), overrides=tuple(arguments.overrides))
        limits = limits_of(arguments, has_mask=loaded.recipe.mask is not None)
        fidelity = request_of(
            arguments, limits=None, has_spread=False, must_hold=arguments.aclr_limit is not None
        )
        request = TuneRequest(
            limits=limits,
            fidelity=fidelity,
            probability=arguments.at,
            methods=tuple(arguments.method),
            seconds=arguments.seconds,
            device=arguments.device,
        )
        progress = console.progress()
        try:
            tuned = tune(
                loaded,
                request,
                out=arguments.out,
                overwrite=arguments.overwrite,
                workers=arguments.workers,
                progress=progress,
            )
        except KeyboardInterrupt:
            folder = arguments.out / loaded.name
            if folder.exists():
                console.keep(f"what was evaluated, in {folder}; the same command goes on with it")
            raise
        finally:
            progress.close()
        document = {
            "format": "wavegen.tuning",
            "version": 1,
            **tuned.document(),
            "evaluations": [item.row() for item in tuned.evaluations],
        }
        said = report_comparison(arguments, document) if are_wanted(arguments) else []
        if arguments.json:
            console.document(document)
        else:
            show(document, console, asked=frozenset(arguments.method))
            for line in said:
                console.line(line)
        return status_of(tuned)


def status_of(tuned: Tuned) -> int:
    """Return the exit status: 0, 5 where limits are not kept, 6 where that is not known."""
    if tuned.best is None:
        return UNDECIDED if tuned.is_unfinished else MISSED
    verdict = tuned.confirmation.verdict if tuned.confirmation else "confirmed"
    return {"undecided": UNDECIDED, "missed": MISSED}.get(verdict, 0)


def limits_of(arguments: argparse.Namespace, *, has_mask: bool) -> Limits:
    """Return the limits that the options, or a recipe with a mask, set.

    Raises
    ------
    ArgumentsError
        None is set, no such limit, or a reserve that leaves nothing.
    """
    from wavegen.tuning.limits import Limits, read_evm_limit

    number: float | None = None
    standard: str | None = None
    text = arguments.evm_limit
    if text is not None and any(letter.isalpha() for letter in text):
        named = read_evm_limit(text)
        number, standard = named.evm_percent, named.evm_standard
    elif text is not None:
        try:
            number = share(text)
        except argparse.ArgumentTypeError as error:
            raise ArgumentsError(
                where="--evm-limit",
                problem=str(error),
                allowed="a number with %, or a standard",
                remedy="Write it like 8%.",
            ) from error
    return Limits(
        evm_percent=number,
        evm_standard=standard,
        reserve_percent=arguments.evm_reserve,
        aclr_db=arguments.aclr_limit,
        keeps_channel_limits=arguments.aclr_limit is None and arguments.channels is not None,
        keeps_mask=has_mask or arguments.mask is not None,
    )


def share(text: str) -> float:
    """Read a share with its unit, such as ``8%``.

    Raises
    ------
    argparse.ArgumentTypeError
        No such share, or none above 0.
    """
    try:
        value = float(parse_quantity(text, DIMENSIONS["_percent"]))
    except QuantityError as error:
        raise argparse.ArgumentTypeError(str(error)) from error
    if not value > 0:
        message = f"{text!r} is not above zero; allowed: more than 0 %. Write it like 8%."
        raise argparse.ArgumentTypeError(message)
    return value


def probability(text: str) -> float:
    """Read a probability: ``0.01%`` or ``1e-4``.

    Raises
    ------
    argparse.ArgumentTypeError
        Neither, or outside 0 to 1.
    """
    message = f"{text[:40]!r} is no probability between 0 and 1; allowed: such as 0.01% or 1e-4"
    try:
        value = share(text) / 100 if text.strip().endswith("%") else positive(text)
    except argparse.ArgumentTypeError as error:
        raise argparse.ArgumentTypeError(message) from error
    if value >= 1:
        raise argparse.ArgumentTypeError(message)
    return value


def show(document: dict[str, Any], console: Console, *, asked: frozenset[str]) -> None:
    """Print what came of a tune; why a method was left out only where it was asked for."""
    from wavegen.reports.tuning import method_table, outcome_words, unsuited_words

    for note in document["warnings"]:
        console.warn(f"{note['where']}: {note['text']}")
    for text in unsuited_words(document, asked):
        console.warn(text)
    if document["n_resumed"]:
        console.warn(f"went on from {document['n_resumed']} evaluations of an earlier run")
    console.table(method_table(document, title=document["title"] or document["name"]))
    for text in outcome_words(document):
        console.line(text)
    console.line(f"In {document['folder']}: {', '.join(document['files'])}.")
