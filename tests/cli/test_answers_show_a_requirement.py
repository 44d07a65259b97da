"""A convention handed over, the other party's answers read back: wrong ones fail a requirement, right ones meet it."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import pytest
from scipy.spatial.transform import Rotation

from trunnion.cli.exits import ExitCode
from trunnion.cli.main import outcome

WORKBOOK = """\
workbook: 1
document: {number: T-7, title: Answers on trial, revision: A}
sources:
  - {id: ICD, title: Interface document, edition: "2"}
frames:
  local: {axes: [north, east, down], north: "true", carried: along}
  body: {axes: [forward, starboard, down]}
conventions:
  ours: {reference: local, body: body, as: ISO 1151-1, angles: [heading, pitch, roll], maps: body to reference}
requirements:
  - {id: IF-1, text: The supplier reads our angles as we do., source: ICD 4, result: largest miss of the answers,
     of: ours, at most: 0.001 deg}
calculations:
  - {id: C01, template: reference-attitudes, convention: ours, answers: {file: answers.csv, source: ICD 4},
     shows: [IF-1]}
"""
MATRIX = [f"m{row}{column}" for row in (1, 2, 3) for column in (1, 2, 3)]


@pytest.fixture
def trial(tmp_path: Path) -> Path:
    (tmp_path / "outputs").mkdir()
    workbook = tmp_path / "trial"
    workbook.mkdir()
    (workbook / "workbook.yaml").write_text(WORKBOOK)
    return workbook


def answered(kit: Path, letters: str) -> str:
    """What a supplier's program prints for the rows of the kit, by scipy's rotations about `letters`."""
    lines = [line for line in (kit / "reference-attitudes.csv").read_text().splitlines() if not line.startswith("#")]
    rows = []
    for line in csv.DictReader(lines):
        angles = [float(line[f"{name}_deg"]) for name in ("heading", "pitch", "roll")]
        matrix = Rotation.from_euler(letters, angles, degrees=True).as_matrix()
        rows.append(",".join([line["row"], *(f"{value:.17g}" for value in matrix.ravel())]))
    return "\n".join([",".join(["row", *MATRIX]), *rows]) + "\n"


def verdict(trial: Path) -> dict:
    (file,) = (trial.parent / "outputs").rglob("results.json")
    (requirement,) = json.loads(file.read_text())["requirements"]
    return requirement


def test_wrong_answers_fail_a_requirement_and_right_ones_meet_it(trial: Path, tmp_path: Path, capsys) -> None:
    kit = tmp_path / "kit"
    # the kit needs no answers yet
    (trial / "answers.csv").write_text("row\n")
    assert outcome(["handover", str(trial), "ours", "--to", str(kit)]) is ExitCode.OK

    (trial / "answers.csv").write_text(answered(kit, "zyx"))  # turns about fixed axes in our order: another function
    assert outcome(["handover", str(trial), "ours", "--answers", str(trial / "answers.csv")]) is ExitCode.NOT_MET
    assert "explained by" in capsys.readouterr().out
    assert outcome(["compute", str(trial)]) is ExitCode.NOT_MET
    assert verdict(trial)["verdict"] == "does not meet"

    (trial / "answers.csv").write_text(answered(kit, "ZYX"))
    assert outcome(["handover", str(trial), "ours", "--answers", str(trial / "answers.csv")]) is ExitCode.OK
    assert outcome(["compute", str(trial)]) is ExitCode.OK
    assert verdict(trial)["verdict"] == "meets"
