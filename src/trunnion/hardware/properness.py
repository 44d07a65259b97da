"""Is this matrix a rotation, a mirror, or neither? Measured and named; never repaired behind the reader's
back.

Letters: `b` host (body), `s` sensor; `R_bs` takes sensor components to host components, so its columns say
where the sensor axes point in the host.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.frames import Frame
from trunnion.errors import HardwareError
from trunnion.hardware.limits import ORTHONORMAL_AS_TYPED
from trunnion.hardware.right_angles import axes_in_words, right_angle_mirrors
from trunnion.hardware.vectors import Array, nearest_rotation


@dataclass(frozen=True, eq=False)
class Properness:
    """What a matrix is.

    orthonormality: largest |MᵀM - I| entry. determinant: +1 rotation, -1 mirror. nearest: the rotation
    nearest to the matrix, distance: Frobenius norm of the difference, angle_moved (rad): largest angle by
    which a column moves when the nearest rotation is put in its place. mirrored: the determinant is
    negative. repairs: for a mirror, every single axis flip or exchange of two axes that makes it proper, in
    words, nearest to a right-angle mount first.
    """

    orthonormality: float
    determinant: float
    nearest: Array
    distance: float
    angle_moved: float
    mirrored: bool
    repairs: tuple[str, ...] = field(default=())

    @property
    def proper(self) -> bool:
        """True when it is a rotation to the accuracy expected of a matrix typed in full."""
        return not self.mirrored and self.orthonormality <= ORTHONORMAL_AS_TYPED


def as_matrix(matrix: ArrayLike, what: str) -> Array:
    """`matrix` as a (3, 3) array of finite numbers, or HardwareError naming what came instead."""
    try:
        M = np.array(matrix, dtype=float)
    except (TypeError, ValueError) as err:
        raise HardwareError(f"{what} is not a table of numbers", remedy="give three rows of three numbers") from err
    if M.shape != (3, 3):
        raise HardwareError(f"{what} has shape {M.shape}, expected (3, 3)", remedy="give three rows of three numbers")
    if not np.all(np.isfinite(M)):
        raise HardwareError(f"{what} holds a number that is not finite", remedy="all nine entries must be finite")
    return M


def properness(
    matrix: ArrayLike,
    host: Frame,
    sensor_axes: tuple[str, str, str] = ("x", "y", "z"),
    *,
    what: str = "the mounting matrix",
) -> Properness:
    """Measure how far `matrix` (3, 3) is from a rotation, and if it mirrors, which single change would cure
    it.
    """
    M = as_matrix(matrix, what)
    determinant = float(np.linalg.det(M))
    nearest, distance = nearest_rotation(M)
    lengths = np.linalg.norm(M, axis=0)
    moved = np.arctan2(np.linalg.norm(np.cross(M.T, nearest.T), axis=1), np.einsum("ij,ij->j", M, nearest))
    return Properness(
        float(np.max(np.abs(M.T @ M - np.eye(3)))),
        determinant,
        nearest,
        distance,
        float(np.max(np.where(lengths > 1e-300, moved, np.pi))),
        determinant < 0.0,
        _repairs(M, host, sensor_axes) if determinant < 0.0 else (),
    )


def _repairs(M: Array, host: Frame, axes: tuple[str, str, str]) -> tuple[str, ...]:
    """Every single flip or swap of columns that makes a mirror proper, in words."""
    said = []
    for k in range(3):
        fixed = M.copy()
        fixed[:, k] *= -1.0
        said.append((_off_right_angle(fixed), f"turn {axes[k]} round: {_columns_in_words(fixed, host, axes)}"))
    for j, k in ((0, 1), (1, 2), (0, 2)):
        fixed = M.copy()
        fixed[:, [j, k]] = fixed[:, [k, j]]
        words = _columns_in_words(fixed, host, axes)
        said.append((_off_right_angle(fixed), f"exchange {axes[j]} and {axes[k]}: {words}"))
    return tuple(words for _, words in sorted(said, key=lambda pair: round(pair[0], 6)))


def _off_right_angle(M: Array) -> float:
    return float(np.linalg.norm(M - np.sign(M) * (np.abs(M) > 0.7)))


def _columns_in_words(M: Array, host: Frame, axes: tuple[str, str, str]) -> str:
    rounded = np.zeros((3, 3))
    for k in range(3):
        j = int(np.argmax(np.abs(M[:, k])))
        rounded[j, k] = np.sign(M[j, k])
    return axes_in_words(rounded, host, axes)


def require_proper(
    matrix: ArrayLike,
    host: Frame,
    sensor_axes: tuple[str, str, str] = ("x", "y", "z"),
    *,
    digits: int | None = None,
    what: str = "the mounting matrix",
) -> tuple[Array, Properness]:
    """The rotation a typed matrix stands for, and its measure; refuses mirrors and matrices that are not
    rotations.

    Without `digits` the entries must be orthonormal to 1e-9. With `digits` (decimals the source prints) the
    nearest rotation is taken when every entry lies within one unit of the last printed digit of it, and the
    measure says what was done. Raises HardwareError naming the cure.
    """
    if host.left_handed:
        raise HardwareError(
            f"{what} is stated in the left-handed frame '{host.name}'",
            remedy="state it in the right-handed partner of that frame",
        )
    M = as_matrix(matrix, what)
    measure = properness(M, host, sensor_axes, what=what)
    if measure.mirrored:
        raise HardwareError(
            f"{what} mirrors: its determinant is {measure.determinant:.6g}, so it turns a right hand into a left one",
            remedy="one of these single changes makes it a rotation: " + "; or ".join(measure.repairs),
        )
    if measure.proper:
        return measure.nearest if measure.distance > 1e-13 else M, measure
    if digits is not None and np.max(np.abs(M - measure.nearest)) <= 10.0**-digits:
        return measure.nearest, measure
    raise HardwareError(
        f"{what} is not a rotation: the largest entry of MᵀM - I is {measure.orthonormality:.3g}, its "
        "determinant "
        f"{measure.determinant:.6g}; the nearest rotation is {measure.distance:.3g} away (Frobenius) and "
        "moves an "
        f"axis by {np.degrees(measure.angle_moved):.3g} deg",
        remedy="say how many decimals the source prints if this is rounding; otherwise measure again: "
        f"the nearest rotation is {np.round(measure.nearest, 6).tolist()}",
    )


def mirror_fit(M: Array, nominal: Array) -> tuple[str, float]:
    """The mirror image of `nominal` nearest to `M`: how its channels are exchanged, and the Frobenius
    distance.
    """
    best, away = "", np.inf
    for Q in right_angle_mirrors():
        distance = float(np.linalg.norm(M - nominal @ Q))
        if distance < away - 1e-12:
            best, away = channels_in_words(Q), distance
    return best, away


def channels_in_words(Q: Array, axes: tuple[str, str, str] = ("x", "y", "z")) -> str:
    """A signed permutation as what happened to the channels: `x inverted`, `x and y exchanged`."""
    said = []
    for k in range(3):
        j = int(np.argmax(np.abs(Q[:, k])))
        if j != k or Q[j, k] < 0:
            said.append(f"{axes[k]} reads {'-' if Q[j, k] < 0 else ''}{axes[j]}")
    return ", ".join(said) or "channels as drawn"


def better_reading(M: Array, nominal: Array) -> list[tuple[str, float]]:
    """How far `M` lies from the nominal as given, transposed, and mirrored (Frobenius norm), nearest
    first.
    """
    words, mirrored = mirror_fit(M, nominal)
    table = [
        ("as given", float(np.linalg.norm(M - nominal))),
        ("transposed", float(np.linalg.norm(M.T - nominal))),
        (f"mirror image ({words})", mirrored),
    ]
    return sorted(table, key=lambda row: row[1])
