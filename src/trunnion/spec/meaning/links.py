"""Links: how one frame is carried by another, as the hardware room's link.

Letters: `p` the carrying (parent) frame, `c` the carried (child) frame. R_pc takes c-components to p-components.
"""

from __future__ import annotations

from typing import Any

from trunnion.spec import parts
from trunnion.spec.meaning.context import Context
from trunnion.spec.meaning.envelopes import OpenTable, statement_of
from trunnion.spec.meaning.rotations import Ends, build_rotation

FORMS = ("constant", "mount", "attitude")


def check_link(ctx: Context, name: str, part: parts.Link) -> parts.Link | None:
    """The link itself when it can be meant; what keeps it from that is noted."""
    del name
    return None if resolve_link(ctx, part) is None else part


def resolve_link(ctx: Context, part: parts.Link) -> dict[str, Any] | None:
    """Parent and child frame, and either `R_pc` or the `table` (an envelope part) that states the attitude."""
    child, parent = ctx.part("frames", part.of, "of"), ctx.part("frames", part.in_, "in")
    given = [key for key in FORMS if getattr(part, key) is not None]
    if len(given) != 1:
        ctx.note("link-form", count=len(given) or "none", forms="constant, mount and attitude")
    if parent is None or child is None:
        return None
    if parent.name == child.name:
        ctx.note("self-link", "in", what="the link", frame=child.name)
        return None
    for key, frame in (("of", child), ("in", parent)):
        if frame.left_handed:
            ctx.note("left-handed-use", key, frame=frame.name)
            return None
    if len(given) != 1:
        return None
    found = _FORMS[given[0]](ctx, part, parent, child)
    return None if found is None else {"parent": parent, "child": child, **found}


def _constant(ctx: Context, part: parts.Link, parent: Any, child: Any) -> dict[str, Any] | None:
    R_pc = build_rotation(ctx.at("constant"), part.constant, Ends(child, parent, ("of",), ("in",)))
    return None if R_pc is None else {"R_pc": R_pc}


def _mount(ctx: Context, part: parts.Link, parent: Any, child: Any) -> dict[str, Any] | None:
    mount = ctx.part("mounts", part.mount, "mount")
    if mount is None:
        return None
    if mount.host.name != parent.name:
        ctx.note("other-host", "mount", mount=mount.name, host=mount.host.name, frame=parent.name)
        return None
    return {"R_pc": mount.R_bs}


def _attitude(ctx: Context, part: parts.Link, parent: Any, child: Any) -> dict[str, Any] | None:
    envelope = ctx.part("envelopes", part.attitude, "attitude")
    if envelope is None:
        return None
    if not isinstance(envelope, parts.Table):
        ctx.note("not-a-table", "attitude", name=part.attitude if isinstance(part.attitude, str) else envelope.name)
        return None
    return {"table": envelope}


_FORMS: dict[str, Any] = {"constant": _constant, "mount": _mount, "attitude": _attitude}


def build_link(ctx: Context, part: parts.Link, open_table: OpenTable) -> Any:
    """The `hardware.frame_chains.Link`; a table is opened by the caller."""
    from trunnion.hardware.frame_chains import Link

    found = resolve_link(ctx, part)
    assert found is not None  # faults raise here
    options: dict[str, Any] = {
        "time_offset": 0.0 if part.time_offset is None else part.time_offset.value,
        "offset_error": 0.0 if part.offset_error is None else part.offset_error.value,
        "jitter": 0.0 if part.jitter is None else part.jitter.value,
        "source": part.source or "",
    }
    parent, child, envelope = found["parent"].name, found["child"].name, found.get("table")
    if envelope is None:
        return Link(parent, child, R_pc=found["R_pc"], **options)
    table = open_table(statement_of(envelope))
    if envelope.attitude_error is not None:
        options["attitude_error"] = envelope.attitude_error.value
    if envelope.max_gap is not None:
        options["longest_gap"] = envelope.max_gap.value
    return Link(parent, child, times=table.times, quaternions=table.quaternions, **options)
