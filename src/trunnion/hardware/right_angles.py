"""The 24 right-angle mounts, in words, and the one nearest to a mount.

Letters: `b` host (body), `s` sensor. A right-angle mount R_bs has one entry of plus or minus one in every
row and column and determinant +1; 48 signed permutations exist, half of them mirror.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from trunnion.attitude.frames import Frame
from trunnion.attitude.right_angles import right_angle_mirrors, right_angle_rotations
from trunnion.attitude.rotations import rotation_angle, rotation_vector
from trunnion.hardware.vectors import Array


def axes_in_words(P: Array, host: Frame, sensor_axes: tuple[str, str, str] = ("x", "y", "z")) -> str:
    """A right-angle mount as a person says it: `x up, y starboard, z forward`."""
    said = []
    for k, name in enumerate(sensor_axes):
        j = int(np.argmax(np.abs(P[:, k])))
        said.append(f"{name} {host.word(j, int(np.sign(P[j, k])))}")
    return ", ".join(said)


def turn_in_words(P: Array, axes: tuple[str, str, str] = ("x", "y", "z")) -> str:
    """A right-angle rotation as one turn: `half turn about x`, `quarter turn about -z`, `third of a turn
    about …`.
    """
    v = rotation_vector(P)
    angle = float(np.linalg.norm(v))
    if angle < 1e-9:
        return "no turn"
    n = np.round(v / np.max(np.abs(v))).astype(int)
    if angle > np.pi - 1e-9 and n[np.flatnonzero(n)[0]] < 0:
        n = -n
    signs = [("+" if s > 0 else "-") + axes[k] for k, s in enumerate(n) if s]
    name = {180: "half turn", 90: "quarter turn", 120: "third of a turn"}[round(np.degrees(angle))]
    line = signs[0].lstrip("+") if len(signs) == 1 else "the diagonal " + "".join(signs).lstrip("+")
    return f"{name} about {line}"


@dataclass(frozen=True, eq=False)
class NearestRightAngle:
    """The right-angle mount nearest to a matrix, how far it is (rad), and how far the second nearest is."""

    matrix: Array
    words: str
    deviation: float
    second_words: str
    second_deviation: float


def nearest_right_angle(
    R_bs: Array, host: Frame, sensor_axes: tuple[str, str, str] = ("x", "y", "z")
) -> NearestRightAngle:
    """The nearest of the 24 right-angle mounts by rotation angle, with the gap to the second nearest."""
    group = np.array(right_angle_rotations())
    away = rotation_angle(group, np.asarray(R_bs, dtype=float))
    first, second = np.argsort(away, kind="stable")[:2]
    return NearestRightAngle(
        group[first],
        axes_in_words(group[first], host, sensor_axes),
        float(away[first]),
        axes_in_words(group[second], host, sensor_axes),
        float(away[second]),
    )


__all__ = [
    "NearestRightAngle",
    "axes_in_words",
    "nearest_right_angle",
    "right_angle_mirrors",
    "right_angle_rotations",
    "turn_in_words",
]
