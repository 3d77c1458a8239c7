"""Pictures and pages as files: all of them, or none."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from wavegen.files.atomic import Drafts
from wavegen.files.faults import told
from wavegen.reports.figures.look import FORMATS, rendered
from wavegen.reports.figures.picture import Picture
from wavegen.reports.pages.page import Page, html_of


def write_pictures(
    pictures: Sequence[Picture], folder: Path, stem: str, *, overwrite: bool = False
) -> list[str]:
    """Write every picture as SVG and PNG.

    Parameters
    ----------
    pictures : sequence of Picture
        What is drawn.
    folder : Path
        Where; made if missing.
    stem : str
        Their names are ``STEM.PICTURE.svg`` and ``.png``.
    overwrite : bool
        Whether files that exist are replaced.

    Returns
    -------
    list of str
        Names.

    Raises
    ------
    FileError
        A file exists, or the disk refuses: then none is written.
    ArgumentsError
        Matplotlib is not installed.
    """
    names = []
    with Drafts(folder, overwrite=overwrite) as drafts:
        for picture in pictures:
            for form in FORMATS:
                name = f"{stem}.{picture.name}.{form}"
                draft = drafts.add(name)
                with told(draft):
                    draft.write_bytes(rendered(picture.figure, form))
                names.append(name)
    return names


def write_page(page: Page, path: Path, *, overwrite: bool = False) -> str:
    """Write a page as one HTML file.

    Parameters
    ----------
    page : Page
        What it says.
    path : Path
        Where; its folder is made if missing.
    overwrite : bool
        Whether a file that exists is replaced.

    Returns
    -------
    str
        Its name.

    Raises
    ------
    FileError
        It exists, or the disk refuses.
    ArgumentsError
        Jinja or Matplotlib is not installed.
    """
    text = html_of(page)
    with Drafts(path.parent, overwrite=overwrite) as drafts:
        draft = drafts.add(path.name)
        with told(draft):
            draft.write_text(text, encoding="utf-8")
    return path.name
