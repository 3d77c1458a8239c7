"""From unit mean power to full scale: by the peak between samples, or by the average."""

from __future__ import annotations

import math

from wavegen.core.errors import RecipeError
from wavegen.production.waveform import Waveform
from wavegen.recipe.load import LoadedRecipe


def gain_for(loaded: LoadedRecipe, waveform: Waveform) -> float:
    """Return the amplitude factor that a recipe's ``output`` asks for.

    Parameters
    ----------
    loaded : LoadedRecipe
        ``output.peak`` or ``output.average``, dBFS of the envelope.
    waveform : Waveform
        Mean, and peaks between samples of envelope and rails.

    Returns
    -------
    float
        The same for every file of the recipe.

    Raises
    ------
    RecipeError
        The average asked for would put the peak over full scale.
    """
    output = loaded.recipe.output
    if output.average_dbfs is None:
        assert output.peak_dbfs is not None  # noqa: S101 - the settings give one of the two
        is_rail = output.peak_of == "rail"
        power = waveform.rails.largest if is_rail else waveform.peak.power
        return math.sqrt(10 ** (output.peak_dbfs / 10) / power)
    if output.average_dbfs + waveform.papr_db > 0:
        raise loaded.resolve(
            RecipeError(
                where="output.average",
                problem=(
                    f"{output.average_dbfs:g} dBFS puts the peak between samples at "
                    f"{output.average_dbfs + waveform.papr_db:.2f} dBFS"
                ),
                allowed=f"up to {-waveform.papr_db:.2f} dBFS",
                remedy="Lower the average, or reduce the crest factor.",
            )
        )
    return math.sqrt(10 ** (output.average_dbfs / 10) / waveform.statistics.mean)
