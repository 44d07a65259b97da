"""Recorded results run again, here from the workbook and from its archive; searched in many archives."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import pytest

from trunnion.calculations import templates
from trunnion.calculations.digest import sha256
from trunnion.calculations.run import Outcome
from trunnion.records import recompute
from trunnion.records.find import INDEX, find
from trunnion.records.recompute import DIFFERS, REPRODUCED, WITHIN, compare_result

pytestmark = pytest.mark.needs("ssh-keygen")
RESULT = {
    "quantity": "q",
    "of": "a",
    "over": None,
    "unit": "deg",
    "basis": "exact",
    "lo": 20.0,
    "hi": 20.0,
    "attained": None,
}


def consents(desk) -> list[str]:
    found = []
    for path in sorted((desk.workbook / "templates").glob("*.ipynb")):
        found += ["--consent", sha256(path.read_bytes())]
    return found


@pytest.mark.parametrize(("now", "state"), [
    ({}, REPRODUCED), ({"lo": 20.0 + 1e-9}, WITHIN), ({"lo": 20.0 + 3e-8}, DIFFERS), ({"unit": "rad"}, DIFFERS),
    ({"basis": "sampled"}, DIFFERS), ({"attained": 20.0}, DIFFERS), ({"lo": float("nan")}, DIFFERS),
])  # fmt: skip
def test_results_are_compared_within_the_stated_tolerance(now: dict, state: str) -> None:
    assert compare_result("C01", "res:q", RESULT, {**RESULT, **now}).state == state


def test_a_result_that_is_gone_or_new_differs() -> None:
    assert compare_result("C01", "res:q", RESULT, None).why == "not recorded now"
    assert compare_result("C01", "res:q", None, RESULT).why == "not recorded then"


def test_a_workbook_is_recomputed_and_the_check_says_so(desk, capsys) -> None:
    assert desk.run("recompute", desk.workbook, *consents(desk)) == 0
    assert "2 reproduced" in capsys.readouterr().out
    desk.sign("prepared")
    desk.sign("checked")
    (path,) = (desk.workbook / "records" / "signatures" / "A").glob("checked-*.json")
    assert json.loads(path.read_text())["recomputed"]["summary"] == "2 reproduced"


def test_a_stored_result_that_is_not_what_runs_differs(desk, capsys, monkeypatch) -> None:
    """The stored notebooks stand for what runs."""

    def stored(folder, jobs, tell):
        bodies = {job.id: json.loads((desk.outputs / "A" / "bodies" / f"{job.key}.ipynb").read_bytes()) for job in jobs}
        return {name: Outcome(name, True) for name in bodies}, bodies

    monkeypatch.setattr(recompute, "_run", stored)
    results = desk.outputs / "A" / "results.json"
    results.write_text(results.read_text().replace('"lo": 65.0', '"lo": 65.5'))
    assert desk.run("recompute", desk.workbook, *consents(desk)) == 1
    assert "1 differs, 1 reproduced" in capsys.readouterr().out


def test_an_archive_is_recomputed_with_consent_to_each_content(archived_once, issued_once, capsys) -> None:
    path = archived_once / "MIN-001-A.zip"
    assert issued_once.run("recompute", path) == 1
    told = capsys.readouterr()
    assert "no consent to template tiny-margin" in told.out
    assert "runs as you, not isolated" in told.err
    assert issued_once.run("recompute", path, *consents(issued_once), "--json") == 0
    found = json.loads(capsys.readouterr().out)
    assert found["summary"] == "2 reproduced"
    assert [entry["template"] for entry in found["consents"]] == ["tiny-margin", "tiny-sum"]
    assert found["same_bodies"] == ["C01", "C02"]


def test_the_environment_is_reduced_to_the_named_list(monkeypatch) -> None:
    import os

    monkeypatch.setenv("SECRET_TOKEN", "x")
    with recompute.reduced_environment():
        assert set(os.environ) <= set(recompute.ENVIRONMENT)
    assert os.environ["SECRET_TOKEN"] == "x"


def test_an_installed_template_that_differs_is_said(archived_once, monkeypatch, tmp_path) -> None:
    """The same archive, as if its templates had come with the program and changed since."""
    root = Path(shutil.copytree(archived_once / "MIN-001-A", tmp_path / "bag"))
    local = root / "data" / "workbook" / "templates"
    shipped = tmp_path / "shipped"
    shutil.copytree(local, shipped)
    (root / "data" / "templates").mkdir(exist_ok=True)
    for path in sorted(local.glob("*.ipynb")):
        shutil.move(path, root / "data" / "templates" / path.name)
    text = (shipped / "tiny-margin.ipynb").read_text()
    (shipped / "tiny-margin.ipynb").write_text(text.replace("margin = 90.0 -", "margin = 90.5 -"))
    monkeypatch.setattr(templates, "shipped_folder", lambda: shipped)
    monkeypatch.setattr(recompute, "problems", lambda root: [])
    found = recompute.recompute_archive(root, consent=lambda template: False)
    assert [row.state for row in found.rows] == [DIFFERS, REPRODUCED]
    assert found.templates == ("template differs: tiny-margin (C01)",)
    asked = []
    found = recompute.recompute_archive(
        root, consent=lambda template: not asked.append(template.name), own_templates=True
    )
    assert [row.state for row in found.rows] == [REPRODUCED, REPRODUCED]
    assert asked == ["tiny-margin"]


def test_compare_takes_archives(archived_once, issued, capsys) -> None:
    issued.run("revise", issued.workbook, "--reason", "Steeper")
    issued.edit("steepest: 25 deg", "steepest: 30 deg")
    issued.run("compute", issued.workbook, "--no-pdf", "--quiet", "--allow-local-templates")
    capsys.readouterr()
    archive, now = archived_once / "MIN-001-A.zip", issued.outputs / "B"
    assert issued.run("compare", archive, now, "--json", "--html", issued.workbook / "c.html") == 0
    found = json.loads(capsys.readouterr().out)
    assert found["calculations"]["changed"] == ["C01"]
    assert issued.run("compare", archive, archived_once / "MIN-001-A") == 0
    assert "Nothing differs." in capsys.readouterr().out


def test_archives_are_searched_and_the_index_is_rebuilt_from_them(archived_once, issued_once, tmp_path, capsys) -> None:
    folder = tmp_path / "many"
    (folder / "deep").mkdir(parents=True)
    shutil.copy(archived_once / "MIN-001-A.zip", folder / "one.zip")
    shutil.copytree(archived_once / "MIN-001-A", folder / "deep" / "two")
    (folder / "broken.zip").write_bytes(b"PK\x05\x06 no archive")
    found = find(folder, ["lock margin", "ordinary"])
    assert {hit.archive for hit in found.hits} == {"one.zip", "deep/two"}
    assert {hit.kind for hit in found.hits} == {"result"}
    assert [name for name, _ in found.unread] == ["broken.zip"]
    for words, kind in ((["ada"], "person"), (["MIN-001"], "document"), (["R2", "meets"], "requirement")):
        assert {hit.kind for hit in find(folder, words).hits} == {kind}
    kept = (folder / INDEX).read_bytes()
    (folder / INDEX).write_text('{"schema": 1, "archives": {"one.zip": []}}')
    find(folder, ["ada"])
    assert (folder / INDEX).read_bytes() == kept
    key = issued_once.keys / "a1"
    assert issued_once.run("withdraw", folder / "one.zip", "--reason", "Wrong", "--key", key) == 0
    assert all(hit.withdrawn for hit in find(folder, ["ada"]).hits)
    assert issued_once.run("find", folder, "lock margin") == 0
    assert "WITHDRAWN" in capsys.readouterr().out
    assert issued_once.run("find", folder, "nowhere") == 1


def test_an_input_above_the_copied_size_is_not_held_and_said_so(desk, tmp_path, capsys) -> None:
    desk.edit("workbook: 1\n", "workbook: 1\n\nmax copied size: 10 B\n")
    assert desk.run("compute", desk.workbook, "--no-pdf", "--quiet", "--allow-local-templates") == 0
    desk.sign_all()
    assert desk.issue() == 0
    assert desk.run("archive", desk.workbook, "--key", desk.keys / "a1", "--into", tmp_path / "made") == 0
    path = tmp_path / "made" / "MIN-001-A.zip"
    held = tmp_path / "made" / "MIN-001-A" / "data"
    assert not (held / "workbook" / "data" / "numbers.csv").exists()
    assert "| inputs not held here | `data/numbers.csv` |" in (held / "CONTENTS.md").read_text()
    assert desk.run("audit", path, "--signers", desk.signers) == 0
    capsys.readouterr()
    assert desk.run("recompute", path, *consents(desk)) == 1
    assert "1 reproduced, 1 input not held" in capsys.readouterr().out
