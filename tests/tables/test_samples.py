"""Samples from files of several kinds: what must be known is asked for, what is useless is left out and said."""

from __future__ import annotations

import struct
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.frames import Frame
from trunnion.crosswalk.identify import Answer
from trunnion.crosswalk.study import study
from trunnion.errors import AttitudeError, TableError
from trunnion.tables.samples import MOST_USED, evidence_of

NED = Frame("local", ("north", "east", "down"))
FRD = Frame("body", ("forward", "starboard", "down"))
KNOWN = {"quaternion": list("wxyz"), "scalar": "first", "maps": "body to reference"}
ASKED = {"table": "s.csv", "numbers": ["a", "b", "c"], **KNOWN}


def write(folder: Path, header: str, rows: Any) -> Path:
    """Write s.csv."""
    lines = [header, *(",".join(str(cell) for cell in row) for row in rows)]
    (folder / "s.csv").write_text("\n".join(lines) + "\n")
    return folder


def samples(folder: Path, count: int = 12) -> Path:
    """Angles of scipy's ZYX with their quaternion, scalar first."""
    angles = np.random.default_rng(3).uniform(-60, 60, size=(count, 3))
    q = Rotation.from_euler("ZYX", angles, degrees=True).as_quat()[:, [3, 0, 1, 2]]
    return write(folder, "a,b,c,w,x,y,z", np.column_stack([angles, q]).tolist())


def test_columns_become_evidence_and_an_answer(tmp_path: Path) -> None:
    made = study(evidence_of(ASKED, samples(tmp_path)))
    assert made.answer is Answer.IDENTIFIED
    assert any("3-2-1 about moving axes; turns: a, b, c; deg" in name for name in made.found.fits[0].reading.names)


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"scalar": None}, "where does the scalar of the known quaternion stand"),
        ({"maps": None}, "which way does the known attitude map"),
        ({"maps": "sideways"}, "'maps' is 'sideways'"),
        ({"numbers": ["a", "b"]}, "does not name 3 columns"),
        ({"numbers": ["a", "b", "d"]}, "no numeric column 'd'"),
        ({"numbers": None}, "the columns in question are not named"),
        ({"poses": "a"}, "more than one known attitude"),
        ({"colour": "red"}, "'colour' is not a key"),
        ({"rates": ["a", "b", "c"]}, "rates need the time"),
        ({"table": "t.csv"}, "there is no such file"),
        ({"topic": "engine"}, "no series 'engine'"),
    ],
)
def test_every_open_question_is_asked(tmp_path: Path, changes: dict, words: str) -> None:
    plain = {key: value for key, value in (ASKED | changes).items() if value is not None}
    with pytest.raises(TableError, match=words):
        evidence_of(plain, samples(tmp_path))


def test_gravity_poses_and_angles_ask_for_what_they_need(tmp_path: Path) -> None:
    root = samples(tmp_path)
    base = {"table": "s.csv", "numbers": ["a", "b", "c"]}
    with pytest.raises(TableError, match="gravity needs a heading"):
        evidence_of({**base, "gravity": ["x", "y", "z"]}, root)
    with pytest.raises(TableError, match="unit of the known angles"):
        evidence_of({**base, "known angles": ["a", "b", "c"]}, root)
    with pytest.raises(TableError, match="no convention"):
        evidence_of({**base, "known angles": ["a", "b", "c"], "unit": "deg"}, root)
    gravity = {**base, "gravity": ["x", "y", "z"], "heading": "a", "gravity points": "down"}
    with pytest.raises(TableError, match="no frame names"):
        evidence_of(gravity, root)
    with pytest.raises(TableError, match="no column 'said'"):
        evidence_of({**base, "poses": "said"}, root, reference=NED, body=FRD)
    with pytest.raises(AttitudeError, match="nothing is known"):
        study(evidence_of(base, root))


def test_gravity_with_a_heading_identifies(tmp_path: Path) -> None:
    angles = np.random.default_rng(8).uniform(-60, 60, size=(20, 3))
    down = Rotation.from_euler("ZYX", angles, degrees=True).inv().apply([0, 0, 9.81])
    root = write(tmp_path, "a,b,c,gx,gy,gz,hdg", np.column_stack([angles, down, angles[:, :1]]).tolist())
    plain = {"table": "s.csv", "numbers": ["a", "b", "c"], "gravity": ["gx", "gy", "gz"], "heading": "hdg",
             "gravity points": "down"}  # fmt: skip
    assert study(evidence_of(plain, root, reference=NED, body=FRD)).answer is Answer.IDENTIFIED
    assert study(evidence_of({**plain, "gravity points": "up"}, root, reference=NED, body=FRD)).answer is not (
        Answer.IDENTIFIED
    )


