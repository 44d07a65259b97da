"""Searching a folder of archives: documents, decisions, requirements, people, results.

The index is a convenience beside the archives, rebuilt from them alone: an archive is read again when the end of its
zip (the central directory, which holds a checksum of every file) or its tag manifest is another one. What is found is
what an archive says of itself; only an audit says whether that is to be believed.
"""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations import writes
from trunnion.calculations.digest import sha256
from trunnion.errors import RecordError, StoreError
from trunnion.records import bag
from trunnion.records.archive import plain_json
from trunnion.records.reading import opened
from trunnion.records.withdrawal import ENDING

INDEX = ".trunnion-index.json"
SCHEMA = 1
MOST_ARCHIVES = 100_000
_TAIL = 1_000_000
_LARGEST = 200_000_000


@dataclass(frozen=True)
class Hit:
    """Something an archive says that holds all words sought."""

    archive: str
    document: str
    kind: str
    text: str
    withdrawn: bool


@dataclass(frozen=True)
class Found:
    """Hits, archives that could not be read with the reason, and how many archives were looked at."""

    hits: tuple[Hit, ...]
    unread: tuple[tuple[str, str], ...]
    archives: int


def find(folder: Path, words: Sequence[str], *, rebuild: bool = False) -> Found:
    """Search the archives below a folder for entries that hold every word, whatever the case."""
    if not folder.is_dir():
        raise RecordError(f"there is no folder {folder}", remedy="name the folder that holds the archives")
    known = {} if rebuild else _index(folder)
    fresh: dict[str, dict[str, Any]] = {}
    for path in _archives(folder):
        name = path.relative_to(folder).as_posix()
        mark = _mark(path)
        former = known.get(name)
        fresh[name] = former if former is not None and former.get("mark") == mark else {"mark": mark, **_read(path)}
    if fresh != known:
        _keep(folder, fresh)
    sought = [word.casefold() for text in words for word in text.split()]
    withdrawn = set(_withdrawn(folder))
    hits = [hit for name, entry in fresh.items() for hit in _hits(name, entry, sought, withdrawn)]
    unread = tuple((name, entry["error"]) for name, entry in fresh.items() if entry.get("error"))
    return Found(tuple(hits), unread, len(fresh))


def _archives(folder: Path) -> Iterator[Path]:
    """Zips and unpacked bags below a folder, links not followed; a zip's own unpacked folder beside it is left out."""
    zips = sorted(path for path in folder.rglob("*.zip") if path.is_file() and not path.is_symlink())
    beside = {path.with_suffix("") for path in zips}
    bags = sorted(path.parent for path in folder.rglob(bag.BAGIT) if path.is_file() and not path.is_symlink())
    yield from [*zips, *(path for path in bags if path not in beside)][:MOST_ARCHIVES]


def _mark(path: Path) -> str:
    """What changes when the archive does: the digest of the zip's end, or of the tag manifest."""
    try:
        if path.is_dir():
            return sha256((path / bag.TAGS).read_bytes())
        with path.open("rb") as stream:
            size = stream.seek(0, 2)
            stream.seek(max(0, size - _TAIL))
            return f"{size}:{sha256(stream.read())}"
    except OSError:
        return "unreadable"


def _read(path: Path) -> dict[str, Any]:
    """What an archive says, ready to be searched; or why it can't be read."""
    try:
        with opened(path) as root:
            wrong = bag.problems(root)
            if wrong:
                return {"error": wrong[0], "entries": []}
            results = plain_json(_bytes(root / "data/issued/results.json"))
            record = plain_json(_bytes(root / "data/issued/record/record.json"))
            document = record["document"]
            entries = [[kind, text] for kind, text in _entries(root, results, record)]
            name = f"{document['number']} revision {document['revision']}"
            return {"document": name, "day": str(record["day"]), "entries": entries}
    except RecordError as err:
        return {"error": err.fault.cause, "entries": []}
    except (OSError, ValueError, KeyError, TypeError, AttributeError) as err:
        return {"error": f"it is no archive of a calculation package ({type(err).__name__})", "entries": []}


def _bytes(path: Path) -> bytes:
    if path.stat().st_size > _LARGEST:
        raise RecordError(f"{path.name} is larger than {_LARGEST} bytes", remedy="trunnion audit ARCHIVE")
    return path.read_bytes()


def _entries(root: Path, results: Mapping[str, Any], record: Mapping[str, Any]) -> Iterator[tuple[str, str]]:
    document = record["document"]
    yield "document", f"{document['number']} revision {document['revision']}: {document['title']} ({record['day']})"
    for person in record["people"]:
        yield "person", f"{person['id']}: {person['name']}, signs as {', '.join(person['signs_as'])}"
    for row in results["requirements"]:
        yield "requirement", f"{row['id']}: {row['asks']}: {row['verdict']}"
    for decision in results["decisions"]:
        yield "decision", f"{decision['id']}: {decision['chosen']}, over {', '.join(decision['over'])}"
    for entry in results["calculations"]:
        yield "calculation", f"{entry['id']}: {entry['title']} ({entry['template']})"
        for result in entry["results"]:
            where = f" over {result['over']}" if result["over"] else ""
            bounds = f"{_number(result['lo'])} … {_number(result['hi'])} {result['unit']} ({result['basis']})"
            yield "result", f"{entry['id']}: {result['quantity']} of {result['of']}{where}: {bounds}"
    for finding in plain_json(_bytes(root / "data/issued/record/findings.json")):
        yield "finding", f"{finding['id']} against {finding['against']}: {finding['text']}"


def _hits(name: str, entry: Mapping[str, Any], sought: Sequence[str], withdrawn: set[str]) -> Iterator[Hit]:
    document = str(entry.get("document", ""))
    for kind, text in entry["entries"]:
        folded = f"{kind} {text}".casefold()
        if all(word in folded for word in sought):
            yield Hit(name, document, kind, text, document in withdrawn)


def _withdrawn(folder: Path) -> Iterator[str]:
    """Documents with a notice of withdrawal below the folder, verified or not: a reader is to look at it."""
    for path in folder.rglob(f"*{ENDING}"):
        try:
            document = json.loads(path.read_bytes()[:_TAIL])["document"]
            yield f"{document['number']} revision {document['revision']}"
        except (OSError, ValueError, KeyError, TypeError, RecursionError):
            continue


def _index(folder: Path) -> dict[str, dict[str, Any]]:
    """The index, or an empty one where it is missing, damaged or of another form."""
    try:
        found = json.loads((folder / INDEX).read_bytes())
        archives = found["archives"] if found["schema"] == SCHEMA else {}
        good = all(isinstance(entry["entries"], list) and isinstance(entry["mark"], str) for entry in archives.values())
        return dict(archives) if good else {}
    except (OSError, ValueError, KeyError, TypeError, AttributeError, RecursionError):
        return {}


def _keep(folder: Path, archives: Mapping[str, Any]) -> None:
    """Keep the index; a folder that can't be written is searched without one."""
    try:
        writes.write_json(folder / INDEX, {"schema": SCHEMA, "archives": archives})
    except StoreError:
        return


def _number(value: float | None) -> str:
    return "—" if value is None else f"{float(value):.6g}"
