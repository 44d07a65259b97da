"""Samples in an unknown convention, as columns of a file of any kind, with what is known of the true attitude.

The statement names columns and says what is known of them; the columns in question come as they stand. Whatever must be
known and is not said (where the scalar stands, which way a matrix maps, which way the vertical points) is asked for.
"""

from __future__ import annotations

import csv
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.rotations import matrix_from_quaternion
from trunnion.crosswalk.identify import printed_rotations
from trunnion.crosswalk.known_attitudes import from_gravity_and_heading, from_poses
from trunnion.crosswalk.study import Evidence
from trunnion.errors import Fault, Place, TableError
from trunnion.tables.candidates import Series
from trunnion.tables.files import file_error
from trunnion.tables.inspection import inspect_file
from trunnion.tables.nearest import nearest_hint
from trunnion.units import UNITS, shown

Array = NDArray[np.float64]

MOST_USED = 1000
"""Samples used at most; of longer files every n-th is taken (rates need them all and keep a stretch)."""

_MOST_RATES = 20_000
_KEYS = {
    "table": "the file",
    "topic": "the series of a log",
    "numbers": "the three columns in question",
    "quaternion": "four columns",
    "matrix": "nine columns",
    "known angles": "three columns in a known convention",
    "unit": "deg or rad, of the known angles",
    "scalar": "first or last",
    "maps": "body to reference, or reference to body",
    "order": "rows or columns",
    "gravity": "three columns",
    "gravity points": "down or up",
    "heading": "one column, deg from north",
    "heading of": "the body axis whose heading it is",
    "poses": "the column of poses in words",
    "rates": "three columns",
    "rate unit": "deg/s or rad/s",
    "time": "{column: …, unit: …}",
    "in question": "numbers, quaternion or matrix",
}
_WIDTHS = {"numbers": 3, "quaternion": 4, "matrix": 9, "known angles": 3, "gravity": 3, "rates": 3}
_KNOWN = ("quaternion", "matrix", "known angles", "gravity", "poses")


@dataclass(frozen=True, eq=False)
class _Columns:
    """A series of a file: its numeric columns, how to find a text column, and where it stands."""

    path: Path
    series: Series
    damage: tuple[str, ...] = ()

    def get(self, names: list[str] | tuple[str, ...]) -> Array:
        """(N, n) of named columns; TableError names the nearest column for one that is not there."""
        known = list(self.series.columns)
        faults = [
            Fault(f"there is no numeric column '{shown(name)}'", nearest_hint(name, known, 24), Place(self.path))
            for name in names
            if name not in self.series.columns
        ]
        if faults:
            raise TableError(faults)
        return np.stack([self.series.columns[name] for name in names], axis=-1)


def evidence_of(
    plain: Mapping[str, Any],
    root: Path,
    *,
    convention: Convention | None = None,
    reference: Frame | None = None,
    body: Frame | None = None,
    agree: bool = False,
) -> Evidence:
    """The evidence a plain statement describes; `table` is relative to `root`.

    convention: of the `known angles`. reference, body: the frames that gravity, headings and poses speak of.
    agree: quaternion, matrix and numbers are all in question, and nothing is known. Raises TableError with what is
    missing, AttitudeError for frames that do not name the directions needed.
    """
    _check(plain, agree)
    path = root / str(plain["table"])
    report = inspect_file(path)
    columns = _Columns(path, _series(path, report.series, plain.get("topic")), tuple(report.troubles))
    question = "all" if agree else _in_question(plain)
    held = {key: columns.get(plain[key]) for key in _WIDTHS if key in plain}
    usable = np.all([np.isfinite(values).all(axis=1) for values in held.values()], axis=0)
    truth, known = None, ""
    if not agree:
        truth, known, good = _truth(plain, columns, question, (convention, reference, body))
        usable &= good
    times = _times(plain, columns)
    chosen, notes = _chosen(usable, thin=times is None)
    taken = {key: values[chosen] for key, values in held.items()}
    asked = ("numbers", "quaternion", "matrix") if agree else (question,)
    rates = taken.get("rates")
    return Evidence(
        **{key: taken.get(key) for key in asked},
        names=_three(plain.get("numbers")),
        truth=None if truth is None else truth[chosen],
        known=known,
        times=None if times is None else times[chosen],
        rates=rates,
        rate_names=_three(plain.get("rates")),
        rate_degrees={"deg/s": True, "rad/s": False}.get(str(plain.get("rate unit"))),
        notes=(*(f"the file is damaged: {trouble}" for trouble in columns.damage), *notes),
        known_quaternion=taken.get("quaternion") if not agree and question != "quaternion" else None,
    )


