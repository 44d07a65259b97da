"""Gimbals, passes, sectors, surveys and budgets: from words to the objects of the hardware room.

Letters: `g` the base of a gimbal, `p` its payload.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np

from trunnion.attitude import frames as numeric
from trunnion.errors import HardwareError
from trunnion.spec.meaning.context import Context
from trunnion.spec.meaning.frames import direction
from trunnion.spec.meaning.rotations import Ends, build_rotation
from trunnion.spec.parts import hardware as parts

SHORTEST_STEP = 0.01  # s; a day of passes stays below ten million samples
HIGHEST_ORBIT = 5e7  # m; a pass of a slower satellite has no end worth sampling


def _refused(ctx: Context, err: HardwareError, *steps: str | int) -> None:
    ctx.note("refused", *steps, why=err.fault.cause, remedy=err.fault.remedy or "correct it")


def payload_frame(ctx: Context, name: str, part: parts.Gimbal, base: numeric.Frame) -> numeric.Frame | None:
    """The payload's triad: a declared frame, else one of its own with the base's axis names."""
    if part.payload is None:
        return numeric.Frame(f"{name} payload", base.axes)
    frame: numeric.Frame | None = ctx.part("frames", part.payload, "payload")
    return frame


def build_gimbal(ctx: Context, name: str, part: parts.Gimbal) -> Any:
    """The `GimbalChain`, or None when something about it is noted."""
    from trunnion.hardware.gimbals import GimbalChain

    base = ctx.part("frames", part.base, "base")
    payload = None if base is None else payload_frame(ctx, name, part, base)
    if base is None or payload is None:
        return None
    joints = [_joint(ctx.at("joints", index), joint, base) for index, joint in enumerate(part.joints)]
    ends = Ends(payload, base, ("payload",), ("base",))
    zero = np.eye(3) if part.zero is None else build_rotation(ctx.at("zero"), part.zero, ends)
    pointed = part.boresight is None or direction(ctx, part.boresight, payload, "boresight") is not None
    if zero is None or not pointed or any(joint is None for joint in joints):
        return None
    try:
        return GimbalChain(name, tuple(joints), zero)
    except HardwareError as err:
        _refused(ctx, err, "joints")
        return None


def _joint(ctx: Context, part: parts.Joint, base: numeric.Frame) -> Any:
    from trunnion.hardware.gimbals import Joint

    axis = direction(ctx, part.axis, base, "axis")
    if axis is None:
        return None
    travel = (-math.inf, math.inf)
    if part.travel.lo is not None and part.travel.hi is not None:
        travel = (part.travel.lo.value, part.travel.hi.value)
    limits = (part.max_rate, part.max_acceleration, part.encoder_step)
    try:
        return Joint(part.name, axis, travel, *(None if limit is None else limit.value for limit in limits))
    except HardwareError as err:
        _refused(ctx, err)
        return None


def check_pass(ctx: Context, name: str, part: Any) -> Any:
    """The part itself when it can be meant, else None: a pass is long, and is made when it is needed."""
    if isinstance(part, parts.TablePass):
        return part
    orbit = part.circular
    if orbit.step is not None and orbit.step.value < SHORTEST_STEP:
        ctx.note("too-small", "circular", "step", text=orbit.step.text, limit="10 ms")
        return None
    if orbit.highest.value > math.pi / 2:
        ctx.note("too-large", "circular", "highest", what="an elevation", text=orbit.highest.text, limit="90 deg")
        return None
    if orbit.lowest is not None and orbit.lowest.value >= orbit.highest.value:
        words = {"lo": orbit.lowest.text, "hi": orbit.highest.text, "otherwise": ""}
        ctx.note("reversed-range", "circular", "lowest", **words)
        return None
    if orbit.altitude.value > HIGHEST_ORBIT:
        ctx.note("too-large", "circular", "altitude", what="an altitude", text=orbit.altitude.text, limit="50000 km")
        return None
    return part


def build_pass(name: str, part: Any, open_pass: Callable[[dict[str, Any]], Any]) -> Any:
    """The `Pass`. A table is opened by the caller: `open_pass` gives `times` s, `azimuth` and `elevation` rad."""
    from trunnion.hardware import passes

    if isinstance(part, parts.TablePass):
        table = open_pass({"table": part.table, "columns": part.columns.plain()})
        return passes.pass_from_table(name, table.times, table.azimuth, table.elevation)
    orbit, options = part.circular, {}
    for key in ("lowest", "heading", "step"):
        if getattr(orbit, key) is not None:
            options[key] = getattr(orbit, key).value
    return passes.circular_pass(orbit.altitude.value, orbit.highest.value, name=name, **options)


def build_sector(ctx: Context, name: str, part: parts.Sector) -> Any:
    """The forbidden `Sector`, or None when something about it is noted."""
    from trunnion.hardware.sectors import Sector

    corners = [[azimuth.value, elevation.value] for azimuth, elevation in part.corners]
    try:
        return Sector(name, np.array(corners).reshape(-1, 2), tuple(part.modes or ()))
    except HardwareError as err:
        _refused(ctx, err, "corners")
        return None


def build_survey(ctx: Context, name: str, part: parts.Survey) -> dict[str, Any] | None:
    """What `survey_directions` takes: `in_host`, `in_sensor` (N, 3), `sigma` (N,) rad, `drawing` (a mount or None)."""
    host = ctx.part("frames", part.host, "host")
    drawing = None if part.mount is None else ctx.part("mounts", part.mount, "mount")
    if host is None or (part.mount is not None and drawing is None):
        return None
    sensor = numeric.Frame("sensor", ("x", "y", "z") if drawing is None else drawing.sensor_axes)
    if len(part.sightings) < 2:
        ctx.note("few-sightings", "sightings", count=len(part.sightings))
        return None
    rows = []
    for index, sighting in enumerate(part.sightings):
        inner = ctx.at("sightings", index)
        rows.append(
            (direction(inner, sighting.host, host, "host"), direction(inner, sighting.sensor, sensor, "sensor"))
        )
    if any(seen is None for row in rows for seen in row):
        return None
    sigma = [(sighting.accuracy or part.accuracy).value for sighting in part.sightings]
    return {
        "in_host": np.array([row[0] for row in rows]),
        "in_sensor": np.array([row[1] for row in rows]),
        "sigma": np.array(sigma),
        "drawing": drawing,
    }


def build_budget(ctx: Context, name: str, part: parts.Budget) -> Any:
    """The `Budget`, or None when something about it is noted."""
    from trunnion.hardware.budgets import Budget

    if not part.terms:
        ctx.note("empty-list", "terms", what="terms")
        return None
    terms = [_term(ctx.at("terms", index), term) for index, term in enumerate(part.terms)]
    for index, term in enumerate(terms):
        if term is not None and len(term.spreads) != len(part.axes):
            ctx.note("budget-axes", "terms", index, count=len(term.spreads), axes=len(part.axes))
            return None
    return None if any(term is None for term in terms) else Budget(tuple(part.axes), tuple(terms))


def _term(ctx: Context, part: Any) -> Any:
    from trunnion.hardware import budgets

    options = {} if part.counts_in is None else {"counts_in": tuple(part.counts_in)}
    try:
        if isinstance(part, parts.MountTerm):
            mount = ctx.part("mounts", part.mount, "mount")
            return None if mount is None else budgets.mount_term(part.name, mount.tolerance, part.source, **options)
        if isinstance(part, parts.TimingTerm):
            rates = [rate.value for rate in part.timing.relative_rate]
            return budgets.timing_term(part.name, rates, part.timing.time_error.value, part.source, **options)
        spreads = _spreads(ctx, part)
    except HardwareError as err:
        _refused(ctx, err)
        return None
    return (
        None
        if spreads is None
        else budgets.Term(part.name, part.kind, part.source, spreads, part.correlated, **options)
    )


def _spreads(ctx: Context, part: Any) -> tuple[Any, ...] | None:
    from trunnion.hardware import budgets

    if isinstance(part, parts.GaussianTerm):
        means = [mean.value for mean in part.mean] if part.mean is not None else [0.0] * len(part.gaussian)
        if len(means) != len(part.gaussian):
            ctx.note("budget-axes", "mean", count=len(means), axes=len(part.gaussian))
            return None
        pairs = zip(means, part.gaussian, strict=True)
        return tuple(budgets.gaussian(mean, sigma.value) for mean, sigma in pairs)
    if isinstance(part, parts.UniformTerm):
        return tuple(budgets.uniform(low.value, high.value) for low, high in part.uniform)
    if isinstance(part, parts.SinusoidTerm):
        return tuple(budgets.sinusoid(amplitude.value) for amplitude in part.sinusoid)
    return tuple(budgets.bounded(bound.value) for bound in part.bounded)
