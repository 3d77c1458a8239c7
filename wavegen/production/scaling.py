"""From unit mean power to full scale: by the peak between samples, or by the average."""

from __future__ import annotations

import math
from collections.abc import Sequence

from wavegen.core.errors import RecipeError
from wavegen.production.waveform import Waveform
from wavegen.recipe.load import LoadedRecipe


def gain_for(loaded: LoadedRecipe, waveforms: Sequence[Waveform]) -> float:
    """Return the amplitude factor that a recipe's ``output`` asks for.

    Parameters
    ----------
    loaded : LoadedRecipe
        ``output.peak`` or ``output.average``, dBFS of the envelope.
    waveforms : sequence of Waveform
        One for each channel: mean, and peaks between samples of envelope and rails. The largest
        peak counts; an average is that of the first.

    Returns
    -------
    float
        The same for every file and channel of the recipe.

    Raises
    ------
    RecipeError
        The average asked for would put the peak over full scale.
    """
    output = loaded.recipe.output
    peak = max(waveform.peak.power for waveform in waveforms)
    if output.average_dbfs is None:
        assert output.peak_dbfs is not None  # noqa: S101 - the settings give one of the two
        is_rail = output.peak_of == "rail"
        power = max(waveform.rails.largest for waveform in waveforms) if is_rail else peak
        return math.sqrt(10 ** (output.peak_dbfs / 10) / power)
    mean = waveforms[0].statistics.mean
    papr_db = 10 * math.log10(peak / mean)
    if output.average_dbfs + papr_db > 0:
        raise loaded.resolve(
            RecipeError(
                where="output.average",
                problem=(
                    f"{output.average_dbfs:g} dBFS puts the peak between samples at "
                    f"{output.average_dbfs + papr_db:.2f} dBFS"
                ),
                allowed=f"up to {-papr_db:.2f} dBFS",
                remedy="Lower the average, or reduce the crest factor.",
            )
        )
    return math.sqrt(10 ** (output.average_dbfs / 10) / mean)
