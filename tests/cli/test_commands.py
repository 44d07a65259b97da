"""The commands: help, exit codes, and what they load."""

from __future__ import annotations

import errno
import hashlib
import json
import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from trunnion.cli.exits import ExitCode
from trunnion.cli.main import COMMANDS, outcome

REPOSITORY = Path(__file__).parents[2]
MINIATURE = REPOSITORY / "tests" / "calculations" / "miniature"
SEDGEWING = REPOSITORY / "workbooks" / "sedgewing"
HEAVY = ("nbformat", "papermill", "nbclient", "scipy", "sympy", "matplotlib", "IPython", "jupyter_client")


@pytest.fixture
def workbook(tmp_path: Path) -> Path:
    (tmp_path / "outputs").mkdir()
    return Path(shutil.copytree(MINIATURE, tmp_path / "miniature"))


def test_help_is_grouped_by_what_people_do(capsys) -> None:
    assert outcome(["--help"]) is ExitCode.OK
    text = capsys.readouterr().out
    heads = [text.index(f"\n{group}:") for group in ("Work", "Change", "Hand over", "Record")]
    assert heads == sorted(heads)
    assert all(f"  {entry.name} " in text for entry in COMMANDS)


@pytest.mark.parametrize("entry", COMMANDS, ids=lambda entry: entry.name)
def test_every_command_has_its_help(entry, capsys) -> None:
    assert outcome([entry.name, "--help"]) is ExitCode.OK
    assert "Usage: trunnion" in capsys.readouterr().out


def test_a_misspelt_command_names_the_nearest(capsys) -> None:
    assert outcome(["compite"]) is ExitCode.FAILED
    assert "Did you mean 'compute'?" in capsys.readouterr().err


@pytest.mark.parametrize(
    "arguments", [["compute", "nowhere"], ["readback", "nowhere"], ["impact", "nowhere"], ["issue", "nowhere"]]
)
def test_a_missing_workbook_is_a_message_and_code_2(arguments, capsys) -> None:
    assert outcome(arguments) is ExitCode.FAILED
    error = capsys.readouterr().err
    assert "there is no" in error
    assert "Traceback" not in error


def test_a_file_that_is_not_yaml_is_a_message_and_code_2(tmp_path, capsys) -> None:
    (tmp_path / "workbook.yaml").write_bytes(b"\x00\x01\xff")
    assert outcome(["compute", str(tmp_path)]) is ExitCode.FAILED
    assert len(capsys.readouterr().err.splitlines()) < 24


def test_a_defect_is_told_as_one_and_is_no_verdict(monkeypatch, capsys) -> None:
    import trunnion.cli.schema

    def broken(*_: object, **__: object) -> None:
        raise ZeroDivisionError

    monkeypatch.setattr(trunnion.cli.schema.command, "callback", broken)
    assert outcome(["schema"]) is ExitCode.FAILED
    assert "This is a defect of Trunnion" in capsys.readouterr().err


def test_compute_and_its_exit_codes(workbook: Path, capsys) -> None:
    arguments = ["compute", str(workbook), "--no-pdf", "--allow-local-templates"]
    assert outcome([*arguments, "--json"]) is ExitCode.OK
    captured = capsys.readouterr()
    assert json.loads(captured.out)["requirements"][0]["verdict"] == "meets"
    for template in (workbook / "templates").iterdir():
        digest = hashlib.sha256(template.read_bytes()).hexdigest()
        assert f"own template {template}  sha256 {digest}" in captured.err
    spec = workbook / "workbook.yaml"
    spec.write_text(spec.read_text().replace("at least: 20 deg", "at least: 66 deg"))
    assert outcome(arguments) is ExitCode.NOT_MET
    shown = capsys.readouterr().out
    assert "does not meet" in shown
    assert "package.html" in shown
    assert outcome([*arguments, "--quiet"]) is ExitCode.NOT_MET
    assert capsys.readouterr().out == ""
    assert outcome(arguments[:-1]) is ExitCode.FAILED
    assert "--allow-local-templates" in capsys.readouterr().err


def test_a_failed_calculation_quotes_cell_and_error_and_ends_with_2(workbook: Path, capsys) -> None:
    template = workbook / "templates" / "tiny-sum.ipynb"
    template.write_text(template.read_text().replace("math.fsum(numbers)", "math.fsum(numberz)"))
    assert outcome(["compute", str(workbook), "--no-pdf", "--allow-local-templates"]) is ExitCode.FAILED
    captured = capsys.readouterr()
    assert "C02 (tiny-sum) failed in cell 6 of 7" in captured.err
    assert "| total = math.fsum(numberz)" in captured.err
    assert "NameError: name 'numberz' is not defined" in captured.err
    assert "C02-tiny-sum.FAILED.ipynb" in captured.err
    assert "R1" in captured.out


