"""Reference attitudes out as files and answers back in, with every fault of the answers named."""

from __future__ import annotations

import csv
import json

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.crosswalk.answers import AnswerKind, all_rows, judge
from trunnion.crosswalk.exchange import MATRIX_COLUMNS, as_csv, as_json, read_answers, row_names
from trunnion.crosswalk.reference import reference_set
from trunnion.errors import AttitudeError

CONVENTION = Convention(
    "ordinary",
    Frame("local", ("north", "east", "down")),
    Frame("body", ("forward", "starboard", "down")),
    Sequence.ZYX,
    Sense.MOVING,
    ("heading", "elevation", "bank"),
)
REFERENCE = reference_set(CONVENTION)
STATEMENT = ["turn right by heading\nabout down"]


def test_the_csv_is_what_scipy_makes_of_its_own_angles() -> None:
    lines = [line for line in as_csv(REFERENCE, STATEMENT).splitlines() if not line.startswith("#")]
    for line in csv.DictReader(lines):
        angles = [float(line[f"{name}_deg"]) for name in CONVENTION.angle_names]
        matrix = np.array([float(line[column]) for column in MATRIX_COLUMNS]).reshape(3, 3)
        theirs = Rotation.from_euler("ZYX", angles, degrees=True)
        assert np.allclose(matrix, theirs.as_matrix(), rtol=0, atol=1e-15)
        q = np.array([float(line[f"q{n}"]) for n in range(4)])
        assert (Rotation.from_quat(q[[1, 2, 3, 0]]).inv() * theirs).magnitude() < 1e-14


def test_a_statement_cannot_break_out_of_its_comment_lines() -> None:
    first = as_csv(REFERENCE, STATEMENT).splitlines()[0]
    assert first == "# turn right by heading about down"


def test_json_holds_the_same_rows() -> None:
    made = json.loads(as_json(REFERENCE, STATEMENT))
    assert [row["row"] for row in made["rows"]] == list(row_names(REFERENCE))
    assert np.array_equal([row["matrix"] for row in made["rows"]], all_rows(REFERENCE).matrices)


@pytest.mark.parametrize("kind", list(AnswerKind))
def test_answers_come_back_in_any_order(kind: AnswerKind) -> None:
    text = as_csv(REFERENCE, STATEMENT)
    lines = [line for line in text.splitlines() if not line.startswith("#")]
    keep = {
        AnswerKind.MATRIX: MATRIX_COLUMNS,
        AnswerKind.QUATERNION: ("q0", "q1", "q2", "q3"),
        AnswerKind.ANGLES: ("heading_deg", "elevation_deg", "bank_deg"),
    }[kind]
    rows = list(csv.DictReader(lines))[::-1]
    answer = ",".join(("row", *keep)) + "\n" + "\n".join(",".join((r["row"], *(r[c] for c in keep))) for r in rows)
    found, values = read_answers(answer, REFERENCE)
    assert found is kind
    assert judge(REFERENCE, found, values).passed


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "no complete form of answer"),
        ("row,m11\nA1,0", "no complete form of answer"),
        ("row,q0,q1,q2,q3\nA1,1,0,0,0", "no answer to row A2"),
        ("row,q0,q1,q2,q3\nA1,1,0,0,0\nA1,1,0,0,0", "answered twice"),
        ("row,q0,q1,q2,q3\nA1,one,0,0,0", "'one' is no number"),
        ("row,q0,q1,q2,q3\nA1,nan,0,0,0", "not finite"),
        ("row,q0,q1,q2,q3,heading_deg,elevation_deg,bank_deg\n", "more than one form"),
        ("x" * (1 << 21), "larger than 1 MiB"),
    ],
)
def test_faulty_answers_are_named(text: str, message: str) -> None:
    with pytest.raises(AttitudeError, match=message):
        read_answers(text, REFERENCE)
