"""BagIt 1.0 bags: made from files by path, and checked rule by rule.

Source: RFC 8493. Fixed order, no clock, no machine: equal content gives equal bytes. The signature over the tag
manifest is the one file that no manifest lists.
"""

from __future__ import annotations

import datetime
import hashlib
import io
import re
import zipfile
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path

from trunnion.calculations.digest import sha256
from trunnion.errors import RecordError

DECLARATION = b"BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n"
BAGIT, INFO, MANIFEST, TAGS = "bagit.txt", "bag-info.txt", "manifest-sha256.txt", "tagmanifest-sha256.txt"
SIGNATURE = TAGS + ".sig"
PAYLOAD = "data/"
_LINE = re.compile(r"([0-9a-f]{64})  (\S.*)")
_MODE = 0o100644


def make(payload: Mapping[str, bytes], info: Sequence[tuple[str, str]], tags: Mapping[str, bytes]) -> dict[str, bytes]:
    """The files of a bag by path, without the signature. `payload` paths are below `data/`."""
    held = {PAYLOAD + path: content for path, content in sorted(payload.items())}
    size = sum(len(content) for content in held.values())
    lines = [*info, ("Payload-Oxum", f"{size}.{len(held)}")]
    files = {
        BAGIT: DECLARATION,
        INFO: "".join(f"{name}: {_one_line(value)}\n" for name, value in lines).encode("utf-8"),
        **{name: tags[name] for name in sorted(tags)},
        MANIFEST: manifest(held),
    }
    return {**files, TAGS: manifest(files), **held}


def manifest(files: Mapping[str, bytes]) -> bytes:
    """The manifest of files by path, sorted by path."""
    return "".join(f"{sha256(files[path])}  {_encoded(path)}\n" for path in sorted(files)).encode("utf-8")


def zipped(name: str, files: Mapping[str, bytes], day: str) -> bytes:
    """The bag as a zip archive under one folder: stored, sorted, with one date and one mode, so the same everywhere."""
    date = datetime.date.fromisoformat(day)
    made = io.BytesIO()
    with zipfile.ZipFile(made, "w", zipfile.ZIP_STORED) as archive:
        for path in sorted(files):
            entry = zipfile.ZipInfo(f"{name}/{path}", (max(date.year, 1980), date.month, date.day, 0, 0, 0))
            entry.create_system = 3
            entry.external_attr = _MODE << 16
            archive.writestr(entry, files[path])
    return made.getvalue()


def problems(root: Path) -> list[str]:
    """Everything that makes a folder no valid, complete bag of this kind; empty if it is one."""
    try:
        return list(_problems(root, files_of(root)))
    except RecordError as err:
        return [err.fault.cause]


def _problems(root: Path, present: set[str]) -> Iterator[str]:
    if "fetch.txt" in present:
        yield "fetch.txt asks for files that are not here"
    lacking = [name for name in (BAGIT, INFO, MANIFEST, TAGS) if name not in present]
    if lacking:
        yield f"missing: {', '.join(lacking)}"
        return
    if (root / BAGIT).read_bytes() != DECLARATION:
        yield f"{BAGIT} does not declare BagIt 1.0 in UTF-8"
    payload = {path for path in present if path.startswith(PAYLOAD)}
    tags = present - payload - {TAGS, SIGNATURE}
    for name, expected in ((MANIFEST, payload), (TAGS, tags)):
        listed = read_manifest(root / name)
        yield from (f"{path} is listed nowhere" for path in sorted(expected - set(listed)))
        yield from (f"{path} is listed in {name} and not here" for path in sorted(set(listed) - expected))
        for path in sorted(expected & set(listed)):
            if file_digest(root / path) != listed[path]:
                yield f"{path} is not what {name} lists"
    yield from _oxum(root, payload)


def _oxum(root: Path, payload: set[str]) -> Iterator[str]:
    size = sum((root / path).stat().st_size for path in payload)
    found = info_of(root).get("Payload-Oxum")
    if found != f"{size}.{len(payload)}":
        yield f"Payload-Oxum is {found}, and {size}.{len(payload)} is here"


def info_of(root: Path) -> dict[str, str]:
    """The entries of bag-info.txt; RecordError if it can't be read."""
    pairs = [line.partition(": ") for line in _text(root / INFO).splitlines()]
    if not all(colon for _, colon, _ in pairs) or len({name for name, _, _ in pairs}) != len(pairs):
        raise RecordError(f"{INFO} is not in order", remedy="take the archive from another copy")
    return {name: value for name, _, value in pairs}


def read_manifest(path: Path) -> dict[str, str]:
    """Digests by path; RecordError if a line is none, or a path is listed twice."""
    found: dict[str, str] = {}
    for line in _text(path).split("\n")[:-1]:
        match = _LINE.fullmatch(line)
        if match is None:
            raise RecordError(f"{path.name} has a line that is none: {line[:80]!r}", remedy="take another copy")
        name = match[2].replace("%0A", "\n").replace("%0D", "\r").replace("%25", "%")
        if name in found:
            raise RecordError(f"{path.name} lists {name} twice", remedy="take another copy")
        found[name] = match[1]
    return found


def files_of(root: Path) -> set[str]:
    """Every file below a folder, by path from it."""
    return {path.relative_to(root).as_posix() for path in root.rglob("*") if not path.is_dir()}


def file_digest(path: Path) -> str:
    """SHA-256 of a file, which is not held in memory."""
    with path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()


def _text(path: Path) -> str:
    content = path.read_bytes()
    try:
        text = content.decode("utf-8")
    except UnicodeDecodeError as err:
        raise RecordError(f"{path.name} is not UTF-8", remedy="take another copy") from err
    if text and not text.endswith("\n"):
        raise RecordError(f"{path.name} ends too early", remedy="take another copy")
    return text


def _encoded(path: str) -> str:
    return path.replace("%", "%25").replace("\r", "%0D").replace("\n", "%0A")


def _one_line(value: str) -> str:
    return " ".join(value.split())
