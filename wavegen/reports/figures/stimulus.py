"""The pictures of a stimulus or a recording."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from wavegen.core.signal import Samples
from wavegen.meters.spectrum import Spectrum
from wavegen.production.sidecar import curves as curves_of
from wavegen.production.views import Views
from wavegen.reports.figures.modulation import (
    MOST_PANELS,
    Cloud,
    constellation_figure,
    evm_words,
)
from wavegen.reports.figures.picture import Picture
from wavegen.reports.figures.power import (
    CcdfCurve,
    Spread,
    ccdf_figure,
    density_figure,
    gaussian_curve,
)
from wavegen.reports.figures.spectrum import Channel, spectrum_figure
from wavegen.reports.figures.time import envelope_figure, seam_picture
from wavegen.reports.tables import percent, seam_words

_MOST_SHADED = 200


@dataclass(frozen=True, slots=True, kw_only=True)
class Absolute:
    """What a second axis tells.

    Parameters
    ----------
    mean_dbm : float or None
        Mean power of all of it, dBm; None where it is not known.
    name : str
        Of the axis, with its unit.
    """

    mean_dbm: float | None = None
    name: str = "level, dBm"


def pictures_of(
    document: dict[str, Any], views: Views | None, *, title: str, suffix: str = ""
) -> list[Picture]:
    """Return every picture that a document and its views hold.

    Parameters
    ----------
    document : dict
        Of a stimulus (its sidecar) or of a measurement.
    views : Views or None
        The rest of the material; None where there is no one signal.
    title : str
        Heading of each.
    suffix : str
        Behind the name of each, where a stimulus has more than one channel.

    Returns
    -------
    list of Picture
        CCDF, PDF and CDF, power against time, spectrum, constellation, seam; what there is no
        material for is left out.

    Raises
    ------
    ArgumentsError
        Matplotlib is not installed.
    """
    absolute = absolute_of(document)
    found = [_ccdf(document, views, title, absolute)]
    if "pdf" in document:
        found.append(_density(document, title, absolute))
    if views is not None:
        found.append(_envelope(document, views, title, absolute))
        if views.spectrum is not None:
            found.append(_spectrum(document, views, views.spectrum, title))
        if views.clouds:
            found.append(_constellation(views, title))
        if views.around_seam is not None:
            found.append(_seam(document, views.around_seam, views.sample_rate_hz, title))
    return [item.renamed(item.name + suffix) for item in found]


def absolute_of(document: dict[str, Any]) -> Absolute:
    """Return how much the mean is in dBm: as measured, else by the bench of a stimulus."""
    mean_dbm = document.get("mean_dbm")
    if mean_dbm is not None:
        return Absolute(mean_dbm=mean_dbm)
    bench = document.get("bench") or {}
    channel = document.get("channel", 0)
    device = next(
        (
            place
            for place in bench.get("path", ())
            if place.get("role") == "device" and place.get("channel", channel) == channel
        ),
        None,
    )
    if device is None:
        return Absolute()
    mean_dbm = device["average_dbm"]
    on_time = document.get("on_time")
    if bench["averaged_over"] == "burst" and on_time:
        mean_dbm -= on_time["mean_dbfs"] - document["mean_dbfs"]
    return Absolute(mean_dbm=mean_dbm, name=f"level at the input of {device['name']}, dBm")


def _ccdf(document: dict[str, Any], views: Views | None, title: str, absolute: Absolute) -> Picture:
    on_time, law = document.get("on_time"), document.get("law")
    is_exact = document.get("is") in {None, "this loop"}
    own = "all of it" if on_time else "measured"
    curves = [
        CcdfCurve.of(own, document["ccdf"], peak_db=document["papr_db"] if is_exact else None)
    ]
    if on_time and "ccdf" in on_time:
        peak = on_time["papr_db"] if is_exact else None
        curves.append(CcdfCurve.of("on-time, over its own mean", on_time["ccdf"], peak_db=peak))
    before = views.before if views is not None else None
    if before is not None:
        ccdf, peak = curves_of(before.power)["ccdf"], before.power.papr_db
        curves.append(CcdfCurve.of(before.name, ccdf, peak_db=peak))
    if law and "level_db" in law:
        curves.append(CcdfCurve.of(f"law: {law['name']}", law, kind="law"))
    if document.get("reference"):
        curves.append(gaussian_curve(document["reference"]["name"]))
    over = f" {before.name[0].upper()}{before.name[1:]} too." if before is not None else ""
    return Picture(
        name="ccdf",
        figure=ccdf_figure(
            curves,
            title=title,
            marks=[(row["probability"], row["level_db"]) for row in _resolved(document)],
            spread=_spread(document) if is_exact else None,
            mean_dbm=absolute.mean_dbm,
            level_name=absolute.name,
        ),
        caption=f"CCDF of the instantaneous power: the share of time above each level.{over}",
        alternative="Curve of the share of time over the level above the mean. "
        + level_words(document),
    )


def _spread(document: dict[str, Any]) -> Spread | None:
    """Return the interval of the process that a loop is a sample of; None where none is known."""
    rows = [
        row
        for row in (document.get("process") or {}).get("levels", ())
        if row["low_db"] is not None and row["high_db"] is not None
    ]
    if len(rows) < 2:  # a band has two ends
        return None
    return Spread(
        name="the process it samples, 95 %",
        **{
            key: np.array([row[key] for row in rows], np.float64)
            for key in ("probability", "low_db", "high_db")
        },
    )


def level_words(document: dict[str, Any]) -> str:
    """Say at which levels the usual probabilities lie."""
    said = [
        f"{percent(row['probability'])} at {row['level_db']:.2f} dB" for row in _resolved(document)
    ]
    return f"It exceeds the mean by: {', '.join(said)}." if said else "No level is resolved."


def _resolved(document: dict[str, Any]) -> list[dict[str, Any]]:
    return [row for row in document["levels"] if row["resolved"] and row["level_db"] is not None]


def _density(document: dict[str, Any], title: str, absolute: Absolute) -> Picture:
    return Picture(
        name="density",
        figure=density_figure(
            document["pdf"]["level_db"],
            document["pdf"]["per_db"],
            document["cdf"]["probability"],
            title=title,
            mean_dbm=absolute.mean_dbm,
            level_name="level, dBm",
        ),
        caption="Density (PDF) and share of time below a level (CDF) of the instantaneous power.",
        alternative="Two curves over the level above the mean: density, and share of time below.",
    )


def _envelope(document: dict[str, Any], views: Views, title: str, absolute: Absolute) -> Picture:
    on_times, said = _on_times(document, views)
    return Picture(
        name="power-time",
        figure=envelope_figure(
            views.envelope,
            title=title,
            on_times_s=on_times,
            mean_dbm=absolute.mean_dbm,
            level_name=absolute.name,
        ),
        caption=f"Power against time{said}.",
        alternative=f"Band from the least to the largest power over time, with its mean{said}.",
    )


def _on_times(
    document: dict[str, Any], views: Views
) -> tuple[tuple[tuple[float, float], ...], str]:
    """Return when it is on, s, and a few words: by its recipe, else as it was measured."""
    on_times, count = views.on_times_s, len(views.on_times_s)
    bursts = (document.get("on_time") or {}).get("bursts")
    if bursts:
        count = bursts["n_bursts"]
        on_times = tuple(
            (
                item["start_sample"] / views.sample_rate_hz,
                item["stop_sample"] / views.sample_rate_hz,
            )
            for item in bursts["each"]
        )
    if not count:
        return (), ""
    if count > _MOST_SHADED:
        return (), f"; its {count} on-times are too many to be shaded"
    return on_times, f"; {count} on-time{'s are' if count > 1 else ' is'} shaded"


def _spectrum(document: dict[str, Any], views: Views, spectrum: Spectrum, title: str) -> Picture:
    spectra = [("measured", spectrum)]
    if views.before is not None and views.before.spectrum is not None:
        spectra.append((views.before.name, views.before.spectrum))
    channels = [
        Channel(
            name=item.name,
            low_hz=item.low_hz,
            high_hz=item.high_hz,
            remark="" if item.leakage_db is None else f"{item.leakage_db:.1f} dB",
        )
        for item in views.channels
    ]
    told = [f"{item.name} {item.remark}" for item in channels if item.remark]
    said = (
        f" Power in the channels beside it over the carrier's: {', '.join(told)}." if told else ""
    )
    return Picture(
        name="spectrum",
        figure=spectrum_figure(
            spectra, title=title, channels=channels, mask=views.mask, is_real=_is_real(document)
        ),
        caption=f"Power spectral density by Welch's method.{said}",
        alternative=f"Curve of the power density over frequency.{said}",
    )


def _constellation(views: Views, title: str) -> Picture:
    clouds = [
        Cloud(
            name=cloud.label,
            received=cloud.received,
            ideal=cloud.ideal,
            evm_percent=cloud.evm_percent,
        )
        for cloud in views.clouds
    ]
    said = "; ".join(
        f"{cloud.name}: EVM {evm_words(cloud.evm_percent)}"
        for cloud in clouds
        if cloud.evm_percent is not None
    )
    more = len(clouds) - MOST_PANELS
    left_out = f" The first {MOST_PANELS} of {len(clouds)} kinds are drawn." if more > 0 else ""
    return Picture(
        name="constellation",
        figure=constellation_figure(clouds, title=title),
        caption="The first symbols as a receiver finds them, after one complex gain, and what was "
        f"sent; EVM of the symbols shown. {said}.{left_out}",
        alternative=f"Clouds of received symbols around the points that were sent. {said}.",
    )


def _is_real(document: dict[str, Any]) -> bool:
    """Return whether the samples that are drawn are real ones."""
    return bool(document.get("is_real") or document.get("files", [{}])[0].get("real"))


def _seam(document: dict[str, Any], around: Samples, sample_rate_hz: float, title: str) -> Picture:
    seam = (document.get("loop") or {}).get("seam") or document.get("seam")
    verdict = seam_words(seam) if seam else ""
    is_real = _is_real(document)
    rails = "The samples" if is_real else "Both rails"
    return Picture(
        name="seam",
        figure=seam_picture(
            around,
            sample_rate_hz=sample_rate_hz,
            title=title,
            verdict=verdict,
            is_real=is_real,
        ),
        caption=f"{rails} where the loop closes{': ' + verdict if verdict else ''}.",
        alternative=f"{rails} over the end and the start of the loop.",
    )
