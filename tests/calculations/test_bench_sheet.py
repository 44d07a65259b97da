"""The bench sheet: what is filled in wrongly is named with its line, and names from the spec are never markup."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from trunnion.calculations import bench
from trunnion.errors import TrunnionError
from trunnion.spec import load_workbook

SEDGEWING = Path(__file__).parents[2] / "workbooks" / "sedgewing"


@pytest.fixture(scope="module")
def workbook() -> Any:
    """The example workbook."""
    return load_workbook(SEDGEWING)


def test_an_unknown_mount_is_answered_with_the_known_ones(workbook: Any) -> None:
    with pytest.raises(TrunnionError, match=r"no mount 'compass'(.|\n)*inertial-unit"):
        bench.bench_of(workbook, "compass")


def _filled(tmp_path: Path, workbook: Any, *rows: str) -> Path:
    heading = bench.blank_readings(bench.bench_of(workbook, "inertial-unit")).splitlines()[0]
    path = tmp_path / "readings.csv"
    path.write_text("\n".join([heading, *rows]) + "\n", encoding="utf-8")
    return path


@pytest.mark.parametrize(
    ("row", "words"),
    [
        ("accelerometer,level,x y z,g,1,zero,0,", "'zero' is not a number"),
        ("accelerometer,level,x y z,g,1,nan,0,", "not a finite number"),
        ("gyro,about forward,x y z,deg,1,0,0,", "'deg' is not a unit of angular rate"),
        ("accelerometer,sideways,x y z,g,1,0,0,", "no row 'sideways'"),
        ("compass,level,x y z,g,1,0,0,", "no instrument 'compass'"),
    ],
)
def test_what_is_filled_in_wrongly_is_named(row: str, words: str, workbook: Any, tmp_path: Path) -> None:
    with pytest.raises(TrunnionError, match=words):
        bench.judge(workbook, "inertial-unit", _filled(tmp_path, workbook, row))


def test_a_row_filled_in_twice_and_a_foreign_file_are_refused(workbook: Any, tmp_path: Path) -> None:
    row = "accelerometer,level,x y z,g,1,0,0,"
    with pytest.raises(TrunnionError, match="filled in twice"):
        bench.judge(workbook, "inertial-unit", _filled(tmp_path, workbook, row, row))
    foreign = tmp_path / "foreign.csv"
    foreign.write_text("a,b\n1,2\n", encoding="utf-8")
    with pytest.raises(TrunnionError, match="no column 'instrument'"):
        bench.judge(workbook, "inertial-unit", foreign)
    with pytest.raises(TrunnionError, match="can't be read"):
        bench.judge(workbook, "inertial-unit", tmp_path / "missing.csv")


def test_one_level_reading_passes_without_being_conclusive(workbook: Any, tmp_path: Path) -> None:
    found = bench.judge(workbook, "inertial-unit", _filled(tmp_path, workbook, "accelerometer,level,x y z,g,1,0,0,"))
    assert found.passed
    assert not bench.conclusive(found)
    assert any("too level" in line for line in bench.judgement_lines(found))


def test_names_from_the_spec_stay_text_on_the_page(workbook: Any) -> None:
    table = bench.bench_of(workbook, "inertial-unit")
    hostile = replace(table, mount=replace(table.mount, name="<script>alert(1)</script>"))
    assert "<script" not in bench.page(workbook, hostile)