def _three(names: Any) -> tuple[str, str, str]:
    first, second, third = names or ("first number", "second number", "third number")
    return str(first), str(second), str(third)


def _check(plain: Mapping[str, Any], agree: bool) -> None:
    """All that is wrong with the statement itself."""
    faults = [
        Fault(f"'{shown(str(key))}' is not a key of samples", nearest_hint(str(key), list(_KEYS)))
        for key in plain
        if key not in _KEYS
    ]
    if not isinstance(plain.get("table"), str):
        faults.append(Fault("'table' is missing", "name the file"))
    for key, width in _WIDTHS.items():
        names = plain.get(key)
        if names is not None and (not isinstance(names, list | tuple) or len(names) != width):
            faults.append(Fault(f"'{key}' does not name {width} columns", f"{key} is {_KEYS[key]}"))
    words = {"scalar": ("first", "last"), "order": ("rows", "columns"), "unit": ("deg", "rad"),
             "gravity points": ("down", "up"), "rate unit": ("deg/s", "rad/s"),
             "maps": ("body to reference", "reference to body")}  # fmt: skip
    for key, allowed in words.items():
        if plain.get(key) is not None and plain[key] not in allowed:
            faults.append(Fault(f"'{key}' is '{shown(str(plain[key]))}'", f"say {' or '.join(allowed)}"))
    if not agree:
        faults += [fault for key, fault in _QUESTIONS if key(plain)]
    if faults:
        raise TableError(faults)


def _known_in(plain: Mapping[str, Any], key: str) -> bool:
    return key in plain and _in_question(plain) != key


def _in_question(plain: Mapping[str, Any]) -> str:
    return str(plain.get("in question", "numbers"))


_QUESTIONS = (
    (
        lambda p: _in_question(p) not in ("numbers", "quaternion", "matrix") or _in_question(p) not in p,
        Fault("the columns in question are not named", "name numbers: [three columns], or say what is in question"),
    ),
    (
        lambda p: sum(_known_in(p, key) for key in _KNOWN) > 1,
        Fault(
            "more than one known attitude is stated", "state one of quaternion, matrix, known angles, gravity, poses"
        ),
    ),
    (
        lambda p: _known_in(p, "quaternion") and p.get("scalar") is None,
        Fault("where does the scalar of the known quaternion stand?", "say scalar: first or last"),
    ),
    (
        lambda p: (_known_in(p, "quaternion") or _known_in(p, "matrix")) and p.get("maps") is None,
        Fault("which way does the known attitude map?", "say maps: body to reference, or reference to body"),
    ),
    (
        lambda p: _known_in(p, "matrix") and p.get("order") is None,
        Fault("do the nine columns of the known matrix go by rows or by columns?", "say order: rows or columns"),
    ),
    (
        lambda p: "known angles" in p and p.get("unit") is None,
        Fault("what is the unit of the known angles?", "say unit: deg or rad"),
    ),
    (
        lambda p: "gravity" in p and ("heading" not in p or p.get("gravity points") is None),
        Fault(
            "gravity needs a heading, and which way its vector points",
            "say heading: COLUMN and gravity points: down (gravity itself) or up (specific force at rest)",
        ),
    ),
    (
        lambda p: "rates" in p and "time" not in p,
        Fault("rates need the time of each sample", "say time: {column: …, unit: …}"),
    ),
)


def _series(path: Path, found: list[Series], topic: Any) -> Series:
    """The series of the file that holds the columns, with its columns."""
    if topic is None:
        held = [series for series in found if series.columns]
        if len(held) == 1:
            return held[0]
        names = ", ".join(series.name for series in held[:12])
        raise file_error(
            path, f"the file holds {len(held)} series with numbers", f"say topic: one of {names}" * bool(held)
        )
    for series in found:
        if series.name == topic or series.name.partition("[")[0].partition(" of ")[0] == topic:
            if not series.columns:
                raise file_error(path, f"the numbers of '{topic}' can't be read column by column", "export it as CSV")
            return series
    raise file_error(
        path, f"the file holds no series '{shown(str(topic))}'", nearest_hint(str(topic), [s.name for s in found])
    )


