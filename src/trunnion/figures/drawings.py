"""Attitude drawings: triads before and after each turn, mounts, rings, the sphere with its caps.

All in a parallel projection from a quarter above; `up` (the drawing's vertical) is a direction
of the reference frame, so that a frame whose z axis points down is drawn with z down.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Polygon
from numpy.typing import NDArray

from trunnion.figures.style import (
    COLOURS,
    DASHES,
    INK,
    LOCK,
    QUIET,
    RULE,
    WORST,
    bare_axes,
    colour_of,
    dash_of,
    house_look,
    label,
    new_figure,
    to_svg,
)

Floats = NDArray[np.float64]

# Viewer's azimuth from the reference frame's first horizontal axis and elevation above the horizon.
_VIEW_AZIMUTH = np.radians(-128.0)
_VIEW_ELEVATION = np.radians(24.0)
# A white ground under a label, so that a line it crosses does not strike through it.
_GROUND: dict[str, Any] = {"facecolor": "white", "edgecolor": "none", "alpha": 0.85, "pad": 0.8}


def view_matrix(up: Floats) -> Floats:
    """(3, 3) rows right, upward, towards the viewer, in reference components; `up` (3,) is drawn vertical."""
    up = np.asarray(up, float) / np.linalg.norm(up)
    first = np.eye(3)[int(np.argmin(np.abs(up)))]
    ahead = first - up * (first @ up)
    ahead /= np.linalg.norm(ahead)
    left = np.cross(up, ahead)
    towards = np.cos(_VIEW_ELEVATION) * (np.cos(_VIEW_AZIMUTH) * ahead + np.sin(_VIEW_AZIMUTH) * left)
    towards = towards + np.sin(_VIEW_ELEVATION) * up
    right = np.cross(up, towards)
    right /= np.linalg.norm(right)
    return np.array([right, np.cross(towards, right), towards])


def upward(axes: Sequence[str]) -> Floats:
    """The direction (3,) drawn upward for a frame with these axis names: along `up`, away from `down`, or z."""
    for index, axis in enumerate(axes):
        if axis in ("up", "down"):
            return np.eye(3)[index] * (1.0 if axis == "up" else -1.0)
    return np.array([0.0, 0.0, 1.0])


@house_look
def turns_drawing(
    stages: Sequence[Floats], axis_words: Sequence[str], captions: Sequence[str], *, up: Floats, columns: int = 2
) -> str:
    """Vehicle axes before and after each turn, one panel a stage.

    stages: (3, 3) matrices, columns the vehicle axes in reference components; captions: one line a panel; columns:
    panels side by side.
    """
    view = view_matrix(up)
    rows = -(-len(stages) // columns)
    figure = new_figure(height_mm=(62 if columns <= 2 else 32) * rows)
    for number, (stage, caption) in enumerate(zip(stages, captions, strict=True), start=1):
        axes = bare_axes(figure, rows, columns, number)
        if number > 1:
            _triad(axes, view, stages[number - 2], ["", "", ""], faint=True)
        _outline(axes, view @ stage)
        _triad(axes, view, stage, axis_words, beside=True)
        _frame_panel(axes, caption)
    return to_svg(figure)


@house_look
def mount_drawing(R_bs: Floats, host_words: Sequence[str], sensor_words: Sequence[str], *, up: Floats) -> str:
    """A sensor triad on its host: host axes at the left, the sensor's axes at the right, same view.

    R_bs (3, 3): columns are the sensor axes in host components.
    """
    view = view_matrix(up)
    heights = np.concatenate([[0.0], view[1], view[1] @ R_bs])
    bottom, top = float(heights.min()) - 0.3, float(heights.max()) + 0.3
    figure = new_figure(width_mm=130, height_mm=8 + 24 * (top - bottom))
    for number, (triad, words, colour, caption) in enumerate(
        (
            (np.eye(3), host_words, None, "host axes"),
            (R_bs, sensor_words, COLOURS[1], "sensor axes on the host"),
        ),
        start=1,
    ):
        axes = bare_axes(figure, 1, 2, number)
        _outline(axes, view)
        _triad(axes, view, triad, words, colour=colour, beside=True)
        _frame_panel(axes, caption)
        axes.set_ylim(bottom, top)
    return to_svg(figure)


@house_look
def rings_drawing(
    axes_directions: Sequence[Floats], names: Sequence[str], *, up: Floats, parallel: tuple[int, int] | None
) -> str:
    """Gimbal rings at one set of joint angles, outermost first; axes that have become parallel are marked.

    axes_directions: unit vectors (3,) of the joint axes in reference components, as they lie at those angles.
    """
    view = view_matrix(up)
    figure = new_figure(width_mm=110, height_mm=84)
    axes = bare_axes(figure)
    count = len(axes_directions)
    tips: list[Floats] = []
    for index, (axis, name) in enumerate(zip(axes_directions, names, strict=True)):
        radius = 1.0 - 0.2 * index
        following = axes_directions[index + 1] if index + 1 < count else axes_directions[index - 1]
        _ring(axes, view, axis, following, radius, index)
        marked = parallel is not None and index in parallel
        tip = view @ (axis * 1.22)
        tail = view @ (-axis * 1.22)
        axes.plot(
            [tail[0], tip[0]],
            [tail[1], tip[1]],
            color=colour_of(index),
            linewidth=2.4 if marked else 1.2,
            linestyle=dash_of(index),
        )
        text = f"{index + 1} {label(name)}" + (" (parallel)" if marked else "")
        shift = 0.15 * sum(float(np.hypot(*(tip - other)[:2])) < 0.2 for other in tips)
        tips.append(tip)
        axes.annotate(
            text,
            (tip[0], tip[1] + shift),
            (4, 3),
            textcoords="offset points",
            color=colour_of(index),
            bbox=_GROUND,
        )
    _frame_panel(axes, "")
    return to_svg(figure)


@house_look
def sphere_drawing(
    tracks: Sequence[tuple[str, Floats]],
    *,
    lock: Floats,
    cap: float,
    up: Floats,
    lock_word: str,
    worst: Floats | None = None,
) -> str:
    """Directions of a vehicle axis on the unit sphere against the forbidden caps around the lock line.

    tracks: (name, (N, 3) unit vectors in reference components); lock (3,) unit; cap: half angle, rad.
    """
    view = view_matrix(up)
    figure = new_figure(width_mm=120, height_mm=96)
    axes = bare_axes(figure)
    turn = np.linspace(0.0, 2 * np.pi, 181)
    axes.plot(np.cos(turn), np.sin(turn), color=INK, linewidth=0.8)
    _graticule(axes, view, up)
    for sign in (1.0, -1.0):
        _cap(axes, view, sign * lock, cap)
        point = view @ (sign * lock)
        if point[2] >= 0:
            axes.plot(point[0], point[1], **LOCK)
            axes.annotate(label(lock_word), (point[0], point[1]), (6, 6), textcoords="offset points", bbox=_GROUND)
    for index, (name, directions) in enumerate(tracks):
        _track(axes, view, directions, name, index)
    if worst is not None:
        point = view @ worst
        axes.plot(point[0], point[1], label="least margin", **WORST)
    axes.legend(loc="upper center", bbox_to_anchor=(0.5, 0.02), ncols=3, markerscale=1.2)
    _frame_panel(axes, "", size=1.15)
    return to_svg(figure)


def _track(axes: Axes, view: Floats, directions: Floats, name: str, index: int) -> None:
    points = directions @ view.T
    colour = colour_of(index)
    front = points[:, 2] >= 0
    if len(points) > 400 or name.endswith("(points)"):
        axes.plot(points[front, 0], points[front, 1], ".", markersize=1.6, color=colour, label=label(name))
        return
    shown = np.where(front[:, None], points, np.nan)
    hidden = np.where(front[:, None], np.nan, points)
    axes.plot(shown[:, 0], shown[:, 1], color=colour, linestyle=dash_of(index), label=label(name))
    axes.plot(hidden[:, 0], hidden[:, 1], color=colour, linewidth=0.5, alpha=0.5)


def _graticule(axes: Axes, view: Floats, up: Floats) -> None:
    up = np.asarray(up, float) / np.linalg.norm(up)
    first = np.eye(3)[int(np.argmin(np.abs(up)))]
    ahead = first - up * (first @ up)
    ahead /= np.linalg.norm(ahead)
    side = np.cross(up, ahead)
    turn = np.linspace(0.0, 2 * np.pi, 121)
    for height in np.radians([-60, -30, 0, 30, 60]):
        ring = np.cos(height) * (np.cos(turn)[:, None] * ahead + np.sin(turn)[:, None] * side) + np.sin(height) * up
        _faint(axes, ring @ view.T)
    for bearing in np.radians(np.arange(0, 180, 30)):
        side_way = np.cos(bearing) * ahead + np.sin(bearing) * side
        _faint(axes, (np.cos(turn)[:, None] * side_way + np.sin(turn)[:, None] * up) @ view.T)


def _faint(axes: Axes, points: Floats) -> None:
    front = np.where(points[:, 2:3] >= 0, points, np.nan)
    axes.plot(front[:, 0], front[:, 1], color=RULE, linewidth=0.5)


def _cap(axes: Axes, view: Floats, centre: Floats, half_angle: float) -> None:
    if half_angle <= 0:
        return
    first = np.eye(3)[int(np.argmin(np.abs(centre)))]
    one = np.cross(centre, first)
    one /= np.linalg.norm(one)
    two = np.cross(centre, one)
    turn = np.linspace(0.0, 2 * np.pi, 121)[:, None]
    rim = np.cos(half_angle) * centre + np.sin(half_angle) * (np.cos(turn) * one + np.sin(turn) * two)
    points = rim @ view.T
    if (view @ centre)[2] < 0:
        return
    inside = points[points[:, 2] >= -0.02]
    axes.add_patch(
        Polygon(inside[:, :2], closed=True, facecolor="none", edgecolor=COLOURS[1], hatch="////", linewidth=1.0)
    )


def _triad(
    axes: Axes,
    view: Floats,
    triad: Floats,
    words: Sequence[str],
    *,
    faint: bool = False,
    colour: str | None = None,
    beside: bool = False,
) -> None:
    """Three arrows, the columns of `triad`; each is named and differs in dash from the others.

    beside: names keep clear of the arrows, for panels in which the axes come to lie along each other.
    """
    tips = (view @ triad)[:2].T
    for index in range(3):
        tip = view @ triad[:, index]
        tint = RULE if faint else (colour or COLOURS[index])
        axes.annotate(
            "",
            (tip[0], tip[1]),
            (0, 0),
            arrowprops={
                "arrowstyle": "-|>",
                "color": tint,
                "linewidth": 0.9 if faint else 1.5,
                "linestyle": "solid" if index == 0 else DASHES[index],
                "shrinkA": 0,
                "shrinkB": 0,
                "mutation_scale": 9,
            },
        )
        if words[index]:
            length = max(float(np.hypot(tip[0], tip[1])), 1e-9)
            away, across, along = tip[:2] * (1.0 + 0.16 / max(length, 0.35)), "center", "center"
            if beside:
                away, across, along = _name_place(tips, index)
            axes.text(away[0], away[1], label(words[index]), color=tint, ha=across, va=along, fontsize=7.5)


def _name_place(tips: Floats, index: int) -> tuple[Floats, str, str]:
    """Where the name of one of three arrows stands, and which edge of it: past the tip, or at its side.

    A name past its tip is pushed off the tip by its own width or height. Where a longer arrow runs on within 45 deg
    of this one, the name stands at the side that is turned away from it.
    """
    lengths = np.maximum(np.hypot(tips[:, 0], tips[:, 1]), 1e-9)
    ways = tips / lengths[:, None]
    way = ways[index]
    close = (ways @ way > np.cos(np.radians(45.0))) & (lengths > lengths[index])
    if close.any():
        other = ways[int(np.argmax(close))]
        side = 1.0 if way[0] * other[1] - way[1] * other[0] < 0 else -1.0
        way = side * np.array([-way[1], way[0]])
    place = tips[index] + 0.09 * way
    across = "center" if abs(way[0]) < 0.35 else ("left" if way[0] > 0 else "right")
    along = "center" if abs(way[0]) >= 0.35 else ("bottom" if way[1] > 0 else "top")
    return place, across, along


def _outline(axes: Axes, view: Floats) -> None:
    """A plain vehicle of our own drawing: a dart with a fin, forward along x, down along z."""
    dart = np.array([[0.62, 0.0, 0.0], [-0.4, 0.3, 0.0], [-0.28, 0.0, 0.0], [-0.4, -0.3, 0.0]])
    fin = np.array([[-0.02, 0.0, 0.0], [-0.36, 0.0, -0.22], [-0.28, 0.0, 0.0]])
    for shape, shade in ((dart, "#eef1f3"), (fin, "#d9dfe4")):
        points = shape @ view.T
        axes.add_patch(Polygon(points[:, :2], closed=True, facecolor=shade, edgecolor=QUIET, linewidth=0.8))


def _ring(axes: Axes, view: Floats, axis: Floats, across: Floats, radius: float, index: int) -> None:
    """A ring in the plane of its own axis and the next ring's axis, so that it carries both bearings."""
    one = np.asarray(axis, float)
    two = np.asarray(across, float) - one * float(np.dot(axis, across))
    size = float(np.linalg.norm(two))
    if size < 1e-6:
        two = np.cross(one, np.eye(3)[int(np.argmin(np.abs(one)))])
        size = float(np.linalg.norm(two))
    two = two / size
    turn = np.linspace(0.0, 2 * np.pi, 181)[:, None]
    points = radius * (np.cos(turn) * one + np.sin(turn) * two) @ view.T
    axes.plot(points[:, 0], points[:, 1], color=colour_of(index), linewidth=2.2)


def _frame_panel(axes: Axes, caption: str, *, size: float = 1.28) -> None:
    axes.set_xlim(-size, size)
    axes.set_ylim(-size, size)
    if caption:
        axes.set_title(label(caption), fontsize=7.5, pad=2)


__all__ = ["Figure", "mount_drawing", "rings_drawing", "sphere_drawing", "turns_drawing", "view_matrix"]
