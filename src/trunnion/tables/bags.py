"""ROS 2 bags and MCAP files: messages of well-known types that hold one attitude each, read in the confined child."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np

from trunnion.tables.assembly import assemble
from trunnion.tables.columns import Columns
from trunnion.tables.confine import Limits, read_confined
from trunnion.tables.files import Seal, file_error
from trunnion.tables.questions import require_answers
from trunnion.tables.statements import Form, Scalar, TableStatement
from trunnion.tables.table import AttitudeTable

_READER = "trunnion.tables.foreign.bag:read_topic"
_LISTING = "trunnion.tables.foreign.bag:list_topics"


def list_topics(path: Path, limits: Limits) -> list[dict[str, object]]:
    """Topics of a bag with type, count and whether one message holds one attitude."""
    topics: list[dict[str, object]] = read_confined(_LISTING, path, {}, limits).meta["topics"]
    return topics


def read_bag_table(statement: TableStatement, path: Path, limits: Limits) -> AttitudeTable:
    """One topic. The frames in the message headers must be those the statement names."""
    seal = Seal.of(path)
    if statement.topic is None:
        listed = ", ".join(
            f"{topic['name']} ({topic['type']})" for topic in list_topics(path, limits) if topic["attitude"]
        )
        raise file_error(path, "not stated: which topic holds the attitude?", f"state topic: one of {listed or 'none'}")
    options = {"topic": statement.topic, "reference": statement.reference, "body": statement.body}
    returned = read_confined(_READER, path, options, limits)
    seal.require_unchanged(path)
    facts = {key: str(value) for key, value in returned.meta["facts"].items()}
    require_answers("bag", statement, facts, path)
    _require_frames(returned.meta["frames"], statement, path)
    own = replace(statement, form=Form.QUATERNION, scalar=Scalar.LAST, time_unit="ns")
    columns = Columns(returned.arrays["time"], list(np.ascontiguousarray(returned.arrays["xyzw"].T)))
    columns.notes = [
        f"topic {statement.topic}, type {returned.meta['type']}, quaternion x y z w",
        returned.meta["clock"],
    ]
    return assemble(columns, own, path, seal.sha256)


def _require_frames(frames: list[list[str]], statement: TableStatement, path: Path) -> None:
    """Raise TableError when a header names other frames than the statement; an empty name says nothing."""
    for reference, body in frames:
        for held, stated, what in ((reference, statement.reference, "reference"), (body, statement.body, "body")):
            if held and held != stated:
                pairs = "; ".join(f"{one or '?'} to {other or '?'}" for one, other in frames[:8])
                cause = f"the messages' {what} frame is '{held}', stated is '{stated}'"
                raise file_error(path, cause, f"the topic holds (reference to body): {pairs}")
