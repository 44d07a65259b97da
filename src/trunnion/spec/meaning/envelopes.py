"""Envelopes: from words to numerical regions. The regions themselves are made only when a table can be
opened."""

from __future__ import annotations

import math
from collections.abc import Callable
from pathlib import PurePosixPath
from typing import Any

import numpy as np

from trunnion.attitude import frames as numeric
from trunnion.attitude.conventions import Convention
from trunnion.spec.kinds import suggestion
from trunnion.spec.meaning.context import Context
from trunnion.spec.meaning.frames import direction
from trunnion.spec.meaning.rotations import Ends, build_rotation, maps_p_to_q
from trunnion.spec.parts import Box, Campaign, Cone, Phases, Poses, Product, Table
from trunnion.spec.values import Range

#: Opens a table: its plain statement to something with `times` (N,) s and `quaternions` (N, 4).
OpenTable = Callable[[dict[str, Any]], Any]

_RIGHT_ANGLE = math.pi / 2 * (1.0 + 1e-12)
_HALF_TURN = math.pi * (1.0 + 1e-12)

#: Keys of a table that are the statement of its file; the rest is the envelope's own.
STATEMENT_KEYS = (
    "table", "columns", "format", "scalar", "order", "convention", "reference", "body", "maps", "between samples",
    "max body rate", "attitude error", "max gap", "accept damaged", "topic", "instance", "segment", "separator",
    "norm tolerance", "answers", "source", "sha256", "reader memory", "reader time",
)  # fmt: skip


def check_envelope(ctx: Context, name: str, part: Any) -> bool:
    """Everything about an envelope that can be told without opening files. True when nothing is noted."""
    balls = _balls_fit(ctx, part)
    if isinstance(part, Box | Cone | Poses):
        numbers = {Box: box_ranges, Cone: cone_numbers, Poses: pose_matrices}[type(part)]
        sound = numbers(ctx, part) is not None  # type: ignore[operator]
        return balls and sound and further_cones(ctx, part) is not None and axis_limits(ctx, part) is not None
    if isinstance(part, Table | Campaign):
        return check_statement(ctx, part) and balls
    if isinstance(part, Product):
        host = ctx.part("envelopes", part.product.host, "product", "host")
        mount = ctx.part("mounts", part.product.mount, "product", "mount")
        return host is not None and mount is not None and balls
    assert isinstance(part, Phases)
    if not part.phases:
        ctx.note("empty-list", "phases", what="phases")
        return False
    found = [ctx.part("envelopes", phase, "phases", step) for step, phase in _phases(part)]
    return all(phase is not None for phase in found) and balls


def _balls_fit(ctx: Context, part: Any) -> bool:
    """Balls of uncertainty of more than a right angle leave no margin in any convention: a slip of the unit."""
    good = True
    for key, what in (("dispersion", "a dispersion"), ("attitude_error", "an attitude error"), ("ball", "a ball")):
        size = getattr(part, key, None)
        if size is not None and size.value > _RIGHT_ANGLE:
            ctx.note("too-large", key.replace("_", " "), what=what, text=size.text, limit="90 deg")
            good = False
    return good


def own_frames(ctx: Context, part: Any, word: str) -> tuple[numeric.Frame, numeric.Frame] | None:
    """(reference, body) of a box, by its convention, or of a cone or poses."""
    if not isinstance(part, Box):
        return frame_pair(ctx, part, word)
    convention = ctx.part("conventions", part.convention, "convention")
    return None if convention is None else (convention.reference, convention.body)


