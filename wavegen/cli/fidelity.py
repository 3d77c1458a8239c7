"""`wavegen fidelity`: EVM, adjacent channels and bandwidth of a recipe, before and after."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from wavegen.cli.console import Console
from wavegen.cli.options import add_overrides, add_workers, rate, whole

if TYPE_CHECKING:
    from wavegen.production.fidelity import FidelityRequest

DEFINITIONS = ("gain_fitted", "zero_forcing", "3gpp", "802.11")


class Fidelity:
    """The verb ``fidelity``."""

    summary = "measure EVM, ACLR and bandwidth of a recipe, before and after its stages"
    description = (
        "Measure what a recipe does to its own symbols and to its neighbours: EVM of each\n"
        "source and group, ACLR, mask, occupied bandwidth, cubic metric and levels; where\n"
        "crest-factor reduction, devices or converters are in it, without and with them."
    )
    examples = ("wavegen fidelity valley-cell-clipped --limits 'NR BS FR1'",)

    @staticmethod
    def arguments(parser: argparse.ArgumentParser) -> None:
        """Declare the arguments."""
        parser.add_argument("recipe", metavar="RECIPE", help="a file, or a shipped recipe's name")
        parser.add_argument(
            "--limits",
            metavar="NAME",
            help="limits of a standard beside each EVM, such as 'NR BS FR1'",
        )
        parser.add_argument(
            "--spread", action="store_true", help="peak and 95 %% of the errors too (in --json)"
        )
        add_fidelity(parser)
        add_overrides(parser)
        add_workers(parser)

    @staticmethod
    def run(arguments: argparse.Namespace, console: Console) -> int:
        """Measure and print."""
        from wavegen.production.fidelity import fidelity_document, recipe_fidelity
        from wavegen.recipe.find import find_recipe
        from wavegen.recipe.load import load_recipe

        loaded = load_recipe(find_recipe(arguments.recipe), overrides=tuple(arguments.overrides))
        request = request_of(
            arguments, limits=arguments.limits, has_spread=arguments.spread, must_hold=False
        )
        progress = console.progress()
        try:
            found = recipe_fidelity(loaded, request, workers=arguments.workers, progress=progress)
        finally:
            progress.close()
        document = fidelity_document(loaded, found)
        if arguments.json:
            console.document(document)
        else:
            show(document, console)
        return 0


def add_fidelity(parser: argparse.ArgumentParser) -> None:
    """Declare how EVM is meant, which channels are adjacent, and the mask."""
    group = parser.add_argument_group("what is measured")
    group.add_argument(
        "--evm",
        choices=DEFINITIONS,
        default="gain_fitted",
        help="definition of EVM (default: one complex gain for each carrier)",
    )
    group.add_argument(
        "--evm-window", type=whole, metavar="SAMPLES", help="EVM window of 3gpp, samples"
    )
    group.add_argument(
        "--evm-frame", type=whole, metavar="SYMBOLS", help="symbols of a frame of 802.11"
    )
    group.add_argument(
        "--channels", metavar="NAME", help="adjacent channels of a standard: 'NR BS FR1'"
    )
    group.add_argument(
        "--channel-width",
        type=rate,
        metavar="HZ",
        help="its channel width (default: the narrowest that holds the signal)",
    )
    group.add_argument(
        "--channel-bandwidth",
        type=rate,
        metavar="HZ",
        help="own channels: measurement bandwidth (default: the band that the signal fills)",
    )
    group.add_argument(
        "--channel-spacing",
        type=rate,
        metavar="HZ",
        help="own channels: centre to centre (default: 10/9 of the bandwidth)",
    )
    group.add_argument(
        "--mask",
        type=Path,
        metavar="FILE",
        help="spectral mask instead of the recipe's: YAML with points, measurement_bandwidth, "
        "reference, both_sides",
    )


def request_of(
    arguments: argparse.Namespace, *, limits: str | None, has_spread: bool, must_hold: bool
) -> FidelityRequest:
    """Return what the options of :func:`add_fidelity` ask for.

    Raises
    ------
    ArgumentsError
        Options that do not go together.
    FileError
        The mask cannot be read.
    """
    from wavegen.meters.evm_probe import EvmSettings
    from wavegen.production.fidelity import FidelityRequest
    from wavegen.production.neighbours import ChannelRequest
    from wavegen.recipe.mask_file import load_mask

    return FidelityRequest(
        evm=EvmSettings(
            definition=arguments.evm,
            window_samples=arguments.evm_window,
            frame_symbols=arguments.evm_frame,
            has_spread=has_spread,
            limits=limits,
        ),
        channels=ChannelRequest(
            standard=arguments.channels,
            width_hz=arguments.channel_width,
            bandwidth_hz=arguments.channel_bandwidth,
            spacing_hz=arguments.channel_spacing,
        ),
        must_hold=must_hold or arguments.channels is not None,
        mask=None if arguments.mask is None else load_mask(arguments.mask),
    )


def show(document: dict[str, Any], console: Console) -> None:
    """Print the figures of one recipe."""
    from wavegen.reports.fidelity import fidelity_table

    for note in (*document["rounded"], *document["warnings"]):
        console.warn(f"{note['where']}: {note['text']}")
    console.table(fidelity_table(document, title=document["title"] or document["name"]))
    if document["channels"] is not None:
        channels = document["channels"]
        console.line(f"Adjacent channels: {channels['name']} ({channels['source']}).")
    for remark in dict.fromkeys(
        remark for source in document["before"]["evm"] for remark in source["remarks"]
    ):
        console.line(f"EVM: {remark}.")
