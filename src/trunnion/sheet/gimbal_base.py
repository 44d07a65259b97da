"""The gimbal by itself: its axes, what they reach, its rings, what encoders and crooked axes cost."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.words import degrees_text
from trunnion.figures import drawings
from trunnion.hardware.gimbals import GimbalChain
from trunnion.hardware.joint_solutions import ReachableSet, attitude_solutions, pointing_solutions
from trunnion.hardware.platforms import axis_misalignment, encoder_error
from trunnion.sheet import display, hardware_parts

Array = NDArray[np.float64]

CROOKED = np.radians(1.0 / 60.0)  # one arc minute, to show the cost of a unit; scale it to the mount's own


def boresight(plain: Mapping[str, Any]) -> Array:
    """The line (3,) in payload components; x, the first axis, unless the gimbal names another."""
    word = plain.get("boresight")
    if word is None:
        return np.array([1.0, 0.0, 0.0])
    if not isinstance(word, str):
        v = np.asarray(word, dtype=float)
        return v / np.linalg.norm(v)
    frame = plain.get("payload", plain["base"])
    return np.asarray(hardware_parts.frame_of(frame).direction(word), dtype=float)


def joint_rows(plain: Mapping[str, Any]) -> list[dict[str, str]]:
    """One row of the inputs a joint."""
    source = str(plain.get("source", "not stated"))
    rows = []
    for number, joint in enumerate(plain["joints"], start=1):
        stated = {key: value for key, value in joint.items() if key != "name"}
        rows.append(hardware_parts.row(f"axis {number}", joint["name"], {**stated, "source": source}))
    return rows


def show_chain(chain: GimbalChain, reach: ReachableSet, base_axes: Sequence[str]) -> None:
    """Axes and limits in a table, and the reachable set in words."""
    rows = []
    for joint in chain.joints:
        lower, upper = joint.travel
        travel = (
            "without stops"
            if not np.isfinite(upper - lower)
            else f"{degrees_text(lower, 2)} … {degrees_text(upper, 2)}"
        )
        rows.append(
            [
                joint.name,
                _axis_words(joint.axis, base_axes),
                travel,
                "none" if joint.rate is None else f"{np.degrees(joint.rate):g} deg/s",
                "none" if joint.acceleration is None else f"{np.degrees(joint.acceleration):g} deg/s²",
            ]
        )
    display.table(
        "tbl:axes",
        ["axis, outermost first", "direction at zero", "travel", "rate limit", "acceleration limit"],
        rows,
        caption=f"The axes of {chain.name}",
        align="lllrr",
    )
    between = ", ".join(degrees_text(float(angle), 4) for angle in chain.neighbour_angles)
    texts = [f"Neighbouring axes cross at {between}."]
    if len(chain.joints) <= 3:
        kind = "attitudes" if len(chain.joints) == 3 else "directions"
        if max(reach.cone_ahead, reach.cone_behind) > 1e-9:
            texts.append(
                f"Out of reach whatever the stops: a cone of half angle {degrees_text(reach.cone_ahead, 4)} about the "
                f"outer axis and one of {degrees_text(reach.cone_behind, 4)} about its opposite."
            )
        else:
            texts.append(f"Stops aside, all {kind} are reached; there is no unreachable cone.")
    display.statement("reach", texts)
    for side, cone in (("ahead", reach.cone_ahead), ("behind", reach.cone_behind)):
        size = float(np.degrees(cone))
        if len(chain.joints) <= 3:
            display.record(
                quantity="unreachable cone", of=chain.name, over=side, lo=size, hi=size, unit="deg", basis="exact"
            )


def _axis_words(axis: Array, words: Sequence[str]) -> str:
    largest = int(np.argmax(np.abs(axis)))
    if abs(axis[largest]) > 1.0 - 1e-12:
        return ("" if axis[largest] > 0 else "opposite of ") + words[largest]
    return "(" + ", ".join(f"{value:.4f}" for value in axis).replace("-", "−") + ")"


def locked_angles(chain: GimbalChain, line: Array) -> Array:
    """Joint angles (k,) at which the chain is locked: the inner axis (or the line) lies along the outer one."""
    inner = chain if len(chain.joints) < 4 else GimbalChain(chain.name, chain.joints[1:], chain.R_gp0)
    n1 = inner.axes[0]
    if len(inner.joints) == 2:
        found = pointing_solutions(inner, np.array([n1, -n1]), boresight_p=line).angles[:, 0, 1]
        lower, upper = inner.joints[1].travel
        return np.array([0.0, min(found, key=lambda t: max(lower - t, t - upper, 0.0))])
    # carry the innermost axis as near to the outermost one as the axes allow
    n3 = inner.axes[2]
    cross = np.cross(n3, n1)
    if np.linalg.norm(cross) < 1e-12:
        onto = np.eye(3)
    else:
        from trunnion.attitude.rotations import about

        onto = about(cross / np.linalg.norm(cross), float(np.arctan2(np.linalg.norm(cross), n3 @ n1)))
    middle = attitude_solutions(inner, onto @ inner.R_gp0).angles[0, 1]
    angles = np.array([0.0, middle, 0.0])
    return angles if len(chain.joints) == 3 else np.concatenate([[0.0], angles])


def show_rings(chain: GimbalChain, line: Array, base_axes: Sequence[str]) -> None:
    """The rings at zero and where the chain is locked, the axes that have become parallel marked."""
    up = drawings.upward(list(base_axes))
    names = [joint.name for joint in chain.joints]
    at = {"zero": np.zeros(len(names)), "lock": locked_angles(chain, line)}
    for where, angles in at.items():
        axes = [*chain.axes_at(angles).T]
        labels = list(names)
        if len(axes) == 2:
            axes.append(chain.attitude(angles) @ line)
            labels.append("line of sight")
        first = len(axes) - 3
        apart = abs(float(axes[first] @ axes[-1]))
        parallel = (first, len(axes) - 1) if where == "lock" and apart > 1.0 - 1e-9 else None
        shown = ", ".join(f"{name} {degrees_text(float(a), 2)}" for name, a in zip(names, angles, strict=True))
        display.figure(
            f"fig:rings-{where}",
            drawings.rings_drawing(axes, labels, up=up, parallel=parallel),
            caption=f"The rings {'at zero' if where == 'zero' else 'at lock'}: {shown}",
            alt=f"Gimbal rings at {shown}"
            + ("" if parallel is None else f"; {labels[parallel[0]]} and {labels[parallel[1]]} lie along one line"),
        )


def show_precision(chain: GimbalChain) -> None:
    """Attitude error from encoder steps at zero, and from axes one arc minute off their drawing over the travel."""
    texts = []
    if any(joint.encoder_step for joint in chain.joints):
        error = float(np.degrees(encoder_error(chain, np.zeros(len(chain.joints)))))
        texts.append(f"Half a step of every encoder at zero turns the payload by at most {error:.2g}°.")
        display.record(
            quantity="encoder error", of=chain.name, over="zero", lo=0.0, hi=error, unit="deg", basis="certified bound",
            note="first order in the steps",
        )  # fmt: skip
    else:
        texts.append("No encoder step is stated.")
    ends = np.array([_largest(joint.travel) for joint in chain.joints])
    found = axis_misalignment(chain, ends, np.full(len(ends), CROOKED))
    parts = ", ".join(
        f"{joint.name} {60.0 * np.degrees(part):.2f}" for joint, part in zip(chain.joints, found.parts, strict=True)
    )
    texts.append(
        f"Every axis one arc minute off its drawing costs at most {60.0 * np.degrees(float(found.bound)):.2f} arc "
        "minutes of "
        f"payload attitude at the end of its travel or half a turn from zero ({parts}); it scales with the crookedness."
    )
    display.statement("precision", texts)


def _largest(travel: tuple[float, float]) -> float:
    return float(min(np.pi, max(abs(travel[0]), abs(travel[1]))))


def result_rows(reach: ReachableSet) -> list[list[str]]:
    """The reachable set among the results."""
    cones = f"{degrees_text(reach.cone_ahead, 4)} / {degrees_text(reach.cone_behind, 4)}"
    return [["unreachable cones, half angles", "outer axis / its opposite", cones, "exact"]]
