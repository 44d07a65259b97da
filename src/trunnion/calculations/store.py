"""The revision folder: bodies by content key, copied inputs, the state, the lock.

`bodies/<key>.ipynb` is written once and never again. `state.json` says which calculation has which body; it
can be lost without loss: a body is whole or absent, and its key is computed afresh. Nothing here looks at
clocks or file times.
"""

from __future__ import annotations

import json
import os
import shutil
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations import writes
from trunnion.calculations.digest import sha256
from trunnion.calculations.locks import hold_lock
from trunnion.calculations.notebooks import Notebook, read_notebook
from trunnion.errors import StoreError

SCHEMA = 1
FAILED = "FAILED"


@dataclass(frozen=True)
class RevisionFolder:
    """One revision's folder of outputs."""

    path: Path

    @property
    def bodies(self) -> Path:
        """Where executed bodies lie, by content key."""
        return self.path / "bodies"

    @property
    def inputs(self) -> Path:
        """Where input files lie, by content."""
        return self.path / "inputs"

    def body(self, key: str) -> Path:
        """The body of a content key."""
        return self.bodies / f"{key}.ipynb"

    def sheet(self, calculation: str, template: str) -> Path:
        """The sheet people open."""
        return self.path / f"{calculation}-{template}.ipynb"

    def failed(self, calculation: str, template: str) -> Path:
        """Where a notebook that failed is kept, under a name that says so."""
        return self.path / f"{calculation}-{template}.{FAILED}.ipynb"

    def prepare(self) -> None:
        """Make the folders; StoreError when they can't be written."""
        for folder in (self.path, self.bodies, self.inputs):
            writes.make_folder(folder)

    @contextmanager
    def locked(self) -> Iterator[None]:
        """Hold the folder alone; StoreError names the owner if another process does. Sweeps leftovers first."""
        self.prepare()
        with hold_lock(self.path / "lock.json"):
            for folder in (self.path, self.bodies, self.inputs):
                writes.sweep(folder)
            yield

    def read_state(self) -> dict[str, Any]:
        """The state, or an empty one: it only spares work, and a damaged or foreign one is set aside."""
        try:
            state = json.loads((self.path / "state.json").read_bytes())
        except (OSError, ValueError):
            state = {}
        good = isinstance(state, dict) and state.get("schema") == SCHEMA
        return state if good else {"schema": SCHEMA, "calculations": {}}

    def write_state(self, state: Mapping[str, Any]) -> None:
        """Keep the state, if it changed."""
        text = json.dumps(state, indent=1, sort_keys=True, ensure_ascii=False, allow_nan=False) + "\n"
        writes.write_if_changed(self.path / "state.json", text.encode("utf-8"))

    def keep_input(self, name: str, content: bytes) -> str:
        """Copy an input by content; returns the name notebooks read it by, `<first 12 of sha256>-<file name>`."""
        held = held_name(name, sha256(content))
        writes.write_if_changed(self.inputs / held, content)
        return held

    def sound_body(self, key: str, checksum: str | None) -> bytes | None:
        """The bytes of the body of `key` if it is there and as it was written; None if it must be computed.

        `checksum` is the recorded SHA-256, None where none was recorded (a run was killed between body and state: the
        body is whole, since it appears under its name only when it is).
        """
        path = self.body(key)
        try:
            content = path.read_bytes()
        except OSError:
            return None
        if checksum is not None and sha256(content) != checksum:
            return None
        try:
            read_notebook(path)
        except StoreError:
            return None
        return content

    def set_aside(self, key: str) -> Path | None:
        """Rename a body that is not what was written, so that the name is free; returns its new path."""
        path = self.body(key)
        if not path.exists():
            return None
        aside = path.with_name(f"{key}.altered-{sha256(path.read_bytes())[:8]}.ipynb")
        try:
            os.replace(path, aside)
        except OSError as err:
            raise writes.store_error(err, path) from err
        return aside

    def take_body_from(self, other: RevisionFolder, key: str, checksum: str | None) -> bytes | None:
        """Copy a body byte for byte from another revision of the workbook, if it is sound there."""
        content = other.sound_body(key, checksum)
        if content is not None:
            writes.write_bytes(self.body(key), content)
        return content


def held_name(name: str, digest: str) -> str:
    """The name of a copied input: content first, so that two files of one name never meet."""
    return f"{digest[:12]}-{Path(name).name}"


def outputs_of(workbook: Path, given: Path | None) -> Path:
    """Where outputs go: as given, else the nearest `outputs/` in the workbook's folder or above, else
    beside the spec.
    """
    if given is not None:
        return given
    for folder in (workbook, *workbook.parents):
        if (folder / "outputs").is_dir():
            return folder / "outputs"
    return workbook / "outputs"


def revision_folder(workbook: Path, revision: str, given: Path | None) -> RevisionFolder:
    """The folder of one revision of a workbook: `<outputs>/<workbook>/<revision>`."""
    whole = workbook.resolve()
    return RevisionFolder(outputs_of(whole, given) / whole.name / revision)


def other_revisions(folder: RevisionFolder) -> list[RevisionFolder]:
    """Sibling revisions whose bodies may serve, in order of name."""
    try:
        names = sorted(entry.name for entry in folder.path.parent.iterdir() if (entry / "bodies").is_dir())
    except OSError:
        return []
    return [RevisionFolder(folder.path.parent / name) for name in names if name != folder.path.name]


def read_body(content: bytes) -> Notebook:
    """A stored body as JSON."""
    return json.loads(content)


def remove_folder(path: Path) -> None:
    """Remove a scratch folder and all in it."""
    shutil.rmtree(path, ignore_errors=True)
