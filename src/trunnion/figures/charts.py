"""Charts: ranking, histogram, margin map, margin against time, gains, a varied value; degrees throughout."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.contour import QuadContourSet
from matplotlib.patches import Rectangle
from matplotlib.ticker import FuncFormatter, MultipleLocator
from numpy.typing import NDArray

from trunnion.figures.style import (
    COLOURS,
    INK,
    LIMIT,
    LOCK,
    QUIET,
    REGION,
    WORST,
    colour_of,
    dash_of,
    house_look,
    label,
    new_axes,
    new_figure,
    to_svg,
)

Floats = NDArray[np.float64]

_MAP_LEVELS = np.arange(0.0, 91.0, 10.0)
_NAMED_RUNS = 24  # more names than this do not fit under the axis


@house_look
def ranking_chart(
    names: Sequence[str], margins: Sequence[float], *, marked: str | None = None, limit: float | None = None
) -> str:
    """Bars of the guaranteed least lock margin, best on top. `margins` in deg; returns SVG text."""
    order = np.argsort(np.asarray(margins), kind="stable")
    figure = new_figure(height_mm=18 + 5.6 * len(names))
    axes = new_axes(figure)
    for row, index in enumerate(order):
        chosen = names[index] == marked
        axes.barh(
            row,
            margins[index],
            height=0.62,
            color=COLOURS[0] if chosen else "#dfe5ea",
            edgecolor=INK,
            linewidth=0.7,
        )
        axes.annotate(f"{margins[index]:.2f}°", (margins[index], row), (3, 0), textcoords="offset points", va="center")
    axes.set_yticks(range(len(names)), [label(names[index]) for index in order])
    axes.grid(visible=False, axis="y")
    axes.set_xlim(0.0, 95.0)
    axes.set_xlabel("guaranteed least lock margin, deg")
    _limit_line(axes, limit, vertical=True)
    return to_svg(figure)


@house_look
def margin_histogram(
    edges: Floats, shares: Mapping[str, Floats], *, limit: float | None = None, of: str = "samples"
) -> str:
    """Share of samples (or `of` the time) against lock margin. `edges` (n+1,) deg, each of `shares` (n,) in percent."""
    figure = new_figure(height_mm=64)
    axes = new_axes(figure)
    for index, (name, share) in enumerate(shares.items()):
        axes.stairs(
            share,
            edges,
            label=label(name),
            color=colour_of(index),
            linestyle=dash_of(index),
            linewidth=1.5,
        )
    axes.set_xlim(float(edges[0]), float(edges[-1]))
    axes.set_ylim(bottom=0.0)
    axes.set_xlabel("lock margin, deg")
    axes.set_ylabel(f"share of {of}, %")
    _limit_line(axes, limit, vertical=True)
    _legend(axes, loc="best")
    return to_svg(figure)


@house_look
def margin_map(
    x: Floats,
    y: Floats,
    margin: Floats,
    *,
    x_label: str,
    y_label: str,
    region: tuple[float, float, float, float] | None = None,
    worst: tuple[float, float] | None = None,
) -> str:
    """Lock margin over two angles (deg), singular set and region drawn. margin (len(y), len(x)) deg."""
    figure = new_figure(height_mm=84)
    axes = new_axes(figure)
    shades = _draw_map(axes, x, y, margin, region=region, worst=worst)
    if worst is not None:
        axes.legend(loc="upper right", facecolor="white", frameon=True, framealpha=0.9, edgecolor=QUIET)
    axes.set_xlabel(f"{label(x_label)}, deg")
    axes.set_ylabel(f"{label(y_label)}, deg")
    bar = figure.colorbar(shades, ax=axes, ticks=_MAP_LEVELS[::3])
    bar.set_label("lock margin, deg")
    return to_svg(figure)


@dataclass(frozen=True, eq=False)
class MapPanel:
    """One map: margin (len(y), len(x)) deg over two angles (deg), the third held; region as left, right, low, high."""

    x: Floats
    y: Floats
    margin: Floats
    x_label: str
    y_label: str
    held: str
    region: tuple[float, float, float, float]
    worst: tuple[float, float] | None


@house_look
def margin_maps(panels: Sequence[MapPanel]) -> str:
    """Lock margin over each pair of angles, the third held as stated; singular set, region and least margin drawn."""
    figure = new_figure(height_mm=62)
    drawn = []
    for number, panel in enumerate(panels, start=1):
        axes = new_axes(figure, 1, len(panels), number)
        shades = _draw_map(axes, panel.x, panel.y, panel.margin, region=panel.region, worst=panel.worst)
        axes.set_xlabel(f"{label(panel.x_label)}, deg")
        axes.set_ylabel(f"{label(panel.y_label)}, deg", labelpad=1.0)
        axes.set_title(label(panel.held))
        drawn.append(axes)
    bar = figure.colorbar(shades, ax=drawn, ticks=_MAP_LEVELS[::3], fraction=0.03, pad=0.02)
    bar.set_label("lock margin, deg")
    return to_svg(figure)


def _draw_map(
    axes: Axes,
    x: Floats,
    y: Floats,
    margin: Floats,
    *,
    region: tuple[float, float, float, float] | None,
    worst: tuple[float, float] | None,
) -> QuadContourSet:
    shades = axes.contourf(x, y, margin, levels=_MAP_LEVELS, cmap="Greys_r", vmin=-40.0, vmax=95.0)
    lines = axes.contour(x, y, margin, levels=_MAP_LEVELS[1:-1], colors=[INK], linewidths=0.5)
    axes.clabel(lines, levels=_MAP_LEVELS[2:-1:2], fmt="%d°", fontsize=6.5)
    if float(margin.min()) < 2.0:
        axes.contour(x, y, margin, levels=[1.0], colors=[COLOURS[1]], linewidths=2.0)
    if region is not None:
        left, right, low, high = region
        axes.add_patch(Rectangle((left, low), right - left, high - low, **REGION))
    if worst is not None:
        axes.plot(*worst, label="least margin", clip_on=False, **WORST)
    if float(margin.max()) < 1.0:
        axes.text(0.5, 0.75, "lock", transform=axes.transAxes, ha="center", color="white")
    for axis, values in ((axes.xaxis, x), (axes.yaxis, y)):
        axis.set_major_locator(MultipleLocator(90.0 if np.ptp(values) > 200.0 else 45.0))
    axes.grid(visible=False)
    return shades


@house_look
def margin_against_time(
    times: Floats,
    margins: Mapping[str, Floats],
    *,
    worst: Mapping[str, tuple[float, float]] | None = None,
    phases: Sequence[tuple[str, float, float]] = (),
    limit: float | None = None,
) -> str:
    """Lock margin (deg) against time (s); worst points marked, flight phases shaded and named."""
    figure = new_figure(height_mm=72)
    axes = new_axes(figure)
    for index, (name, start, end) in enumerate(phases):
        axes.axvspan(start, end, facecolor="#e9edf0" if index % 2 == 0 else "#f6f7f8", edgecolor="none")
        axes.annotate(
            label(name),
            ((start + end) / 2, 1.0),
            xycoords=("data", "axes fraction"),
            va="bottom",
            ha="center",
        )
    for index, (name, margin) in enumerate(margins.items()):
        colour, dash = colour_of(index), dash_of(index)
        axes.plot(times, margin, label=label(name), color=colour, linestyle=dash)
        if worst and name in worst:
            axes.plot(*worst[name], clip_on=False, **WORST)
    axes.set_ylim(0.0, 92.0)
    axes.set_xlabel("time, s")
    axes.set_ylabel("lock margin, deg")
    _limit_line(axes, limit, vertical=False)
    _legend(axes, loc="best", ncols=min(3, max(1, len(margins))))
    return to_svg(figure)


@house_look
def run_margins(runs: Sequence[str], margins: Mapping[str, Sequence[float]], *, limit: float | None = None) -> str:
    """Least lock margin (deg) of each run, one mark a convention; runs are named while there is room for names."""
    figure = new_figure(height_mm=76)
    axes = new_axes(figure)
    places = np.arange(1, len(runs) + 1)
    for index, (name, values) in enumerate(margins.items()):
        axes.plot(
            places,
            values,
            label=label(name),
            color=colour_of(index),
            linestyle="none",
            marker="osD^vP"[index % 6],
            markersize=5 if len(runs) <= _NAMED_RUNS else 2.5,
            clip_on=False,
            markerfacecolor="none" if index % 2 else colour_of(index),
        )
    if len(runs) <= _NAMED_RUNS:
        axes.set_xticks(places, [label(run) for run in runs], rotation=45, ha="right")
    else:
        axes.set_xlabel("run, in order of its least margin")
    axes.set_ylim(0.0, 92.0)
    axes.set_ylabel("least lock margin, deg")
    _limit_line(axes, limit, vertical=False)
    _legend(axes, loc="best", ncols=min(3, max(1, len(margins))))
    return to_svg(figure)


@house_look
def gain_curves(middle: Floats, curves: Mapping[str, Floats], *, locks: Sequence[float], x_label: str) -> str:
    """Amplification against the middle angle (deg), logarithmic; the singular values crossed."""
    figure = new_figure(height_mm=66)
    axes = new_axes(figure)
    for index, (name, gain) in enumerate(curves.items()):
        axes.semilogy(
            middle,
            gain,
            label=label(name),
            color=colour_of(index),
            linestyle=dash_of(index),
        )
    for number, lock in enumerate(locks):
        axes.axvline(lock, color=QUIET, linewidth=0.7)
        axes.plot([lock], [1.0], clip_on=False, label="lock" if number == 0 else None, **LOCK)
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axes.set_xlabel(f"{label(x_label)}, deg")
    axes.set_ylabel("amplification")
    _legend(axes, loc="upper center")
    return to_svg(figure)


@house_look
def error_laws(margins: Floats, pairs: Mapping[str, tuple[Floats, Floats]]) -> str:
    """Measured errors (points) and their laws (lines), rad, against the margin (deg), both logarithmic."""
    figure = new_figure(height_mm=72)
    axes = new_axes(figure)
    for index, (name, (measured, law)) in enumerate(pairs.items()):
        colour = colour_of(index)
        axes.loglog(margins, law, color=colour, linestyle=dash_of(index), label=f"{label(name)}, law")
        axes.loglog(margins, measured, color=colour, linestyle="none", marker="osD"[index % 3], markersize=4)
    axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:.0e}"))
    axes.set_xlabel("lock margin, deg")
    axes.set_ylabel("error, rad")
    _legend(axes, loc="upper right")
    return to_svg(figure)


@house_look
def varied_value(
    values: Sequence[float],
    series: Mapping[str, tuple[Sequence[float], Sequence[float]]],
    *,
    x_label: str,
    y_label: str,
    limits: Mapping[str, Sequence[float]] | None = None,
    flips: Sequence[tuple[float, float]] = (),
) -> str:
    """Result intervals [lo, hi] against one varied spec value, limits dashed, verdict flips bracketed."""
    figure = new_figure(height_mm=72)
    axes = new_axes(figure)
    for start, end in flips:
        axes.axvspan(start, end, facecolor="#efe3d8", edgecolor=COLOURS[1], hatch="////", linewidth=0.4)
    for index, (name, (low, high)) in enumerate(series.items()):
        colour = colour_of(index)
        axes.plot(
            values,
            low,
            label=label(name),
            color=colour,
            linestyle=dash_of(index),
            marker="o",
            markersize=3,
        )
        axes.fill_between(values, low, high, color=colour, alpha=0.2, linewidth=0)
    for name, bound in (limits or {}).items():
        axes.plot(values, bound, label=f"limit {label(name)}", **LIMIT)
    axes.set_xlabel(label(x_label))
    axes.set_ylabel(label(y_label))
    _legend(axes, loc="best")
    return to_svg(figure)


@house_look
def budget_bars(terms: Mapping[str, float], *, total: float, limit: float | None, unit: str) -> str:
    """Error budget: one bar a term, the combined figure below them, the requirement dashed."""
    names = [*terms, "combined"]
    values = [*terms.values(), total]
    figure = new_figure(height_mm=18 + 6.0 * len(names))
    axes = new_axes(figure)
    for row, (name, value) in enumerate(zip(names, values, strict=True)):
        whole = name == "combined" and row == len(names) - 1
        axes.barh(-row, value, height=0.6, color=COLOURS[0] if whole else "#dfe5ea", edgecolor=INK, linewidth=0.7)
        axes.annotate(f"{value:.3g}", (value, -row), (3, 0), textcoords="offset points", va="center")
    axes.set_yticks([-row for row in range(len(names))], [label(name) for name in names])
    axes.grid(visible=False, axis="y")
    axes.set_xlim(0.0, 1.15 * max([*values, limit or 0.0]))
    axes.set_xlabel(unit)
    _limit_line(axes, limit, vertical=True)
    return to_svg(figure)


def _limit_line(axes: Axes, limit: float | None, *, vertical: bool) -> None:
    """The requirement dashed; an upright line is named at its head, for the bars it crosses have no legend."""
    if limit is None:
        return
    (axes.axvline if vertical else axes.axhline)(limit, label="limit", **LIMIT)
    if vertical:
        axes.annotate("limit", (limit, 1.0), xycoords=("data", "axes fraction"), va="bottom", ha="center")


def _legend(axes: Axes, **options: Any) -> None:
    """A legend on a white ground, so that no grid line or curve strikes through its words."""
    axes.legend(frameon=True, facecolor="white", framealpha=0.9, edgecolor="none", **options)
