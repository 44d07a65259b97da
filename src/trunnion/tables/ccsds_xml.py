"""Attitude messages in XML, read into the same blocks as the key-value notation. DTD and entities are refused.

Source: CCSDS-504.0-B-2 section 7 (same keys as tags).
"""

from __future__ import annotations

from pathlib import Path
from typing import NoReturn
from xml.parsers import expat

from trunnion.errors import Fault, Place, TableError
from trunnion.tables import ccsds_rules as rules
from trunnion.tables.ccsds_checks import attitude_type, check_blocks
from trunnion.tables.ccsds_message import AttitudeMessage, Block

_MAX_DEPTH = 20
_BLOCK_TAGS = {"quaternionState": "QUAT", "eulerAngleState": "EULER", "angVelState": "ANGVEL"}


def looks_like_xml(data: bytes) -> bool:
    """Does the text begin as XML does?"""
    return data.lstrip(b"\xef\xbb\xbf \t\r\n")[:1] == b"<"


def safe_parser(path: Path | str) -> expat.XMLParserType:
    """An expat parser that refuses DTDs, entities and external references, whatever the document wants."""
    parser = expat.ParserCreate()

    def refuse(*_: object) -> NoReturn:
        place = Place(path, parser.CurrentLineNumber)
        raise TableError([Fault("the XML declares a DTD or entities", "messages need neither; remove them", place)])

    parser.StartDoctypeDeclHandler = refuse
    parser.EntityDeclHandler = refuse
    parser.UnparsedEntityDeclHandler = refuse
    parser.ExternalEntityRefHandler = refuse
    return parser


class _Tree:
    """Collects the leaves of the document in order: (path of tags, text, line)."""

    def __init__(self, path: Path | str) -> None:
        self.path = path
        self.parser = safe_parser(path)
        self.parser.StartElementHandler = self._start
        self.parser.EndElementHandler = self._end
        self.parser.CharacterDataHandler = self._text
        self.root: tuple[str, dict[str, str]] | None = None
        self.stack: list[str] = []
        self.text: list[str] = []
        self.leaf = False
        self.events: list[tuple[str, str, str, int]] = []

    def _start(self, tag: str, attributes: dict[str, str]) -> None:
        if self.root is None:
            self.root = (tag, attributes)
        self.stack.append(tag)
        if len(self.stack) > _MAX_DEPTH:
            raise TableError([Fault("the XML nests too deep", place=Place(self.path, self.parser.CurrentLineNumber))])
        self.text, self.leaf = [], True
        self.events.append(("open", tag, "", self.parser.CurrentLineNumber))

    def _end(self, tag: str) -> None:
        self.stack.pop()
        text = "".join(self.text).strip() if self.leaf else ""
        self.events.append(("leaf" if self.leaf else "close", tag, text, self.parser.CurrentLineNumber))
        self.leaf = False

    def _text(self, text: str) -> None:
        self.text.append(text)


def parse_xml_message(data: bytes, path: Path | str) -> AttitudeMessage:
    """Parse an AEM or APM in XML. Raises TableError for broken XML, a DTD, or another root."""
    tree = _Tree(path)
    try:
        tree.parser.Parse(data, True)
    except expat.ExpatError as err:
        cause = f"the XML is broken: {expat.errors.messages[err.code]}"
        raise TableError([Fault(cause, place=Place(path, err.lineno))]) from err
    tag, attributes = tree.root or ("", {})
    editions = {"1.0": 1, "2.0": 2}
    if tag not in ("aem", "apm") or attributes.get("version") not in editions:
        raise TableError([Fault("this is no attitude message: the root must be aem or apm, version 1.0 or 2.0",
                                place=Place(path))])  # fmt: skip
    message = AttitudeMessage(tag.upper(), editions[attributes["version"]], Block("HEADER", 1))
    _Builder(message).run(tree.events)
    check_blocks(message)
    return message


class _Builder:
    """Sorts the leaves into header, metadata and data, as the key-value notation has them."""

    def __init__(self, message: AttitudeMessage) -> None:
        self.message = message
        self.block = message.header
        self.row: dict[str, str] | None = None

    def run(self, events: list[tuple[str, str, str, int]]) -> None:
        """Take the events in order."""
        for what, tag, text, line in events:
            if what == "open":
                self._open(tag, line)
            elif what == "leaf":
                self._leaf(tag, text, line)
            elif tag in ("attitudeState", "attitudeEphemeris") and self.row is not None:
                self._close_row(line)

    def _open(self, tag: str, line: int) -> None:
        aem = self.message.kind == "AEM"
        if tag == "metadata":
            self._begin("SEGMENT" if aem else "METADATA", line)
        elif tag == "data" and not aem:
            self._begin("DATA", line)
        elif tag == "attitudeState" and aem:
            self.row = {}
        elif tag in _BLOCK_TAGS and not aem:
            self._begin(_BLOCK_TAGS[tag], line)

    def _begin(self, kind: str, line: int) -> None:
        self.block = Block(kind, line)
        self.message.blocks.append(self.block)

    def _leaf(self, tag: str, text: str, line: int) -> None:
        if tag == "COMMENT":
            self.block.comments.append(text)
        elif self.row is not None:
            self.row[tag] = text
        elif rules.KEY.fullmatch(tag):
            self.block.values[tag] = text
            self.block.lines[tag] = line
            self.block.order.append((tag, line))

    def _close_row(self, line: int) -> None:
        assert self.row is not None
        types = rules.ROWS_B2 if self.message.edition == 2 else rules.ROWS_B1
        names = types.get(attitude_type(self.block), ())
        known = [self.row[name] for name in names if name in self.row]
        self.block.rows.append((line, [self.row.get("EPOCH", ""), *known]))
        self.row = None
