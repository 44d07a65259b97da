"""A workbook from spec to verdicts, and what is kept when nothing or little changed."""

from __future__ import annotations

import hashlib
import json
from pathlib import Path

import nbformat
import pytest

from trunnion.calculations.digest import content_digest
from trunnion.calculations.notebooks import SHEET_TAG
from trunnion.calculations.sheets import body_bytes_of
from trunnion.calculations.verdicts import Verdict
from trunnion.errors import SpecError, StoreError, TemplateError, TrunnionError

MINIATURE = Path(__file__).parent / "miniature"


def outputs_of(workbook: Path, revision: str = "A") -> Path:
    return workbook.parent / "outputs" / workbook.name / revision


def checksums(folder: Path) -> dict[str, str]:
    return {
        path.relative_to(folder).as_posix(): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(folder.rglob("*"))
        if path.is_file() and not path.name.startswith(".")
    }


def test_a_computed_workbook_meets_and_keeps_everything(computed: Path) -> None:
    folder = outputs_of(computed)
    results = json.loads((folder / "results.json").read_text())
    assert [entry["state"] for entry in results["calculations"]] == ["computed", "computed"]
    assert [entry["verdict"] for entry in results["requirements"]] == ["meets", "meets"]
    margin = results["calculations"][0]["results"][0]
    assert (margin["lo"], margin["hi"], margin["unit"], margin["basis"]) == (65.0, 65.0, "deg", "certified bound")
    held = [path.name for path in (folder / "inputs").iterdir()]
    numbers = (computed / "data" / "numbers.csv").read_bytes()
    assert held == [f"{hashlib.sha256(numbers).hexdigest()[:12]}-numbers.csv"]
    assert not list(folder.rglob("lock.json"))


def test_bodies_are_valid_notebooks_without_times_or_paths(computed: Path) -> None:
    for path in (outputs_of(computed) / "bodies").iterdir():
        text = path.read_text(encoding="utf-8")
        nbformat.validate(nbformat.reads(text, as_version=4))
        assert str(computed.parent) not in text
        notebook = json.loads(text)
        assert "papermill" not in notebook["metadata"]
        assert all("papermill" not in cell["metadata"] for cell in notebook["cells"])


def test_a_sheet_without_its_tagged_cells_is_the_body_byte_for_byte(computed: Path) -> None:
    folder = outputs_of(computed)
    state = json.loads((folder / "state.json").read_text())
    for name, template in (("C01", "tiny-margin"), ("C02", "tiny-sum")):
        sheet = json.loads((folder / f"{name}-{template}.ipynb").read_text())
        nbformat.validate(nbformat.from_dict(sheet))
        assert any(SHEET_TAG in cell["metadata"].get("tags", []) for cell in sheet["cells"])
        body = (folder / "bodies" / f"{state['calculations'][name]['key']}.ipynb").read_bytes()
        assert body_bytes_of(sheet) == body


def test_the_digest_agrees_with_its_written_rule(computed: Path) -> None:
    """An independent rendering of the rule: SHA-256 of sorted, compact JSON of type, tags, source, outputs."""
    folder = outputs_of(computed)
    for path in (folder / "bodies").iterdir():
        body = json.loads(path.read_text())
        cells = []
        for cell in body["cells"]:
            outputs = []
            for output in cell.get("outputs", []):
                entry = {"type": output["output_type"]}
                entry.update(
                    {k: output[k] for k in ("data", "text", "name", "ename", "evalue", "traceback") if k in output}
                )
                outputs.append(entry)
            tags = cell["metadata"].get("tags", [])
            cells.append({"type": cell["cell_type"], "tags": tags, "source": cell["source"], "outputs": outputs})
        text = json.dumps(cells, sort_keys=True, ensure_ascii=False, separators=(",", ":"))
        assert content_digest(body) == hashlib.sha256(text.encode()).hexdigest()


