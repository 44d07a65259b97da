"""What has to be known of each format before its numbers mean anything: answered by the file, stated, or asked.

The list of questions a format asks follows what goes wrong with it in the field; every unanswered question is named at
once, with the form in which to answer it. Nothing is guessed.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path

from trunnion.errors import Fault, Place, TableError
from trunnion.tables.statements import Form, TableStatement


@dataclass(frozen=True)
class Question:
    """One question: its key under `answers`, its words, the form of an answer, and what answers it without being asked.

    `answered` gets the statement and the facts read from the file and tells whether the question is settled.
    """

    key: str
    words: str
    remedy: str
    answered: Callable[[TableStatement, Mapping[str, str]], bool]

    def settled(self, statement: TableStatement, facts: Mapping[str, str]) -> bool:
        """True when the statement, an entry under `answers`, or the file itself answers."""
        return self.key in statement.answers or self.key in facts or self.answered(statement, facts)


def _never(statement: TableStatement, facts: Mapping[str, str]) -> bool:
    return False


def _in_answers(key: str, words: str, example: str) -> Question:
    return Question(key, words, f"state answers: {{{key}: {example}}}", _never)


_COLUMNS = Question(
    "columns",
    "which columns hold the attitude, in which order?",
    "state columns: {quaternion: [four names]}, {matrix: [nine names]} or {angles: [three names], unit: deg}",
    lambda s, facts: bool(s.columns),
)
_TIME = Question(
    "time",
    "which column is the time, in which unit?",
    "state columns: {time: {column: name, unit: s}}",
    lambda s, facts: bool(s.time_column and s.time_unit),
)
_SCALAR = Question(
    "scalar",
    "is the scalar part the first or the last of the four quaternion columns?",
    "state scalar: first, or scalar: last",
    lambda s, facts: s.form is not Form.QUATERNION or s.scalar is not None,
)
_ORDER = Question(
    "order",
    "do the nine columns fill the matrix row by row or column by column?",
    "state order: rows, or order: columns",
    lambda s, facts: s.form is not Form.MATRIX or s.order is not None,
)
_MAPS = Question(
    "maps",
    "which components does the rotation take to which: body to reference, or reference to body?",
    "state maps: body to reference (or with the frames' names), or the other way round",
    lambda s, facts: s.form is Form.ANGLES or s.body_to_reference is not None,
)
_CONVENTION = Question(
    "convention",
    "in which convention are the angles (sequence, moving or fixed axes, senses, zero attitude)?",
    "name the convention: convention: …",
    lambda s, facts: s.form is not Form.ANGLES or s.convention is not None,
)
_ANGLE_UNIT = Question(
    "unit",
    "in which unit are the angles?",
    "state columns: {angles: […], unit: deg}, or unit: rad",
    lambda s, facts: s.form is not Form.ANGLES or s.angle_unit is not None,
)
_BETWEEN = Question(
    "between samples",
    "what may be assumed of the attitude between two samples?",
    "state between samples: slerp, rate limited (with max rate), or samples (nothing)",
    lambda s, facts: s.between is not None,
)
_TOPIC = Question(
    "topic",
    "which series of the log holds the attitude?",
    "state topic: …",
    lambda s, facts: s.topic is not None,
)
_FRAMES = Question(
    "frames",
    "which of the file's two frames is the body, which the reference?",
    "state reference: … and body: … with the names the file uses",
    lambda s, facts: s.reference is not None and s.body is not None,
)

_MEANING = (_COLUMNS, _SCALAR, _ORDER, _MAPS, _CONVENTION, _ANGLE_UNIT, _BETWEEN)
_LAYOUT_GIVEN = (_MAPS, _BETWEEN)

_WORLD = _in_answers("world", "which way do the world frame's axes point?", "'x east, y north, z up'")
_CAMERA = _in_answers("moving axes", "which way do the moving frame's axes point?", "'x right, y down, z forward'")
_MOUNT = _in_answers("mount", "is the sensor's mount already taken out of the attitude?", "'applied' or 'not applied'")
_CLOCK = _in_answers("clock", "how many seconds lie between two rows?", "'0.1 s'")
_OFFSET = _in_answers("display offset", "is the message's attitude offset field used?", "'not used'")
_PHASE = _in_answers("phase frame", "does the meaning of the frame change with the flight phase?", "'no'")
_WHOSE = _in_answers("whose", "are these the gimbal's angles or the aircraft's?", "'gimbal'")
_PITCH_ZERO = _in_answers("pitch zero", "is pitch zero at the horizon or straight down?", "'horizon'")
_UPSIDE = _in_answers("roll 180", "is roll 180 at straight down the same camera turned, or upside down?", "'turned'")

QUESTIONS: dict[str, tuple[Question, ...]] = {
    "csv": (_TIME, *_MEANING),
    "parquet": (_TIME, *_MEANING),
    "mat": (_TIME, *_MEANING),
    "ulog": (_TOPIC, _TIME, *_MEANING),
    "tum": (*_LAYOUT_GIVEN, _WORLD, _CAMERA),
    "kitti": (*_LAYOUT_GIVEN, _WORLD, _CAMERA, _CLOCK),
    "bag": (_TOPIC, *_LAYOUT_GIVEN, _FRAMES, _WORLD, _MOUNT),
    "mavlink": (_TOPIC, _TIME, *_MEANING, _OFFSET),
    "dataflash": (_TOPIC, _TIME, *_MEANING, _PHASE),
    "photo": (_COLUMNS, _CONVENTION, _ANGLE_UNIT, _BETWEEN, _WHOSE, _PITCH_ZERO, _UPSIDE),
    "ccsds": (_FRAMES, _BETWEEN),
}


def require_answers(format_name: str, statement: TableStatement, facts: Mapping[str, str], path: Path) -> None:
    """Raise TableError with one fault for each question of the format that neither file nor statement answers."""
    faults = [
        Fault(f"not stated: {question.words}", question.remedy, Place(path))
        for question in QUESTIONS[format_name]
        if not question.settled(statement, facts)
    ]
    if faults:
        raise TableError(faults)
