"""A figure with the words that belong to it."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from matplotlib.figure import Figure


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Picture:
    """A figure, its name, and what is said of it.

    Parameters
    ----------
    name : str
        Letters and dashes: part of a file's name, and unique on a page.
    figure : Figure
        As made by this package.
    caption : str
        Below it.
    alternative : str
        What it shows, for those who do not see it.
    """

    name: str
    figure: Figure
    caption: str
    alternative: str

    def renamed(self, name: str) -> Picture:
        """Return it under another name."""
        return replace(self, name=name)
