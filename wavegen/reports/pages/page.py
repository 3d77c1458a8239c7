"""A report as data, and as one HTML file."""

from __future__ import annotations

import base64
import hashlib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import TYPE_CHECKING, Any, Literal
from xml.etree import ElementTree as ET

from wavegen.core.errors import ArgumentsError
from wavegen.core.table import Table
from wavegen.reports.figures.look import INSTALL, rendered
from wavegen.reports.figures.picture import Picture
from wavegen.reports.inert import inert
from wavegen.reports.pages.readings import readings_of

if TYPE_CHECKING:
    from jinja2 import Template
    from matplotlib.figure import Figure

_SVG, _XLINK = "http://www.w3.org/2000/svg", "http://www.w3.org/1999/xlink"
ET.register_namespace("", _SVG)
ET.register_namespace("xlink", _XLINK)

Standing = Literal["good", "bad", "open", ""]
"""Of a verdict: it holds, it does not, it is not decided; empty where there is none."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Section:
    """A part of the page under a heading.

    Parameters
    ----------
    heading : str
    paragraphs : tuple of str
    pictures : tuple of Picture
    tables : tuple of Table
    text : str
        Shown letter by letter, as a recipe is.
    """

    heading: str
    paragraphs: tuple[str, ...] = ()
    pictures: tuple[Picture, ...] = ()
    tables: tuple[Table, ...] = ()
    text: str = ""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Page:
    """A whole report.

    Parameters
    ----------
    title : str
    summary : tuple of str
        The result in words, the first sentence the most important.
    verdict : str
        In a few words; empty where there is none.
    standing : {"good", "bad", "open", ""}
        Of the verdict.
    warnings, cautions : tuple of str
        What is doubtful about the figures; what can break or hurt.
    sections : tuple of Section
    origin : tuple of (str, str)
        Versions, hashes, dates: names and values.
    """

    title: str
    summary: tuple[str, ...]
    sections: tuple[Section, ...]
    verdict: str = ""
    standing: Standing = ""
    warnings: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    origin: tuple[tuple[str, str], ...] = ()


def html_of(page: Page) -> str:
    """Return a page as one HTML file that needs nothing else.

    Parameters
    ----------
    page : Page
        Texts may hold anything; all of it is escaped.

    Returns
    -------
    str

    Raises
    ------
    ArgumentsError
        Jinja or Matplotlib is not installed.

    Notes
    -----
    The page allows itself no address to fetch from, and no script but its own, by the hash of it
    (W3C Content Security Policy Level 3).
    """
    pictures: dict[str, dict[str, Any]] = {}
    for section in page.sections:
        for picture in section.pictures:
            svg = inline_svg(picture.figure, picture.name)
            pictures[picture.name] = {"svg": svg, "readings": readings_of(picture.figure)}
    script = _text("page.js")
    return _template().render(
        page=page,
        pictures=pictures,
        style=_text("page.css"),
        script=script,
        script_hash=base64.b64encode(hashlib.sha256(script.encode()).digest()).decode(),
    )


def inline_svg(figure: Figure, name: str) -> str:
    """Return a figure as an SVG element that can stand in a page beside others.

    Parameters
    ----------
    figure : Figure
        Its marks get names of their own, by ``name``.
    name : str
        Unique on the page.
    """
    svg = ET.fromstring(rendered(figure, "svg", salt=name))  # noqa: S314 - our own drawing
    for metadata in svg.findall(f"{{{_SVG}}}metadata"):
        svg.remove(metadata)
    for element in svg.iter():
        for key, value in element.attrib.items():
            if key == "id":
                element.set(key, f"{name}-{value}")
            elif key == f"{{{_XLINK}}}href" and value.startswith("#"):
                element.set(key, f"#{name}-{value[1:]}")
            elif "url(#" in value:
                element.set(key, value.replace("url(#", f"url(#{name}-"))
    return ET.tostring(svg, encoding="unicode")


def _text(name: str) -> str:
    return files("wavegen.reports.pages").joinpath(name).read_text(encoding="utf-8")


@cache
def _template() -> Template:
    try:
        from jinja2 import Environment, StrictUndefined
        from markupsafe import Markup
    except ImportError as error:
        raise ArgumentsError(
            where="--report",
            problem="report pages need Jinja, which is not installed",
            allowed="an installation with the extra `reports`",
            remedy=f"Run: {INSTALL}",
        ) from error
    environment = Environment(
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        # Markup is what this program made itself; all else may come from files.
        finalize=lambda value: value if isinstance(value, Markup) else inert(str(value)),
    )
    environment.filters["own"] = Markup  # what this program wrote itself: style, script, drawings
    return environment.from_string(_text("page.html"))