def _truth(
    plain: Mapping[str, Any],
    columns: _Columns,
    question: str,
    around: tuple[Convention | None, Frame | None, Frame | None],
) -> tuple[Array | None, str, NDArray[np.bool_]]:
    """R_rb (N, 3, 3) as stated, in words, and which rows have it; rows without stand as the identity."""
    key = next((key for key in _KNOWN if key in plain and key != question), None)
    rows = len(next(iter(columns.series.columns.values())))
    if key is None:
        return None, "", np.ones(rows, dtype=bool)
    convention, reference, body = around
    if key == "gravity":
        values = columns.get([*plain["gravity"], str(plain["heading"])])
        known = from_gravity_and_heading(
            values[:, :3], np.radians(values[:, 3]), reference=_needed(reference), body=_needed(body),
            points_down=plain["gravity points"] == "down", heading_of=str(plain.get("heading of", "forward")),
        )  # fmt: skip
        return known.matrices, "gravity and heading", known.usable
    if key == "poses":
        texts = _text_column(columns.path, str(plain["poses"]), rows)
        posed = from_poses(texts, reference=_needed(reference), body=_needed(body))
        return posed.matrices, "poses in words", posed.usable
    values = columns.get(plain[key])
    good: NDArray[np.bool_] = np.asarray(np.isfinite(values).all(axis=1))
    if key == "known angles":
        if convention is None:
            raise file_error(columns.path, "the known angles have no convention", "name the convention they are in")
        turned = np.where(good[:, None], values, 0.0)
        stated = np.radians(turned) if plain["unit"] == "deg" else turned
        return convention.matrix(stated), f"angles in '{convention.name}'", good
    if key == "quaternion":
        good &= np.abs(np.linalg.norm(values, axis=1) - 1.0) < 0.01
        q = np.where(
            good[:, None], values, [1.0, 0.0, 0.0, 0.0] if plain["scalar"] == "first" else [0.0, 0.0, 0.0, 1.0]
        )
        q = q / np.linalg.norm(q, axis=1, keepdims=True)
        R = matrix_from_quaternion(q if plain["scalar"] == "first" else np.roll(q, 1, axis=1))
        words = f"the quaternion, scalar {plain['scalar']}, {plain['maps']}"
    else:
        R = np.where(good[:, None, None], values.reshape(-1, 3, 3), np.eye(3))
        R = printed_rotations(R if plain["order"] == "rows" else np.swapaxes(R, 1, 2), "a known matrix")
        words = f"the matrix by {plain['order']}, {plain['maps']}"
    return (R if plain["maps"] == "body to reference" else np.swapaxes(R, 1, 2)), words, good


def _needed(frame: Frame | None) -> Frame:
    if frame is None:
        cause = "gravity, headings and poses speak of directions that no frame names"
        raise TableError(
            [Fault(cause, "state the axes of both frames: north, east, down and forward, starboard, down")]
        )
    return frame


def _text_column(path: Path, name: str, rows: int) -> list[str]:
    """A column of texts of a CSV, as many rows as were looked at."""
    if path.suffix.lower() not in (".csv", ".txt"):
        raise file_error(path, "poses in words are read from CSV only", "export the table as CSV")
    with path.open(encoding="utf-8-sig", errors="replace", newline="") as handle:
        reader = csv.DictReader(line for line in handle if line.strip() and not line.startswith("#"))
        if name not in (reader.fieldnames or ()):
            raise file_error(path, f"there is no column '{shown(name)}'", nearest_hint(name, reader.fieldnames or ()))
        found = [row[name] or "" for row, _ in zip(reader, range(rows), strict=False)]
    if len(found) != rows:
        raise file_error(path, f"column '{name}' has {len(found)} rows, the numbers {rows}", "quote texts with commas")
    return found


def _times(plain: Mapping[str, Any], columns: _Columns) -> Array | None:
    time = plain.get("time")
    if time is None:
        return None
    if not isinstance(time, Mapping) or time.get("unit") not in UNITS or UNITS[time["unit"]].kind != "time":
        raise TableError([Fault("'time' does not name column and unit", "write time: {column: t, unit: s}")])
    raw = columns.get([str(time["column"])])[:, 0]
    return (raw - raw[np.isfinite(raw)][:1]) * UNITS[time["unit"]].to_inside(1.0)


def _chosen(usable: NDArray[np.bool_], *, thin: bool) -> tuple[NDArray[np.intp], tuple[str, ...]]:
    """Which rows are used, and what is said about the others."""
    rows = np.flatnonzero(usable)
    notes = []
    left_out = len(usable) - len(rows)
    if left_out:
        first = int(np.flatnonzero(~usable)[0]) + 1
        notes.append(f"{left_out} rows without usable numbers are left out (the first is row {first})")
    if not len(rows):
        raise TableError(
            [Fault("no row has usable numbers in all columns named", "look at the columns: trunnion inspect")]
        )
    if thin and len(rows) > MOST_USED:
        kept = rows[np.unique(np.linspace(0, len(rows) - 1, MOST_USED).astype(int))]
        notes.append(f"of {len(rows)} rows {len(kept)} spread evenly are used")
        rows = kept
    elif len(rows) > _MOST_RATES:
        notes.append(f"of {len(rows)} rows the first {_MOST_RATES} are used")
        rows = rows[:_MOST_RATES]
    return rows, tuple(notes)
