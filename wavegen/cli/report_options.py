"""Pictures and report pages, on verbs that print a document."""

from __future__ import annotations

import argparse
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from wavegen.cli.console import Console
from wavegen.cli.progress import ConsoleProgress
from wavegen.core.errors import ArgumentsError

if TYPE_CHECKING:
    from wavegen.production.views import Views
    from wavegen.reports.figures.picture import Picture
    from wavegen.reports.pages.page import Page

PAGE_SUFFIXES = (".html", ".htm")


def add_reports(parser: argparse.ArgumentParser, *, has_overwrite: bool = False) -> None:
    """Declare where pictures and a report page go.

    Parameters
    ----------
    parser : ArgumentParser
        Of a verb.
    has_overwrite : bool
        Whether it declares ``--overwrite`` itself.
    """
    group = parser.add_argument_group("pictures and a report page")
    group.add_argument(
        "--figures", type=Path, metavar="DIR", help="write pictures there, as SVG and PNG"
    )
    group.add_argument(
        "--report", type=Path, metavar="FILE.html", help="write a page that opens in any browser"
    )
    if not has_overwrite:
        group.add_argument("--overwrite", action="store_true", help="replace files that exist")


def are_wanted(arguments: argparse.Namespace) -> bool:
    """Return whether anything is to be drawn.

    Raises
    ------
    ArgumentsError
        A page that is no HTML file by its name, or what draws is not installed.
    """
    page = arguments.report
    if page is not None and page.suffix.lower() not in PAGE_SUFFIXES:
        raise ArgumentsError(
            where="--report",
            problem=f"{str(page)[:100]} does not end in .html",
            allowed="the name of an HTML file",
            remedy="Write it like --report link.html.",
        )
    if arguments.figures is None and page is None:
        return False
    from wavegen.reports.figures.look import check_installed

    check_installed()
    return True


_SUBJECTS = ("recipe", "subjects", "stimulus", "field", "source", "output")
"""Arguments that name what a verb reads."""
_TELL = frozenset({".json", ".html", ".svg", ".png", ".yaml"})
"""Endings of files in the folder of a stimulus that speak of it."""


def _holds_data(path: Path) -> bool:
    """Return whether a file in the folder of a stimulus is none of those beside the data."""
    is_table = path.suffix == ".csv" and path.with_suffix("").suffix != ""
    return path.is_file() and path.suffix not in _TELL and not is_table


def write_reports(
    arguments: argparse.Namespace, pictures: Sequence[Picture], page: Page, *, stem: str
) -> list[str]:
    """Write what the options ask for, and return the sentences that say so.

    Parameters
    ----------
    arguments : Namespace
        With the options of :func:`add_reports`.
    pictures : sequence of Picture
        Of the document.
    page : Page
        Made of the same pictures.
    stem : str
        What pictures are called.

    Raises
    ------
    FileError
        A file exists, or cannot be written.
    ArgumentsError
        What draws is not installed.
    """
    from wavegen.reports.written import write_page, write_pictures

    said = []
    if arguments.figures is not None:
        names = write_pictures(pictures, arguments.figures, stem, overwrite=arguments.overwrite)
        said.append(f"{len(names)} pictures in {arguments.figures}.")
    if arguments.report is not None:
        write_page(page, arguments.report, overwrite=arguments.overwrite)
        said.append(f"Report: {arguments.report}.")
    return said


def report_measurement(
    arguments: argparse.Namespace, document: dict[str, Any], views: Views | None
) -> list[str]:
    """Draw a measurement; see :func:`write_reports`."""
    from wavegen.reports.figures.stimulus import pictures_of
    from wavegen.reports.pages.stimulus import measurement_page

    pictures = pictures_of(document, views, title=document["name"])
    page = measurement_page(document | read_files(arguments), pictures)
    return write_reports(arguments, pictures, page, stem=stem_of(document["name"]))


def report_comparison(arguments: argparse.Namespace, document: dict[str, Any]) -> list[str]:
    """Draw a match, a shaped stimulus, a device or a tuning; see :func:`write_reports`."""
    from wavegen.reports.figures import compared as figures
    from wavegen.reports.pages import compared as pages

    kind = document["format"].rpartition(".")[2]
    draw, write = {
        "match": (figures.match_pictures, pages.match_page),
        "shape": (figures.shape_pictures, pages.shape_page),
        "gain_curve": (figures.gain_pictures, pages.gain_page),
        "tuning": (figures.tune_pictures, pages.tune_page),
    }[kind]
    pictures = draw(document)
    page = write(document | read_files(arguments), pictures)
    return write_reports(arguments, pictures, page, stem=stem_of(document.get("name") or kind))


def read_files(arguments: argparse.Namespace) -> dict[str, Any]:
    """Return what a page says of the files that were read: ``files_read``, names and SHA-512.

    Parameters
    ----------
    arguments : Namespace
        Of a verb that reads files. Nothing is hashed where no page is asked for.

    Raises
    ------
    FileError
        A file cannot be read.
    """
    from wavegen.files.digest import sha512_of

    if arguments.report is None:
        return {}
    given = [getattr(arguments, name, None) for name in _SUBJECTS]
    words = [word for each in given for word in (each if isinstance(each, list) else [each])]
    paths: dict[Path, None] = {}
    for path in (Path(word) for word in words if word):
        if path.is_dir():
            within = sorted(path.iterdir())
            paths |= dict.fromkeys(x for x in within if _holds_data(x))
        elif path.is_file():
            paths[path] = None
            if path.suffix == ".sigmf-meta" and path.with_suffix(".sigmf-data").is_file():
                paths[path.with_suffix(".sigmf-data")] = None
    return {"files_read": [{"name": path.name, "sha512": sha512_of(path)} for path in paths]}


def compared(
    arguments: argparse.Namespace,
    console: Console,
    work: Callable[[ConsoleProgress], dict[str, Any]],
    show: Callable[[dict[str, Any], Console], None],
) -> dict[str, Any]:
    """Do the work of a comparing verb, draw what is asked for, and print it.

    Parameters
    ----------
    arguments : Namespace
        With the options of :func:`add_reports`.
    console : Console
        Where it is printed.
    work : callable
        Makes the document; told a progress.
    show : callable
        Prints a document for people.

    Returns
    -------
    dict
        The document.
    """
    draws = are_wanted(arguments)
    progress = console.progress()
    try:
        document = work(progress)
        said = report_comparison(arguments, document) if draws else []
    finally:
        progress.close()
    if arguments.json:
        console.document(document)
        return document
    show(document, console)
    for line in said:
        console.line(line)
    return document


def stem_of(name: str) -> str:
    """Return a name that a file can have.

    Examples
    --------
    >>> stem_of("field run/7.sigmf-data")
    '7'
    >>> stem_of("2 files")
    '2_files'
    """
    last = name.replace("\\", "/").rpartition("/")[2].partition(".")[0]
    kept = "".join(c if c.isalnum() or c in "-_" else "_" for c in last)
    return kept[:80] or "figures"
