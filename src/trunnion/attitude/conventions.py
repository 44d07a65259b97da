"""A convention: frames, sequence, moving or fixed axes, senses, zero, mapping direction, ranges.

Letters: `r` the reference frame, `b` the body frame. `R_rb` takes b-components to r-components, v_r = R_rb
v_b.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude import ranges as _ranges
from trunnion.attitude.extraction import Extraction, Policy, chain_angles, chain_matrix, second_triple
from trunnion.attitude.frames import Frame
from trunnion.attitude.margins import line_angle
from trunnion.attitude.rotations import (
    matrix_from_quaternion,
    quaternion_conjugate,
    quaternion_from_matrix,
    require_rotation,
)
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]


def _identity() -> Array:
    return np.eye(3)


@dataclass(frozen=True, eq=False)
class Convention:
    """How three angles state an attitude.

    With chain angles t = signs * (angles - offsets) (rad) and E the product of the three elementary rotations
    (moving axes: E = Rot(i, t1) Rot(j, t2) Rot(k, t3); fixed axes: E = Rot(k, t3) Rot(j, t2) Rot(i, t1)):

        R_rb = left @ E @ right

    `left` is a constant on the reference side, `right` one on the body side. The zero attitude Z is `left`
    for moving axes and `right` for fixed axes; the other one is the separately stated constant (`body turned
    by`, `reference turned by`).

    `ranges` are those of the stated angles, rad; None means (-pi, pi] for the outer angles and the middle
    branch [-pi/2, pi/2] or [0, pi] of the chain. `maps_body_to_reference` False: the matrix and the
    quaternion that are exchanged are those of the transposed map (`stated_matrix`, `stated_quaternion`); all
    other methods speak of R_rb.

    Raises AttitudeError when a part is not what it claims to be.
    """

    name: str
    reference: Frame
    body: Frame
    sequence: Sequence
    sense: Sense
    angle_names: tuple[str, str, str]
    signs: tuple[int, int, int] = (1, 1, 1)
    offsets: tuple[float, float, float] = (0.0, 0.0, 0.0)
    left: Array = field(default_factory=_identity)
    right: Array = field(default_factory=_identity)
    ranges: tuple[tuple[float, float], tuple[float, float], tuple[float, float]] | None = None
    maps_body_to_reference: bool = True

    def __post_init__(self) -> None:
        of = f"convention '{self.name}'"
        for frame in (self.reference, self.body):
            if frame.left_handed:
                raise AttitudeError(
                    f"{of} stands on the left-handed frame '{frame.name}'",
                    remedy="state it on the right-handed partner; conversion serves the left-handed one",
                )
        if len(set(self.angle_names)) != 3:
            raise AttitudeError(f"{of} names its angles {', '.join(self.angle_names)}", remedy="three different names")
        if len(self.signs) != 3 or any(sign not in (1, -1) for sign in self.signs):
            raise AttitudeError(f"{of} has senses {self.signs}", remedy="+1 or -1 for each of the three angles")
        if len(self.offsets) != 3 or not np.all(np.isfinite(self.offsets)):
            raise AttitudeError(f"{of} has offsets {self.offsets}", remedy="three finite angles")
        for side in ("left", "right"):
            constant = require_rotation(getattr(self, side), f"{of}: the constant {side} of the chain").copy()
            constant.flags.writeable = False
            object.__setattr__(self, side, constant)
        if self.ranges is not None:
            _ranges.check(self.ranges, self.sequence, self.signs, self.offsets, of)

    @property
    def zero(self) -> Array:
        """R_rb (3, 3) at zero chain angles, every constant included: left @ right."""
        return self.left @ self.right

    @property
    def lock_axes(self) -> tuple[Array, Array]:
        """(u, v): u a unit vector in reference, v one in body components; lock means R_rb v along +u or
        -u.
        """
        first, _, third = self.sequence.axes
        if self.sense is Sense.FIXED:
            first, third = third, first
        return self.left[:, first].copy(), self.right[third, :].copy()

    def chain_from_stated(self, angles: ArrayLike) -> Array:
        """Chain angles (..., 3) of stated angles (..., 3), rad: signs * (angles - offsets)."""
        stated = np.asarray(angles, dtype=float)
        if stated.shape[-1:] != (3,):
            raise AttitudeError(
                f"convention '{self.name}': angles have shape {stated.shape}",
                remedy="three angles each, in turn order",
            )
        return (stated - np.asarray(self.offsets)) * np.asarray(self.signs, dtype=float)

    def stated_from_chain(self, turns: ArrayLike) -> Array:
        """Stated angles (..., 3) of chain angles (..., 3), rad, not placed into ranges: signs * turns +
        offsets.
        """
        return np.asarray(turns, dtype=float) * np.asarray(self.signs, dtype=float) + np.asarray(self.offsets)

    def matrix(self, angles: ArrayLike) -> Array:
        """R_rb (..., 3, 3) of stated angles (..., 3) rad. Any values, in range or not."""
        return self._carry(chain_matrix(self.chain_from_stated(angles), sequence=self.sequence, sense=self.sense))

    def quaternion(self, angles: ArrayLike) -> Array:
        """Quaternion (..., 4) of R_rb, scalar first, of stated angles (..., 3) rad; first non-zero component
        positive.
        """
        return quaternion_from_matrix(self.matrix(angles))

    def chain(self, R_rb: ArrayLike) -> Array:
        """The chain E (..., 3, 3) of an attitude: left^T R_rb right^T. Raises AttitudeError for no
        rotation.
        """
        R = require_rotation(R_rb, f"convention '{self.name}': attitude")
        return self.left.T @ R @ self.right.T

    def angles(
        self,
        R_rb: ArrayLike,
        policy: Policy = Policy.LAST_ZERO,
        *,
        other_branch: bool = False,
        lock_within: float | None = None,
    ) -> Extraction:
        """Stated angles (..., 3) rad of attitudes (..., 3, 3), the lock margin (...) rad, and where the lock
        branch ran.

        Without stated ranges `other_branch` asks for the second triple of the same attitude; with ranges the
        ranges decide and `other_branch` is refused. The matrix of the returned angles meets R_rb to rounding
        at every margin (but for `lock_within`, see `chain_angles`). At lock one outer angle's turn is zero by
        `policy`: the stated angle is then its offset.
        """
        if self.ranges is not None and other_branch:
            raise AttitudeError(
                f"convention '{self.name}' states its ranges; they choose the branch",
                remedy="leave other_branch out, or state the convention without ranges",
            )
        found = chain_angles(
            self.chain(R_rb),
            sequence=self.sequence,
            sense=self.sense,
            policy=policy,
            other_branch=other_branch,
            lock_within=lock_within,
        )
        return found._replace(angles=self._place(found.angles))

    def lock_margin(self, R_rb: ArrayLike) -> Array:
        """Rotation angle (...) rad from attitudes (..., 3, 3) to the nearest locked one, in [0, pi/2]."""
        u, v = self.lock_axes
        return line_angle(u, np.asarray(R_rb, dtype=float) @ v)

    def carried_direction(self, R_rb: ArrayLike) -> Array:
        """Unit vector (..., 3) in reference components of the body axis whose line with the reference axis means lock.

        What can be said in place of the angles at lock: where that axis points. Well defined at every attitude.
        """
        return np.asarray(R_rb, dtype=float) @ self.lock_axes[1]

    def locked_attitude_near(self, R_rb: ArrayLike) -> Array:
        """The locked attitude (..., 3, 3) nearest to R_rb: R_rb tilted straight until the carried axis lies
        on the line.

        Exactly at right angles to the line both sides are equally near; +u is taken.
        """
        from trunnion.attitude.rotations import about

        u, v = self.lock_axes
        R = require_rotation(R_rb, f"convention '{self.name}': attitude")
        w = R @ v
        target = np.where((w @ u < 0.0)[..., None], -u, u)
        across = np.cross(w, target)
        length = np.linalg.norm(across, axis=-1)
        axis = np.where((length > 0.0)[..., None], across, np.cross(u, np.roll(np.abs(u), 1) + 1.0))
        return about(axis, np.arctan2(length, np.sum(w * target, axis=-1))) @ R

    def stated_matrix(self, R_rb: ArrayLike) -> Array:
        """The matrix as this convention exchanges it: R_rb, or its transpose when it maps reference to
        body.
        """
        R = np.asarray(R_rb, dtype=float)
        return R if self.maps_body_to_reference else np.swapaxes(R, -1, -2)

    def from_stated_matrix(self, M: ArrayLike) -> Array:
        """R_rb (..., 3, 3) of a matrix as exchanged; checked to be a rotation."""
        return self.stated_matrix(require_rotation(M, f"convention '{self.name}': matrix"))

    def stated_quaternion(self, R_rb: ArrayLike) -> Array:
        """Quaternion (..., 4), scalar first, of the matrix as exchanged."""
        q = quaternion_from_matrix(R_rb)
        return q if self.maps_body_to_reference else quaternion_conjugate(q)

    def from_stated_quaternion(self, q: ArrayLike) -> Array:
        """R_rb (..., 3, 3) of a quaternion (..., 4), scalar first, as exchanged."""
        return self.stated_matrix(matrix_from_quaternion(q))

    def _carry(self, E: Array) -> Array:
        return self.left @ E @ self.right

    def _place(self, turns: Array) -> Array:
        """Stated angles in range, of chain angles in the standard branch (or the other one, as asked)."""
        stated = self.stated_from_chain(turns)
        if self.ranges is None:
            return _ranges.place_outer(stated)
        other = self.stated_from_chain(second_triple(turns, repeated=self.sequence.repeated))
        return _ranges.choose(stated, other, self.ranges, f"convention '{self.name}'")
