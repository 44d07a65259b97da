"""Reference attitudes as tables two parties exchange: CSV and JSON out, answers in. Degrees in the files."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.crosswalk.answers import AnswerKind, all_rows
from trunnion.crosswalk.reference import ReferenceSet
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

MATRIX_COLUMNS = tuple(f"m{row}{column}" for row in (1, 2, 3) for column in (1, 2, 3))
QUATERNION_COLUMNS = ("q0", "q1", "q2", "q3")
_LARGEST_ANSWERS = 1 << 20  # bytes; a file of answers has a few dozen lines


def row_names(reference: ReferenceSet) -> tuple[str, ...]:
    """`A1` … for the regular rows, `L1` … for those at and near lock."""
    regular = [f"A{number}" for number in range(1, len(reference.regular.angles) + 1)]
    return (*regular, *(f"L{number}" for number in range(1, len(reference.extra.angles) + 1)))


def angle_columns(reference: ReferenceSet) -> tuple[str, str, str]:
    """Column names of the three angles: their names with the unit, spaces as underscores."""
    first, second, third = (f"{name.replace(' ', '_')}_deg" for name in reference.convention.angle_names)
    return first, second, third


def as_csv(reference: ReferenceSet, statement: Sequence[str]) -> str:
    """The rows as CSV with 17 significant digits; the convention in words goes before, on lines that start with #."""
    rows = all_rows(reference)
    text = io.StringIO()
    for line in statement:
        text.write("# " + " ".join(line.split()) + "\n")
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(["row", *angle_columns(reference), *MATRIX_COLUMNS, *QUATERNION_COLUMNS])
    for index, name in enumerate(row_names(reference)):
        numbers = [*np.degrees(rows.angles[index]), *rows.matrices[index].ravel(), *rows.quaternions[index]]
        writer.writerow([name, *(f"{float(number):.17g}" for number in numbers)])
    return text.getvalue()


def as_json(reference: ReferenceSet, statement: Sequence[str]) -> str:
    """The same as JSON."""
    rows = all_rows(reference)
    words = ["" for _ in reference.regular.angles] + list(reference.extra_words)
    made = {
        "convention": {"name": reference.convention.name, "statement": list(statement)},
        "angle columns": list(angle_columns(reference)),
        "quaternion": "scalar first",
        "matrix": "rows of the matrix as the convention exchanges it",
        "rows": [
            {
                "row": name,
                "angles deg": [float(value) for value in np.degrees(rows.angles[index])],
                "matrix": rows.matrices[index].tolist(),
                "quaternion": rows.quaternions[index].tolist(),
                "note": words[index],
            }
            for index, name in enumerate(row_names(reference))
        ],
    }
    return json.dumps(made, indent=1, ensure_ascii=False) + "\n"


def read_answers(text: str, reference: ReferenceSet) -> tuple[AnswerKind, Array]:
    """Answers from CSV: `row` and the nine matrix entries, the four quaternion components, or the three angles.

    Rows may come in any order; each must be there once. Returns what was answered and the values in row order
    (angles in rad). Raises AttitudeError naming row and column.
    """
    if len(text) > _LARGEST_ANSWERS:
        raise AttitudeError("the file of answers is larger than 1 MiB", remedy="one line for each reference attitude")
    lines = [line for line in text.splitlines() if line.strip() and not line.lstrip().startswith("#")]
    table = list(csv.DictReader(lines))
    header = [name.strip() for name in (lines[0].split(",") if lines else [])]
    kind, columns = _answered(header, reference)
    found: dict[str, list[float]] = {}
    for number, line in enumerate(table, start=2):
        name = (line.get("row") or "").strip()
        if name in found:
            raise AttitudeError(f"row '{name}' is answered twice", remedy="one line for each reference attitude")
        found[name] = [_number(line, column, number) for column in columns]
    wanted = row_names(reference)
    missing = [name for name in wanted if name not in found]
    if missing:
        raise AttitudeError(f"no answer to row {', '.join(missing)}", remedy=f"answer {', '.join(wanted)}")
    unknown = [name for name in found if name not in wanted]
    if unknown:
        raise AttitudeError(
            f"there is no reference attitude '{unknown[0]}'", remedy=f"the rows are {', '.join(wanted)}"
        )
    values = np.array([found[name] for name in wanted])
    if kind is AnswerKind.MATRIX:
        return kind, values.reshape(-1, 3, 3)
    return kind, np.radians(values) if kind is AnswerKind.ANGLES else values


def _answered(header: list[str], reference: ReferenceSet) -> tuple[AnswerKind, tuple[str, ...]]:
    forms: dict[AnswerKind, tuple[str, ...]] = {
        AnswerKind.MATRIX: MATRIX_COLUMNS,
        AnswerKind.QUATERNION: QUATERNION_COLUMNS,
        AnswerKind.ANGLES: angle_columns(reference),
    }
    there = [kind for kind, columns in forms.items() if set(columns) <= set(header)]
    if "row" not in header or len(there) != 1:
        wanted = "; ".join(", ".join(columns) for columns in forms.values())
        what = "more than one form of answer" if len(there) > 1 else "no complete form of answer"
        raise AttitudeError(
            f"the answers hold {what} under the columns {', '.join(header) or 'none'}",
            remedy=f"give row and exactly one of: {wanted}",
        )
    return there[0], forms[there[0]]


def _number(line: dict[str, Any], column: str, number: int) -> float:
    text = (line.get(column) or "").strip()
    try:
        value = float(text)
    except ValueError as err:
        raise AttitudeError(f"line {number}, column {column}: '{text[:40]}' is no number") from err
    if not np.isfinite(value):
        raise AttitudeError(f"line {number}, column {column}: {text} is not finite")
    return value
