"""Pictures of an identification: how far each sample misses under the best reading and under the next."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from matplotlib.ticker import FuncFormatter, MaxNLocator, NullFormatter
from numpy.typing import NDArray

from trunnion.figures.style import COLOURS, INK, LIMIT, colour_of, house_look, label, new_axes, new_figure, to_svg

Floats = NDArray[np.float64]

_MARKS = ("o", "s", "^", "D")
_FLOOR_DEG = 1e-7  # a logarithmic axis has no zero; printed digits end long before


@house_look
def residual_chart(residuals: Mapping[str, Floats], *, limit: float | None = None) -> str:
    """Miss of each sample (deg) under each named reading, logarithmic; `limit`: the noise allowed for. SVG text."""
    figure = new_figure(height_mm=70)
    axes = new_axes(figure)
    for index, (name, values) in enumerate(residuals.items()):
        axes.plot(
            np.arange(1, len(values) + 1),
            np.maximum(values, _FLOOR_DEG),
            marker=_MARKS[index % len(_MARKS)],
            markersize=3.2,
            markerfacecolor="white" if index else COLOURS[0],
            markeredgecolor=INK if index == 0 else colour_of(index),
            markeredgewidth=0.7,
            linestyle="none",
            label=label(name),
        )
    axes.set_yscale("log")
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axes.yaxis.set_minor_formatter(NullFormatter())
    if limit is not None:
        axes.axhline(max(limit, _FLOOR_DEG), **LIMIT)
        axes.annotate("noise allowed for", (0.99, max(limit, _FLOOR_DEG)), (0, -9), xycoords=("axes fraction", "data"),
                      textcoords="offset points", ha="right")  # fmt: skip
    axes.xaxis.set_major_locator(MaxNLocator(integer=True, min_n_ticks=1))
    axes.set_xlabel("sample")
    axes.set_ylabel("miss, deg")
    axes.legend(loc="best")
    return to_svg(figure)
