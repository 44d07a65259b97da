"""The checks on the blocks of a parsed attitude message: keys, their order, values, rows, times.

Source: CCSDS-504.0-B-2, tables and sections as named in `ccsds_rules`.
"""

from __future__ import annotations

from collections.abc import Callable

from trunnion.attitude.sequences import Sequence
from trunnion.errors import AttitudeError
from trunnion.tables import ccsds_rules as rules
from trunnion.tables.ccsds_message import AttitudeMessage, Block, Breach, elapsed, unknown_key
from trunnion.tables.nearest import nearest_hint

Note = Callable[[Breach], None]

_TIME_KEYS = ("CREATION_DATE", "EPOCH", "START_TIME", "STOP_TIME", "USEABLE_START_TIME", "USEABLE_STOP_TIME")
_FREE_TEXT = ("OBJECT_NAME", "OBJECT_ID", "ORIGINATOR", "MESSAGE_ID", "CLASSIFICATION")


def check_blocks(message: AttitudeMessage) -> None:
    """Put every broken rule of the blocks on the message's list. Edition 1 is checked only for what gives meaning."""
    note = message.breaches.append
    if message.edition == 2:
        _check_keys(message.header, rules.HEADER, note)
    if message.kind == "AEM":
        if not message.segments:
            note(Breach(message.header.line, "the message holds no META_START … META_STOP segment"))
        for segment in message.segments:
            _check_segment(message, segment, note)
    else:
        _check_apm(message, note)


def _check_keys(block: Block, table: tuple[tuple[str, bool], ...], note: Note) -> None:
    known = [key for key, _ in table]
    places = [known.index(key) for key, _ in block.order if key in known]
    for key, line in block.order:
        if key not in known:
            note(Breach(line, unknown_key(key, known)))
    for key, obligatory in table:
        if obligatory and key not in block.values:
            note(Breach(block.line, f"{key} is missing in this part"))
    if places != sorted(places):
        first = next(at for at in range(1, len(places)) if places[at] < places[at - 1])
        line = [line for key, line in block.order if key in known][first]
        note(Breach(line, f"{known[places[first]]} stands out of the fixed order", hard=False))
    _check_values(block, note)


def _check_values(block: Block, note: Note) -> None:
    for key, value in block.values.items():
        line = block.lines.get(key, block.line)
        if key in _TIME_KEYS:
            _check_time(block, value, line, note)
        elif key.startswith(("Q1", "Q2", "Q3", "QC", "ANGLE_")) or key in rules.ANGVEL:
            _check_number(value, line, key, note)
        elif key not in _FREE_TEXT and (words := rules.text_value_fault(value)):
            note(Breach(line, f"{key} = {value} {words}", hard=False))


def _check_time(block: Block, value: str, line: int, note: Note) -> int | None:
    try:
        return elapsed(block, value)
    except ValueError as err:
        note(Breach(line, str(err)))
        return None


def _check_number(value: str, line: int, key: str, note: Note) -> None:
    try:
        finite = abs(float(value)) < float("inf") and "_" not in value
    except ValueError:
        finite = False
    if not finite:
        note(Breach(line, f"{key} = '{value[:30]}' is not a finite number"))
    elif words := rules.number_fault(value):
        note(Breach(line, f"{key} = {value} {words}", hard=False))


def _check_segment(message: AttitudeMessage, segment: Block, note: Note) -> None:
    if message.edition == 2:
        _check_keys(segment, rules.AEM_METADATA, note)
    types = rules.ROWS_B2 if message.edition == 2 else rules.ROWS_B1
    kind = attitude_type(segment)
    if kind not in types:
        hint = nearest_hint(kind, types)
        note(Breach(segment.line, f"ATTITUDE_TYPE = '{kind[:40]}' is not known", remedy=hint))
        return
    _check_dependent_keys(message, segment, kind, note)
    _check_rows(segment, types[kind], note)


def attitude_type(segment: Block) -> str:
    """ATTITUDE_TYPE in upper case with underscores."""
    return rules.plain_value(segment.get("ATTITUDE_TYPE") or "").replace(" ", "_")


