"""Impact, comparison, issue, revision and trial: what a change touches, told before and after."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import pytest

from trunnion.calculations import trial as trials
from trunnion.calculations.compare import change_rows, compare_results, interval
from trunnion.calculations.impact import impact
from trunnion.calculations.impact_text import impact_lines
from trunnion.calculations.issue import alterations, freeze
from trunnion.calculations.letters import next_letter
from trunnion.calculations.reasons import ReasonKind
from trunnion.calculations.revise import revise
from trunnion.errors import RecordError, StoreError, TrunnionError
from trunnion.spec import load_workbook

DAY = "2031-05-28"


def outputs_of(workbook: Path) -> Path:
    return workbook.parent / "outputs" / workbook.name


def against_computed(workbook: Path):
    return next(found for found in impact(load_workbook(workbook)) if found.baseline == "last computed state")


def issued(workbook: Path, run) -> Path:
    folders = []
    run(workbook, only=None, then=lambda done: folders.append(freeze(done, date=DAY)))
    return folders[0]


def test_nothing_changed_is_said(computed: Path) -> None:
    found = against_computed(computed)
    assert found.nothing
    assert list(impact_lines(found))[1] == "  nothing differs"


def test_a_moved_limit_gets_its_verdict_without_a_run(computed: Path, edit) -> None:
    edit(computed / "workbook.yaml", "at least: 20 deg", "at least: 66 deg")
    found = against_computed(computed)
    assert not any(entry.out_of_date for entry in found.calculations)
    first, second = found.verdicts
    assert (first.old, first.new, first.certain, first.flips) == ("meets", "does not meet", True, True)
    assert (second.new, second.flips) == ("meets", False)
    assert [change.text for change in found.spec] == ["requirements.R1.at least: 20 deg → 66 deg"]


def test_a_changed_parameter_names_itself_and_what_may_change(computed: Path, edit) -> None:
    edit(computed / "workbook.yaml", "steepest: 25 deg", "steepest: 30 deg")
    found = against_computed(computed)
    (reason,) = found.calculations[0].reasons
    assert reason.plain() == {"kind": "parameter", "what": "steepest", "old": "25 deg", "new": "30 deg"}
    assert not found.calculations[1].out_of_date
    assert [entry.certain for entry in found.verdicts] == [False, True]


def test_a_changed_data_file_is_told_by_content(computed: Path, edit) -> None:
    edit(computed / "data" / "numbers.csv", "2.25", "2.50")
    found = against_computed(computed)
    (reason,) = found.calculations[1].reasons
    assert reason.kind is ReasonKind.INPUT
    assert reason.what == "numbers.csv"
    assert reason.old != reason.new
    assert found.spec == ()


def test_new_and_removed_calculations_are_told(computed: Path, edit) -> None:
    edit(computed / "workbook.yaml", "id: C01", "id: C07")
    found = against_computed(computed)
    assert found.removed == ("C01",)
    assert [reason.kind for reason in found.calculations[0].reasons] == [ReasonKind.NEW]
    assert not found.verdicts[0].certain


def test_a_source_that_goes_up_an_edition_lists_what_cites_it(computed: Path, run, edit) -> None:
    spec = computed / "workbook.yaml"
    edit(spec, "frames:\n", 'sources:\n  - {id: SYS, title: System, edition: "1"}\n\nframes:\n')
    edit(spec, "text: Keep clear of lock.,", "text: Keep clear of lock., source: SYS 3.1,")
    run(computed)
    edit(spec, 'edition: "1"', 'edition: "2"')
    (source,) = against_computed(computed).sources
    assert (source.id, source.old, source.new) == ("SYS", "1", "2")
    assert source.to_be_confirmed == ("requirements.R1",)


def test_an_impact_writes_nothing(computed: Path, edit) -> None:
    edit(computed / "workbook.yaml", "steepest: 25 deg", "steepest: 30 deg")
    before = {path: path.stat().st_mtime_ns for path in computed.parent.rglob("*")}
    impact(load_workbook(computed))
    assert {path: path.stat().st_mtime_ns for path in computed.parent.rglob("*")} == before


# A hand-made pair of result sets and the table worked out by hand.
def _results(margins, verdict, limit, *, inputs="aa", extra=()):
    calculation = {
        "id": "C01", "digest": inputs, "state": "computed", "checks": [], "findings": [],
        "inputs": [{"path": "d.csv", "sha256": inputs, "held": None, "size": 1}],
        "figures": [{"id": "fig:m", "caption": "", "sha256": inputs}],
        "results": [
            {"id": f"res:{of}", "quantity": "lock margin", "of": of, "over": "hover", "lo": lo, "hi": hi,
             "attained": hi, "basis": "certified bound", "unit": "deg", "witness": None, "note": ""}
            for of, (lo, hi) in margins.items()
        ],
    }  # fmt: skip
    requirement = {
        "id": "R1", "of": "D1", "comparison": "at least", "limit": limit, "verdict": verdict,
        "candidates": [
            {"name": "a", "counts": True, "verdict": verdict},
            {"name": "b", "counts": False, "verdict": "meets"},
        ],
    }  # fmt: skip
    others = [{**calculation, "id": name, "results": []} for name in extra]
    return {
        "document": {"number": "X-1", "revision": "A"},
        "calculations": [calculation, *others],
        "requirements": [requirement],
        "decisions": [{"id": "D1", "chosen": "a", "over": ["a", "b"], "rests_on": ["C01"]}],
    }


def test_comparing_two_hand_made_result_sets_gives_the_hand_worked_table() -> None:
    old = _results({"a": (25.0, 25.5), "b": (30.0, 30.0), "gone": (1.0, 1.0)}, "meets", "20 deg", extra=["C08"])
    new = _results({"a": (18.5, 19.0), "b": (30.0, 30.0), "came": (2.0, 2.0)}, "does not meet", "20 deg", inputs="bb")
    found = compare_results(old, new, "old", "new")
    assert change_rows(found) == [
        ("R1, a", "meets", "does not meet", ""),
        ("lock margin of a over hover", "25 … 25.5 deg (certified bound)", "18.5 … 19 deg (certified bound)",
         "lo -6.5 deg, hi -6.5 deg, attained -6.5 deg"),
        ("lock margin of came over hover", "—", "2 deg (certified bound)", "new"),
        ("lock margin of gone over hover", "1 deg (certified bound)", "—", "removed"),
        ("calculation C08", "removed", "—", ""),
        ("input d.csv", "aa", "bb", ""),
        ("figure C01 fig:m", "aa", "bb", ""),
        ("figure C08 fig:m", "aa", "none", ""),
        ("decision D1", "", "", "to be revisited"),
    ]  # fmt: skip
    assert not found.same
    assert compare_results(new, new, "x", "y").same


def test_issuing_freezes_results_spec_and_digests(computed: Path, run) -> None:
    folder = issued(computed, run)
    assert sorted(path.name for path in folder.iterdir()) == ["digests.json", "results.json", "workbook.yaml"]
    assert (folder / "workbook.yaml").read_bytes() == (computed / "workbook.yaml").read_bytes()
    assert (folder / "results.json").read_bytes() == (outputs_of(computed) / "A" / "results.json").read_bytes()
    assert alterations(computed, outputs_of(computed)) == []
    with pytest.raises(RecordError, match="revision A is issued and never changed"):
        issued(computed, run)


@pytest.mark.parametrize("name", ["issued/A/results.json", "issued/A/workbook.yaml", "outputs/A/results.json"])
def test_an_issued_revision_edited_behind_the_tools_back_is_named(computed: Path, run, name: str) -> None:
    issued(computed, run)
    path = computed / name if name.startswith("issued") else outputs_of(computed) / "A" / "results.json"
    path.write_bytes(path.read_bytes() + b" ")
    (found,) = alterations(computed, outputs_of(computed))
    assert (found.revision, found.path.name, found.what) == ("A", path.name, "changed")


def test_an_issue_altered_with_its_digests_shows_once_another_follows(computed: Path, run) -> None:
    issued(computed, run)
    revise(load_workbook(computed), reason="Next")
    run(computed)
    issued(computed, run)
    assert alterations(computed) == []
    digests = computed / "issued" / "A" / "digests.json"
    digests.write_text(digests.read_text().replace(DAY, "2030-01-01"))
    assert [entry.path for entry in alterations(computed)] == [digests]


def test_an_issued_revision_is_not_computed_into(computed: Path, run, edit) -> None:
    issued(computed, run)
    run(computed)  # nothing to do is no change
    edit(computed / "workbook.yaml", "title: Miniature", "title: Other")
    with pytest.raises(StoreError, match="revision A is issued, and the spec says something else"):
        run(computed)


def test_the_outputs_of_an_issued_revision_can_be_rebuilt(computed: Path, run) -> None:
    issued(computed, run)
    shutil.rmtree(outputs_of(computed) / "A")
    run(computed)
    assert alterations(computed, outputs_of(computed)) == []


def test_changed_data_of_an_issued_revision_are_told(computed: Path, run, edit) -> None:
    issued(computed, run)
    edit(computed / "data" / "numbers.csv", "2.25", "2.50")
    with pytest.raises(StoreError, match="data differ now for C02; it stays as issued"):
        run(computed)


def test_an_incomplete_workbook_is_not_issued(miniature: Path, run, set_cell) -> None:
    set_cell(miniature / "templates" / "tiny-margin.ipynb", 3, "margin = 1 / 0")
    run(miniature)
    with pytest.raises(StoreError, match="out of date or failed: C01"):
        issued(miniature, run)
    assert not (miniature / "issued").exists()


def test_revising_edits_only_title_block_and_revision_table(computed: Path, run) -> None:
    issued(computed, run)
    before = (computed / "workbook.yaml").read_text().splitlines()
    done = revise(load_workbook(computed), reason='The limit moved: "25 deg"', date=DAY)
    assert (done.revision, done.supersedes) == ("B", "A")
    after = (computed / "workbook.yaml").read_text().splitlines()
    assert [line for line in before if line not in after] == [
        "document: {number: MIN-001, title: Miniature, revision: A}"
    ]
    document = load_workbook(computed).document
    assert (document.revision, document.supersedes) == ("B", "A")
    (row,) = load_workbook(computed).revisions
    assert (row.revision, row.supersedes, row.reason, row.date) == ("B", "A", 'The limit moved: "25 deg"', DAY)
    run(computed)
    issued(computed, run)
    revise(load_workbook(computed), reason="Again")
    assert [entry.revision for entry in load_workbook(computed).revisions] == ["B", "C"]


def test_only_an_issued_revision_is_superseded(computed: Path) -> None:
    with pytest.raises(RecordError, match="revision A is not issued"):
        revise(load_workbook(computed), reason="x")


@pytest.mark.parametrize(
    ("revision", "following"),
    [
        ("A", "B"),
        ("H", "J"),
        ("N", "P"),
        ("P", "R"),
        ("R", "T"),
        ("W", "Y"),
        ("Y", "AA"),
        ("AY", "BA"),
        ("YY", "AAA"),
        ("9", "10"),
    ],
)
def test_letters_skip_what_drawing_practice_skips(revision: str, following: str) -> None:
    """I, O, Q, S, X and Z are not used, as ASME Y14.35 has it (from memory)."""
    assert next_letter(revision) == following


@pytest.mark.parametrize("revision", ["I", "AO", "b", "A1", ""])
def test_a_revision_outside_the_series_has_no_follower(revision: str) -> None:
    with pytest.raises(TrunnionError, match="--revision"):
        next_letter(revision)


def test_a_trial_touches_no_revision(computed: Path, run) -> None:
    before = {path: path.read_bytes() for path in (outputs_of(computed) / "A").rglob("*") if path.is_file()}
    tried = load_workbook(computed, [("requirements.R1.at least", "70 deg")])
    done = trials.trial(tried, allow_local=True)
    assert not done.satisfied
    assert done.folder.path.name == "trial"
    assert {path: path.read_bytes() for path in (outputs_of(computed) / "A").rglob("*") if path.is_file()} == before
    with pytest.raises(TrunnionError, match="never computed into a revision"):
        run_with(tried)


def run_with(workbook):
    from trunnion.calculations.compute import compute

    return compute(workbook, allow_local=True)


def test_a_sweep_of_a_limit_brackets_the_flip_around_the_recorded_bound(computed: Path) -> None:
    values, unit = trials.parse_values("50 deg .. 80 deg in 4")
    assert [text for _, text in values] == ["50 deg", "60 deg", "70 deg", "80 deg"]
    found = trials.vary(
        lambda overrides: load_workbook(computed, overrides), "requirements.R1.at least", values, unit, allow_local=True
    )
    (flip,) = found.flips
    assert flip.start <= 65.0 <= flip.end
    assert flip.end - flip.start == pytest.approx(10 / 2**6)
    assert (flip.before, flip.after) == ("meets", "does not meet")
    json.dumps(found.plain(), allow_nan=False)


@pytest.mark.parametrize("text", ["5 deg", "1 deg .. 2 s", "1 .. 2", "1 deg .. 2 deg in 1000"])
def test_sweeps_that_make_no_sense_are_refused(text: str) -> None:
    with pytest.raises(TrunnionError):
        trials.parse_values(text)


def test_the_comparison_page_is_one_file_with_figures_side_by_side(tmp_path: Path) -> None:
    from trunnion.calculations.compare_page import page
    from trunnion.sheet.items import MIME

    def folder(name: str, svg: str) -> Path:
        (tmp_path / name).mkdir()
        data = {MIME: {"kind": "figure", "id": "fig:m"}, "image/svg+xml": svg}
        cell = {
            "cell_type": "code",
            "source": "",
            "metadata": {},
            "outputs": [{"output_type": "display_data", "data": data}],
        }
        notebook = {"nbformat": 4, "nbformat_minor": 5, "metadata": {}, "cells": [cell]}
        (tmp_path / name / "C01-x.ipynb").write_text(json.dumps(notebook))
        (tmp_path / name / "results.json").write_text(json.dumps({"calculations": [{"id": "C01", "template": "x"}]}))
        return tmp_path / name

    old = _results({"a<b>": (25.0, 25.5)}, "meets", "20 deg")
    new = _results({"a<b>": (18.5, 19.0)}, "does not meet", "20 deg", inputs="bb")
    text = page(compare_results(old, new, "o", "n"), folder("o", "<svg>1</svg>"), folder("n", "<svg>2</svg>"))
    assert text.count("data:image/svg+xml;base64,") == 2
    assert "a&lt;b&gt;" in text
    assert "<b>" not in text
    assert "http" not in text.replace("http-equiv", "")
    assert "<script" not in text


def test_the_package_holds_the_changes_since_the_superseded_revision(computed: Path, run, edit) -> None:
    from trunnion.cli.packaging import changes_since_superseded

    issued(computed, run)
    revise(load_workbook(computed), reason="A steeper slope")
    edit(computed / "workbook.yaml", "at least: 20 deg", "at least: 70 deg")
    rows = changes_since_superseded(run(computed))
    assert rows[0] == ("R1, ordinary", "meets", "does not meet", "limit at least 20 deg → at least 70 deg")
    assert ("input", "numbers") not in rows


def test_a_sweep_of_a_parameter_brackets_the_flip_with_recorded_results(computed: Path, edit, set_cell) -> None:
    set_cell(computed / "templates" / "tiny-margin.ipynb", 5, "# the check by hand holds for one value only")
    values, unit = trials.parse_values("60 deg, 80 deg")
    told = []
    found = trials.vary(
        lambda overrides: load_workbook(computed, overrides),
        "calculations.C01.steepest",
        values,
        unit,
        bisections=2,
        allow_local=True,
        tell=told.append,
    )
    (flip,) = found.flips  # the margin is 90 deg less the steepest, and 20 deg are asked for
    assert (flip.before, flip.after) == ("meets", "does not meet")
    assert flip.start <= 70.0 <= flip.end
    assert flip.end - flip.start == 5.0
    assert found.series("R1")["ordinary"][0] == [90.0 - step.number for step in found.steps]
    assert not any(step.failed for step in found.steps)


def test_a_one_sided_number_says_which_side_it_bounds():
    plain = {"lo": 28.0, "hi": None, "attained": None, "unit": "deg", "basis": "certified bound"}
    assert interval(plain) == "at least 28 deg (certified bound)"
    assert interval({**plain, "lo": None, "hi": 3.0}) == "at most 3 deg (certified bound)"