def test_two_runs_give_the_same_bytes(computed: Path, tmp_path: Path, run) -> None:
    run(computed, output=tmp_path / "elsewhere")
    again = checksums(tmp_path / "elsewhere" / "miniature" / "A")
    assert again == checksums(outputs_of(computed))


def test_nothing_changed_runs_nothing_and_changes_nothing(computed: Path, run) -> None:
    before = checksums(outputs_of(computed))
    done = run(computed)
    assert not any(entry.fresh for entry in done.done)
    assert checksums(outputs_of(computed)) == before


def test_a_limit_title_text_or_comment_runs_no_notebook(computed: Path, run, edit) -> None:
    spec = computed / "workbook.yaml"
    bodies = checksums(outputs_of(computed) / "bodies")
    edit(spec, "title: Miniature", "title: Small")
    edit(spec, "at least: 20 deg", "at least: 70 deg")
    edit(spec, "text: Keep clear of lock.", "text: Keep well clear of lock.")
    edit(spec, "# A miniature", "# Still a miniature")
    done = run(computed)
    assert not any(entry.fresh for entry in done.done)
    assert done.judgements[0].verdict is Verdict.DOES_NOT_MEET
    assert not done.satisfied
    assert checksums(outputs_of(computed) / "bodies") == bodies
    sheet = (outputs_of(computed) / "C01-tiny-margin.ipynb").read_text()
    assert "does not meet" in sheet
    assert "70 deg" in sheet


def test_an_input_runs_only_what_reads_it(computed: Path, run, edit) -> None:
    edit(computed / "data" / "numbers.csv", "2.25", "2.75")
    done = run(computed)
    assert [entry.fresh for entry in done.done] == [False, True]
    assert done.judgements[1].verdict is Verdict.DOES_NOT_MEET


def test_text_cells_count_as_part_of_the_template(computed: Path, run, set_cell) -> None:
    set_cell(computed / "templates" / "tiny-margin.ipynb", 0, "# Another heading")
    assert [entry.fresh for entry in run(computed).done] == [True, False]


def test_a_new_revision_takes_bodies_over_byte_for_byte(computed: Path, run, edit) -> None:
    edit(computed / "workbook.yaml", "revision: A", "revision: B")
    done = run(computed)
    assert not any(entry.fresh for entry in done.done)
    assert checksums(outputs_of(computed, "B") / "bodies") == checksums(outputs_of(computed, "A") / "bodies")


def test_an_altered_body_is_set_aside_and_computed_again(computed: Path, run, edit) -> None:
    before = checksums(outputs_of(computed) / "bodies")
    name = next(iter(before))
    edit(outputs_of(computed) / "bodies" / name, '"cells"', '"cells" ')
    done = run(computed)
    assert sum(entry.fresh for entry in done.done) == 1
    after = checksums(outputs_of(computed) / "bodies")
    assert {key: after[key] for key in before} == before
    assert any(".altered-" in key for key in after)


def test_a_lost_state_costs_nothing(computed: Path, run) -> None:
    before = checksums(outputs_of(computed))
    (outputs_of(computed) / "state.json").unlink()
    assert not any(entry.fresh for entry in run(computed).done)
    assert checksums(outputs_of(computed)) == before


def test_a_template_that_raises_keeps_its_notebook_and_stops_nobody(miniature: Path, run, set_cell) -> None:
    set_cell(miniature / "templates" / "tiny-margin.ipynb", 3, "margin = 1 / 0")
    done = run(miniature)
    failed, other = done.done
    assert (failed.state, other.state) == ("failed", "computed")
    assert failed.failure.cell == 4  # the injected cell counts
    assert failed.failure.source == "margin = 1 / 0"
    assert "ZeroDivisionError: division by zero" in failed.error
    kept = outputs_of(miniature) / "C01-tiny-margin.FAILED.ipynb"
    assert "ZeroDivisionError" in kept.read_text()
    assert len(list((outputs_of(miniature) / "bodies").iterdir())) == 1
    assert not (outputs_of(miniature) / "C01-tiny-margin.ipynb").exists()
    assert done.judgements[0].verdict is Verdict.NOT_SHOWN


