"""Key lists in OpenSSH's `allowed_signers` form: who may sign as what, from when to when.

Source: ssh-keygen(1), ALLOWED SIGNERS, and ssh_config(5), PATTERNS. ssh-keygen is the authority; this reader serves the
rules about persons, and the verifier used where ssh-keygen is missing. What it does not understand it says, and never
takes for permission.
"""

from __future__ import annotations

import base64
import binascii
import datetime
import hashlib
import re
import time
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from trunnion.errors import RecordError

LARGEST = 1_000_000  # bytes of a key list
_OPTION = re.compile(r'(namespaces|valid-after|valid-before)="([^"]*)"(?:,|(?=\s))', re.IGNORECASE)
_TIME = re.compile(r"(\d{8})(\d{4}|\d{6})?(Z?)")
_ALGORITHM = re.compile(r"(?:ssh|sk|ecdsa)-[a-z0-9@.-]+")


@dataclass(frozen=True)
class Entry:
    """One line: a key, the principals it stands for, the namespaces and the time it is good for (s since 1970)."""

    line: int
    principals: str
    algorithm: str
    blob: bytes
    namespaces: str | None = None
    valid_after: int | None = None
    valid_before: int | None = None

    @property
    def fingerprint(self) -> str:
        """The key's fingerprint as OpenSSH prints it."""
        return fingerprint(self.blob)

    def stands_for(self, principal: str) -> bool:
        """Whether it speaks for a person."""
        return matches(principal, self.principals)

    def grants(self, name: str) -> bool:
        """Whether it may sign in a namespace."""
        return self.namespaces is None or matches(name, self.namespaces)


@dataclass(frozen=True)
class KeyList:
    """A key list as read: entries, and the lines that are not understood with the reason."""

    text: bytes
    entries: tuple[Entry, ...]
    unread: tuple[tuple[int, str], ...]

    def of(self, blob: bytes) -> list[Entry]:
        """The entries of one key."""
        return [entry for entry in self.entries if entry.blob == blob]

    def identities(self, people: Iterable[str]) -> dict[str, str]:
        """Who is who: each person's id, and the first id of those that share a key with it, directly or in a chain."""
        names = list(people)
        same = {name: name for name in names}
        keys: dict[bytes, list[str]] = {}
        for entry in self.entries:
            keys.setdefault(entry.blob, []).append(entry.principals)
        for patterns in keys.values():
            sharing = [name for name in names if any(matches(name, each) for each in dict.fromkeys(patterns))]
            roots = {same[name] for name in sharing}
            if roots:
                first = min(roots, key=names.index)
                same = {name: first if root in roots else root for name, root in same.items()}
        return same


def read_keys(path: Path) -> KeyList:
    """Read a key list; RecordError if it can't be read."""
    try:
        with path.open("rb") as stream:
            content = stream.read(LARGEST + 1)
    except OSError as err:
        raise RecordError(
            f"the key list {path} can't be read ({err.strerror})",
            remedy='one line a key, as in: p1 namespaces="prepared@trunnion" ssh-ed25519 AAAA…',
        ) from err
    if len(content) > LARGEST:
        raise RecordError(f"the key list {path} is larger than {LARGEST} bytes", remedy="list keys, one a line")
    return parse_keys(content)


def parse_keys(content: bytes) -> KeyList:
    """Read the bytes of a key list."""
    entries: list[Entry] = []
    unread: list[tuple[int, str]] = []
    for number, raw in enumerate(content.split(b"\n"), 1):
        line = raw.decode("utf-8", "replace").strip(" \t\r")
        if not line or line.startswith("#"):
            continue
        try:
            entries.append(_entry(number, line))
        except ValueError as err:
            unread.append((number, str(err)))
    return KeyList(content, tuple(entries), tuple(unread))


def fingerprint(blob: bytes) -> str:
    """SHA-256 fingerprint of a public key, as `ssh-keygen -l` prints it."""
    return "SHA256:" + base64.b64encode(hashlib.sha256(blob).digest()).decode().rstrip("=")


def matches(text: str, patterns: str) -> bool:
    """Whether a comma-separated list of patterns (`*`, `?`, `!` for refusal) matches a text."""
    found = False
    for pattern in patterns.split(","):
        if _fits(text, pattern.removeprefix("!")):
            if pattern.startswith("!"):
                return False
            found = True
    return found


def _fits(text: str, pattern: str) -> bool:
    """Whether one pattern fits: a `*` that failed is tried one sign later, only the last one, so no pattern is slow."""
    at = place = 0
    star, resume = -1, 0
    while at < len(text):
        if place < len(pattern) and pattern[place] == "*":
            star, resume = place, at
            place += 1
        elif place < len(pattern) and pattern[place] in ("?", text[at]):
            at, place = at + 1, place + 1
        elif star >= 0:
            resume += 1
            at, place = resume, star + 1
        else:
            return False
    return not pattern[place:].strip("*")


def public_blob(line: str) -> tuple[str, bytes]:
    """Algorithm and blob of a public key line `ssh-ed25519 AAAA… comment`; ValueError if it is none."""
    parts = line.split()
    if len(parts) < 2 or not _ALGORITHM.fullmatch(parts[0]):
        raise ValueError("no public key")
    try:
        blob = base64.b64decode(parts[1], validate=True)
    except binascii.Error as err:
        raise ValueError("a key that is no base64") from err
    named = parts[0].encode()
    if blob[:4] != len(named).to_bytes(4, "big") or blob[4 : 4 + len(named)] != named:
        raise ValueError("a key that is of another kind than its line says")
    return parts[0], blob


def _entry(number: int, line: str) -> Entry:
    if line.startswith('"'):
        principals, quote, rest = line[1:].partition('"')
        if not quote:
            raise ValueError("a quote that does not end")
    else:
        principals, _, rest = line.replace("\t", " ", 1).partition(" ")
    options, key = _options(rest.lstrip())
    algorithm, blob = public_blob(key)
    after, before = (_moment(options[name]) if name in options else None for name in ("valid-after", "valid-before"))
    if after is not None and before is not None and before <= after:
        raise ValueError("valid-before is not after valid-after")
    return Entry(number, principals, algorithm, blob, options.get("namespaces"), after, before)


def _options(text: str) -> tuple[dict[str, str], str]:
    options: dict[str, str] = {}
    if _ALGORITHM.match(text):
        return options, text
    while text and not text[0].isspace():
        found = _OPTION.match(text)
        if found is None or found[1].lower() in options:
            raise ValueError(f"an option not understood here: {text.split()[0]}")
        options[found[1].lower()] = found[2]
        text = text[found.end() :]
    return options, text.strip()


def _moment(text: str) -> int:
    """Seconds since 1970; without Z in the zone of this machine, as ssh-keygen has it."""
    found = _TIME.fullmatch(text)
    if found is None:
        raise ValueError(f"'{text}' is no time")
    form = "%Y%m%d" + {None: "", 4: "%H%M", 6: "%H%M%S"}[len(found[2]) if found[2] else None]
    moment = datetime.datetime.strptime(found[1] + (found[2] or ""), form)
    if found[3]:
        return int(moment.replace(tzinfo=datetime.UTC).timestamp())
    return int(time.mktime(moment.timetuple()))