def test_rows_without_numbers_are_left_out_and_counted(tmp_path: Path) -> None:
    root = samples(tmp_path)
    text = (root / "s.csv").read_text().splitlines()
    text[3] = ",".join(["nan", *text[3].split(",")[1:]])
    text[5] = text[5].rsplit(",", 1)[0] + ",0.9"
    (root / "s.csv").write_text("\n".join(text) + "\n")
    evidence = evidence_of(ASKED, root)
    assert evidence.samples == 10
    assert evidence.notes == ("2 rows without usable numbers are left out (the first is row 3)",)
    write(tmp_path, "a,b,c,w,x,y,z", [["nan", 1, 1, 1, 0, 0, 0], [1, "nan", 1, 1, 0, 0, 0]])
    with pytest.raises(TableError, match="no row has usable numbers"):
        evidence_of(ASKED, tmp_path)


def test_long_files_are_thinned_evenly(tmp_path: Path) -> None:
    evidence = evidence_of(ASKED, samples(tmp_path, 5000))
    assert evidence.samples == MOST_USED
    assert evidence.notes == ("of 5000 rows 1000 spread evenly are used",)


def setpoint_log(angles: np.ndarray, quaternions: np.ndarray) -> bytes:
    """A flight log with one topic: roll, pitch, yaw and quaternion of the same setpoint, in single precision."""

    def message(kind: str, payload: bytes) -> bytes:
        return struct.pack("<HB", len(payload), ord(kind)) + payload

    name = "vehicle_attitude_setpoint"
    out = [b"ULog\x01\x12\x35\x01" + struct.pack("<Q", 0), message("B", bytes(40))]
    out.append(
        message(
            "F", f"{name}:uint64_t timestamp;float roll_body;float pitch_body;float yaw_body;float[4] q_d;".encode()
        )
    )
    out.append(message("A", struct.pack("<BH", 0, 0) + name.encode()))
    for row, (triple, q) in enumerate(zip(angles, quaternions, strict=True)):
        out.append(message("D", struct.pack("<H", 0) + struct.pack("<Q7f", 1000 + 20000 * row, *triple, *q)))
    return b"".join(out)


def test_the_setpoint_topic_of_a_log_from_the_data_alone(tmp_path: Path) -> None:
    """Documented convention (PX4 user guide, value from memory): 3-2-1 in rad, quaternion scalar first."""
    turned = Rotation.from_euler("ZYX", np.random.default_rng(5).uniform(-0.6, 0.6, size=(80, 3)))
    log = setpoint_log(turned.as_euler("ZYX")[:, ::-1], turned.as_quat()[:, [3, 0, 1, 2]])
    (tmp_path / "f.ulg").write_bytes(log)
    plain = {"table": "f.ulg", "topic": "vehicle_attitude_setpoint", "numbers": ["roll_body", "pitch_body", "yaw_body"],
             "quaternion": [f"q_d[{n}]" for n in range(4)]}  # fmt: skip
    made = study(evidence_of(plain, tmp_path, agree=True), agree=True)
    assert made.answer is Answer.IDENTIFIED
    assert made.agreements[0].words["quaternion"] == "scalar first, maps body to reference"
    assert "3-2-1 about moving axes; turns: yaw_body, pitch_body, roll_body; rad" in made.agreements[0].words["angles"]
    still = setpoint_log(np.tile([0.0, 0.0, -0.6], (80, 1)), np.tile([np.cos(0.3), 0, 0, -np.sin(0.3)], (80, 1)))
    (tmp_path / "f.ulg").write_bytes(still)
    made = study(evidence_of(plain, tmp_path, agree=True), agree=True)
    assert made.answer is Answer.AMBIGUOUS
    assert len(made.agreements[0].angles.fits) == 96
    (tmp_path / "f.ulg").write_bytes(log[:-5])
    torn = evidence_of(plain, tmp_path, agree=True)
    assert torn.samples == 79
    assert any(note.startswith("the file is damaged") for note in torn.notes)


def test_quaternions_and_matrices_in_question(tmp_path: Path) -> None:
    turned = Rotation.random(8, random_state=3)
    header = "w,x,y,z," + ",".join(f"m{n}" for n in range(9))
    rows = np.column_stack([turned.as_quat()[:, [3, 0, 1, 2]], turned.inv().as_matrix().reshape(8, 9).round(6)])
    root = write(tmp_path, header, rows.tolist())
    matrix = [f"m{n}" for n in range(9)]
    made = study(evidence_of({"table": "s.csv", "matrix": matrix, "in question": "matrix", **KNOWN}, root))
    assert [f.reading.words for f in made.found.fits] == ["entries by columns, or by rows and maps reference to body"]
    known = {"matrix": matrix, "order": "rows", "maps": "reference to body"}
    plain = {"table": "s.csv", "quaternion": list("wxyz"), "in question": "quaternion", **known}
    made = study(evidence_of(plain, root))
    assert [f.reading.words for f in made.found.fits] == ["scalar first, maps body to reference"]


def test_a_known_quaternion_read_wrongly_is_suspected(tmp_path: Path) -> None:
    made = study(evidence_of({**ASKED, "scalar": "last"}, samples(tmp_path)))
    assert made.answer is Answer.NONE_FITS
    assert any("if the known quaternion is read otherwise" in line and "scalar first" in line for line in made.mistakes)
