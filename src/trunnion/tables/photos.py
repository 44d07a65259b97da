"""Angles in photo metadata: the XMP packet of JPEG, TIFF or DNG files, read as text (DTD and entities are refused),
and the direction and date of EXIF.

A table is a folder of photos or one photo. Columns are named as the tags are: `GimbalYawDegree`, `Camera:Yaw`; without
a prefix a name must be unique. Rows are the photos in the order of their names; `time: {column: number}` counts them,
a tag with a date (`CreateDate`) gives seconds.
"""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from xml.parsers import expat

import numpy as np

from trunnion.errors import Fault, Place, TableError
from trunnion.tables.assembly import assemble
from trunnion.tables.ccsds_xml import safe_parser
from trunnion.tables.columns import Columns
from trunnion.tables.confine import Limits
from trunnion.tables.exif import exif_tags
from trunnion.tables.files import Seal, file_error
from trunnion.tables.nearest import nearest_hint
from trunnion.tables.questions import require_answers
from trunnion.tables.statements import TableStatement
from trunnion.tables.table import AttitudeTable
from trunnion.units import shown

SUFFIXES = (".jpg", ".jpeg", ".tif", ".tiff", ".dng", ".xmp")
_SEARCHED = 4 << 20  # bytes from the start of a file in which the packet must lie
_MAX_PHOTOS = 100_000


def read_photo_table(statement: TableStatement, path: Path, limits: Limits) -> AttitudeTable:
    """Angles of each photo in a stated convention."""
    require_answers("photo", statement, {}, path)
    seal = Seal.of(path)
    photos = photo_files(path)
    tags = [photo_tags(photo) for photo in photos]
    faults: list[Fault] = []
    values = [[_number(photo, found, name, faults) for photo, found in zip(photos, tags, strict=True)]
              for name in statement.columns]  # fmt: skip
    times = [
        _time(photo, found, place, statement, faults)
        for place, (photo, found) in enumerate(zip(photos, tags, strict=True))
    ]
    if faults:
        raise TableError(faults[:20])
    columns = Columns(np.array(times, dtype=np.int64), [np.array(column) for column in values])
    columns.notes = [f"{len(photos)} photos; angles from {', '.join(statement.columns)}"]
    columns.notes += _north_notes(tags, statement.columns)
    unit = "s" if statement.time_column in (None, "number") else "us"
    return assemble(columns, replace(statement, time_unit=unit), path, seal.sha256)


def photo_files(path: Path) -> list[Path]:
    """The photos of a folder by name, or the one photo."""
    if path.is_file():
        return [path]
    found = sorted(part for part in path.iterdir() if part.suffix.lower() in SUFFIXES)
    if not found or len(found) > _MAX_PHOTOS:
        raise file_error(path, f"the folder holds {len(found)} photos", f"looked for {', '.join(SUFFIXES)}")
    return found


def photo_tags(path: Path) -> dict[str, str]:
    """Tags of the XMP packet as `prefix:name` and text, and the EXIF tags that bear on attitude as `exif:name`.

    Raises TableError where there is neither, or a DTD in the packet.
    """
    with path.open("rb") as handle:
        data = handle.read(_SEARCHED)
    tags = exif_tags(data)
    start = data.find(b"<x:xmpmeta")
    end = data.find(b"</x:xmpmeta>", start)
    if start >= 0 and end >= 0:
        opening = data.rfind(b"<?xpacket begin", 0, start)
        packet = data[opening if opening >= 0 else start : end + len(b"</x:xmpmeta>")]
        return {**tags, **_parse(packet, path)}
    if not tags:
        raise file_error(path, "the photo holds no XMP packet and no direction", "its angles may be in a side-car file")
    return tags


def _parse(packet: bytes, path: Path) -> dict[str, str]:
    """Attributes and simple elements inside the packet's descriptions."""
    parser = safe_parser(path)
    tags: dict[str, str] = {}
    stack: list[str] = []
    texts: list[str] = []

    def start(tag: str, attributes: Mapping[str, str]) -> None:
        stack.append(tag)
        texts.append("")
        if len(stack) > 30:
            raise file_error(path, "the XMP packet nests too deep")
        if tag.endswith(":Description"):
            tags.update({key: value for key, value in attributes.items() if not key.startswith("xmlns")})

    def end(tag: str) -> None:
        stack.pop()
        text = texts.pop().strip()
        if text and stack and stack[-1].endswith(":Description"):
            tags[tag] = text

    def take(text: str) -> None:
        if texts:
            texts[-1] += text

    parser.StartElementHandler, parser.EndElementHandler, parser.CharacterDataHandler = start, end, take
    try:
        parser.Parse(packet, True)
    except expat.ExpatError as err:
        raise file_error(path, f"the XMP packet is broken: {expat.errors.messages[err.code]}") from err
    return tags


def _find(photo: Path, tags: dict[str, str], name: str, faults: list[Fault]) -> str | None:
    """The text of a tag by its full name, or by its plain name where that is unique."""
    if name in tags:
        return tags[name]
    found = [key for key in tags if key.partition(":")[2] == name]
    if len(found) == 1:
        return tags[found[0]]
    cause = f"the tag '{name}' is there as {shown(' and '.join(found), 200)}" if found else f"there is no tag '{name}'"
    faults.append(Fault(cause, nearest_hint(name, tags), Place(photo)))
    return None


def _number(photo: Path, tags: dict[str, str], name: str, faults: list[Fault]) -> float:
    text = _find(photo, tags, name, faults)
    try:
        return float(text) if text is not None else float("nan")
    except ValueError:
        faults.append(Fault(f"the tag '{name}' is '{shown(text or '', 40)}', not a number", place=Place(photo)))
        return float("nan")


def _time(photo: Path, tags: dict[str, str], place: int, statement: TableStatement, faults: list[Fault]) -> int:
    """Row number, or microseconds of a date tag (its own clock; an offset from UTC is applied)."""
    if statement.time_column in (None, "number"):
        return place
    text = _find(photo, tags, statement.time_column or "", faults)
    if text is None:
        return 0
    try:
        moment = _moment(text.strip())
    except ValueError:
        faults.append(
            Fault(f"the tag '{statement.time_column}' is '{shown(text, 40)}', not a date", place=Place(photo))
        )
        return 0
    zero = datetime.datetime(2000, 1, 1, tzinfo=moment.tzinfo and datetime.UTC)
    return (moment - zero) // datetime.timedelta(microseconds=1)


def _moment(text: str) -> datetime.datetime:
    """A date of XMP (ISO 8601) or of EXIF (2031:05:01 10:00:00)."""
    if text[4:5] == ":":
        return datetime.datetime.strptime(text, "%Y:%m:%d %H:%M:%S")
    return datetime.datetime.fromisoformat(text)


def _north_notes(tags: list[dict[str, str]], columns: tuple[str, ...]) -> list[str]:
    """Which north an EXIF direction counts from, as the files say."""
    if not any(name.endswith("GPSImgDirection") for name in columns):
        return []
    named = {"T": "true north", "M": "magnetic north"}
    norths = {named.get(found.get("exif:GPSImgDirectionRef", ""), "a north that is not said") for found in tags}
    return [f"GPSImgDirection counts from {' and '.join(sorted(norths))}"]
