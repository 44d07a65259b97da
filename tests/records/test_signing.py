"""Prepared, checked, approved: by three people, in that order, over exactly this content."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from trunnion.records import layout
from trunnion.records.casework import case_of, stored_results
from trunnion.records.rules import State, judge
from trunnion.spec import load_workbook

DAY = "2031-05-28"
pytestmark = pytest.mark.needs("ssh-keygen")


def standing(desk):
    workbook = load_workbook(desk.workbook)
    return judge(case_of(workbook, stored_results(workbook)))


def states(desk, role: str) -> dict[str, State]:
    return {name: mark.state for (name, own), mark in standing(desk).marks.items() if own == role}


def statements(desk, role: str) -> list[Path]:
    return sorted((desk.workbook / "records" / "signatures" / "A").glob(f"{role}-*.json"))


def test_three_signatures_make_a_revision_ready(desk, capsys) -> None:
    assert desk.run("status", desk.workbook) == 1
    desk.sign_all()
    capsys.readouterr()
    assert desk.run("status", desk.workbook) == 0
    told = capsys.readouterr().out
    assert "Ready to be issued." in told
    assert "not proven" in told
    assert told.count("SHA256:") == 6


def test_ssh_keygen_alone_enforces_person_and_role(desk) -> None:
    """The outside program, called as the finder's README says, judges a kept signature without Trunnion."""
    desk.sign("prepared")
    (statement,) = statements(desk, "prepared")

    def verify(person: str, space: str) -> int:
        command = ["ssh-keygen", "-Y", "verify", "-f", desk.signers, "-I", person, "-n", space]
        command += ["-s", f"{statement}.sig", "-O", "verify-time=20310528080000Z"]
        return subprocess.run(command, input=statement.read_bytes(), capture_output=True).returncode

    assert verify("p1", "prepared@trunnion") == 0
    assert verify("c1", "prepared@trunnion") != 0
    assert verify("p1", "checked@trunnion") != 0
    found = subprocess.run(
        ["ssh-keygen", "-Y", "find-principals", "-f", desk.signers, "-s", f"{statement}.sig"], capture_output=True
    )
    assert found.stdout.decode().strip() == "p1"


def test_the_order_is_kept(desk, capsys) -> None:
    assert desk.sign("checked") == 2
    assert "checked without prepared" in capsys.readouterr().err
    desk.sign("prepared")
    assert desk.sign("approved") == 2
    assert desk.sign("checked", "--time", "2031-05-28T07:59:59Z") == 2
    assert "checked is stated before prepared" in capsys.readouterr().err


def test_a_key_signs_only_as_what_the_list_grants(desk, capsys) -> None:
    assert desk.sign("prepared", key="c1") == 2
    told = capsys.readouterr().err
    assert "speaks for nobody who signs as prepared" in told
    assert 'namespaces="prepared@trunnion"' in told
    assert desk.sign("prepared", key="stranger") == 2


def test_one_key_under_two_names_is_one_person(desk, capsys) -> None:
    keys = desk.workbook / "records" / "allowed_signers"
    line = keys.read_text().splitlines()[0]
    keys.write_text(keys.read_text() + line.replace("p1 ", "c1 ").replace("prepared@", "checked@") + "\n")
    desk.sign("prepared")
    assert desk.sign("checked", key="p1") == 2
    assert "prepared and checked by the same person" in capsys.readouterr().err
    assert desk.sign("checked") == 2, "with another key of c1, who is p1 by the list"


def test_the_approver_may_check_where_the_workbook_says_so(desk) -> None:
    keys = desk.workbook / "records" / "allowed_signers"
    keys.write_text(keys.read_text().replace("approved@trunnion", "checked@trunnion,approved@trunnion"))
    desk.edit("signs as: [approved]", "signs as: [checked, approved]")
    desk.sign("prepared")
    assert desk.sign("checked", key="a1") == 0
    assert desk.sign("approved") == 2
    desk.edit("revision: A", "revision: A, approver may check: true")
    assert desk.sign("approved") == 0
    desk.run("bind", desk.workbook, "--no-pdf")
    assert "the approver may also have checked" in (desk.outputs / "A" / "package.html").read_text()


def test_a_check_states_method_and_reference(desk, capsys) -> None:
    desk.sign("prepared")
    key = desk.keys / "c1"
    assert desk.run("sign", desk.workbook, "--as", "checked", "--key", key) == 2
    assert "a check has a method" in capsys.readouterr().err
    assert desk.run("sign", desk.workbook, "--as", "checked", "--key", key, "--method", "alternate calculation") == 2
    assert "a check has a reference" in capsys.readouterr().err


