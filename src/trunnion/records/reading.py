"""Opening an archive from somebody else: a zip or a folder, nothing of which is trusted.

A zip is refused before anything is written if an entry has an absolute or parent path, a backslash, a drive letter, a
control character, a name that is not UTF-8, a name that meets another one when case does not count, is a link or
encrypted, or if there are too many entries or bytes. Bytes are counted while they are written, not believed. Memory
stays within the central directory and one block; time within what the limits below take.
"""

from __future__ import annotations

import os
import stat
import struct
import tempfile
import unicodedata
import zipfile
import zlib
from collections.abc import Iterator, Sequence
from contextlib import ExitStack, contextmanager
from pathlib import Path, PurePosixPath

from trunnion.errors import RecordError

MOST_FILES = 20_000
LARGEST_DIRECTORY = 8_000_000  # bytes of the zip's central directory
LARGEST_TOTAL = 2_000_000_000  # bytes unpacked
LARGEST_EXPANSION = 100  # times the size of the zip, where that is more than LEAST_TOTAL
LEAST_TOTAL = 50_000_000
LONGEST_PATH = 500
DEEPEST = 20
_BLOCK = 1_000_000
_END = b"PK\x05\x06"
_METHODS = (zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED)
_COPY = "take the archive from another copy"


@contextmanager
def opened(path: Path) -> Iterator[Path]:
    """The root of the bag in an archive, unpacked for the time of the `with`; RecordError says why it is refused."""
    if path.is_dir() and not path.is_symlink():
        _require_plain_tree(path)
        yield path
        return
    if not path.is_file():
        raise RecordError(f"there is no archive {path}", remedy="name the zip, or the folder it was unpacked to")
    with tempfile.TemporaryDirectory(prefix="trunnion-archive-") as scratch:
        yield _unpacked(path, Path(scratch))


def archived_results(stack: ExitStack, path: Path) -> Path | None:
    """`results.json` of the package in an archive, which stays open as long as `stack`; None if it is no archive."""
    is_bag = path.is_dir() and (path / "bagit.txt").is_file()
    if not is_bag and not (path.is_file() and zipfile.is_zipfile(path)):
        return None
    return stack.enter_context(opened(path)) / "data" / "package" / "results.json"


def _unpacked(path: Path, scratch: Path) -> Path:
    size = path.stat().st_size
    _require_small_directory(path, size)
    limit = min(LARGEST_TOTAL, max(LEAST_TOTAL, LARGEST_EXPANSION * size))
    try:
        with zipfile.ZipFile(path) as archive:
            entries = archive.infolist()
            top = _require_safe(entries, limit)
            written = 0
            for entry in entries:
                if not entry.is_dir():
                    written += _write(archive, entry, scratch, limit - written)
    except (zipfile.BadZipFile, zlib.error, EOFError, OSError, NotImplementedError, ValueError, struct.error) as err:
        raise RecordError(f"{path.name} is damaged or no zip archive ({err})", remedy=_COPY) from err
    return scratch / top


def _require_small_directory(path: Path, size: int) -> None:
    """Read the zip's end record before zipfile reads the directory it announces."""
    with path.open("rb") as stream:
        stream.seek(max(0, size - 65_557))
        tail = stream.read()
    at = tail.rfind(_END)
    if at < 0 or len(tail) < at + 22:
        raise RecordError(f"{path.name} is no zip archive, or it ends too early", remedy=_COPY)
    entries, length = struct.unpack("<HI", tail[at + 10 : at + 16])
    if entries == 0xFFFF or entries > MOST_FILES or length > LARGEST_DIRECTORY:
        raise RecordError(f"{path.name} announces too many files (at most {MOST_FILES})", remedy=_COPY)


def _require_safe(entries: Sequence[zipfile.ZipInfo], limit: int) -> str:
    """Refuse names that lead elsewhere or meet each other, links, and sizes beyond reason; returns the one folder."""
    seen: set[str] = set()
    if len(entries) > MOST_FILES:
        raise RecordError(f"more than {MOST_FILES} files", remedy=_COPY)
    for entry in entries:
        name = entry.orig_filename
        why = _wrong_name(name, entry)
        mode = entry.external_attr >> 16
        if mode and stat.S_IFMT(mode) not in (0, stat.S_IFREG, stat.S_IFDIR):
            why = "is a link or a device"
        elif entry.flag_bits & 0x1:
            why = "is encrypted"
        elif entry.compress_type not in _METHODS:
            why = "is compressed in an unusual way"
        folded = unicodedata.normalize("NFC", name.rstrip("/")).casefold()
        if folded in seen:
            why = "is there twice, or differs from another name only in case"
        if why:
            raise RecordError(f"the entry {name[:80]!r} {why}", remedy=_COPY)
        seen.add(folded)
    if sum(entry.file_size for entry in entries) > limit:
        raise RecordError(f"it unpacks to more than {limit} bytes", remedy=_COPY)
    tops = {entry.orig_filename.split("/")[0] for entry in entries}
    if len(tops) != 1 or not any("/" in entry.orig_filename.rstrip("/") for entry in entries):
        raise RecordError("it does not hold exactly one folder", remedy=_COPY)
    return tops.pop()


def _wrong_name(name: str, entry: zipfile.ZipInfo) -> str:
    if not entry.flag_bits & 0x800 and not name.isascii():
        return "has a name that is not UTF-8"
    return wrong_path(name.removesuffix("/"))


def wrong_path(name: str) -> str:
    """Why a path can't stand in an archive; "" if it can."""
    parts = name.split("/")
    if name.startswith("/") or (len(name) > 1 and name[1] == ":"):
        return "has an absolute path"
    if any(part in ("", ".", "..") for part in parts):
        return "has a path that leads elsewhere"
    if "\\" in name or any(unicodedata.category(sign) in ("Cc", "Cs") for sign in name):
        return "has a name with signs that do not belong into one"
    if any(part.endswith((" ", ".")) or ":" in part for part in parts):
        return "has a name that not every system can keep"
    if len(name.encode("utf-8", "replace")) > LONGEST_PATH or len(parts) > DEEPEST:
        return "has too long a path"
    return ""


def _write(archive: zipfile.ZipFile, entry: zipfile.ZipInfo, scratch: Path, left: int) -> int:
    target = scratch.joinpath(*PurePosixPath(entry.orig_filename).parts)
    target.parent.mkdir(parents=True, exist_ok=True)
    written = 0
    with archive.open(entry) as source, target.open("xb") as stream:
        while block := source.read(_BLOCK):
            written += len(block)
            if written > left or written > entry.file_size:
                raise RecordError(f"the entry {entry.filename!r} is larger than it says", remedy=_COPY)
            stream.write(block)
    return written


def _require_plain_tree(root: Path) -> None:
    count = total = 0
    for folder, folders, files in os.walk(root):
        for name in (*folders, *files):
            path = Path(folder) / name
            status = path.lstat()
            why = wrong_path(path.relative_to(root).as_posix())
            if not (stat.S_ISREG(status.st_mode) or stat.S_ISDIR(status.st_mode)):
                why = "is a link or a device"
            count += 1
            total += status.st_size if stat.S_ISREG(status.st_mode) else 0
            if why:
                raise RecordError(f"{path} {why}", remedy=_COPY)
            if count > MOST_FILES or total > LARGEST_TOTAL:
                raise RecordError(f"{root} holds more than {MOST_FILES} files or {LARGEST_TOTAL} bytes", remedy=_COPY)