def further_cones(ctx: Context, part: Any) -> list[dict[str, Any]] | None:
    """Axis, direction (3,), nearest and farthest angle (rad) of each cone of `also`; empty where there is none."""
    listed = getattr(part, "also", None)
    if listed is None:
        return []
    if not listed:
        ctx.note("empty-list", "also", what="further cones")
        return None
    pair = own_frames(ctx, part, "cone")
    if pair is None:
        return None
    found = []
    for number, shape in enumerate(listed):
        inner = ctx.at("also", number)
        axis, around = direction(inner, shape.axis, pair[1], "axis"), direction(inner, shape.around, pair[0], "around")
        ends = _cone_ends(inner, shape)
        if axis is None or around is None or ends is None:
            return None
        found.append({"body_axis": axis, "reference_axis": around, "nearest": ends[0], "farthest": ends[1]})
    return found


def axis_limits(ctx: Context, part: Any) -> dict[str, Any] | None:
    """Axes (K, 3), limits (K,) rad and side of a dispersion about some axes; empty where there is none."""
    stated = getattr(part, "dispersion_about", None)
    if stated is None:
        return {}
    pair, inner = own_frames(ctx, part, "dispersion"), ctx.at("dispersion about", "limits")
    if not stated.limits:
        ctx.note("empty-list", "dispersion about", "limits", what="axes")
    if pair is None or not stated.limits:
        return None
    frame = pair[1] if stated.axes_of == "body" else pair[0]
    axes: dict[str, Any] = {}
    for word, limit in stated.limits.items():
        axis = direction(inner, word, frame, word)
        if axis is None:
            return None
        same = next((other for other, known in axes.items() if abs(float(known @ axis)) > 1.0 - 1e-9), None)
        if same is not None:
            inner.note("same-axis", word, key=True, name=word, other=same)
            return None
        if limit.value > _RIGHT_ANGLE:
            inner.note("too-large", word, what="a dispersion", text=limit.text, limit="90 deg")
            return None
        axes[word] = axis
    limits = [limit.value for limit in stated.limits.values()]
    return {"axes": np.array(list(axes.values())), "limits": np.array(limits), "side": stated.axes_of}


def _phases(part: Phases) -> list[tuple[str | int, Any]]:
    return list(part.phases.items()) if isinstance(part.phases, dict) else list(enumerate(part.phases))


# --- boxes
# ---------------------------------------------------------------------------------------------------------


def box_ranges(ctx: Context, part: Box) -> tuple[Convention, tuple[tuple[float, float], ...]] | None:
    """The convention of a box and its ranges (rad) in the convention's angle order."""
    convention = ctx.part("conventions", part.convention, "convention")
    if convention is None:
        return None
    names = convention.angle_names
    good = True
    for name in part.box:
        if name not in names:
            hint = suggestion(name, names, "its angles are")
            ctx.note("unknown-angle", "box", name, key=True, convention=convention.name, name=name, hint=hint)
            good = False
    missing = [name for name in names if name not in part.box]
    if missing and good:
        ctx.note("missing-angle", "box", names=" and ".join(missing), first=missing[0])
    if missing or not good:
        return None
    ends = [_box_ends(ctx, name, part.box[name], middle=index == 1) for index, name in enumerate(names)]
    return None if None in ends else (convention, tuple(ends))  # type: ignore[arg-type]


def _box_ends(ctx: Context, name: str, stated: Range, *, middle: bool) -> tuple[float, float] | None:
    if not middle:
        return _outer_ends(ctx, stated, "box", name)
    if stated.lo is None or stated.hi is None or stated.lo.value <= stated.hi.value:
        return stated.ends()
    ctx.note("reversed-range", "box", name, lo=stated.lo.text, hi=stated.hi.text, otherwise="")
    return None


def _outer_ends(ctx: Context, stated: Range, *steps: str) -> tuple[float, float] | None:
    """The ends (rad) of a range that may run through the half turn, as [170 deg, -170 deg] does."""
    if stated.lo is None or stated.hi is None or stated.lo.value <= stated.hi.value:
        return stated.ends()
    lo, hi = stated.lo.value, stated.hi.value
    hi += 2 * math.pi * math.ceil((lo - hi) / (2 * math.pi))
    if hi - lo <= _HALF_TURN:
        return lo, hi
    otherwise = f", or [{stated.lo.text}, {math.degrees(hi):g} deg] if the way through the half turn is meant"
    ctx.note("reversed-range", *steps, lo=stated.lo.text, hi=stated.hi.text, otherwise=otherwise)
    return None


