"""What all figures share: size, strokes, axes, and how they are written to a file."""

from __future__ import annotations

import io
import textwrap
import warnings
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from importlib.util import find_spec
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from wavegen.core.errors import ArgumentsError
from wavegen.reports.inert import one_line

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure
    from matplotlib.text import Text

INK = "#1d2733"
FAINT = "#c9d1d8"
SHADE = "#dde3e8"
SIZE_INCHES = (8.0, 5.8)
_SIZES = {2: (9.4, 5.6), 3: (10.4, 4.7)}
_TICKS = {1: 9, 2: 7, 3: 5}
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
REFERENCE = Stroke(colour="#75808b", dashes=(1, 1.6), mark="x", width=1.4)
"""What stands for comparison only: the complex Gaussian."""
LAW = Stroke(colour="#b5179e", dashes=(4, 1.4, 1, 1.4), mark="", width=1.8)
"""What mathematics says of the curve beside it."""
LIMIT = Stroke(colour="#1d2733", dashes=(9, 2, 1.5, 2), mark="", width=1.8)
"""What must not be passed."""
_TITLE_WIDTHS = (72, 60, 48, 36, 24)
_LONG_NAME = 34


def stroke(number: int) -> Stroke:
    """Return the stroke of the curve with this number, from 0; they repeat after six."""
    return STROKES[number % len(STROKES)]


def draw(
    axes: Axes,
    x: Any,
    y: Any,
    style: Stroke,
    *,
    label: str | None = None,
    has_marks: bool = False,
) -> None:
    """Draw a line with a stroke, and its points if they are few enough to be told."""
    axes.plot(
        x,
        y,
        color=style.colour,
        linewidth=style.width,
        linestyle=(0, style.dashes) if style.dashes else "-",
        marker=style.mark if has_marks else "",
        markersize=6,
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
    figure = Figure(figsize=_SIZES.get(n_panels, SIZE_INCHES), layout="constrained")
    panels = figure.subplots(1, n_panels, squeeze=False)[0]
    heading = figure.suptitle(
        "", x=0.01, ha="left", color=INK, fontsize=13, fontweight="bold", parse_math=False
    )
    _fill(heading, one_line(title))
    for axes in panels:
        plain(axes, n_ticks=_TICKS[min(n_panels, 3)])
    return figure, panels


@contextmanager
def _any_letter() -> Iterator[None]:
    """Let letters pass that the font lacks: drawn as boxes, kept in an SVG."""
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", message=r"Glyph .* missing from")
        yield


def _width(text: Text) -> float:
    with _any_letter():
        return float(text.get_window_extent().width)


def _fill(heading: Text, title: str) -> None:
    """Set a title on as many lines as it needs, two at most."""
    figure = heading.get_figure(root=True)
    assert figure is not None  # noqa: S101 - told to the type checker
    for width in _TITLE_WIDTHS:
        lines = textwrap.wrap(title, width, max_lines=2, placeholder=" ...")
        heading.set_text("\n".join(lines))
        if _width(heading) <= 0.97 * figure.bbox.width:
            return


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


def plain(axes: Axes, *, n_ticks: int = 9) -> None:
    """Give axes the house's grid, ink and letters, and so many ticks at most."""
    from matplotlib.ticker import MaxNLocator

    axes.grid(visible=True, which="major", color=FAINT, linewidth=0.8)
    axes.set_axisbelow(True)
    axes.tick_params(labelsize=11, colors=INK, length=4)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    for side in ("left", "bottom"):
        axes.spines[side].set_color(INK)
    for axis in (axes.xaxis, axes.yaxis):
        axis.label.set(color=INK, fontsize=12)
        axis.set_major_locator(MaxNLocator(nbins=n_ticks, steps=[1, 2, 5, 10]))


def legend(axes: Axes, *, mark_scale: float = 1.0) -> None:
    """Name the curves, as they are drawn, below the axes: there they cover none of them."""
    figure = axes.get_figure(root=True)
    assert figure is not None  # noqa: S101 - told to the type checker
    handles, labels = axes.get_legend_handles_labels()
    longest = max((len(label) for label in labels), default=0)
    made = figure.legend(
        handles,
        [one_line(label) for label in labels],
        loc="outside lower left",
        ncols=1 if longest > _LONG_NAME else 2,
        fontsize=11,
        frameon=False,
        handlelength=3.2,
        markerscale=mark_scale,
        borderaxespad=0.2,
    )
    for text in made.get_texts():
        text.set(color=INK, parse_math=False)
        _shorten(text, 0.86 if longest > _LONG_NAME else 0.4)


def _shorten(text: Text, share: float) -> None:
    """Cut a text that is longer than a share of its figure."""
    figure = text.get_figure(root=True)
    assert figure is not None  # noqa: S101 - told to the type checker
    whole = text.get_text()
    for length in (len(whole), 100, 80, 60, 44, 30, 20):
        if length > len(whole):
            continue
        text.set_text(whole if length == len(whole) else f"{whole[:length].rstrip()} ...")
        if _width(text) <= share * figure.bbox.width:
            return


def note(axes: Axes, text: str) -> None:
    """Write a remark over a panel, at its left end."""
    axes.set_title(
        "\n".join(one_line(line) for line in text.split("\n")),
        loc="left",
        fontsize=11,
        color=INK,
        fontweight="normal",
        parse_math=False,
    )


def absolute_axis(
    axes: Axes, origin_dbm: float, name: str, *, along: str = "x", n_ticks: int = 9
) -> None:
    """Add a second axis in dBm to one in dB.

    Parameters
    ----------
    axes : Axes
        Its levels are over a mean.
    origin_dbm : float
        That mean, dBm.
    name : str
        Of the axis, with its unit.
    along : {"x", "y"}
        Which one is doubled.
    n_ticks : int
        Ticks at most.
    """
    from matplotlib.ticker import MaxNLocator

    def forth(level: Any) -> Any:
        return np.asarray(level) + origin_dbm

    def back(level: Any) -> Any:
        return np.asarray(level) - origin_dbm

    name = one_line(name)
    functions: tuple[Callable[[Any], Any], Callable[[Any], Any]] = (forth, back)
    if along == "x":
        second = axes.secondary_xaxis("top", functions=functions)
        second.set_xlabel(name, fontsize=12, color=INK)
    else:
        second = axes.secondary_yaxis("right", functions=functions)
        second.set_ylabel(name, fontsize=12, color=INK)
    second.tick_params(labelsize=11, colors=INK)
    axis = second.xaxis if along == "x" else second.yaxis
    axis.set_major_locator(MaxNLocator(nbins=n_ticks, steps=[1, 2, 5, 10]))


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
    with mpl.rc_context(settings), _any_letter():
        if figure.get_layout_engine() is not None:  # laid out anew, panels would move
            figure.draw_without_rendering()
            figure.set_layout_engine(None)
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
