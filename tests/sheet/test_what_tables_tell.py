"""What the reader of a table noticed reaches the calculation: notes, accepted damage with counts, gaps as findings."""

from __future__ import annotations

import json
from pathlib import Path

from trunnion.sheet import display
from trunnion.sheet.sweep import EnvelopeSweep

LOCAL = {"name": "local", "axes": ["north", "east", "down"], "north": "true", "carried": "along"}
BODY = {"name": "body", "axes": ["forward", "starboard", "down"]}
ORDINARY = {"name": "ordinary", "reference": LOCAL, "body": BODY, "sequence": "3-2-1", "about": "moving axes",
            "angles": ["heading", "elevation", "bank"], "positive": "by axis", "maps": "body to reference"}  # fmt: skip
FLOWN = {"name": "flown", "table": "flown.csv", "scalar": "first", "maps": "body to local", "between samples": "slerp",
         "columns": {"time": {"column": "t", "unit": "s"}, "quaternion": ["w", "x", "y", "z"]}, "max gap": "0.5 s",
         "accept damaged": "one row lost in printing", "reference": LOCAL, "body": BODY}  # fmt: skip


def test_accepted_damage_and_gaps_are_told_with_counts(tmp_path: Path, monkeypatch) -> None:
    (tmp_path / "inputs").mkdir()
    rows = ["0.0,1,0,0,0", "0.1,1,0,0,0", "0.2,nan,0,0,0", "0.3,1,0,0,0", "2.3,1,0,0,0"]
    (tmp_path / "inputs" / "flown.csv").write_text("\n".join(["t,w,x,y,z", *rows]) + "\n")
    monkeypatch.chdir(tmp_path)
    shown: list = []
    monkeypatch.setattr(display, "show", shown.append)
    sweep = EnvelopeSweep(conventions={"ordinary": ORDINARY}, envelopes={"flown": FLOWN})
    sweep.show_assumptions()
    statement, finding = (json.dumps(item.bundle(), ensure_ascii=False) for item in shown)
    assert "flown is damaged, and the workbook accepts it: row 3: " in statement
    assert "against flown" in finding
    assert "gap" in finding
