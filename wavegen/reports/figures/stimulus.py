"""The pictures of a stimulus or a recording."""

from __future__ import annotations

from typing import Any

from wavegen.core.signal import Samples
from wavegen.meters.spectrum import Spectrum
from wavegen.production.views import Views
from wavegen.reports.figures.modulation import Cloud, constellation_figure
from wavegen.reports.figures.picture import Picture
from wavegen.reports.figures.power import CcdfCurve, ccdf_figure, density_figure
from wavegen.reports.figures.spectrum import spectrum_figure
from wavegen.reports.figures.time import envelope_figure, seam_picture
from wavegen.reports.tables import percent, seam_words


def pictures_of(document: dict[str, Any], views: Views | None, *, title: str) -> list[Picture]:
    """Return every picture that a document and its views hold.

    Parameters
    ----------
    document : dict
        Of a stimulus (its sidecar) or of a measurement.
    views : Views or None
        The rest of the material; None where there is no one signal.
    title : str
        Heading of each.

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
    found = [_ccdf(document, title)]
    if "pdf" in document:
        found.append(_density(document, title))
    if views is None:
        return found
    found.append(_envelope(views, title))
    if views.spectrum is not None:
        found.append(_spectrum(views.spectrum, title))
    if views.clouds:
        found.append(_constellation(views, title))
    if views.around_seam is not None:
        found.append(_seam(document, views.around_seam, views.sample_rate_hz, title))
    return found


def _ccdf(document: dict[str, Any], title: str) -> Picture:
    on_time, law = document.get("on_time"), document.get("law")
    curves = [CcdfCurve.of("all of it" if on_time else "measured", document["ccdf"])]
    if on_time and "ccdf" in on_time:
        curves.append(CcdfCurve.of("on-time, over its own mean", on_time["ccdf"]))
    if law and "level_db" in law:
        curves.append(CcdfCurve.of(f"law: {law['name']}", law, is_reference=True))
    if document.get("reference"):
        reference = document["reference"]
        curves.append(CcdfCurve.of(reference["name"], reference, is_reference=True))
    return Picture(
        name="ccdf",
        figure=ccdf_figure(
            curves,
            title=title,
            marks=[(row["probability"], row["level_db"]) for row in _resolved(document)],
            mean_dbm=document.get("mean_dbm"),
        ),
        caption="CCDF of the instantaneous power: the share of time above each level.",
        alternative="Curve of the share of time over the level above the mean. "
        + level_words(document),
    )


def level_words(document: dict[str, Any]) -> str:
    """Say at which levels the usual probabilities lie."""
    said = [
        f"{percent(row['probability'])} at {row['level_db']:.2f} dB" for row in _resolved(document)
    ]
    return f"It exceeds the mean by: {', '.join(said)}." if said else "No level is resolved."


def _resolved(document: dict[str, Any]) -> list[dict[str, Any]]:
    return [row for row in document["levels"] if row["resolved"] and row["level_db"] is not None]


def _density(document: dict[str, Any], title: str) -> Picture:
    return Picture(
        name="density",
        figure=density_figure(
            document["pdf"]["level_db"],
            document["pdf"]["per_db"],
            document["cdf"]["probability"],
            title=title,
        ),
        caption="Density (PDF) and share of time below a level (CDF) of the instantaneous power.",
        alternative="Two curves over the level above the mean: density, and share of time below.",
    )


def _envelope(views: Views, title: str) -> Picture:
    bursts = f"; {len(views.on_times_s)} on-times are shaded" if views.on_times_s else ""
    return Picture(
        name="power-time",
        figure=envelope_figure(views.envelope, title=title, on_times_s=views.on_times_s),
        caption=f"Power against time{bursts}.",
        alternative=f"Band from the least to the largest power over time, with its mean{bursts}.",
    )


def _spectrum(spectrum: Spectrum, title: str) -> Picture:
    return Picture(
        name="spectrum",
        figure=spectrum_figure([("measured", spectrum)], title=title),
        caption="Power spectral density by Welch's method.",
        alternative="Curve of the power density over frequency.",
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
    said = "; ".join(f"{cloud.name}: EVM {cloud.evm_percent:.3g} %" for cloud in clouds)
    return Picture(
        name="constellation",
        figure=constellation_figure(clouds, title=title),
        caption="The first symbols as a receiver finds them, after one complex gain, and what was "
        f"sent; EVM of the symbols shown. {said}.",
        alternative=f"Clouds of received symbols around the points that were sent. {said}.",
    )


def _seam(document: dict[str, Any], around: Samples, sample_rate_hz: float, title: str) -> Picture:
    seam = (document.get("loop") or {}).get("seam") or document.get("seam")
    verdict = seam_words(seam) if seam else ""
    return Picture(
        name="seam",
        figure=seam_picture(
            around,
            sample_rate_hz=sample_rate_hz,
            title=title,
            verdict=verdict,
        ),
        caption=f"Both rails where the loop closes{': ' + verdict if verdict else ''}.",
        alternative="Both rails over the last and the first samples of the loop.",
    )
