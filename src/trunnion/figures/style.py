"""The one look of all figures: print first, black-and-white legible, safe for colour-blind readers.

Meaning is never carried by colour alone: lines differ in dash, areas in hatching, points in shape.
"""

from __future__ import annotations

import functools
import io
from collections.abc import Callable
from typing import Any, ParamSpec, cast

import matplotlib as mpl
from matplotlib.axes import Axes
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure

from trunnion.glyphs import visible_text

MM_PER_INCH = 25.4
TEXT_WIDTH_MM = 160.0  # the text width of an A4 page with the package's margins

INK = "#1d2429"
QUIET = "#66717a"
RULE = "#b9c0c5"
# Blue, orange, teal, plum, ochre, slate: distinct in hue and in lightness (common practice, no source).
COLOURS = ("#1f4e79", "#c4661f", "#2e7d74", "#7a4069", "#a08418", "#556270")
DASHES: tuple[Any, ...] = (
    "solid",
    (0, (5, 2)),
    (0, (1.2, 1.4)),
    (0, (6, 2, 1.2, 2)),
    (0, (3, 1)),
    (0, (8, 3)),
)
HATCHES = ("", "////", "....", "xxxx", "----", "\\\\\\\\")

# One symbol for one thing in every figure.
LOCK: dict[str, Any] = {"marker": "x", "color": INK, "markersize": 8, "markeredgewidth": 2.0, "linestyle": "none"}
WORST: dict[str, Any] = {
    "marker": "D",
    "color": COLOURS[1],
    "markeredgecolor": INK,
    "markersize": 6.5,
    "linestyle": "none",
}
LIMIT: dict[str, Any] = {"color": INK, "linestyle": (0, (6, 2.5)), "linewidth": 1.1}
REGION: dict[str, Any] = {"edgecolor": INK, "linewidth": 1.3, "fill": False}

_RC: dict[str, Any] = {
    "font.family": ["DejaVu Sans"],
    "font.size": 8.0,
    "axes.titlesize": 8.5,
    "axes.labelsize": 8.0,
    "xtick.labelsize": 7.5,
    "ytick.labelsize": 7.5,
    "legend.fontsize": 7.5,
    "text.color": INK,
    "axes.labelcolor": INK,
    "axes.edgecolor": INK,
    "axes.linewidth": 0.7,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "xtick.color": INK,
    "ytick.color": INK,
    "axes.grid": True,
    "grid.color": RULE,
    "grid.linewidth": 0.4,
    "axes.axisbelow": True,
    "lines.linewidth": 1.5,
    "legend.frameon": False,
    "svg.fonttype": "none",  # real text: searchable in the package
    "svg.hashsalt": "trunnion",  # the same picture gives the same bytes
    "text.parse_math": False,  # names come from the spec and are shown literally
    "text.usetex": False,
    "axes.unicode_minus": True,
    "figure.dpi": 100,
}


_Arguments = ParamSpec("_Arguments")


def house_look(draw: Callable[_Arguments, str]) -> Callable[_Arguments, str]:
    """Draw inside the house look, so that no setting leaks to whoever asked for the picture."""

    @functools.wraps(draw)
    def drawn(*arguments: _Arguments.args, **options: _Arguments.kwargs) -> str:
        with mpl.rc_context(cast(Any, _RC)):
            return draw(*arguments, **options)

    return drawn


def new_figure(*, width_mm: float = TEXT_WIDTH_MM, height_mm: float = 80.0) -> Figure:
    """An empty figure of the house look, width and height in millimetres."""
    figure = Figure(figsize=(width_mm / MM_PER_INCH, height_mm / MM_PER_INCH), layout="constrained")
    FigureCanvasSVG(figure)
    return figure


def new_axes(figure: Figure, rows: int = 1, columns: int = 1, index: int = 1, **options: Any) -> Axes:
    """Axes numbered row by row from 1."""
    return figure.add_subplot(rows, columns, index, **options)


def bare_axes(figure: Figure, rows: int = 1, columns: int = 1, index: int = 1) -> Axes:
    """Axes for a drawing: equal scales, no ticks, no frame."""
    axes = new_axes(figure, rows, columns, index)
    axes.set_aspect("equal")
    axes.set_axis_off()
    return axes


def colour_of(index: int) -> str:
    """The colour of series number `index` from 0; they come round again after the last."""
    return COLOURS[index % len(COLOURS)]


def dash_of(index: int) -> Any:
    """The dash of series number `index` from 0, as matplotlib's `linestyle`."""
    return DASHES[index % len(DASHES)]


def label(text: str) -> str:
    """Text from the spec as it may stand in a figure: shown literally, missing characters made visible."""
    return visible_text(text)


def to_svg(figure: Figure) -> str:
    """The figure as SVG text, byte-identical for the same picture (no date, fixed ids)."""
    buffer = io.StringIO()
    figure.savefig(buffer, format="svg", metadata={"Date": None, "Creator": None})
    return buffer.getvalue()