def test_a_kernel_that_dies_is_one_failed_calculation(miniature: Path, run, set_cell) -> None:
    set_cell(miniature / "templates" / "tiny-margin.ipynb", 3, "import os\nos._exit(1)")
    done = run(miniature)
    assert [entry.state for entry in done.done] == ["failed", "computed"]
    assert "the kernel died" in done.done[0].error


def test_a_mended_template_takes_the_failed_notebook_away(miniature: Path, run, set_cell) -> None:
    template = miniature / "templates" / "tiny-margin.ipynb"
    good = json.loads(template.read_text())["cells"][3]["source"]
    set_cell(template, 3, "raise ValueError('no')")
    run(miniature, only=["C01"])
    set_cell(template, 3, good)
    run(miniature, only=["C01"])
    assert not (outputs_of(miniature) / "C01-tiny-margin.FAILED.ipynb").exists()


def test_a_notebook_that_records_nothing_is_no_evidence(miniature: Path, run, set_cell) -> None:
    set_cell(miniature / "templates" / "tiny-sum.ipynb", 5, "total")
    done = run(miniature, only=["C02"])
    assert "recorded nothing" in done.done[1].error


def test_a_check_that_does_not_agree_leaves_the_requirement_not_shown(miniature: Path, run, edit) -> None:
    edit(miniature / "templates" / "tiny-margin.ipynb", "90.0 - parse", "91.0 - parse")
    done = run(miniature, only=["C01"])
    assert done.judgements[0].verdict is Verdict.NOT_SHOWN
    assert "does not agree" in done.judgements[0].why


def test_local_templates_ask_for_consent_with_name_and_digest(miniature: Path, run) -> None:
    with pytest.raises(TemplateError, match=r"tiny-margin.ipynb\s+sha256 [0-9a-f]{64}"):
        run(miniature, allow_local=False)
    assert not outputs_of(miniature).exists()


def test_a_local_template_may_not_bear_a_shipped_name(miniature: Path, run, edit) -> None:
    templates = miniature / "templates"
    (templates / "tiny-sum.ipynb").rename(templates / "envelope-sweep.ipynb")
    edit(miniature / "workbook.yaml", "template: tiny-sum", "template: envelope-sweep")
    with pytest.raises(SpecError, match="bears the name of a shipped one"):
        run(miniature)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("template: tiny-sum", "template: tiny-sums", "there is no template 'tiny-sums'\n.*did you mean 'tiny-sum'"),
        ("steepest: 25 deg", "steepst: 25 deg", "takes no 'steepst'\n.*did you mean 'steepest'"),
        (", steepest: 25 deg", "", "needs 'steepest', which is not given"),
        ("data/numbers.csv", "data/number.csv", "data/number.csv' can't be read"),
        ("data/numbers.csv", "../../numbers.csv", "leaves the workbook"),
    ],
)
def test_wrong_parameters_are_told_before_anything_runs(miniature: Path, run, edit, old, new, message) -> None:
    edit(miniature / "workbook.yaml", old, new)
    with pytest.raises(SpecError, match=message) as caught:
        run(miniature)
    assert "workbook.yaml:" in str(caught.value)
    assert not outputs_of(miniature).exists()


def test_a_promise_without_its_result_names_both(computed: Path, run, edit) -> None:
    edit(computed / "workbook.yaml", "data/numbers.csv, shows: [R2]", "data/numbers.csv, shows: [R1, R2]")
    with pytest.raises(SpecError, match="C02 promises to show R1"):
        run(computed)


def test_two_results_for_one_requirement_name_both(computed: Path, run, edit) -> None:
    edit(
        computed / "workbook.yaml",
        "calculations:\n",
        "calculations:\n  - {id: C03, template: tiny-margin, steepest: 25 deg}\n",
    )
    with pytest.raises(SpecError, match=r"two results answer R1: C03, .* and C01, "):
        run(computed)


