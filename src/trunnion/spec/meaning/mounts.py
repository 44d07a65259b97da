"""Mounts: from words to the numerical mount.

Letters: `b` the host, `s` the sensor. R_bs takes sensor components to host components.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from trunnion.attitude import frames as numeric
from trunnion.attitude.conventions import Convention
from trunnion.attitude.sequences import Sense
from trunnion.errors import HardwareError
from trunnion.hardware import mounts as hardware
from trunnion.spec.kinds import suggestion
from trunnion.spec.meaning.context import Context
from trunnion.spec.meaning.conventions import Turns, senses
from trunnion.spec.meaning.frames import direction
from trunnion.spec.meaning.rotations import Ends, build_sequence, maps_p_to_q, three_turns
from trunnion.spec.parts.mounts import (
    AnglesAs,
    AnglesMount,
    AxesMount,
    DirectionsMount,
    MatrixMount,
    QuaternionMount,
)

_INERTIAL = ["accelerometer", "gyro"]


def build_mount(ctx: Context, name: str, part: Any) -> hardware.Mount | None:
    """The mount, or None when something about it is noted."""
    host = ctx.part("frames", part.host, "host")
    sensor = sensor_frame(ctx, name, part)
    if host is None or sensor is None:
        return None
    if host.left_handed:
        ctx.note("left-handed-use", "host", frame=host.name)
        return None
    if sensor.left_handed:
        ctx.note("left-handed-use", "frame", frame=sensor.name)
        return None
    details = _details(ctx, part, sensor)
    if details is None:
        return None
    angles_as = _angles_as(ctx, name, part, host, sensor)
    enter_as = None if part.enter_as is None else ctx.part("conventions", part.enter_as, "enter as")
    if (part.angles_as is not None and angles_as is None) or (part.enter_as is not None and enter_as is None):
        return None
    details |= {"angles_as": angles_as, "enter_as": enter_as, "sensor_axes": sensor.axes, "name": name}
    try:
        return _BUILDERS[type(part)](ctx, part, host, sensor, details)
    except HardwareError as err:
        ctx.note("refused", form_of(part), why=err.fault.cause, remedy=err.fault.remedy or "correct it")
        return None


def form_of(part: Any) -> str:
    """The key that makes a mount what it is."""
    forms = {AxesMount: "axes", AnglesMount: "angles", MatrixMount: "matrix", QuaternionMount: "quaternion"}
    return next((form for kind, form in forms.items() if isinstance(part, kind)), "directions")


def sensor_frame(ctx: Context, name: str, part: Any) -> numeric.Frame | None:
    """The sensor's own triad: a declared frame, its own axis names, or x, y, z."""
    if part.frame is not None:
        frame: numeric.Frame | None = ctx.part("frames", part.frame, "frame")
        return frame
    axes = part.sensor_axes
    if axes is None and isinstance(part, AxesMount) and len(part.axes) == 3 and not set(part.axes) <= set("xyz"):
        axes = list(part.axes)
    axes = tuple(axes or ("x", "y", "z"))
    for index, axis in enumerate(axes):
        if axis in axes[:index]:
            ctx.note("repeated-axis", "sensor axes", index, one=axis, two=axis)
            return None
    return numeric.Frame(name, axes)


def _details(ctx: Context, part: Any, sensor: numeric.Frame) -> dict[str, Any] | None:
    """What the mount says of boresight, tolerance and instruments."""
    good = True
    for key, words in (("boresight", [part.boresight]), ("tilt axes", part.tilt_axes or [])):
        for index, word in enumerate(words):
            if word is not None and word.lstrip("+-") not in sensor.axes:
                hint = suggestion(word, sensor.axes, "its axes are")
                ctx.note("no-sensor-axis", key, *([index] if key == "tilt axes" else []), word=word, hint=hint)
                good = False
    instruments = part.instruments if part.instruments is not None else _INERTIAL
    if "accelerometer" in instruments and part.accelerometer is None:
        ctx.note("accelerometer-silent", *(["instruments"] if part.instruments else []))
        good = False
    if "clinometer" in instruments and part.clinometer is None:
        ctx.note("clinometer-silent", "instruments")
        good = False
    try:
        tolerance = _tolerance(part)
    except HardwareError as err:
        ctx.note("refused", "tolerance", why=err.fault.cause, remedy=err.fault.remedy)
        return None
    if not good:
        return None
    return {
        "boresight": part.boresight,
        "tolerance": tolerance,
        "instruments": tuple(hardware.Instrument(word) for word in instruments),
        "accelerometer": None if part.accelerometer is None else hardware.Reports(part.accelerometer),
        "clinometer": None if part.clinometer is None else hardware.TiltType[part.clinometer.upper()],
        "tilt_axes": None if part.tilt_axes is None else tuple(part.tilt_axes),
    }


def _tolerance(part: Any) -> hardware.MountTolerance:
    stated = part.tolerance
    if stated is None:
        return hardware.MountTolerance()
    return hardware.MountTolerance(
        per_axis=None if stated.per_axis is None else tuple(angle.value for angle in stated.per_axis),
        total=None if stated.total_rotation is None else stated.total_rotation.value,
        covariance=None if stated.covariance is None else np.array(stated.covariance),
    )


# --- the five forms
# ------------------------------------------------------------------------------------------------


