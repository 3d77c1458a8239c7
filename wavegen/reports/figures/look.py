"""What all figures share: size, strokes, axes, and how they are written to a file."""

from __future__ import annotations

import io
from collections.abc import Sequence
from dataclasses import dataclass
from importlib.util import find_spec
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import ArgumentsError

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

INK = "#1d2733"
FAINT = "#c9d1d8"
SHADE = "#eef1f3"
SIZE_INCHES = (8.0, 5.4)
FORMATS = ("svg", "png")
INSTALL = "pip install matplotlib jinja2"


@dataclass(frozen=True, slots=True, kw_only=True)
class Stroke:
    """How one curve is drawn.

    Parameters
    ----------
    colour : str
        Hexadecimal; those of :data:`STROKES` fall from dark to light in grey.
    dashes : tuple of float
        Drawn and left out in turn, in line widths; empty for a full line.
    mark : str
        Matplotlib's name of the mark.
    width : float
        Points.
    """

    colour: str
    dashes: tuple[float, ...]
    mark: str
    width: float = 1.8


STROKES = (
    Stroke(colour="#123a5c", dashes=(), mark="o", width=2.2),
    Stroke(colour="#c2410c", dashes=(6, 2), mark="s"),
    Stroke(colour="#0f766e", dashes=(2, 1.5), mark="^"),
    Stroke(colour="#7c4d9e", dashes=(8, 2, 2, 2), mark="D"),
    Stroke(colour="#a16207", dashes=(4, 1.5, 1.5, 1.5, 1.5, 1.5), mark="v"),
    Stroke(colour="#5b6673", dashes=(1, 1.2), mark="P"),
)
REFERENCE = Stroke(colour="#75808b", dashes=(1, 1.6), mark="", width=1.4)
"""What stands for comparison only: the complex Gaussian, a limit."""


def stroke(number: int) -> Stroke:
    """Return the stroke of the curve with this number, from 0; they repeat after six."""
    return STROKES[number % len(STROKES)]


def draw(axes: Axes, x: Any, y: Any, style: Stroke, *, label: str | None = None) -> None:
    """Draw a line with a stroke."""
    axes.plot(
        x,
        y,
        color=style.colour,
        linewidth=style.width,
        linestyle=(0, style.dashes) if style.dashes else "-",
        label=label,
    )


def new_figure(title: str, *, n_panels: int = 1) -> tuple[Figure, Sequence[Axes]]:
    """Return an empty figure with panels side by side.

    Parameters
    ----------
    title : str
        Shown as it is, never as a formula.
    n_panels : int
        Panels.

    Raises
    ------
    ArgumentsError
        Matplotlib is not installed; says which command installs it.
    """
    try:
        from matplotlib.figure import Figure
    except ImportError as error:
        raise ArgumentsError(
            where="--figures",
            problem="figures need Matplotlib, which is not installed",
            allowed="an installation with the extra `reports`",
            remedy=f"Run: {INSTALL}",
        ) from error
    width, height = SIZE_INCHES
    figure = Figure(figsize=(width * (1.35 if n_panels > 1 else 1), height), layout="constrained")
    panels = figure.subplots(1, n_panels, squeeze=False)[0]
    figure.suptitle(
        title, x=0.01, ha="left", color=INK, fontsize=13, fontweight="bold", parse_math=False
    )
    for axes in panels:
        plain(axes)
    return figure, panels


def check_installed() -> None:
    """Refuse to begin work whose pictures or pages could not be made in the end.

    Raises
    ------
    ArgumentsError
        Matplotlib or Jinja is not installed; says which command installs them.
    """
    for module, name in (("matplotlib", "Matplotlib"), ("jinja2", "Jinja")):
        if find_spec(module) is None:
            raise ArgumentsError(
                where="--figures/--report",
                problem=f"pictures and pages need {name}, which is not installed",
                allowed="an installation with the extra `reports`",
                remedy=f"Run: {INSTALL}",
            )


def plain(axes: Axes) -> None:
    """Give axes the house's grid, ink and letters."""
    axes.grid(visible=True, which="major", color=FAINT, linewidth=0.8)
    axes.set_axisbelow(True)
    axes.tick_params(labelsize=11, colors=INK, length=4)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    for side in ("left", "bottom"):
        axes.spines[side].set_color(INK)
    axes.xaxis.label.set(color=INK, fontsize=12)
    axes.yaxis.label.set(color=INK, fontsize=12)


def legend(axes: Axes, *, place: Any = "best") -> None:
    """Name the curves, as they are drawn."""
    made = axes.legend(
        loc=place, fontsize=11, frameon=True, framealpha=0.92, edgecolor=FAINT, handlelength=3.2
    )
    for text in made.get_texts():
        text.set(color=INK, parse_math=False)


def condensed(values: NDArray[np.float64], most: int) -> NDArray[np.float64]:
    """Return means over as many neighbours as leave at most so many points."""
    factor = -(-values.size // most)
    whole = values.size // factor * factor
    return np.asarray(values[:whole].reshape(-1, factor).mean(axis=1))


def rendered(figure: Figure, form: str, *, salt: str = "wavegen") -> bytes:
    """Return a figure as the bytes of a file: the same figure, the same bytes.

    Parameters
    ----------
    figure : Figure
        As made here.
    form : {"svg", "png"}
        Format.
    salt : str
        Marks of figures that will stand in one page differ by it.
    """
    import matplotlib as mpl

    settings: dict[Any, Any] = {"svg.hashsalt": salt, "svg.fonttype": "none"}
    metadata: dict[str, Any] = {"Date": None} if form == "svg" else {"Software": None}
    held = io.BytesIO()
    with mpl.rc_context(settings):
        if figure.get_layout_engine() is not None:  # laid out anew, panels would move
            figure.draw_without_rendering()
            figure.set_layout_engine("none")
        figure.savefig(held, format=form, dpi=150, metadata=metadata)
    return held.getvalue()


def file_names(name: str, stem: str) -> tuple[Path, ...]:
    """Return the files that a figure is written to.

    Examples
    --------
    >>> [str(path) for path in file_names("ccdf", "car")]
    ['car.ccdf.svg', 'car.ccdf.png']
    """
    return tuple(Path(f"{stem}.{name}.{form}") for form in FORMATS)
