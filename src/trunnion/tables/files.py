"""Opening a table file safely: inside its folder, of bounded size, sealed by its SHA-256."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from trunnion.errors import Fault, Place, TableError
from trunnion.units import shown

_BLOCK = 1 << 20
#: Whole-file readers hold the file in memory; longer files go through `iter_chunks`.
MAX_WHOLE_BYTES = 2 << 30


def locate(path_text: str, root: Path | str) -> Path:
    """The file a statement names, relative to `root`; TableError when it leaves root or is not there."""
    base = Path(root).resolve()
    try:
        path = (base / path_text).resolve()
        there = path.exists()
    except (OSError, ValueError) as err:
        raise file_error(shown(path_text), "this is no usable file name") from err
    if Path(path_text).is_absolute() or not path.is_relative_to(base):
        raise file_error(path_text, "the path leaves the workbook", "keep the file in the workbook's folder")
    if there:
        require_plain(path)
    else:
        near = sorted(other.name for other in path.parent.glob("*")) if path.parent.is_dir() else []
        listed = f"in that folder: {', '.join(near[:8])}" if near else "its folder is empty or missing"
        raise file_error(path, "there is no such file", listed)
    return path


def require_plain(path: Path) -> None:
    """Raise TableError for pipes, devices and sockets: opening one may wait for ever."""
    if not path.is_file() and not path.is_dir():
        raise file_error(path, "this is neither a file nor a folder")


def read_whole(path: Path, limit: int = MAX_WHOLE_BYTES) -> bytes:
    """All bytes of a binary file of at most `limit` bytes."""
    try:
        size = path.stat().st_size
        if size > limit:
            raise file_error(path, f"the file has {size} bytes, more than {limit}", "cut it into several")
        return path.read_bytes()
    except OSError as err:
        raise file_error(path, f"can't be read: {err.strerror or err}") from err


def file_error(path: Path | str, cause: str, remedy: str = "", line: int | None = None) -> TableError:
    """A TableError with one fault at a file."""
    return TableError([Fault(cause, remedy, Place(path, line))])


@dataclass(frozen=True)
class Seal:
    """Digest of a file as read, and what must not change until reading is done."""

    sha256: str
    size: int
    changed: int

    @classmethod
    def of(cls, path: Path) -> Seal:
        """Read the file once, in blocks, for its SHA-256; of a folder, the digest of its files' digests and names."""
        if path.is_dir():
            return _seal_of_folder(path)
        try:
            digest = hashlib.sha256()
            with path.open("rb") as handle:
                while block := handle.read(_BLOCK):
                    digest.update(block)
            state = path.stat()
        except OSError as err:
            raise file_error(path, f"can't be read: {err.strerror or err}") from err
        return cls(digest.hexdigest(), state.st_size, state.st_mtime_ns)

    def require_unchanged(self, path: Path) -> None:
        """Raise TableError when the file changed while it was being read."""
        if path.is_dir():
            return
        state = path.stat()
        if (state.st_size, state.st_mtime_ns) != (self.size, self.changed):
            raise file_error(path, "the file changed while it was being read", "read it again when it is complete")


def _seal_of_folder(path: Path) -> Seal:
    digest, size, changed = hashlib.sha256(), 0, 0
    for part in sorted(part for part in path.rglob("*") if part.is_file()):
        if not part.resolve().is_relative_to(path):
            raise file_error(part, "the file is a link that leaves its folder", "copy it into the folder")
        seal = Seal.of(part)
        digest.update(f"{seal.sha256}  {part.relative_to(path).as_posix()}\n".encode())
        size, changed = size + seal.size, max(changed, seal.changed)
    return Seal(digest.hexdigest(), size, changed)


def read_text_bytes(path: Path, limit: int = MAX_WHOLE_BYTES) -> memoryview:
    """All bytes of a text file of at most `limit` bytes.

    A block of 1 MiB without a line end raises TableError at once: a gigabyte line costs one block.
    """
    try:
        size = path.stat().st_size
        if size > limit:
            raise file_error(path, f"the file has {size} bytes, more than {limit}", "read it in chunks")
        buffer, filled = np.empty(size, dtype=np.uint8), 0
        data = buffer.data
        with path.open("rb", buffering=0) as handle:
            while count := handle.readinto(data[filled : filled + _BLOCK]):
                if count == _BLOCK and not _has_line_end(buffer[filled : filled + count]):
                    raise file_error(path, f"a line is longer than {_BLOCK} bytes", "this is no table of text")
                filled += count
            complete = filled == size and not handle.read(1)
        if not complete:
            raise file_error(path, "the file changed while it was being read", "read it again when it is complete")
        return data
    except OSError as err:
        raise file_error(path, f"can't be read: {err.strerror or err}") from err


def _has_line_end(block: np.ndarray) -> bool:
    """Usually answered by the first 4 KiB."""
    return bool(np.any(block[:4096] == 10)) or bool(np.any(block == 10))


def first_bytes(path: Path, count: int = 64) -> bytes:
    """The first `count` bytes of a file."""
    try:
        with path.open("rb") as handle:
            return handle.read(count)
    except OSError as err:
        raise file_error(path, f"can't be read: {err.strerror or err}") from err
