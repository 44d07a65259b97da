"""Withdrawing: a signed notice, beside the archive, that a revision found wrong must not be used.

The archive itself stays as it is. An approver signs; audit and find show every notice that lies in the archive's folder
and is about its document and revision, whatever the file is called.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations import writes
from trunnion.errors import RecordError
from trunnion.records import bag, layout, moments, openssh
from trunnion.records import statements as st
from trunnion.records.archive import plain_json
from trunnion.records.reading import opened
from trunnion.records.verification import Keys, Verified

ENDING = ".withdrawn.json"
MOST_NOTICES = 2_000


@dataclass(frozen=True)
class Notice:
    """A notice of withdrawal and what verification says of it."""

    path: Path
    statement: Mapping[str, Any]
    verified: Verified

    @property
    def text(self) -> str:
        """The notice in one line."""
        who = self.statement["person"].get("name", self.statement["person"]["id"])
        told = f"{self.path.name}: withdrawn by {who}, {self.statement['time']}: {self.statement['reason']}"
        return told if self.verified.good else f"{told} — this notice is {self.verified.text}"


def withdraw(
    path: Path, *, reason: str, key: Path, keys: Keys | None = None, by: str | None = None, time: str | None = None
) -> Path:
    """Write the signed notice beside an archive; returns its path. `keys` are those of the archive unless given."""
    if not reason.strip():
        raise RecordError("a withdrawal has a reason", remedy="--reason 'the limit was taken from an old edition'")
    with opened(path) as root:
        document, person, known = _about(root)
        digest = bag.file_digest(root / bag.TAGS)
    keys = keys or known
    statement = {
        "schema": st.SCHEMA,
        "kind": st.WITHDRAWAL,
        "document": document,
        "role": "approved",
        "person": _approver(person, keys, key, by),
        "time": moments.stated(time),
        "reason": reason.strip(),
        "archive": digest,
    }
    content = st.canonical(statement)
    signature = openssh.sign(content, namespace=layout.namespace("approved"), key=key)
    verified = st.verify_statement(content, signature, statement, keys)
    if not verified.good:
        raise RecordError(f"the signature made is {verified.text}", remedy="an approver's key withdraws")
    target = path.with_name(path.name.removesuffix(".zip") + ENDING)
    writes.write_bytes(target.with_name(target.name + ".sig"), signature)
    writes.write_bytes(target, content)
    return target


def notices(path: Path, document: Mapping[str, Any], keys: Keys) -> list[Notice]:
    """Notices in the archive's folder that are about its document and revision."""
    found = []
    for file in sorted(path.resolve().parent.glob(f"*{ENDING}"))[:MOST_NOTICES]:
        signature = file.with_name(file.name + ".sig")
        if not file.is_file() or not signature.is_file() or file.stat().st_size > st.LARGEST:
            continue
        content = file.read_bytes()
        try:
            statement = st.parse(content)
        except RecordError:
            continue
        about = statement["document"]
        if statement["kind"] == st.WITHDRAWAL and all(about[n] == document.get(n) for n in ("number", "revision")):
            verified = st.verify_statement(content, signature.read_bytes()[:100_000], statement, keys)
            if statement["role"] == "approved":
                found.append(Notice(file, statement, verified))
    return found


def _about(root: Path) -> tuple[dict[str, str], dict[str, str], Keys]:
    """Document, people by id, and keys of an archive."""
    try:
        record = plain_json((root / "data/issued/record/record.json").read_bytes())
        document = {name: str(record["document"][name]) for name in ("number", "revision")}
        people = {str(person["id"]): str(person["name"]) for person in record["people"]}
        return document, people, Keys((root / "data/issued/record" / layout.KEYS).read_bytes())
    except (OSError, ValueError, KeyError, TypeError) as err:
        raise RecordError(f"the archive can't be read ({err!r})", remedy="trunnion audit ARCHIVE") from err


def _approver(people: Mapping[str, str], keys: Keys, key: Path, by: str | None) -> dict[str, str]:
    blob = openssh.public_key(key)
    granted = [entry for entry in keys.listed.of(blob) if entry.grants(layout.namespace("approved"))]
    own = [name for name in people if any(entry.stands_for(name) for entry in granted) and by in (None, name)]
    if len(own) != 1:
        raise RecordError(
            f"by the key list this key speaks for {' and '.join(own) or 'no approver'}", remedy="--by, or another --key"
        )
    return {"id": own[0], "name": people[own[0]]}