def _from_axes(ctx: Context, part: Any, host: Any, sensor: Any, details: dict[str, Any]) -> hardware.Mount | None:
    for axis, word in part.axes.items():
        if axis not in sensor.axes:
            hint = suggestion(axis, sensor.axes, "its axes are")
            ctx.note("no-sensor-axis", "axes", axis, key=True, word=axis, hint=hint)
            return None
        if direction(ctx, word, host, "axes", axis) is None:
            return None
    words = {axis: host.nearest_word(direction(ctx, word, host, "axes", axis))[0] for axis, word in part.axes.items()}
    return hardware.mount_from_axes(words, host, **details)


def _from_angles(ctx: Context, part: Any, host: Any, sensor: Any, details: dict[str, Any]) -> hardware.Mount | None:
    R_bs = three_turns(ctx, part, Ends(sensor, host, ("sensor",), ("host",)))
    if R_bs is None:
        return None
    angles = np.array([angle.value for angle in part.angles])
    if part.convention is not None:
        convention = ctx.part("conventions", part.convention, "convention")
    else:
        sequence = build_sequence(ctx, part.sequence, "sequence")
        names = ("first angle", "second angle", "third angle")
        assert sequence is not None
        convention = Convention(details["name"], host, sensor, sequence, Sense(part.about), names)
    return hardware.mount_from_angles(angles, convention, host, **details)


def _ends(host: numeric.Frame, sensor: numeric.Frame) -> Ends:
    return Ends(sensor, host, ("sensor",), ("host",))


def _from_matrix(ctx: Context, part: Any, host: Any, sensor: Any, details: dict[str, Any]) -> hardware.Mount | None:
    forward = maps_p_to_q(ctx, part.maps, _ends(host, sensor), "maps")
    if forward is None:
        return None
    return hardware.mount_from_matrix(part.matrix, host, maps_sensor_to_host=forward, digits=part.digits, **details)


def _from_quaternion(ctx: Context, part: Any, host: Any, sensor: Any, details: dict[str, Any]) -> hardware.Mount | None:
    forward = maps_p_to_q(ctx, part.maps, _ends(host, sensor), "maps")
    if forward is None:
        return None
    tolerance = {} if part.norm_tolerance is None else {"norm_tolerance": part.norm_tolerance}
    return hardware.mount_from_quaternion(
        part.quaternion, host, scalar_first=part.scalar == "first", maps_sensor_to_host=forward,
        **tolerance, **details,
    )  # fmt: skip


def _from_directions(ctx: Context, part: Any, host: Any, sensor: Any, details: dict[str, Any]) -> hardware.Mount | None:
    seen = [direction(ctx, pair.sensor, sensor, "directions", i, "sensor") for i, pair in enumerate(part.directions)]
    known = [direction(ctx, pair.host, host, "directions", i, "host") for i, pair in enumerate(part.directions)]
    if any(vector is None for vector in (*seen, *known)):
        return None
    mount, _ = hardware.mount_from_directions(seen, known, host, **details)
    return mount


_BUILDERS: dict[Any, Any] = {
    AxesMount: _from_axes,
    AnglesMount: _from_angles,
    MatrixMount: _from_matrix,
    QuaternionMount: _from_quaternion,
    DirectionsMount: _from_directions,
}

# --- the sensor's own angles
# ---------------------------------------------------------------------------------------


def _angles_as(ctx: Context, name: str, part: Any, host: numeric.Frame, sensor: numeric.Frame) -> Convention | None:
    """The convention in which the sensor states its own attitude."""
    stated = part.angles_as
    if not isinstance(stated, AnglesAs):
        return None if stated is None else ctx.part("conventions", stated, "angles as")
    inner = ctx.at("angles as")
    reference = inner.part("frames", stated.relative_to, "relative to")
    sequence = build_sequence(inner, stated.sequence, "sequence")
    right = _in_place_of(inner, stated, host, sensor)
    if reference is None or sequence is None or right is None:
        return None
    names = tuple(stated.angles or ("first angle", "second angle", "third angle"))
    for index, angle in enumerate(names):
        if angle in names[:index]:
            inner.note("repeated-angle", "angles", index, name=angle)
            return None
    turns = Turns(sequence, Sense(stated.about), names)
    base = Convention(f"{name}'s own angles", reference, sensor, turns.sequence, turns.sense, turns.names, right=right)
    if stated.positive is None:
        return base
    signs = senses(inner, stated.positive, base)
    return None if signs is None else Convention(
        base.name, reference, sensor, turns.sequence, turns.sense, turns.names, signs=signs, right=right
    )  # fmt: skip


def _in_place_of(ctx: Context, stated: AnglesAs, host: numeric.Frame, sensor: numeric.Frame) -> Any:
    """R (3, 3) from sensor components to those of the host axes the sensor's axes stand in for."""
    if stated.x_y_z_in_place_of is None:
        return np.eye(3)
    columns = [direction(ctx, w, host, "x y z in place of", i) for i, w in enumerate(stated.x_y_z_in_place_of)]
    if any(column is None for column in columns):
        return None
    M = np.column_stack(columns)
    if abs(float(np.linalg.det(M)) - 1.0) > 1e-9:
        words = ", ".join(stated.x_y_z_in_place_of)
        ctx.note("left-handed-stand-in", "x y z in place of", words=words)
        return None
    return M
