"""Pictures of pointing mounts: the sky with keyhole, passes and forbidden sectors; joint angles between their stops."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from matplotlib.projections.polar import PolarAxes
from matplotlib.ticker import FuncFormatter
from numpy.typing import NDArray

from trunnion.figures.style import (
    COLOURS,
    DASHES,
    HATCHES,
    INK,
    LIMIT,
    LOCK,
    QUIET,
    colour_of,
    dash_of,
    house_look,
    label,
    new_axes,
    new_figure,
    to_svg,
)

Floats = NDArray[np.float64]

_COMPASS = {0: "north", 90: "east", 180: "south", 270: "west"}


@house_look
def sky_plot(
    tracks: Mapping[str, tuple[Floats, Floats]],
    *,
    outer_axis: tuple[float, float] | None,
    keyhole: Sequence[tuple[float, float]] | None = None,
    out_of_travel: tuple[Floats, Floats, NDArray[np.bool_]] | None = None,
    sectors: Mapping[str, Floats] | None = None,
    cones: Mapping[str, Sequence[tuple[float, float]]] | None = None,
) -> str:
    """The sky seen from the mount, zenith in the middle, north up, east right.

    tracks: name -> (azimuth, elevation) deg; outer_axis: azimuth, elevation (deg) of the outer axis above the horizon;
    keyhole: its outline as (azimuth, elevation) deg; out_of_travel: azimuths (A,), elevations (E,) deg and a mask
    (E, A) of what the stops keep out; sectors: polygons (N, 2) deg; cones: further outlines by name.
    """
    figure = new_figure(width_mm=130, height_mm=118)
    axes = new_axes(figure, projection="polar")
    assert isinstance(axes, PolarAxes)
    axes.set_theta_zero_location("N")
    axes.set_theta_direction(-1)
    axes.set_rlim(0.0, 90.0)
    axes.set_rgrids(
        [15, 30, 45, 60, 75, 90],
        ["75°", "60°", "45°", "30°", "15°", "0°"],
        angle=_free_bearing(tracks, sectors or {}),
        fontsize=6.5,
        color=QUIET,
    )
    axes.set_thetagrids(range(0, 360, 30), [_COMPASS.get(angle, f"{angle}°") for angle in range(0, 360, 30)])
    if out_of_travel is not None and bool(out_of_travel[2].any()):
        azimuth, elevation, mask = out_of_travel
        shade = axes.contourf(
            np.radians(azimuth),
            90.0 - elevation,
            mask.astype(float),
            levels=[0.5, 1.5],
            colors=["#e3e7ea"],
            hatches=["...."],
        )
        shade.set_edgecolor(QUIET)
        axes.fill([], [], facecolor="#e3e7ea", hatch="....", edgecolor=QUIET, label="beyond the stops")
    for index, (name, polygon) in enumerate((sectors or {}).items()):
        outline = _dense(polygon)
        axes.fill(
            np.radians(outline[:, 0]),
            90.0 - outline[:, 1],
            facecolor="none",
            edgecolor=COLOURS[1],
            hatch=HATCHES[1 + 2 * (index % 2)],
            linewidth=1.0,
            label=label(name),
        )
    if keyhole:
        around = np.array(keyhole)
        axes.plot(np.radians(around[:, 0]), 90.0 - around[:, 1], color=INK, linewidth=1.4, label="keyhole")
    for index, (name, points) in enumerate((cones or {}).items()):
        around = np.array(points)
        axes.plot(
            np.radians(around[:, 0]),
            90.0 - around[:, 1],
            color=COLOURS[3],
            linestyle=DASHES[1 + index % 4],
            label=label(name),
        )
    if outer_axis is not None and outer_axis[1] >= 0.0:
        axes.plot(np.radians(outer_axis[0]), 90.0 - outer_axis[1], label="outer axis", **LOCK)
    for index, (name, (azimuth, elevation)) in enumerate(tracks.items()):
        axes.plot(
            np.radians(azimuth),
            90.0 - elevation,
            color=COLOURS[(0, 2, 3, 4, 5)[index % 5]],
            linestyle=dash_of(index),
            label=label(name),
        )
    axes.legend(loc="upper center", bbox_to_anchor=(0.5, -0.06), ncols=3)
    return to_svg(figure)


def _free_bearing(tracks: Mapping[str, tuple[Floats, Floats]], sectors: Mapping[str, Floats]) -> float:
    """Bearing (deg), half way between two spokes, along which the elevations stand farthest from what is drawn."""
    drawn = [(azimuth, elevation) for azimuth, elevation in tracks.values()]
    drawn += [(outline[:, 0], outline[:, 1]) for outline in map(_dense, sectors.values())]
    if not drawn:
        return 15.0
    lines = [np.radians(azimuth) for azimuth, _ in drawn]
    points = np.concatenate(
        [(90.0 - e) * np.exp(1j * a) for a, (_, e) in zip(lines, drawn, strict=True)]
    )  # the plane of the plot as complex numbers, north along the real axis
    candidates = np.arange(15.0, 360.0, 30.0)
    labels = np.array([30.0, 45.0, 60.0, 75.0, 90.0]) * np.exp(1j * np.radians(candidates))[:, None]
    room = np.abs(labels[:, :, None] - points).min(axis=(1, 2))
    return float(candidates[int(np.argmax(np.round(room, 6)))])


def _dense(polygon: Floats) -> Floats:
    """A polygon (N, 2) with points every degree along its sides, so that straight sides in angles are drawn right."""
    parts = []
    for one, other in zip(polygon, np.roll(polygon, -1, axis=0), strict=True):
        count = max(1, int(np.ceil(np.max(np.abs(other - one)))))
        parts.append(one + (other - one) * np.arange(count)[:, None] / count)
    return np.concatenate([*parts, polygon[:1]])


@house_look
def joint_history(
    times: Floats,
    angles: Mapping[str, Floats],
    *,
    stops: Mapping[str, tuple[float, float]] | None = None,
    unit: str = "deg",
) -> str:
    """Angles (deg) against time (s), one panel an angle or joint, its stops dashed where they come into view.

    nan in an angle breaks the line, as where the mount unwinds.
    """
    figure = new_figure(height_mm=18 + 34 * len(angles))
    for row, (name, values) in enumerate(angles.items(), start=1):
        axes = new_axes(figure, len(angles), 1, row)
        axes.plot(times, values, color=colour_of(row - 1), linestyle=dash_of(row - 1))
        low, high = float(np.nanmin(values)), float(np.nanmax(values))
        room = max(0.15 * (high - low), 1.0)
        for stop in (stops or {}).get(name, ()):
            if np.isfinite(stop) and low - 4.0 * room <= stop <= high + 4.0 * room:
                axes.axhline(stop, **LIMIT)
                axes.annotate(
                    "stop", (1.0, stop), xycoords=("axes fraction", "data"), ha="right", va="bottom", fontsize=6.5
                )
        axes.set_ylabel(f"{label(name)}, {unit}")
        if row == len(angles):
            axes.set_xlabel("time, s")
    return to_svg(figure)


@house_look
def growth_curves(margins: Floats, curves: Mapping[str, Floats], *, turn: float, here: float | None) -> str:
    """Error of the outer angles (deg) against the margin (deg), logarithmic; `here` is the least margin of a region."""
    figure = new_figure(height_mm=66)
    axes = new_axes(figure)
    for index, (name, values) in enumerate(curves.items()):
        axes.semilogy(
            margins,
            values,
            label=label(name),
            color=colour_of(index),
            linestyle=dash_of(index),
        )
    axes.axvline(turn, color=QUIET, linewidth=0.7)
    axes.annotate("misalignment", (turn, 1.0), (3, -3), xycoords=("data", "axes fraction"), textcoords="offset points",
                  va="top", fontsize=6.5, color=QUIET,
                  bbox={"facecolor": "white", "edgecolor": "none", "pad": 0.4})  # fmt: skip
    if here is not None:
        axes.axvline(here, label="least margin of the regions", **LIMIT)
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axes.set_xlabel("lock margin, deg")
    axes.set_ylabel("error of the outer angles, deg")
    axes.legend(loc="center", frameon=True, facecolor="white", framealpha=0.9, edgecolor="none")
    return to_svg(figure)
