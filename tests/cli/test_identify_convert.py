"""`inspect`, `identify` and `convert` as people type them: exit codes, texts, no traceback for bad input."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.cli.main import outcome
from trunnion.tables.ccsds_message import parse_message

SEDGEWING = Path(__file__).parents[2] / "workbooks" / "sedgewing"
HEAD = ["originator=BENCH", "creation date=2031-05-01T00:00:00", "object name=SEDGEWING", "object id=SW-1",
        "time system=UTC", "epoch=2031-04-28T00:00:00"]  # fmt: skip


@pytest.fixture
def file(tmp_path: Path) -> Path:
    """Angles of scipy's ZXY in degrees with their quaternion, scalar last."""
    angles = np.random.default_rng(2).uniform(-60, 60, size=(30, 3))
    q = Rotation.from_euler("ZXY", angles, degrees=True).as_quat()
    rows = [",".join(f"{value:.9f}" for value in row) for row in np.column_stack([angles, q])]
    (tmp_path / "log.csv").write_text("\n".join(["yaw,roll,pitch,qx,qy,qz,qw", *rows]) + "\n")
    return tmp_path / "log.csv"


def test_identify_says_the_convention_and_writes_spec_lines(file: Path, capsys: pytest.CaptureFixture) -> None:
    known = ["--quaternion", "qx,qy,qz,qw", "--scalar", "last", "--maps", "body to reference"]
    assert outcome(["identify", str(file), "--numbers", "yaw,roll,pitch", *known]) == 0
    text = capsys.readouterr().out
    assert "IDENTIFIED, one of 1152 functions" in text
    assert "3-1-2 about moving axes; turns: yaw, roll, pitch; deg" in text
    assert "    sequence: 3-1-2" in text
    assert outcome(["identify", str(file), "--numbers", "yaw,roll,pitch", *known, "--json"]) == 0
    made = json.loads(capsys.readouterr().out)
    assert made["answer"] == "identified"
    assert len(made["fits"]) == 1
    assert len(made["fits"][0]["names"]) == 4


def test_identify_agree_holds_the_statements_together(file: Path, capsys: pytest.CaptureFixture) -> None:
    assert (
        outcome(["identify", str(file), "--numbers", "yaw,roll,pitch", "--quaternion", "qx,qy,qz,qw", "--agree"]) == 0
    )
    text = capsys.readouterr().out
    assert "ONE WAY to read the statements makes them agree" in text
    assert "scalar last" in text


def test_identify_with_a_known_convention(file: Path, capsys: pytest.CaptureFixture) -> None:
    arguments = [
        "--known-angles",
        "yaw,roll,pitch",
        "--unit",
        "deg",
        "--workbook",
        str(SEDGEWING),
        "--convention",
        "wing-last",
    ]
    assert (
        outcome(["identify", str(file), "--quaternion", "qx,qy,qz,qw", "--in-question", "quaternion", *arguments]) == 0
    )
    assert "scalar last, maps body to reference" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["--numbers", "yaw,roll,pitch"], "nothing is known of the true attitude"),
        (["--numbers", "yaw,roll,tilt", "--quaternion", "qx,qy,qz,qw", "--agree"], "no numeric column 'tilt'"),
        (["--numbers", "yaw,roll,pitch", "--quaternion", "qx,qy,qz,qw"], "where does the scalar"),
        (["--numbers", "yaw,roll,pitch", "--gravity", "qx,qy,qz", "--heading", "yaw"], "gravity needs a heading"),
        (["--numbers", "yaw,roll,pitch", "--convention", "x", "--known-angles", "yaw,roll,pitch"], "of no workbook"),
        (["--numbers", "yaw,roll,pitch", "--noise", "0.1", "--quaternion", "qx,qy,qz,qw", "--scalar", "last",
          "--maps", "body to reference"], "0.1"),
    ],
)  # fmt: skip
def test_identify_asks_for_what_is_missing(
    file: Path, capsys: pytest.CaptureFixture, arguments: list, words: str
) -> None:
    assert outcome(["identify", str(file), *arguments]) == 2
    caught = capsys.readouterr()
    assert words in caught.err
    assert "Traceback" not in caught.err


