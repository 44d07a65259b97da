"""Data behind the pictures of a sweep: histograms, maps over two angles, tracks on the sphere."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.rotations import matrix_from_quaternion
from trunnion.attitude.words import axis_words
from trunnion.envelope.regions import Box, Region, Track
from trunnion.envelope.results import Extreme
from trunnion.figures import drawings

Array = NDArray[np.float64]

_SAMPLES = 20_000
_SEED = 7
_MAP_POINTS = 121
_BIN_DEG = 2.5


def histogram(
    conventions: Mapping[str, Convention], regions: Mapping[str, Region], plain: Mapping[str, Any]
) -> tuple[Array, dict[str, Array]]:
    """Bin edges (n+1,) deg and, for each convention, the share of samples (n,) in per cent."""
    edges = np.arange(0.0, 90.0 + _BIN_DEG, _BIN_DEG)
    samples = [R for name, region in regions.items() if (R := region_samples(region, plain[name])) is not None]
    attitudes = np.concatenate(samples) if samples else np.empty((0, 3, 3))
    shares = {}
    for name, convention in conventions.items():
        counts, _ = np.histogram(np.degrees(convention.lock_margin(attitudes)), bins=edges)
        shares[name] = 100.0 * counts / max(1, len(attitudes))
    return edges, shares


def region_samples(region: Region, plain: Mapping[str, Any]) -> Array | None:
    """Attitudes (N, 3, 3) of a box (even in its angles) or the rows of a table; None for other regions."""
    del plain
    if isinstance(region, Track):
        return matrix_from_quaternion(region.quaternions)
    if isinstance(region, Box):
        generator = np.random.default_rng(_SEED)
        low, high = np.array(region.ranges).T
        return region.convention.matrix(low + generator.uniform(size=(_SAMPLES, 3)) * (high - low))
    return None


@dataclass(frozen=True)
class AngleMap:
    """What `charts.margin_map` needs, the angles in words, and the region drawn."""

    picture: dict[str, Any]
    words: str
    region: str


def angle_map(convention: Convention, regions: Mapping[str, Region], least: Mapping[str, Extreme]) -> AngleMap | None:
    """Map of the margin over the second and third angle of the box in which it is least (None without a box)."""
    boxes = {name: region for name, region in regions.items() if isinstance(region, Box)}
    if not boxes:
        return None
    name = min(boxes, key=lambda over: least[over].lo)
    box, witness = boxes[name], least[name].witness
    angles = box.convention.angles(witness.matrix).angles if witness is not None else np.zeros(3)
    inside = np.array([_into(angle, *span) for angle, span in zip(angles, box.ranges, strict=True)])
    (x_low, x_high), (y_low, y_high) = box.ranges[1], box.ranges[2]
    x = _axis(x_low, x_high, np.pi / 2)
    y = _axis(y_low, y_high, np.pi)
    grid = np.stack(np.broadcast_arrays(inside[0], x[None, :], y[:, None]), axis=-1)
    margin = np.degrees(convention.lock_margin(box.convention.matrix(grid)))
    names = box.convention.angle_names
    picture = {
        "x": np.degrees(x),
        "y": np.degrees(y),
        "margin": margin,
        "x_label": names[1],
        "y_label": names[2],
        "region": tuple(np.degrees([x_low, x_high, y_low, y_high])),
        "worst": None if witness is None else (float(np.degrees(inside[1])), float(np.degrees(inside[2]))),
    }
    return AngleMap(picture, f"{names[1]} and {names[2]} of {box.convention.name}", name)


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
