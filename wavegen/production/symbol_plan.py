"""How the OFDM symbols of a recipe are laid, for figures about symbols."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from wavegen.core.errors import WavegenError
from wavegen.laws.papr_symbol import LevelCrossing
from wavegen.meters.useful_symbols import symbols_of
from wavegen.production.prepare import Prepared, prepare
from wavegen.production.subject import SymbolPlan
from wavegen.recipe.load import load_text
from wavegen.sources.ofdm import Ofdm


def symbol_plan(prepared: Prepared) -> SymbolPlan | None:
    """Return where the OFDM symbols of a recipe stand.

    Parameters
    ----------
    prepared : Prepared
        The recipe, or one of its channels.

    Returns
    -------
    SymbolPlan or None
        None for what is not one OFDM signal, or is delayed or resampled. The law is that of the
        source alone: None behind stages, which change it.
    """
    prefixed = symbols_of(prepared.built.signal)
    if prefixed is None:
        return None
    recipe = prepared.loaded.recipe
    law = None
    if isinstance(recipe.signal, Ofdm) and not recipe.stages:
        found = recipe.signal.symbol_papr_law(prepared.site)
        law = found if isinstance(found, LevelCrossing) else None
    return SymbolPlan(prefixed=prefixed, law=law)


def described_recipe(sidecar: Mapping[str, Any], folder: Path, channel: int) -> Prepared | None:
    """Return the recipe of a stimulus as a graph, as its sidecar carries it.

    Parameters
    ----------
    sidecar : mapping
        What it says.
    folder : Path
        Where it lies: data files of the recipe are looked for there.
    channel : int
        Which of its channels.

    Returns
    -------
    Prepared or None
        None where the recipe can no longer be built, or makes another loop than this one.
    """
    recipe = sidecar["recipe"]
    try:
        loaded = load_text(
            recipe["text"], overrides=recipe["overrides"], name=recipe["name"], folder=folder
        )
        prepared = prepare(loaded).channels[channel]
    except (WavegenError, IndexError):
        return None
    return prepared if prepared.built.signal.n_samples == sidecar["n_samples"] else None