def _check_dependent_keys(message: AttitudeMessage, segment: Block, kind: str, note: Note) -> None:
    def breach(words: str, hard: bool = True) -> None:
        note(Breach(segment.line, words, hard))

    sequence = segment.get("EULER_ROT_SEQ")
    if kind.startswith("EULER") and sequence is None:
        breach(f"{kind} needs EULER_ROT_SEQ")
    if sequence is not None:
        if not kind.startswith("EULER"):
            breach("EULER_ROT_SEQ belongs to the EULER_ANGLE types only", hard=False)
        _check_sequence(message.edition, sequence, segment.lines["EULER_ROT_SEQ"], note)
    if message.edition == 1:
        needed = ("ATTITUDE_DIR", "QUATERNION_TYPE") if kind.startswith("QUATERNION") else ("ATTITUDE_DIR",)
        for key in needed:
            if key not in segment.values:
                breach(f"{key} is missing, and without it an edition 1 message has two meanings")
    else:
        if ("ANGVEL" in kind) != ("ANGVEL_FRAME" in segment.values):
            breach(f"ANGVEL_FRAME goes with the /ANGVEL types, this is {kind}", hard="ANGVEL" in kind)
        degree, method = segment.get("INTERPOLATION_DEGREE"), segment.get("INTERPOLATION_METHOD")
        if (method is None) != (degree is None):
            breach("INTERPOLATION_METHOD and INTERPOLATION_DEGREE go together", hard=False)
        if degree is not None and not degree.isdigit():
            breach("INTERPOLATION_DEGREE is not a whole number", hard=False)


def _check_sequence(edition: int, text: str, line: int, note: Note) -> None:
    marks = "123" if edition == 1 else "XYZ"
    try:
        Sequence.from_text(text)
    except AttitudeError as err:
        note(Breach(line, f"EULER_ROT_SEQ = '{text[:20]}': {err.fault.cause}"))
        return
    if not all(mark in marks for mark in text.upper()):
        words = f"EULER_ROT_SEQ = {text}: edition {edition} writes it with {', '.join(marks)}"
        note(Breach(line, words, hard=False))


def _check_rows(segment: Block, names: tuple[str, ...], note: Note) -> None:
    if not segment.rows:
        note(Breach(segment.line, "the segment holds no data lines"))
    last: int | None = None
    for line, cells in segment.rows:
        if len(cells) != 1 + len(names):
            words = f"{len(cells) - 1} values where this type has {len(names)} ({' '.join(names)})"
            note(Breach(line, words))
            continue
        for name, cell in zip(names, cells[1:], strict=True):
            _check_number(cell, line, name, note)
        now = _check_time(segment, cells[0], line, note)
        if now is not None and last is not None and now <= last:
            note(Breach(line, f"the time {cells[0]} is not after the one before"))
        last = now if now is not None else last
    _check_span(segment, note)


def _check_span(segment: Block, note: Note) -> None:
    """Data lie within START_TIME … STOP_TIME."""
    try:
        start, stop = (elapsed(segment, segment.values[key]) for key in ("START_TIME", "STOP_TIME"))
        times = [elapsed(segment, cells[0]) for _, cells in (segment.rows[:1] + segment.rows[-1:])]
    except (KeyError, ValueError, IndexError):
        return  # already reported
    if times and (start > times[0] or stop < times[-1]):
        note(Breach(segment.line, "the data reach beyond START_TIME … STOP_TIME", hard=False))


def _check_apm(message: AttitudeMessage, note: Note) -> None:
    if message.edition == 1:
        return
    kinds = {block.kind for block in message.blocks}
    tables = {"METADATA": rules.APM_METADATA, "DATA": (("COMMENT", False), ("EPOCH", True)), **rules.APM_BLOCKS}
    system = next((block.get("TIME_SYSTEM") for block in message.blocks if block.kind == "METADATA"), None)
    for needed, words in (("METADATA", "OBJECT_NAME"), ("DATA", "EPOCH")):
        if needed not in kinds:
            note(Breach(message.header.line, f"the message has no {words}"))
    if not kinds & set(rules.APM_BLOCKS):
        note(Breach(message.header.line, "the message holds no block of data"))
    for block in message.blocks:
        if block.kind == "DATA" and system:
            block.values.setdefault("TIME_SYSTEM", system)
        table = tables[block.kind]
        if table is not None:
            _check_keys(block, table, note)
        sequence = block.get("EULER_ROT_SEQ")
        if sequence is not None:
            _check_sequence(2, sequence, block.lines["EULER_ROT_SEQ"], note)