def test_a_changed_limit_or_body_takes_the_signature_and_a_title_does_not(desk, capsys) -> None:
    desk.sign("prepared")
    desk.edit("title: Miniature", "title: Another title")
    assert desk.run("compute", desk.workbook, "--no-pdf", "--quiet", "--allow-local-templates") == 0
    assert set(states(desk, "prepared").values()) == {State.SIGNED}
    desk.edit("steepest: 25 deg", "steepest: 26 deg")
    capsys.readouterr()
    desk.run("impact", desk.workbook)
    assert "signature that will fall: C01: prepared by Ada Mill, 2031-05-28" in capsys.readouterr().out
    desk.edit("steepest: 26 deg", "steepest: 25 deg")
    desk.edit("at least: 20 deg", "at least: 21 deg")
    assert desk.run("compute", desk.workbook, "--no-pdf", "--quiet", "--allow-local-templates") == 0
    assert states(desk, "prepared") == {"C01": State.STALE, "C02": State.SIGNED}
    desk.edit("2.25", "2.00", "data/numbers.csv")
    desk.run("compute", desk.workbook, "--no-pdf", "--quiet", "--allow-local-templates")
    assert states(desk, "prepared") == {"C01": State.STALE, "C02": State.STALE}


def test_one_calculation_may_be_signed_alone(desk) -> None:
    desk.sign("prepared", "--calculation", "C02")
    assert states(desk, "prepared") == {"C01": State.NOT_SIGNED, "C02": State.SIGNED}


def test_what_bars_approval_is_named(desk, capsys) -> None:
    desk.edit(
        "requirements:\n", "assumptions:\n  - {id: AS-1, text: It is so., status: open, owner: p1}\n\nrequirements:\n"
    )
    desk.run("finding", "add", desk.workbook, "--against", "C01", "--text", "Which edition?", "--by", "c1")
    desk.sign("prepared")
    desk.sign("checked")
    capsys.readouterr()
    assert desk.sign("approved") == 2
    told = capsys.readouterr().err
    assert "assumption AS-1 is open (bars approval)" in told
    assert "finding F1 is open: Which edition? (bars approval)" in told


def test_an_unmet_requirement_needs_a_signed_deviation(desk, capsys) -> None:
    deviation = (
        "deviations:\n  - {id: DV-1, requirement: R1, reason: Flown below 60 deg., limits: This revision., "
        'expires: "2032-01-01", approved by: a1}\n\ncalculations:\n'
    )
    desk.edit("calculations:\n", deviation)
    desk.edit("at least: 20 deg", "at least: 70 deg")
    compute = ("compute", desk.workbook, "--no-pdf", "--quiet", "--allow-local-templates")
    assert desk.run(*compute) == 1
    desk.sign("prepared")
    desk.sign("checked")
    assert desk.sign("approved") == 2
    assert "R1: does not meet (DV-1 is not approved)" in capsys.readouterr().err
    assert desk.sign("approved", "--deviation", "DV-1", key="c1") == 2
    assert desk.sign("approved", "--deviation", "DV-1", "--time", "2032-05-01T00:00:00Z") == 2
    assert "expired on 2032-01-01" in capsys.readouterr().err
    assert desk.sign("approved", "--deviation", "DV-1") == 0
    assert desk.run(*compute) == 0, "the deviation holds; the verdict stays as computed"
    results = json.loads((desk.outputs / "A" / "results.json").read_text())
    assert results["requirements"][0]["verdict"] == "does not meet"
    assert desk.sign("approved") == 0
    assert desk.issue() == 0
    desk.edit("Flown below 60 deg.", "Flown below 65 deg.")
    assert standing(desk).approved_deviations == frozenset()


def test_nobody_approves_a_deviation_on_his_own_calculation(desk, capsys) -> None:
    row = "{id: DV-1, requirement: R1, reason: x, limits: y, expires: never, approved by: p1}"
    desk.edit("calculations:\n", f"deviations:\n  - {row}\n\ncalculations:\n")
    desk.edit("signs as: [prepared]", "signs as: [prepared, approved]")
    keys = desk.workbook / "records" / "allowed_signers"
    keys.write_text(keys.read_text().replace("prepared@trunnion", "prepared@trunnion,approved@trunnion"))
    desk.sign("prepared")
    assert desk.sign("approved", "--deviation", "DV-1", key="p1") == 2
    assert "deviation DV-1: approved by the preparer (p1)" in capsys.readouterr().err


