"""Regions that are boxes of three angles, and their spread by the closed form of `box`."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.basis import Basis
from trunnion.attitude.rotations import about
from trunnion.attitude.sequences import Sense
from trunnion.envelope.box import box_angle_range, carried
from trunnion.envelope.regions import Box
from trunnion.envelope.results import Spread, closed_form_ends, connected
from trunnion.envelope.search import sign_change
from trunnion.envelope.vectors import Array, dot, turned


@dataclass(frozen=True, eq=False)
class ChainBox:
    """A box of three angles: R_rb = left Rot(p, a) Rot(q, b) Rot(r, c) right, rows of `axes` p, q, r.

    low, high (3,) rad in the order a, b, c. `names`, `signs` and `offsets` lead back to the angles people state:
    stated = chain / sign + offset.
    """

    axes: Array
    low: Array
    high: Array
    left: Array
    right: Array
    names: tuple[str, ...]
    signs: tuple[int, ...] = (1, 1, 1)
    offsets: tuple[float, ...] = (0.0, 0.0, 0.0)

    def matrix(self, angles: Array) -> Array:
        """R_rb (3, 3) at chain angles (3,) rad."""
        first, second, third = (about(axis, angle) for axis, angle in zip(self.axes, angles, strict=True))
        return self.left @ first @ second @ third @ self.right

    def place(self, angles: Array) -> str:
        """The angles (3,) as people state them."""
        stated = angles * np.array(self.signs) + np.array(self.offsets)
        return ", ".join(f"{name} {_plain(value)} deg" for name, value in zip(self.names, stated, strict=True))


def box_chain(box: Box) -> ChainBox:
    """The chain of a Box; fixed axes are the moving chain of the reversed sequence."""
    convention = box.convention
    low, high = box.chain_ranges()
    order = [0, 1, 2] if convention.sense is Sense.MOVING else [2, 1, 0]
    axes = np.eye(3)[list(convention.sequence.axes)]
    return ChainBox(
        axes=axes[order],
        low=low[order],
        high=high[order],
        left=np.asarray(convention.left, dtype=float),
        right=np.asarray(convention.right, dtype=float),
        names=tuple(convention.angle_names[i] for i in order),
        signs=tuple(convention.signs[i] for i in order),
        offsets=tuple(convention.offsets[i] for i in order),
    )


def chain_spread(chain: ChainBox, u: Array, v: Array) -> Spread:
    """Spread of a box of angles for pairs u, v (3, M): exact up to the rounding bound of the closed form."""
    left, right = chain.left.T @ u, chain.right @ v
    found = box_angle_range(chain.axes, chain.low[:, None], chain.high[:, None], left, right)

    def crossing(pairs: NDArray[np.intp]) -> tuple[Array, Array, list[str]]:
        start, way = found.least_at[:, pairs], found.largest_at[:, pairs] - found.least_at[:, pairs]
        goal, vector = left[:, pairs], right[:, pairs]

        def miss(t: Array) -> Array:
            angles = start[:, None] + t * way[:, None]
            return dot(goal[:, None], carried(chain.axes, angles, vector[:, None]))

        at = start + sign_change(miss, len(pairs)) * way
        return chain_matrices(chain, at), np.full(len(pairs), np.nan), _places(chain, at)

    return connected(
        closed_form_ends(found.least, chain_matrices(chain, found.least_at), _places(chain, found.least_at)),
        closed_form_ends(found.largest, chain_matrices(chain, found.largest_at), _places(chain, found.largest_at)),
        crossing,
        Basis.CERTIFIED,
    )


def chain_matrices(chain: ChainBox, angles: Array) -> Array:
    """R_rb (M, 3, 3) at chain angles (3, M) rad."""
    p, q, r = (axis[:, None] for axis in chain.axes)
    columns = []
    for vector in chain.right.T:
        start = np.broadcast_to(vector[:, None], angles.shape)
        image = turned(p, angles[0], turned(q, angles[1], turned(r, angles[2], start)))
        columns.append(chain.left @ image)
    return np.moveaxis(np.stack(columns, axis=1), -1, 0)


def _places(chain: ChainBox, angles: Array) -> list[str]:
    return [chain.place(column) for column in angles.T]


def _plain(angle: float) -> str:
    """An angle (rad) in degrees without the dust of rounding: six digits, nothing below a billionth of a degree."""
    return f"{round(float(np.degrees(angle)), 9) + 0.0:.6g}"
