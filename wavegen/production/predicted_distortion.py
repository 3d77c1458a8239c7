"""EVM and adjacent channels behind memoryless steps, by mathematics alone.

Where what enters the first step is all but complex Gaussian and fills one flat band, a series says
what clips and amplifiers do to it (:class:`wavegen.laws.memoryless.MemorylessStep`).
"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np

from wavegen.core.signal import Signal
from wavegen.core.site import Site
from wavegen.laws.distortion import NEAR_DB, memoryless_chain
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.law import Law
from wavegen.laws.mapped import ClippedLaw, MappedLaw
from wavegen.laws.term import NoLaw
from wavegen.production.neighbours import ChannelRequest, OccupiedBand, plan_channels
from wavegen.production.sidecar import rounded
from wavegen.stages.chain import HasLaw
from wavegen.stages.passband import filled_band

FLAT_DB = 1.0
"""Unevenness of a band that still counts as flat, dB between its tenths and their mean."""
_PARTS = 10
_FEWEST_BINS = 30


def steps_before(stages: tuple[Any, ...], site: Site) -> int | None:
    """Return how many stages stand before the first memoryless step, None if there is none."""
    for number, stage in enumerate(stages):
        if isinstance(stage, HasLaw):
            here = site.at(f"stages[{number}]", site.label)
            if isinstance(stage.law(here, GaussianLaw()), ClippedLaw | MappedLaw):
                return number
    return None


def distortion_rows(law: Law | NoLaw, undistorted: Signal, site: Site) -> dict[str, Any] | None:
    """Return what memoryless steps do to a signal, as JSON values.

    Parameters
    ----------
    law : Law or NoLaw
        Behind the steps.
    undistorted : Signal
        What enters the first; some of it is computed, to find its band.
    site : Site
        Where it is built.

    Returns
    -------
    dict or None
        None where there is no such step. ``says`` names what is missing where the series does
        not hold; ``aclr_db`` of the channels that ``fidelity`` measures too.
    """
    if isinstance(law, NoLaw):
        return None
    chain = memoryless_chain(law)
    if not chain.n_steps:
        return None
    error_db = chain.gaussian_error_db
    if error_db > NEAR_DB:
        return {"says": f"{chain.base.name} is not like complex Gaussian noise: by simulation only"}
    flat = _flat_band(site, undistorted)
    if flat is None:
        return {"says": f"{chain.base.name} does not fill one flat band: by simulation only"}
    band, width_hz = flat
    step, plan = chain.step(), plan_channels(ChannelRequest(), band)
    return {
        "says": None,
        "is": "of a complex Gaussian signal that fills one flat band, without aliasing",
        "gaussian_error_db": rounded(error_db, 4),
        "band_hz": rounded(width_hz, 1),
        "mean_shift_db": rounded(chain.mean_shift_db, 4),
        "evm_in_band_percent": rounded(step.evm_in_band_percent, 4),
        "evm_percent": rounded(step.evm_percent, 4),
        "evm_unfitted_percent": rounded(step.evm_unfitted_percent, 4),
        "channels": plan.name,
        "aclr": [
            {
                "offset_hz": rounded(item.offset_hz, 1),
                "bandwidth_hz": rounded(item.bandwidth_hz, 1),
                "aclr_db": rounded(
                    step.aclr_db(
                        offset=item.offset_hz / width_hz,
                        width=item.bandwidth_hz / width_hz,
                    ),
                    3,
                ),
            }
            for item in plan.neighbours
            if item.offset_hz > 0  # both sides are alike
        ],
    }


def _flat_band(site: Site, signal: Signal) -> tuple[OccupiedBand, float] | None:
    """Return the band of a signal that fills one evenly, and the width of as much flat power.

    A hole of some bins in it does not count. None where there is no such band.
    """
    rate = float(signal.sample_rate_hz)
    quiet = replace(
        site, sample_rate_hz=signal.sample_rate_hz, n_samples=signal.n_samples, notes=[]
    )
    found = filled_band(quiet, signal)
    if found is None or len(found.bands) != 1:
        return None
    (band,) = found.bands
    n = found.spectrum.size
    first, last = round(band.low * n), round(band.high * n)
    inset = math.ceil((last - first) / 50)  # edges
    bins = np.arange(first + inset, last - inset) % n
    if bins.size < _FEWEST_BINS:
        return None
    parts = np.array([part.mean() for part in np.array_split(found.spectrum[bins], _PARTS)])
    if np.max(np.abs(10 * np.log10(parts / parts.mean()))) > FLAT_DB:
        return None
    width_hz = float(found.spectrum.sum() / parts.mean()) / n * rate
    return OccupiedBand(low_hz=band.low * rate, high_hz=band.high * rate), width_hz
