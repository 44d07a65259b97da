"""Data behind the pictures of a sweep: histograms, maps over two angles, tracks on the sphere."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.demand import rate_demand
from trunnion.attitude.noise import linear_noise
from trunnion.attitude.rotations import matrix_from_quaternion
from trunnion.attitude.words import axis_words, degrees_text
from trunnion.envelope.regions import Box, Cone, Region, Track, Union
from trunnion.envelope.results import Extreme
from trunnion.envelope.sampling import sample_region
from trunnion.errors import RegionError
from trunnion.figures import drawings
from trunnion.figures.charts import MapPanel

Array = NDArray[np.float64]

_SAMPLES = 16_384
_SHORTEST_PHASE = 3  # rows
_SLACK = 1e-9  # rad, for rows that lie on the edge of a region
_MAP_POINTS = 121
_BIN_DEG = 2.5


def histogram(conventions: Mapping[str, Convention], regions: Mapping[str, Region]) -> tuple[Array, dict[str, Array]]:
    """Bin edges (n+1,) deg and, for each convention, the share of samples (n,) in per cent."""
    edges = np.arange(0.0, 90.0 + _BIN_DEG, _BIN_DEG)
    samples = [R for region in regions.values() if (R := region_samples(region)) is not None]
    attitudes = np.concatenate(samples) if samples else np.empty((0, 3, 3))
    shares = {}
    for name, convention in conventions.items():
        counts, _ = np.histogram(np.degrees(convention.lock_margin(attitudes)), bins=edges)
        shares[name] = 100.0 * counts / max(1, len(attitudes))
    return edges, shares


def region_samples(region: Region) -> Array | None:
    """Attitudes (N, 3, 3) of a region drawn by its own rule (phases one after the other), or the rows of a table."""
    if isinstance(region, Track):
        return matrix_from_quaternion(region.quaternions)
    if isinstance(region, Union):
        parts = [R for part in region.parts.values() if (R := region_samples(part)) is not None]
        return np.concatenate(parts) if parts else None
    try:
        return sample_region(region, _SAMPLES).matrices
    except RegionError:  # dispersed unions, and constraints that next to no sample keeps
        return None


@dataclass(frozen=True)
class AngleMaps:
    """A map over each pair of angles, whose angles they are, and the region drawn."""

    panels: list[MapPanel]
    words: str
    region: str


def angle_maps(convention: Convention, regions: Mapping[str, Region], least: Mapping[str, Extreme]) -> AngleMaps | None:
    """Maps of the margin over each pair of angles of the box in which it is least (None without a box).

    The third angle is held at the value it has where the margin is least.
    """
    boxes = {name: region for name, region in regions.items() if isinstance(region, Box)}
    if not boxes:
        return None
    name = min(boxes, key=lambda over: least[over].lo)
    box, witness = boxes[name], least[name].witness
    angles = box.convention.angles(witness.matrix).angles if witness is not None else np.zeros(3)
    inside = np.array([_into(angle, *span) for angle, span in zip(angles, box.ranges, strict=True)])
    panels = [_panel(convention, box, inside, pair, marked=witness is not None) for pair in ((0, 1), (0, 2), (1, 2))]
    return AngleMaps(panels, f"the angles of {box.convention.name}", name)


def _panel(convention: Convention, box: Box, inside: Array, pair: tuple[int, int], *, marked: bool) -> MapPanel:
    names, reach = box.convention.angle_names, (np.pi, np.pi / 2, np.pi)
    first, second = pair
    held = 3 - first - second
    x, y = (_axis(*box.ranges[index], reach[index]) for index in pair)
    grid = np.empty((len(y), len(x), 3))
    grid[..., held], grid[..., first], grid[..., second] = inside[held], x[None, :], y[:, None]
    return MapPanel(
        x=np.degrees(x),
        y=np.degrees(y),
        margin=np.degrees(convention.lock_margin(box.convention.matrix(grid))),
        x_label=names[first],
        y_label=names[second],
        held=f"{names[held]} {degrees_text(float(inside[held]), 1)}",
        region=tuple(float(end) for index in pair for end in np.degrees(box.ranges[index])),  # type: ignore[arg-type]
        worst=(float(np.degrees(inside[first])), float(np.degrees(inside[second]))) if marked else None,
    )


def gains(conventions: Mapping[str, Convention]) -> list[tuple[str, dict[str, Any]]]:
    """For each kind of sequence among the conventions: its words, and what `charts.gain_curves` needs."""
    found = []
    for repeated, words in ((False, "three different axes"), (True, "a repeated axis")):
        if not any(convention.sequence.repeated is repeated for convention in conventions.values()):
            continue
        margin = np.radians(np.linspace(0.5, 90.0, 180))
        side = np.degrees(margin) if repeated else np.degrees(margin) - 90.0
        far = 180.0 - side if repeated else -side
        middle = np.concatenate([side, far[-2::-1]])
        both = np.concatenate([margin, margin[-2::-1]])
        noise, rates = linear_noise(both, 1e-9), rate_demand(both, 1.0)
        curves = {
            "outer angle rate, or noise of an outer angle": rates.outer,
            "noise of the combination of outer angles known at lock": noise.combination / 1e-9,
            "middle angle rate, or noise of the middle angle": rates.middle,
        }
        locks = [0.0, 180.0] if repeated else [-90.0, 90.0]
        found.append((words, {"middle": middle, "curves": curves, "locks": locks, "x_label": "middle angle"}))
    return found


def phases_along(track: Track, regions: Mapping[str, Region]) -> list[tuple[str, float, float]]:
    """Stretches (name, start, end) of a table in which the recorded attitude lies in one of the boxes or cones.

    A row that lies in several belongs to the first; stretches of fewer than three rows are left out.
    """
    R = matrix_from_quaternion(track.quaternions)
    owner = np.full(len(R), -1)
    names = list(regions)
    for number in range(len(names) - 1, -1, -1):
        inside = _inside(regions[names[number]], R)
        if inside is not None:
            owner[inside] = number
    edges = np.concatenate([[0], np.flatnonzero(np.diff(owner)) + 1, [len(owner)]])
    return [
        (names[owner[start]], float(track.times[start]), float(track.times[min(end, len(owner) - 1)]))
        for start, end in pairwise(edges.tolist())
        if owner[start] >= 0 and end - start >= _SHORTEST_PHASE
    ]


def _inside(region: Region, R: Array) -> Any:
    """Mask (N,) of the attitudes within a box or a cone of any roll; None for other regions."""
    if isinstance(region, Cone) and region.roll is None:
        held = R @ region.body_axis
        across = np.linalg.norm(np.cross(held, region.reference_axis), axis=1)
        angle = np.arctan2(across, held @ region.reference_axis)
        return (angle >= region.nearest - _SLACK) & (angle <= region.farthest + _SLACK)
    if isinstance(region, Box):
        angles = region.convention.angles(R).angles
        low, high = np.array(region.ranges).T
        return ((low + (angles - low + _SLACK) % (2.0 * np.pi) - _SLACK) <= high + _SLACK).all(axis=1)
    return None


def _axis(low: float, high: float, reach: float) -> Array:
    """Grid values (rad) that hold the range and reach at least `reach` to either side of zero."""
    return np.linspace(min(low, -reach), max(high, reach), _MAP_POINTS)


def _into(angle: float, low: float, high: float) -> float:
    """The angle moved by whole turns into the range, or to its nearer end."""
    turn = 2.0 * np.pi
    moved = low + (angle - low) % turn
    if moved <= high:
        return float(moved)
    return float(low if turn - (moved - low) < moved - high else high)


def body_track(name: str, track: Track, convention: Convention) -> dict[str, Any]:
    """What `drawings.sphere_drawing` needs: the path of the carried axis among the caps about the lock line."""
    u, v = convention.lock_axes
    R = matrix_from_quaternion(track.quaternions)
    path = R @ v
    worst = path[int(np.argmin(convention.lock_margin(R)))]
    lock = -u if u @ worst < 0 else u
    return {
        "tracks": [(name, path)],
        "lock": lock,
        "cap": np.radians(10.0),
        "up": drawings.upward(convention.reference.axes),
        "lock_word": axis_words(lock, convention.reference),
        "worst": worst,
    }
