"""What people sign: a statement in one canonical form of JSON, so that everybody signs and checks the same bytes."""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations import writes
from trunnion.calculations.digest import sha256
from trunnion.errors import RecordError
from trunnion.records import layout, moments
from trunnion.records.verification import Keys, Verified, verify

SCHEMA = 1
SIGNATURE, DEVIATION, WITHDRAWAL = "signature", "deviation", "withdrawal"
KINDS = (SIGNATURE, DEVIATION, WITHDRAWAL)
METHODS = ("alternate calculation", "comparison with test", "review of inputs and results")
LARGEST = 4_000_000
MOST_STATEMENTS = 2_000
_FIELDS: dict[str, type] = {"schema": int, "kind": str, "document": dict, "role": str, "person": dict, "time": str}
_MORE: dict[str, dict[str, type]] = {
    SIGNATURE: {"calculations": list},
    DEVIATION: {"deviation": dict},
    WITHDRAWAL: {"reason": str, "archive": str},
}


@dataclass(frozen=True)
class Signed:
    """A statement with its signature and what verification says of them. `name` is the file's name without ending."""

    name: str
    content: bytes
    signature: bytes
    statement: Mapping[str, Any]
    verified: Verified

    @property
    def kind(self) -> str:
        """What is stated."""
        return str(self.statement["kind"])

    @property
    def role(self) -> str:
        """As what it is signed."""
        return str(self.statement["role"])

    @property
    def person(self) -> str:
        """Who signed, by id."""
        return str(self.statement["person"]["id"])

    @property
    def person_name(self) -> str:
        """Who signed, by name."""
        return str(self.statement["person"].get("name", self.person))

    @property
    def time(self) -> str:
        """When, as the signer states it."""
        return str(self.statement["time"])

    @property
    def digest(self) -> str:
        """SHA-256 of the signed bytes."""
        return sha256(self.content)

    @property
    def entries(self) -> dict[str, Mapping[str, Any]]:
        """The calculations it covers, by id."""
        return {str(entry["id"]): entry for entry in self.statement.get("calculations", [])}

    def is_for(self, document: Mapping[str, Any]) -> bool:
        """Whether it is a statement about this document and revision."""
        return all(self.statement["document"].get(name) == document.get(name) for name in ("number", "revision"))


def canonical(statement: Mapping[str, Any]) -> bytes:
    """The bytes that are signed: UTF-8 JSON, sorted keys, one space a level, a newline at the end."""
    return (json.dumps(statement, indent=1, sort_keys=True, ensure_ascii=False, allow_nan=False) + "\n").encode("utf-8")


def parse(content: bytes) -> dict[str, Any]:
    """Read a statement; RecordError unless it is one in canonical form."""
    if len(content) > LARGEST:
        raise RecordError(f"the statement is larger than {LARGEST} bytes", remedy="sign fewer calculations at once")
    try:
        statement = json.loads(content)
        good = isinstance(statement, dict) and canonical(statement) == content
    except (ValueError, RecursionError):
        good = False
    if not good:
        raise RecordError("a statement is not in the form that is signed", remedy="sign again: trunnion sign")
    wanted = {**_FIELDS, **_MORE.get(str(statement.get("kind")), {})}
    lacking = [name for name, kind in wanted.items() if type(statement.get(name)) is not kind]
    if lacking or statement["kind"] not in KINDS or statement["schema"] != SCHEMA:
        raise RecordError(f"a statement lacks {', '.join(lacking) or 'a known kind'}", remedy="sign again")
    moments.seconds(statement["time"])
    _require_entries(statement)
    return statement


def _require_entries(statement: Mapping[str, Any]) -> None:
    texts = [statement["person"].get("id"), *(statement["document"].get(name) for name in ("number", "revision"))]
    entries = statement.get("calculations", [])
    good = all(isinstance(text, str) for text in texts) and all(
        isinstance(entry, dict) and all(isinstance(entry.get(name), str) for name in ("id", "body", "results"))
        and isinstance(entry.get("verdicts"), list) and isinstance(entry.get("by_reference") or {}, dict)
        for entry in entries
    )  # fmt: skip
    if not good or len({entry["id"] for entry in entries}) != len(entries):
        raise RecordError("a statement is not in order", remedy="sign again: trunnion sign")


def read_signed(
    files: Mapping[str, bytes], keys: Keys, *, fallback: bool | None = None
) -> tuple[list[Signed], list[str]]:
    """Statements with their signatures from files by name, verified; and what is wrong with the others."""
    found: list[Signed] = []
    wrong: list[str] = []
    if len(files) > 2 * MOST_STATEMENTS:
        raise RecordError(f"more than {MOST_STATEMENTS} statements", remedy="sign several calculations with one")
    for name in sorted(files):
        if not name.endswith(".json"):
            if not (name.endswith(".json.sig") and name.removesuffix(".sig") in files):
                wrong.append(f"{name}: a signature without its statement")
            continue
        signature = files.get(name + ".sig")
        if signature is None:
            wrong.append(f"{name}: a statement without its signature")
            continue
        try:
            statement = parse(files[name])
        except RecordError as err:
            wrong.append(f"{name}: {err.fault.cause}")
            continue
        verified = verify_statement(files[name], signature, statement, keys, fallback=fallback)
        found.append(Signed(name.removesuffix(".json"), files[name], signature, statement, verified))
    return found, wrong


def verify_statement(
    content: bytes, signature: bytes, statement: Mapping[str, Any], keys: Keys, *, fallback: bool | None = None
) -> Verified:
    """Verify one statement in the namespace of its role, at its stated time."""
    role = layout.namespace(str(statement["role"]))
    person, at = str(statement["person"]["id"]), str(statement["time"])
    return verify(content, signature, person=person, namespace=role, at=at, keys=keys, fallback=fallback)


def file_name(statement: Mapping[str, Any]) -> str:
    """The name a statement is kept under: role, person and the beginning of its digest."""
    return f"{statement['role']}-{statement['person']['id']}-{sha256(canonical(statement))[:12]}.json"


def keep(folder: Path, statement: Mapping[str, Any], signature: bytes) -> Path:
    """Write a signed statement: the signature first, so that a statement never stands without one."""
    writes.make_folder(folder)
    path = folder / file_name(statement)
    writes.write_bytes(path.with_name(path.name + ".sig"), signature)
    writes.write_bytes(path, canonical(statement))
    return path


def files_in(folder: Path, *, endings: Iterable[str] = (".json", ".json.sig")) -> dict[str, bytes]:
    """The statement and signature files of a folder, by name; none where there is no folder."""
    if not folder.is_dir():
        return {}
    wanted = tuple(endings)
    return {
        path.name: path.read_bytes()[: LARGEST + 1]
        for path in sorted(folder.iterdir())
        if path.name.endswith(wanted) and not path.name.startswith(".") and path.is_file()
    }
