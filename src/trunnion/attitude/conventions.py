"""A convention: frames, sequence, moving or fixed axes, senses, zero, mapping direction.

Letters: `r` the reference frame, `b` the body frame. `R_rb` takes b-components to r-components, v_r = R_rb v_b.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence


def _identity() -> NDArray[np.float64]:
    return np.eye(3)


@dataclass(frozen=True, eq=False)
class Convention:
    """How three angles state an attitude.

    With chain angles t = signs * (angles - offsets) (rad) and E the product of the three elementary rotations
    (moving axes: E = Rot(i, t1) Rot(j, t2) Rot(k, t3); fixed axes: E = Rot(k, t3) Rot(j, t2) Rot(i, t1)):

        R_rb = left @ E @ right

    `left` is a constant on the reference side, `right` one on the body side. The zero attitude Z is `left` for moving
    axes and `right` for fixed axes; the other one is the separately stated constant (`body turned by`,
    `reference turned by`).
    """

    name: str
    reference: Frame
    body: Frame
    sequence: Sequence
    sense: Sense
    angle_names: tuple[str, str, str]
    signs: tuple[int, int, int] = (1, 1, 1)
    offsets: tuple[float, float, float] = (0.0, 0.0, 0.0)
    left: NDArray[np.float64] = field(default_factory=_identity)
    right: NDArray[np.float64] = field(default_factory=_identity)
    ranges: tuple[tuple[float, float], tuple[float, float], tuple[float, float]] | None = None
    maps_body_to_reference: bool = True
