"""Which way should we bolt it? The 24 right-angle mounts ranked by the margin they leave over an envelope.

The sensor's own convention locks when a constant sensor direction v comes to lie along a constant reference
direction u. For a right-angle mount and v along a sensor axis, that is one of the host's own axes: the 24
mounts share nine margins a region, and ranking them is looking them up.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.errors import HardwareError
from trunnion.hardware.right_angles import axes_in_words, right_angle_rotations
from trunnion.hardware.vectors import Array


@dataclass(frozen=True, eq=False)
class RankedMount:
    """One right-angle mount with its least margin (rad) over all regions, where it is least, and every
    region's.
    """

    matrix: Array
    words: str
    margin: float
    governed_by: str
    margins: dict[str, float]


def rank_right_angle_mounts(
    entry_margins: Mapping[str, ArrayLike],
    convention: Convention,
    host: Frame,
    sensor_axes: tuple[str, str, str] = ("x", "y", "z"),
) -> list[RankedMount]:
    """The 24 mounts, best guaranteed margin first; equal ones in the order of `right_angle_rotations`.

    entry_margins: a region's name and its (3, 3) least line angles (rad) between reference axis i and
    carried HOST axis k, certified by whoever made them: the ranking only looks them up, so it is as certain
    as they are. convention: the sensor's own, reference to sensor, with lock axes along reference and sensor
    axes; anything else is an error that sends the reader to `rank_mounts`.
    """
    tables = {name: np.asarray(table, dtype=float) for name, table in entry_margins.items()}
    wrong = [name for name, table in tables.items() if table.shape != (3, 3) or not np.all(np.isfinite(table))]
    if wrong or not tables:
        raise HardwareError(
            f"region '{wrong[0]}' has no (3, 3) table of margins" if wrong else "no region to rank mounts over",
            remedy="give each region the nine least angles between reference axes and host axes",
        )
    u, v = convention.lock_axes
    row, column = _axis_of(u, convention), _axis_of(v, convention)
    ranked = []
    for P in right_angle_rotations():
        host_axis = int(np.argmax(np.abs(P[:, column])))
        margins = {name: float(table[row, host_axis]) for name, table in tables.items()}
        ranked.append(_ranked(P, margins, host, sensor_axes))
    return sorted(ranked, key=lambda mount: -mount.margin)


def rank_mounts(
    candidates: Mapping[str, ArrayLike], margins_of: Callable[[Array], Mapping[str, float]]
) -> list[RankedMount]:
    """Any candidate mounts by name, best first, with margins supplied by `margins_of(R_bs) -> {region:
    rad}`.
    """
    ranked = []
    for words, matrix in candidates.items():
        R_bs = np.asarray(matrix, dtype=float)
        margins = dict(margins_of(R_bs))
        least = min(margins, key=lambda name: margins[name])
        ranked.append(RankedMount(R_bs, words, margins[least], least, margins))
    return sorted(ranked, key=lambda mount: -mount.margin)


def _axis_of(direction: Array, convention: Convention) -> int:
    axis = int(np.argmax(np.abs(direction)))
    if abs(abs(float(direction[axis])) - 1.0) > 1e-12:
        raise HardwareError(
            f"convention '{convention.name}' has its zero turned away from the axes, so the nine shared "
            "margins do "
            "not serve it",
            remedy="rank the 24 mounts one by one with `rank_mounts`",
        )
    return axis


def _ranked(P: Array, margins: dict[str, float], host: Frame, axes: tuple[str, str, str]) -> RankedMount:
    least = min(margins, key=lambda name: margins[name])
    return RankedMount(P, axes_in_words(P, host, axes), margins[least], least, margins)