def test_an_unknown_calculation_to_run_is_told(miniature: Path, run) -> None:
    with pytest.raises(TrunnionError, match="no calculation C09"):
        run(miniature, only=["C09"])


def test_a_unit_that_cannot_be_compared_is_told(computed: Path, run, edit) -> None:
    edit(computed / "workbook.yaml", "at most: 7 deg", "at most: 7 s")
    with pytest.raises(SpecError, match="R2 asks 7 s, and C02"):
        run(computed)


def test_a_missing_outputs_folder_falls_back_to_the_workbook(tmp_path: Path, miniature: Path) -> None:
    from trunnion.calculations.store import outputs_of as chosen

    (miniature.parent / "outputs").rmdir()
    assert chosen(miniature, None) in (miniature / "outputs", *(p / "outputs" for p in miniature.parents))
    assert chosen(miniature, tmp_path / "x") == tmp_path / "x"


def test_a_file_where_the_output_folder_should_be_is_told(miniature: Path, run, tmp_path: Path) -> None:
    blocked = tmp_path / "blocked"
    blocked.write_text("not a folder")
    with pytest.raises(StoreError, match="lies below something that is a file"):
        run(miniature, output=blocked)


def test_a_file_above_the_copied_size_is_listed_by_digest_only(miniature: Path, run, edit) -> None:
    edit(miniature / "workbook.yaml", "workbook: 1", "workbook: 1\nmax copied size: 5 B")
    done = run(miniature, only=["C02"])
    assert done.done[1].state == "computed", done.done[1].error
    (listed,) = done.results["calculations"][1]["inputs"]
    assert listed["held"] is None
    assert listed["sha256"] == hashlib.sha256((miniature / "data" / "numbers.csv").read_bytes()).hexdigest()
    assert list((outputs_of(miniature) / "inputs").iterdir()) == []


def test_a_sheet_that_tells_an_earlier_state_is_taken_away(computed: Path, run, edit) -> None:
    edit(computed / "workbook.yaml", "steepest: 25 deg", "steepest: 30 deg")
    run(computed, only=["C02"])
    assert not (outputs_of(computed) / "C01-tiny-margin.ipynb").exists()
    assert (outputs_of(computed) / "C02-tiny-sum.ipynb").exists()
    run(computed)
    assert (outputs_of(computed) / "C01-tiny-margin.ipynb").exists()


def test_nothing_is_written_into_the_workbook(computed_once: Path) -> None:
    assert checksums(computed_once / "miniature") == checksums(MINIATURE)


def test_a_decision_over_conventions_always_has_a_candidate_without_angles(computed: Path, run, edit) -> None:
    from trunnion.calculations.judgement import NO_ANGLES

    spec = computed / "workbook.yaml"
    edit(spec, "of: ordinary, at least: 20 deg", "of: D1, at least: 20 deg")
    decision = "  - {id: D1, chosen: ordinary, over: [ordinary], because: It is clear., rests on: [C01]}\n"
    spec.write_text(spec.read_text() + "\ndecisions:\n" + decision)
    first, second, _ = run(computed).judgements
    assert (first.candidate, first.counts, first.verdict) == ("ordinary", True, Verdict.MEETS)
    assert (second.candidate, second.counts, second.verdict) == (NO_ANGLES, False, Verdict.MEETS)
    assert second.value_text == "no singular attitude"


def test_an_old_body_altered_meanwhile_is_not_taken_back(computed: Path, run, edit) -> None:
    spec = computed / "workbook.yaml"
    former = next(iter(run(computed).done)).planned.key
    edit(spec, "steepest: 25 deg", "steepest: 30 deg")
    run(computed, only=["C01"])
    edit(outputs_of(computed) / "bodies" / f"{former}.ipynb", "65.0", "66.0")
    edit(spec, "steepest: 30 deg", "steepest: 25 deg")
    assert run(computed).done[0].fresh
