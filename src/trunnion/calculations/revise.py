"""Opening the next revision: the title block and the revision table of the spec, edited in place.

Only those lines change; comments and layout stay. The edited text is read again and must say exactly what was meant
before it replaces the file.
"""

from __future__ import annotations

import json
import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations import writes
from trunnion.calculations.baselines import issued_revisions
from trunnion.calculations.issue import require_unaltered
from trunnion.calculations.letters import next_letter
from trunnion.errors import RecordError

_PLAIN = re.compile(r"[A-Za-z0-9][A-Za-z0-9 ,.;()/+-]*")


@dataclass(frozen=True)
class Revised:
    """The revision opened, the one it supersedes, and the spec that says so."""

    revision: str
    supersedes: str
    spec: Path


def revise(workbook: Any, *, reason: str, revision: str | None = None, date: str | None = None) -> Revised:
    """Open the next revision of a loaded workbook, superseding the issued one.

    `revision` states the next letter where the series is not to be followed. RecordError if the current revision is
    not issued, was altered, or the next one is already there.
    """
    current = workbook.document.revision
    issued = issued_revisions(workbook.root)
    if current not in issued:
        raise RecordError(
            f"revision {current} is not issued, so there is nothing to supersede", remedy="trunnion issue freezes it"
        )
    require_unaltered(workbook.root)
    new = revision or next_letter(current)
    if new in issued or new == current:
        raise RecordError(f"revision {new} is issued already", remedy="state another one with --revision")
    text = _edited(workbook, new, current, reason, date)
    _require_meaning(workbook, text, new, current, reason)
    writes.write_text(workbook.path, text)
    return Revised(new, current, workbook.path)


def _edited(workbook: Any, new: str, current: str, reason: str, date: str | None) -> str:
    lines = workbook.text.splitlines(keepends=True)
    document = workbook.tree.child("document")
    _put_value(lines, document.child("revision"), new)
    superseded = document.child("supersedes")
    if superseded is not None:
        _put_value(lines, superseded, current)
    else:
        _put_key_after(lines, document, "revision", f"supersedes: {_scalar(current)}")
    entry = {"revision": new, "supersedes": current, "reason": reason, **({"date": date} if date else {})}
    row = "{" + ", ".join(f"{key}: {_scalar(value)}" for key, value in entry.items()) + "}"
    return _with_row("".join(lines), row)


def _put_value(lines: list[str], node: Any, value: str) -> None:
    """Replace a one-word scalar where it stands."""
    line, column = node.line - 1, node.column - 1
    old = re.match(r"\"[^\"]*\"|'[^']*'|[^\s,}#]+", lines[line][column:])
    if old is None:
        raise RecordError(
            f"line {node.line} of the spec is laid out so that it can't be edited here", remedy="edit it by hand"
        )
    lines[line] = lines[line][:column] + _scalar(value) + lines[line][column + old.end() :]


def _put_key_after(lines: list[str], document: Any, key: str, text: str) -> None:
    """Add a key after another one: on a line of its own in block style, after a comma in flow style."""
    row, column = document.keys[key]
    node = document.child(key)
    line = lines[node.line - 1]
    if lines[row - 1][: column - 1].strip():  # flow style: something stands before the key
        end = node.column - 1 + re.match(r"\"[^\"]*\"|'[^']*'|[^\s,}#]+", line[node.column - 1 :]).end()  # type: ignore[union-attr]
        lines[node.line - 1] = f"{line[:end]}, {text}{line[end:]}"
    else:
        lines.insert(node.line, " " * (column - 1) + text + "\n")


def _with_row(text: str, row: str) -> str:
    """The text with a row added to the revision table, which is begun where there is none."""
    heading = re.search(r"^revisions:[ \t]*(#.*)?\n", text, re.MULTILINE)
    if heading is None:
        if re.search(r"^revisions:", text, re.MULTILINE):
            raise RecordError(
                "the revision table is not written line by line", remedy="write it as a list, one row a line"
            )
        return text.rstrip("\n") + f"\n\nrevisions:\n  - {row}\n"
    end = heading.end()
    rows = re.match(r"(?:[ \t]+\S.*\n|[ \t]*-.*\n|[ \t]*\n(?=[ \t]+-|-))*", text[end:])
    block = rows.group() if rows else ""
    indent = re.match(r"[ \t]*", block).group() if block else "  "  # type: ignore[union-attr]
    block = block if not block or block.endswith("\n") else block + "\n"
    return text[:end] + block + f"{indent}- {row}\n" + text[end + len(rows.group() if rows else "") :]


def _scalar(text: str) -> str:
    """A YAML scalar that every reader takes for this text."""
    return (
        text
        if re.fullmatch(r"[A-Z]{1,3}", text) and text not in ("N", "Y", "NO", "YES", "ON")
        else json.dumps(text, ensure_ascii=False)
    )


def _require_meaning(workbook: Any, text: str, new: str, current: str, reason: str) -> None:
    """The edited text must load and differ from the former spec in title block and revision table only."""
    from trunnion.calculations.specdiff import plain_tree, spec_changes
    from trunnion.spec.tree import read_tree

    tree, _, faults = read_tree(text.encode("utf-8"), str(workbook.path))
    if tree is None or faults:
        raise RecordError("the spec can't be edited here", remedy="edit document and revisions by hand")
    made, former = plain_tree(tree), plain_tree(workbook.tree)
    changed = {change.path for change in spec_changes(former, made)}
    row = made.get("revisions", [{}])[-1]
    meant = made["document"]["revision"] == new and made["document"]["supersedes"] == current
    if (
        not meant
        or row.get("reason") != reason
        or not changed <= {"document.revision", "document.supersedes", "revisions"}
    ):
        raise RecordError(
            "the spec is laid out so that it can't be edited here", remedy="edit document and revisions by hand"
        )
