"""Handing a convention over: statement, reference attitudes, source with self-tests; and judging the answers."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from trunnion.attitude.conventions import Convention
from trunnion.calculations.writes import write_bytes
from trunnion.crosswalk.answers import Judgement, all_rows, judge
from trunnion.crosswalk.exchange import as_csv, as_json, read_answers, row_names
from trunnion.crosswalk.reference import ReferenceSet, reference_set
from trunnion.errors import Place, TrunnionError

FOLDER = "handover"


def convention_of(workbook: Any, name: str) -> Convention:
    """A convention of a workbook; TrunnionError names the ones there are."""
    from trunnion.spec.build import convention_from_plain
    from trunnion.spec.plain import plain_part

    known = workbook.names("conventions")
    if name not in known:
        raise TrunnionError(
            f"this workbook has no convention '{name}'", remedy=f"it has {', '.join(known)}", place=Place(workbook.path)
        )
    return convention_from_plain(plain_part(workbook, "conventions", name))


def hand_over(workbook: Any, name: str, folder: Path) -> list[Path]:
    """Write the hand-over kit of one convention into `folder`: what was written, in order."""
    from trunnion.sheet.convention_page import stated_page
    from trunnion.spec.plain import plain_part
    from trunnion.symbolic.codegen import codegen

    convention = convention_of(workbook, name)
    reference = reference_set(convention)
    words = stated_page(plain_part(workbook, "conventions", name))
    lines = words.paragraphs()
    rows = all_rows(reference)
    files = {
        "statement.txt": "\n\n".join([words.title, *(_part(part) for part in words.parts)]) + "\n",
        "reference-attitudes.csv": as_csv(reference, lines),
        "reference-attitudes.json": as_json(reference, lines),
        **codegen(convention, list(zip(rows.angles, rows.matrices, rows.quaternions, strict=True))),
    }
    folder.mkdir(parents=True, exist_ok=True)
    written = []
    for file, text in files.items():
        write_bytes(folder / file, text.encode("utf-8"))
        written.append(folder / file)
    return written


def _part(part: Any) -> str:
    return "\n".join([part.title, "-" * len(part.title), *part.paragraphs])


def judge_answers(workbook: Any, name: str, answers: Path) -> tuple[ReferenceSet, Judgement]:
    """Judge a file of answers to the reference attitudes of one convention."""
    reference = reference_set(convention_of(workbook, name))
    try:
        text = answers.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as err:
        raise TrunnionError(f"the answers cannot be read: {err}", place=Place(answers)) from err
    try:
        kind, values = read_answers(text, reference)
        return reference, judge(reference, kind, values)
    except TrunnionError as err:
        raise TrunnionError(err.fault.cause, remedy=err.fault.remedy, place=Place(answers)) from err


def answer_lines(reference: ReferenceSet, found: Judgement) -> list[str]:
    """The judgement in lines for the screen: each row's miss, the verdict, the wrong reading behind a failure."""
    from trunnion.attitude.words import degrees_text

    names = row_names(reference)
    lines = [f"{name}  {degrees_text(float(miss), 4)}" for name, miss in zip(names, found.misses, strict=True)]
    if found.passed:
        return [*lines, f"pass: no row misses by more than {degrees_text(found.tolerance)}"]
    lines.append(f"fail: {names[found.worst]} misses by {degrees_text(float(found.misses[found.worst]), 4)}")
    if not found.explanations:
        return [*lines, "no single wrong reading explains every row"]
    return [*lines, "every row is explained by:", *(f"  {words}" for words in found.explanations)]