def test_issue_refuses_until_the_rules_are_met_and_freezes_the_record(desk, capsys) -> None:
    assert desk.issue() == 2
    told = capsys.readouterr().err
    assert "C01, prepared: not signed" in told
    assert not (desk.workbook / "issued").exists()
    desk.sign_all()
    assert desk.issue("2031-05-27") == 2, "signed after the day of issue"
    assert desk.issue() == 0
    record = desk.workbook / "issued" / "A" / layout.RECORD
    assert len(list((record / "signatures").glob("*.json"))) == 3
    digests = json.loads((desk.workbook / "issued" / "A" / "digests.json").read_text())
    assert "record/allowed_signers" in digests["files"]
    assert desk.sign("prepared") == 2
    assert "revision A is issued; nothing is added to it" in capsys.readouterr().err
    page = (desk.outputs / "A" / "package.html").read_text()
    for name in ("Ada Mill", "Bo Carr", "Cy Dunn", "SHA256:", "review of inputs and results: CR-1"):
        assert name in page
    sheet = (desk.outputs / "A" / "C01-tiny-margin.ipynb").read_text()
    assert "Bo Carr" in sheet
    assert DAY in sheet


def test_unchanged_calculations_are_signed_by_reference(issued, capsys) -> None:
    assert issued.run("revise", issued.workbook, "--reason", "New limit for the sum") == 0
    issued.edit("at most: 7 deg", "at most: 8 deg")
    assert issued.run("compute", issued.workbook, "--no-pdf", "--quiet", "--allow-local-templates") == 0
    later = {"prepared": "2031-06-01T08:00:00Z", "checked": "2031-06-01T09:00:00Z", "approved": "2031-06-01T10:00:00Z"}
    assert issued.sign("prepared", "--time", later["prepared"]) == 0
    assert issued.sign("checked", "--unchanged", "--time", later["checked"]) == 0
    assert issued.sign("checked", "--unchanged", "--calculation", "C02", "--time", later["checked"]) == 2
    assert "C02 is not what was signed as checked" in capsys.readouterr().err
    assert issued.sign("checked", "--calculation", "C02", "--time", later["checked"]) == 0
    assert issued.sign("approved", "--time", later["approved"]) == 0
    assert issued.issue("2031-06-01") == 0
    assert (
        "unchanged since A, checked there by Bo Carr on 2031-05-28"
        in (issued.outputs / "B" / "package.html").read_text()
    )
    assert list((issued.workbook / "issued" / "B" / "record" / "former").glob("checked-c1-*.json"))


def test_a_replayed_signature_of_another_revision_does_not_stand(issued) -> None:
    issued.run("revise", issued.workbook, "--reason", "Nothing")
    issued.run("compute", issued.workbook, "--no-pdf", "--quiet", "--allow-local-templates")
    target = issued.workbook / "records" / "signatures" / "B"
    shutil.copytree(issued.workbook / "issued" / "A" / "record" / "signatures", target)
    found = standing(issued)
    assert {mark.state for mark in found.marks.values()} == {State.INVALID}
    assert "signed for MIN-001 revision A" in found.missing[0]


def test_changed_keys_and_roles_are_told(issued, capsys) -> None:
    issued.run("revise", issued.workbook, "--reason", "Nothing")
    issued.edit("signs as: [prepared]", "signs as: [prepared, approved]")
    keys = issued.workbook / "records" / "allowed_signers"
    keys.write_text(keys.read_text().replace("prepared@trunnion", "prepared@trunnion,approved@trunnion"))
    issued.run("compute", issued.workbook, "--no-pdf", "--quiet", "--allow-local-templates")
    capsys.readouterr()
    issued.run("status", issued.workbook)
    told = capsys.readouterr().out
    assert "p1: signs as prepared → prepared, approved since A" in told
    assert "of p1: new or changed since A" in told


def test_a_revoked_key_fails_at_every_stated_time(desk) -> None:
    desk.sign("prepared")
    shutil.copy(desk.keys / "p1.pub", desk.workbook / "records" / "revoked_keys")
    assert set(states(desk, "prepared").values()) == {State.INVALID}


@pytest.mark.parametrize("change", ["swap role", "flip a space", "another armour block", "no signature"])
def test_a_touched_statement_does_not_stand(desk, change: str) -> None:
    desk.sign("prepared")
    (path,) = statements(desk, "prepared")
    signature = path.with_name(path.name + ".sig")
    if change == "swap role":
        path.write_text(path.read_text().replace('"role": "prepared"', '"role": "checked"'))
    elif change == "flip a space":
        path.write_text(path.read_text() + " ")
    elif change == "another armour block":
        signature.write_bytes(signature.read_bytes() * 2)
    else:
        signature.unlink()
    found = standing(desk)
    assert all(mark.state is not State.SIGNED for mark in found.marks.values())