# --- cones and poses
# -----------------------------------------------------------------------------------------------


def frame_pair(ctx: Context, part: Any, word: str) -> tuple[numeric.Frame, numeric.Frame] | None:
    """(reference, body) of an envelope: as it says, else the pair all conventions of the workbook share."""
    if part.reference is not None and part.body is not None:
        reference = ctx.part("frames", part.reference, "reference")
        body = ctx.part("frames", part.body, "body")
        return _right_handed(ctx, reference, body)
    pair: tuple[numeric.Frame, numeric.Frame] | None
    pair = ctx.part("frame pair", (part.reference, part.body, None, word))
    return pair


def _right_handed(ctx: Context, reference: Any, body: Any) -> tuple[numeric.Frame, numeric.Frame] | None:
    """The pair when both frames are there, differ and are right-handed; what keeps it from being is noted."""
    for key, frame in (("reference", reference), ("body", body)):
        if frame is None:
            return None
        if frame.left_handed:
            ctx.note("left-handed-use", key, frame=frame.name)
            return None
    if reference.name == body.name:
        ctx.note("self-link", "body", what="the envelope", frame=body.name)
        return None
    return reference, body


def cone_numbers(ctx: Context, part: Cone) -> dict[str, Any] | None:
    """Axis and direction (3,), nearest and farthest angle (rad), roll limit or None of a cone."""
    pair = frame_pair(ctx, part, "cone")
    if pair is None:
        return None
    reference, body = pair
    inner, shape = ctx.at("cone"), part.cone
    axis = direction(inner, shape.axis, body, "axis")
    around = direction(inner, shape.around, reference, "around")
    ends = _cone_ends(inner, shape)
    roll = None if isinstance(shape.roll, str) else _roll(inner, shape.roll, body, axis)
    if axis is None or around is None or ends is None or (roll is None and not isinstance(shape.roll, str)):
        return None
    return {"body_axis": axis, "reference_axis": around, "nearest": ends[0], "farthest": ends[1], "roll": roll}


def _cone_ends(ctx: Context, shape: Any) -> tuple[float, float] | None:
    if (shape.half_angle is None) == (shape.between is None):
        ctx.note("cone-size", *(["between"] if shape.between is not None else []))
        return None
    angles = [shape.half_angle] if shape.between is None else shape.between
    steps = [("half angle",)] if shape.between is None else [("between", 0), ("between", 1)]
    for angle, place in zip(angles, steps, strict=True):
        if angle.value < 0.0:
            ctx.note("negative", *place, text=angle.text, what="the angle of a cone", example="10 deg")
            return None
        if angle.value > _HALF_TURN:
            ctx.note("too-large", *place, what="a cone", text=angle.text, limit="180 deg")
            return None
    if len(angles) == 2 and angles[0].value > angles[1].value:
        ctx.note("reversed-range", "between", lo=angles[0].text, hi=angles[1].text, otherwise="")
        return None
    return (0.0, angles[0].value) if len(angles) == 1 else (angles[0].value, angles[1].value)


def _roll(ctx: Context, limit: Any, body: numeric.Frame, axis: Any) -> tuple[float, float, Any] | None:
    zero = direction(ctx, limit.zero, body, "roll", "zero")
    if zero is None or axis is None:
        return None
    if abs(float(zero @ axis)) > 1.0 - 1e-12:
        ctx.note("roll-zero", "roll", "zero", word=limit.zero)
        return None
    ends = _outer_ends(ctx, limit.range, "roll", "range")
    return None if ends is None else (ends[0], ends[1], zero)