def test_an_unwritable_output_folder_is_a_message_and_code_2(workbook: Path, capsys) -> None:
    outputs = workbook.parent / "outputs"
    outputs.chmod(0o500)
    unwritable = outputs if not os.access(outputs, os.W_OK) else Path("/sys")  # where even root may not write
    arguments = ["compute", str(workbook), "--allow-local-templates", "--output", str(unwritable)]
    assert outcome(arguments) is ExitCode.FAILED
    error = capsys.readouterr().err
    assert "--output DIR" in error
    assert "Traceback" not in error


def test_an_output_below_a_file_is_a_message_and_code_2(workbook: Path, capsys) -> None:
    blocked = workbook / "workbook.yaml"
    assert outcome(["compute", str(workbook), "--allow-local-templates", "--output", str(blocked)]) is ExitCode.FAILED
    assert "--output DIR" in capsys.readouterr().err


def test_a_full_disk_is_a_message_and_code_2(monkeypatch, workbook: Path, capsys) -> None:
    def full(_: int) -> None:
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    assert outcome(["compute", str(workbook), "--allow-local-templates"]) is ExitCode.FAILED
    assert "the disk is full" in capsys.readouterr().err
    left = [
        path for path in (workbook.parent / "outputs").rglob("*") if path.is_file() and path.name != ".lock.json.guard"
    ]
    assert left == []


def test_a_trial_value_without_trial_is_refused(workbook: Path, capsys) -> None:
    assert outcome(["compute", str(workbook), "--set", "requirements.R1.at least=25 deg"]) is ExitCode.FAILED
    assert "needs --trial" in capsys.readouterr().err


def test_start_writes_a_workbook_that_reads_back(tmp_path: Path, capsys) -> None:
    folder = tmp_path / "new"
    assert outcome(["start", str(folder)]) is ExitCode.OK
    assert outcome(["readback", str(folder)]) is ExitCode.OK
    assert "Convention driving-angles" in capsys.readouterr().out
    assert outcome(["start", str(folder)]) is ExitCode.FAILED
    assert "is not empty" in capsys.readouterr().err


def test_schema_is_json(capsys) -> None:
    assert outcome(["schema"]) is ExitCode.OK
    assert json.loads(capsys.readouterr().out)["title"] == "Trunnion workbook"


def test_templates_lists_what_each_takes_and_records(workbook: Path, capsys) -> None:
    assert outcome(["templates", str(workbook)]) is ExitCode.OK
    text = capsys.readouterr().out
    assert "envelope-sweep: Envelope sweep" in text
    assert "takes envelopes (envelopes)" in text
    assert "tiny-sum" in text


# Source digests are held still: an editor saving a file while tests run must not decide them.
GUARD = """
import sys
from trunnion.calculations import keys
keys.source_digests = lambda package: {}
from trunnion.cli.main import outcome
code = outcome(sys.argv[1:])
print([name for name in HEAVY if name in sys.modules], int(code), file=sys.stderr)
""".replace("HEAVY", repr(HEAVY))


def loaded(*arguments: str) -> tuple[str, str]:
    done = subprocess.run([sys.executable, "-c", GUARD, *arguments], capture_output=True, text=True, check=True)
    assert "Traceback" not in done.stderr
    listed, _, code = done.stderr.strip().splitlines()[-1].rpartition(" ")
    return listed, code


@pytest.mark.parametrize(
    "arguments",
    [["--help"], ["schema"], ["templates"], ["readback", str(MINIATURE)], ["readback", str(SEDGEWING)],
     ["impact", str(MINIATURE)], ["revise", str(MINIATURE), "--reason", "x"]],
    ids=lambda arguments: " ".join(Path(word).name for word in arguments),
)  # fmt: skip
def test_no_command_that_runs_no_notebook_loads_notebooks_or_numerics(arguments: list[str]) -> None:
    assert loaded(*arguments)[0] == "[]"


def test_computing_loads_none_of_them_in_this_process_either(workbook: Path) -> None:
    arguments = ["compute", str(workbook), "--no-pdf", "--allow-local-templates", "--quiet"]
    drawn = ("[]", "['matplotlib']")  # binding anew draws the statement pages
    listed, code = loaded(*arguments)
    assert listed in drawn
    assert code == "0"
    assert loaded(*arguments) == ("[]", "0")  # nothing changed: nothing is run and nothing is bound
    assert loaded("impact", str(workbook)) == ("[]", "0")
    listed, code = loaded("bind", str(workbook), "--no-pdf")
    assert listed in drawn
    assert code == "0"
    assert loaded("issue", str(workbook), "--no-pdf")[0] == "[]"  # refused or not, it runs no notebook