@pytest.mark.parametrize("content", [b"", b"\x00\x01\x02\x03", b"a,b\n1\n", b"x" * 5_000_000, b"ULog\x01\x12\x35"])
def test_damaged_files_are_refused_in_words(tmp_path: Path, capsys: pytest.CaptureFixture, content: bytes) -> None:
    (tmp_path / "bad.csv").write_bytes(content)
    assert (
        outcome(["identify", str(tmp_path / "bad.csv"), "--numbers", "a,b,c", "--quaternion", "w,x,y,z", "--agree"])
        == 2
    )
    assert "Traceback" not in capsys.readouterr().err


def test_inspect_lists_columns_and_suggests_spec_lines(file: Path, capsys: pytest.CaptureFixture) -> None:
    assert outcome(["inspect", str(file)]) == 0
    text = capsys.readouterr().out
    assert "quaternion: qx, qy, qz, qw" in text
    assert "suggested spec lines" in text
    assert outcome(["inspect", str(file), "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["series"][0]["rows"] == 30
    assert outcome(["inspect", str(file.parent / "none.csv")]) == 2


def test_convert_writes_each_format(tmp_path: Path, capsys: pytest.CaptureFixture) -> None:
    for suffix in (".csv", ".parquet"):
        assert outcome(["convert", str(SEDGEWING), "flown", "wing-last", str(tmp_path / f"out{suffix}")]) == 0
    text = (tmp_path / "out.csv").read_text()
    assert "#   name: wing-last" in text
    assert "least lock margin" in capsys.readouterr().out
    head = [part for pair in HEAD for part in ("--head", pair)]
    for angles in ([], ["--angles"]):
        assert (
            outcome(["convert", str(SEDGEWING), "flown", "wing-last", str(tmp_path / "out.aem"), *head, *angles]) == 0
        )
        assert parse_message((tmp_path / "out.aem").read_bytes(), "out.aem").breaches == []
    assert "EULER_ROT_SEQ = ZXY" in (tmp_path / "out.aem").read_text()


def test_convert_flags_rows_near_lock_by_its_exit_code(tmp_path: Path, capsys: pytest.CaptureFixture) -> None:
    assert (
        outcome(["convert", str(SEDGEWING), "flown", "ordinary", str(tmp_path / "o.csv"), "--near-lock", "30 deg"]) == 1
    )
    text = capsys.readouterr().out
    assert "flagged:" in text
    assert "within 30 deg of the lock of 'ordinary'" in text


@pytest.mark.parametrize(
    ("envelope", "convention", "out", "more", "words"),
    [
        ("flown", "wing-last", "o.txt", [], "does not say what to write"),
        ("hover", "wing-last", "o.csv", [], "is no table"),
        ("flew", "wing-last", "o.csv", [], "no envelope 'flew'"),
        ("flown", "wing", "o.csv", [], "no convention 'wing'"),
        ("flown", "wing-last", "o.aem", [], "an attitude message needs originator"),
        (
            "flown",
            "wing-last",
            "o.apm",
            [part for pair in HEAD for part in ("--head", pair)],
            "an APM holds one attitude",
        ),
        ("flown", "wing-last", "o.aem", ["--head", "colour=red"], "no entry of a message head"),
        ("flown", "wing-last", "o.csv", ["--near-lock", "5"], "5"),
    ],
)
def test_convert_says_what_is_wrong(
    tmp_path: Path, capsys: pytest.CaptureFixture, envelope: str, convention: str, out: str, more: list, words: str
) -> None:
    assert outcome(["convert", str(SEDGEWING), envelope, convention, str(tmp_path / out), *more]) == 2
    assert words in capsys.readouterr().err
    assert not (tmp_path / out).exists()