def pose_matrices(ctx: Context, part: Poses) -> list[Any] | None:
    """R_rb (3, 3) of each listed pose."""
    pair = frame_pair(ctx, part, "pose")
    if not part.poses:
        ctx.note("empty-list", "poses", what="poses")
    if pair is None or not part.poses:
        return None
    ends = Ends(pair[1], pair[0], ("body",), ("reference",))
    made = [build_rotation(ctx.at("poses", index), pose, ends) for index, pose in enumerate(part.poses)]
    return None if any(matrix is None for matrix in made) else made


# --- tables
# --------------------------------------------------------------------------------------------------------


def check_statement(ctx: Context, part: Any) -> bool:
    """Whether a table's statement is complete and does not contradict itself, as far as the spec alone can
    tell."""
    notes_before = _Counter(ctx)
    inner = notes_before.context
    columns = part.columns
    if columns is not None:
        _check_columns(inner, part, columns)
    elif PurePosixPath(part.table if isinstance(part, Table) else part.campaign).suffix in (".csv", ".parquet", ".ulg"):
        example = "columns: {time: {column: t_s, unit: s}, quaternion: [qw, qx, qy, qz]}"
        inner.note("table-needs", because="the file holds bare columns", name="columns", example=example)
    if part.between_samples == "rate limited" and part.max_body_rate is None:
        inner.note("between-rate", "between samples")
    if part.convention is not None:
        inner.part("conventions", part.convention, "convention")
    if part.maps is not None and part.convention is None:
        pair = table_frames(inner, part)
        if pair is not None:
            maps_p_to_q(inner, part.maps, Ends(pair[1], pair[0], ("body",), ("reference",)), "maps")
    return notes_before.count == 0


class _Counter:
    """A context that also counts what is noted through it."""

    def __init__(self, ctx: Context) -> None:
        self.count = 0
        self._take = ctx.take

        def take(kind: str, steps: Any, *, key: bool = False, **words: object) -> None:
            self.count += 1
            self._take(kind, steps, key=key, **words)

        self.context = Context(ctx.find, take, ctx.steps)


def _check_columns(ctx: Context, part: Any, columns: Any) -> None:
    forms = [form for form in ("quaternion", "matrix", "angles") if getattr(columns, form) is not None]
    if len(forms) != 1:
        ctx.note("table-form", "columns", count=len(forms) or "no")
        return
    form = forms[0]
    _repeated_column(ctx, getattr(columns, form), form)
    needs = {
        "quaternion": (("scalar", part.scalar, "scalar: first"), ("maps", part.maps, "maps: body to reference")),
        "matrix": (("order", part.order, "order: rows"), ("maps", part.maps, "maps: body to reference")),
        "angles": (("convention", part.convention, "convention: NAME"), ("unit", columns.unit, "unit: deg")),
    }
    because = {
        "quaternion": "the columns are a quaternion",
        "matrix": "the columns are a matrix",
        "angles": "the columns are angles",
    }
    for key, given, example in needs[form]:
        if given is None:
            place = ("columns",) if key == "unit" else ()
            ctx.note("table-needs", *place, because=because[form], name=key, example=example)
    excess = {
        "scalar": (part.scalar, "quaternion"),
        "order": (part.order, "matrix"),
        "convention": (part.convention, "angles"),
    }
    for key, (given, owner) in excess.items():
        if given is not None and owner != form:
            ctx.note("table-excess", key, key=True, name=key, because=because[form])
    if columns.time is None and part.between_samples != "samples":
        example = "time: {column: t_s, unit: s}"
        ctx.note("table-needs", "columns", because="motion between samples needs time", name="time", example=example)


def _repeated_column(ctx: Context, names: list[str], form: str) -> None:
    for index, name in enumerate(names):
        if name in names[:index]:
            ctx.note("repeated-column", "columns", form, index, name=name)
            return