@pytest.mark.needs("ssh-agent", "ssh-add")
def test_an_agent_signs_with_the_public_half_alone(desk, tmp_path, monkeypatch) -> None:
    """The private key is in the agent and nowhere on the disk; hardware keys go the same way."""
    started = subprocess.run(["ssh-agent", "-s"], capture_output=True, text=True, check=True).stdout
    found = dict(re.findall(r"(SSH_AUTH_SOCK|SSH_AGENT_PID)=([^;]+);", started))
    for name, value in found.items():
        monkeypatch.setenv(name, value)
    try:
        subprocess.run(["ssh-add", "-q", desk.keys / "p1"], check=True, capture_output=True)
        shutil.copy(desk.keys / "p1.pub", tmp_path / "alone.pub")
        command = ("sign", desk.workbook, "--as", "prepared", "--time", "2031-05-28T08:00:00Z")
        assert desk.run(*command, "--key", tmp_path / "alone.pub") == 0
    finally:
        subprocess.run(["ssh-agent", "-k"], check=True, capture_output=True)
    assert set(states(desk, "prepared").values()) == {State.SIGNED}


def test_trunnion_opens_no_private_key(desk, monkeypatch) -> None:
    """Of a key file only the public half is read, whatever reads it in this process."""
    opened: list[str] = []
    watching = [True]  # a hook stays for the life of the process

    def hook(event: str, arguments: tuple) -> None:
        if event == "open" and watching:
            opened.append(str(arguments[0]))

    sys.addaudithook(hook)
    assert desk.sign("prepared") == 0
    watching.clear()
    assert str(desk.keys / "p1.pub") in opened
    assert str(desk.keys / "p1") not in opened


def test_findings_are_answered_by_the_preparer_and_closed_by_the_finder(desk, capsys) -> None:
    def run(*words: str) -> int:
        return desk.run("finding", words[0], desk.workbook, *words[1:])

    assert run("add", "--against", "C09", "--text", "x", "--by", "c1") == 2
    assert run("add", "--against", "C01 cell 4", "--text", "Which elevation?", "--by", "c1") == 0
    assert run("add", "--against", "data/numbers.csv", "--text", "Whose file?", "--by", "a1") == 2
    assert run("add", "--against", "R1", "--text", "Which edition?", "--by", "a1") == 0
    assert run("close", "F1", "--by", "c1") == 2
    assert "F1 is not answered yet" in capsys.readouterr().err
    assert run("answer", "F1", "--text", "The steepest flown.", "--by", "c1") == 2
    assert run("answer", "F1", "--text", "The steepest flown.", "--by", "p1") == 0
    assert run("close", "F1", "--by", "a1") == 2
    assert run("close", "F1", "--by", "c1", "--because", "Seen in the log.") == 0
    capsys.readouterr()
    run("list")
    told = capsys.readouterr().out
    assert "F1  closed" in told
    assert "F2  open" in told
    desk.run("bind", desk.workbook, "--no-pdf")
    page = (desk.outputs / "A" / "package.html").read_text()
    assert "Which edition?" in page
    assert "Seen in the log." in page


def test_an_input_without_a_source_is_a_finding_until_a_checker_closes_it(desk, capsys) -> None:
    desk.edit(", source: SYS 2", "")
    desk.run("compute", desk.workbook, "--no-pdf", "--quiet", "--allow-local-templates")
    desk.sign("prepared")
    desk.sign("checked")
    assert desk.sign("approved") == 2
    assert "finding source:requirements.R2 is open" in capsys.readouterr().err
    desk.run("finding", "answer", desk.workbook, "source:requirements.R2", "--text", "House rule.", "--by", "p1")
    assert desk.run("finding", "close", desk.workbook, "source:requirements.R2", "--by", "p1") == 2
    assert desk.run("finding", "close", desk.workbook, "source:requirements.R2", "--by", "c1") == 0
    assert desk.sign("approved") == 0


def test_all_lasting_files_are_written_by_the_one_module() -> None:
    """Records and commands write through `calculations.writes`; what they write else lies in temporary folders."""
    temporary = {"verification.py", "reading.py", "scratch.py", "recompute.py"}  # scratch copies only
    package = Path(layout.__file__).parents[1]
    for path in [*(package / "records").glob("*.py"), *(package / "cli").glob("*.py")]:
        text = path.read_text()
        found = re.findall(r"\.write_(?:text|bytes)\(|\.open\(\"[wxa]|\bopen\([^)]*\"[wxa]|shutil\.(?:copy|move)", text)
        through = len(re.findall(r"\bwrites\.write_(?:text|bytes)\(", text))
        assert len(found) == through or path.name in temporary, path
