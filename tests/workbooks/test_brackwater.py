"""The survey boat end to end: figures that can be checked by hand.

By hand: a pitch of at most 15 deg leaves 75 deg to lock, for the boat's angles and for rings with the outer axis fore
and aft; a pass 1.5 deg off the zenith asks the azimuth axis for its rate over sin 1.5 deg.
"""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

NANODEGREE = 1e-9


def test_it_computes_to_exit_code_zero_with_a_package(brackwater) -> None:
    assert brackwater.code == 0, brackwater.screen
    assert {calculation["state"] for calculation in brackwater.results["calculations"]} == {"computed"}
    assert all(row["verdict"] == "meets" for row in brackwater.results["requirements"])
    assert (brackwater.folder / "package.html").stat().st_size > 10_000
    assert (brackwater.folder / "package.pdf").read_bytes().startswith(b"%PDF")


def test_every_independent_check_agrees(brackwater) -> None:
    checks = [check for calculation in brackwater.results["calculations"] for check in calculation["checks"]]
    assert len(checks) >= 30
    assert all(check["agrees"] for check in checks)


@pytest.mark.parametrize(("region", "pitch"), [("working", 8.0), ("heavy", 15.0)])
def test_margins_and_clearances_are_ninety_degrees_less_the_pitch(brackwater, region: str, pitch: float) -> None:
    for quantity, of in (("lock margin", "motion-sensor"), ("gimbal clearance", "leveller")):
        found = brackwater.result(quantity, of, region)
        assert found["lo"] == pytest.approx(90.0 - pitch, abs=NANODEGREE)
        assert found["basis"] == "certified bound"


def test_the_overhead_pass_meets_the_keyhole_and_the_westerly_one_does_not(brackwater) -> None:
    assert brackwater.result("time lost", "pedestal", "overhead")["attained"] > 0.0
    assert brackwater.result("time lost", "pedestal", "westerly")["attained"] == 0.0
    assert 1.0 < brackwater.result("pass clearance", "pedestal", "overhead")["lo"] <= 1.5
    assert brackwater.result("time beyond rate, best tilt", "pedestal", "all passes")["attained"] == 0.0


def test_figures_of_the_hardware_are_in_the_package(brackwater) -> None:
    page = (brackwater.folder / "package.html").read_text(encoding="utf-8")
    for words in ("The sky seen from pedestal", "The rings at lock", "Budget about elevation", "motion-sensor on hull"):
        assert words in page


def _bench(*arguments: str) -> subprocess.CompletedProcess:
    program = str(Path(sys.executable).with_name("trunnion"))
    return subprocess.run([program, "bench", *arguments], capture_output=True, text=True, check=False)


def test_the_bench_sheet_comes_back_judged(tmp_path: Path) -> None:
    import csv

    workbook = str(Path(__file__).parents[2] / "workbooks" / "brackwater")
    done = _bench(workbook, "motion-sensor", "--to", str(tmp_path))
    assert done.returncode == 0, done.stderr
    assert (tmp_path / "motion-sensor-bench.html").read_text(encoding="utf-8").count('class="box"') == 57
    with (tmp_path / "motion-sensor-readings.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))

    def filled(name: str, sign: dict[str, float]) -> str:
        for row in rows:
            for number, text in enumerate(row["expected"].split(";"), start=1):
                value = float(text.split("±")[0].replace("−", "-"))
                row[f"reading {number}"] = f"{sign.get(row['instrument'], 1.0) * value:.2f}"
        with (tmp_path / name).open("w", encoding="utf-8", newline="") as stream:
            writer = csv.DictWriter(stream, fieldnames=list(rows[0]))
            writer.writeheader()
            writer.writerows(rows)
        return str(tmp_path / name)

    good = _bench(workbook, "motion-sensor", "--readings", filled("good.csv", {}))
    assert (good.returncode, good.stdout.splitlines()[0]) == (0, "pass")
    upside = _bench(workbook, "motion-sensor", "--readings", filled("gravity.csv", {"accelerometer": -1.0}))
    assert upside.returncode == 1
    assert "the mount itself is not inverted" in upside.stdout
    blank = _bench(workbook, "motion-sensor", "--readings", str(tmp_path / "motion-sensor-readings.csv"))
    assert blank.returncode == 2
    assert "no reading" in blank.stderr
    assert "Traceback" not in blank.stderr