def table_frames(ctx: Context, part: Any) -> tuple[numeric.Frame, numeric.Frame] | None:
    """(reference, body) of a table: as stated, else the conventions' pair that its `maps` names."""
    if part.reference is not None and part.body is not None:
        reference = ctx.part("frames", part.reference, "reference")
        body = ctx.part("frames", part.body, "body")
        return _right_handed(ctx, reference, body)
    pair: tuple[numeric.Frame, numeric.Frame] | None
    pair = ctx.part("frame pair", (part.reference, part.body, part.maps, part.maps), "maps")
    return pair


# --- regions
# -------------------------------------------------------------------------------------------------------


def build_region(ctx: Context, part: Any, open_table: OpenTable) -> Any:
    """The numerical region of an envelope; its tables are opened by `open_table`."""
    from trunnion.envelope import AxisDispersion, Constrained, TurnSide, regions

    region = _bare_region(ctx, part, open_table)
    if getattr(part, "also", None):
        cones = [regions.Cone(**numbers) for numbers in further_cones(ctx, part) or ()]
        region = Constrained(region, tuple(cones))
    limits = axis_limits(ctx, part)
    if limits:
        side = TurnSide.BODY if limits["side"] == "body" else TurnSide.REFERENCE
        region = AxisDispersion(region, limits["axes"], limits["limits"], side)
    if part.dispersion is not None:
        region = regions.Dispersed(region, part.dispersion.value)
    return region


def _bare_region(ctx: Context, part: Any, open_table: OpenTable) -> Any:
    from trunnion.envelope import regions

    if isinstance(part, Box):
        found = box_ranges(ctx, part)
        assert found is not None
        return regions.Box(found[0], found[1])  # type: ignore[arg-type]
    if isinstance(part, Cone):
        numbers = cone_numbers(ctx, part)
        assert numbers is not None
        roll = numbers.pop("roll")
        return regions.Cone(**numbers, roll=None if roll is None else regions.Roll(*roll))
    if isinstance(part, Poses):
        matrices = pose_matrices(ctx, part)
        return regions.Poses(np.array(matrices), part.ball.value if part.ball is not None else 0.0)
    if isinstance(part, Product):
        host = ctx.part("envelopes", part.product.host, "product", "host")
        mount = ctx.part("mounts", part.product.mount, "product", "mount")
        return regions.Mounted(build_region(ctx.at("product", "host"), host, open_table), mount.R_bs)
    if isinstance(part, Phases):
        named = [(str(step), ctx.part("envelopes", phase, "phases", step)) for step, phase in _phases(part)]
        return regions.Union({name: build_region(ctx.at("phases", name), inner, open_table) for name, inner in named})
    return _table_region(part, open_table)


def _table_region(part: Any, open_table: OpenTable) -> Any:
    from trunnion.envelope import regions

    if isinstance(part, Campaign):
        runs = {file: _track(part, open_table(statement_of(part) | {"table": file})) for file in part.files or ()}
        return regions.Union(runs)
    return _track(part, open_table(statement_of(part)))


def statement_of(part: Any) -> dict[str, Any]:
    """The plain statement of a table's file: the keys `trunnion.tables` reads."""
    plain = part.plain()
    return {key: _name_only(key, plain[key]) for key in STATEMENT_KEYS if key in plain}


def _name_only(key: str, value: Any) -> Any:
    return value["name"] if key in ("reference", "body") and isinstance(value, dict) else value


def _track(part: Any, table: Any) -> Any:
    from trunnion.envelope import regions

    kinds = {"slerp": "SLERP", "rate limited": "RATE_LIMITED", "samples": "SAMPLES"}
    return regions.Track(
        table.times,
        table.quaternions,
        between=regions.Between[kinds[part.between_samples]],
        max_rate=None if part.max_body_rate is None else part.max_body_rate.value,
        attitude_error=None if part.attitude_error is None else part.attitude_error.value,
        longest_gap=None if part.max_gap is None else part.max_gap.value,
    )
