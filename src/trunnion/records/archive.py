"""The archive of an issued revision: everything a stranger needs to read, verify and recompute it.

Byte-identical for the same issued revision and signatures, wherever and whenever it is made: all dates are those of the
issue, the order is fixed, nothing of the machine takes part.
"""

from __future__ import annotations

import json
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from trunnion.calculations import store, templates, writes
from trunnion.calculations.baselines import DIGESTS, RESULTS, SPEC, issued_folder, read_json
from trunnion.calculations.digest import sha256
from trunnion.calculations.issue import is_issued, require_unaltered
from trunnion.errors import RecordError
from trunnion.records import bag, layout, moments, openssh
from trunnion.records import statements as st
from trunnion.records.casework import Trust, case_of, keys_of
from trunnion.records.signing import resolve_key
from trunnion.records.verification import Keys, verify

SPACE = layout.namespace(layout.ARCHIVED)
AGENT = "trunnion"
_DATA = Path(__file__).parent / "data"


@dataclass(frozen=True)
class Archived:
    """The folder and the zip, and who signed the tag manifest."""

    folder: Path
    zip: Path
    person: str


def archive(
    workbook: Any, *, key: Path | None, output: Path | None = None, into: Path | None = None, trust: Trust | None = None
) -> Archived:
    """Write the archive of the workbook's issued revision as a folder and a zip.

    Without `key` the signature kept from the last time is used. RecordError if the revision is not issued, was altered
    since, or its outputs are gone.
    """
    revision = workbook.document.revision
    if not is_issued(workbook.root, revision):
        raise RecordError(f"revision {revision} is not issued", remedy="trunnion issue WORKBOOK")
    if not (issued_folder(workbook.root) / revision / layout.RECORD / "record.json").is_file():
        raise RecordError(f"revision {revision} was frozen without signatures", remedy="archive a signed revision")
    outputs = store.revision_folder(workbook.root, revision, output).path
    require_unaltered(workbook.root, outputs.parent)
    keys = keys_of(workbook.root, trust or Trust())
    person, key, kept = _archivist(workbook, key, keys, trust)
    issued = issued_folder(workbook.root) / revision
    day = str(read_json(issued / DIGESTS)["document"]["issued"])
    files = _files(workbook, issued, outputs, day, person)
    files[bag.SIGNATURE] = _signature(workbook, files[bag.TAGS], person, day, key, kept, keys)
    name = archive_name(workbook.document.number, revision)
    folder = writes.make_folder(into or outputs.parent / "archive")
    _write_folder(folder / name, files)
    writes.write_if_changed(folder / f"{name}.zip", bag.zipped(name, files, day))
    return Archived(folder / name, folder / f"{name}.zip", person)


def archive_name(number: str, revision: str) -> str:
    """The name of an archive: document number and revision, in signs every system can keep."""
    return re.sub(r"[^A-Za-z0-9._-]+", "-", f"{number}-{revision}").strip("-.")


def _archivist(
    workbook: Any, key: Path | None, keys: Keys, trust: Trust | None
) -> tuple[str, Path | None, bytes | None]:
    """Who signs the archive, with which key; and the signature kept from the last time, if there is one."""
    kept = layout.archive_signature_file(workbook.root, workbook.document.revision)
    former = read_json(kept.with_suffix(".json")) if kept.with_suffix(".json").is_file() and kept.is_file() else None
    if key is None and former is not None:
        return str(former["by"]), None, kept.read_bytes()
    results = read_json(issued_folder(workbook.root) / workbook.document.revision / RESULTS)
    key, blob = resolve_key(case_of(workbook, results, trust), layout.ARCHIVED, key)
    granted = [entry for entry in keys.listed.of(blob) if entry.grants(SPACE)]
    own = [person.id for person in workbook.people if any(entry.stands_for(person.id) for entry in granted)]
    if len(own) != 1:
        raise RecordError(
            f"by the key list this key may archive for {' and '.join(own) or 'nobody'}",
            remedy=f'the key list needs a line such as\n    a1 namespaces="{SPACE}" ssh-ed25519 AAAA…',
        )
    same = former is not None and former["by"] == own[0]
    return own[0], key, kept.read_bytes() if same else None


def _signature(
    workbook: Any, manifest: bytes, person: str, day: str, key: Path | None, kept: bytes | None, keys: Keys
) -> bytes:
    asked: dict[str, Any] = {"person": person, "namespace": SPACE, "at": moments.end_of(day), "keys": keys}
    if kept is not None and verify(manifest, kept, **asked).good:
        return kept
    if key is None:
        raise RecordError("the signature kept is not one of this archive", remedy="sign it: --key FILE")
    made = openssh.sign(manifest, namespace=SPACE, key=key)
    verified = verify(manifest, made, **asked)
    if not verified.good:
        raise RecordError(f"the signature made is {verified.text}", remedy="see the key list and its dates")
    path = layout.archive_signature_file(workbook.root, workbook.document.revision)
    writes.make_folder(path.parent)
    writes.write_bytes(path, made)
    writes.write_json(path.with_suffix(".json"), {"by": person})
    return made


def _files(workbook: Any, issued: Path, outputs: Path, day: str, person: str) -> dict[str, bytes]:
    results = read_json(issued / RESULTS)
    payload = {f"workbook/{path}": content for path, content in _workbook_files(workbook, results)}
    payload |= {f"templates/{path}": content for path, content in _shipped_templates(results, issued)}
    payload |= _issued_files(issued)
    digests = read_json(issued / DIGESTS)
    for path, digest in digests["outputs"].items():
        payload[f"package/{path}"] = _as_issued(outputs / path, digest)
    payload |= _explanations(results)
    document = results["document"]
    info = [
        ("Bag-Software-Agent", AGENT),
        ("Bagging-Date", day),
        ("External-Identifier", f"{document['number']} revision {document['revision']}"),
        ("External-Description", document["title"]),
        ("Trunnion-Archived-By", person),
    ]
    return bag.make(payload, info, {"README.txt": _finder(document, day, person, payload)})


def _workbook_files(workbook: Any, results: Mapping[str, Any]) -> Iterator[tuple[str, bytes]]:
    """The spec, the files it names, and the workbook's own templates that were used."""
    yield SPEC, workbook.text.encode("utf-8")
    inputs = {file["path"]: file for entry in results["calculations"] for file in entry["inputs"]}
    for path in dict.fromkeys((*inputs, *_named_files(workbook))):
        used = inputs.get(path)
        if used is not None and used["held"] is None:
            continue  # above the copied size: not held, and said so
        if used is None and (workbook.root / path).stat().st_size > workbook.max_copied_size:
            continue
        yield path, _as_issued(workbook.root / path, used["sha256"] if used else None)
    own = {entry["template"] for entry in results["calculations"] if entry["local_template"]}
    for name in sorted(own):
        yield f"templates/{name}.ipynb", (workbook.root / "templates" / f"{name}.ipynb").read_bytes()


def _named_files(workbook: Any) -> Iterator[str]:
    """Files the spec names, whether a calculation reads them or not: it can't be loaded without them."""
    for part in (*workbook.envelopes.values(), *workbook.passes.values()):
        if getattr(part, "table", None) is not None and isinstance(part.table, str):
            yield part.table
        if getattr(part, "campaign", None) is not None:
            found = sorted(workbook.root.glob(part.campaign))
            yield from (path.relative_to(workbook.root).as_posix() for path in found if path.is_file())
    if workbook.house is not None:
        yield workbook.house.relative_to(workbook.root).as_posix()


def _shipped_templates(results: Mapping[str, Any], issued: Path) -> Iterator[tuple[str, bytes]]:
    parts = {name: entry["parts"] for name, entry in read_json(issued / DIGESTS)["calculations"].items()}
    for entry in results["calculations"]:
        if entry["local_template"]:
            continue
        template = templates.find(entry["template"])
        if template.cells_digest != parts[entry["id"]]["template"]["cells"]:
            raise RecordError(
                f"template '{template.name}' is not the one revision {issued.name} was computed with",
                remedy="archive with the program that issued it",
            )
        yield f"{template.name}.ipynb", template.path.read_bytes()


def _issued_files(issued: Path) -> dict[str, bytes]:
    files = [path for path in sorted(issued.rglob("*")) if path.is_file() and not path.name.startswith(".")]
    return {f"issued/{path.relative_to(issued).as_posix()}": path.read_bytes() for path in files}


def _as_issued(path: Path, digest: str | None) -> bytes:
    try:
        content = path.read_bytes()
    except OSError as err:
        raise RecordError(
            f"{path} can't be read ({err.strerror})", remedy="rebuild the outputs: trunnion compute WORKBOOK"
        ) from err
    if digest is not None and sha256(content) != digest:
        raise RecordError(f"{path} is not what was issued", remedy="take it from version control")
    return content


def _explanations(results: Mapping[str, Any]) -> dict[str, bytes]:
    missing = sorted({f["path"] for e in results["calculations"] for f in e["inputs"] if f["held"] is None})
    listed = ", ".join(f"`{path}`" for path in missing) or "none"
    contents = (_DATA / "CONTENTS.md").read_text("utf-8").replace("{missing}", listed)
    return {
        "CONTENTS.md": contents.encode("utf-8"),
        "digest/DIGEST.md": (_DATA / "DIGEST.md").read_bytes(),
        "digest/digest.py": (_DATA / "digest.py.txt").read_bytes(),
    }


def _finder(document: Mapping[str, Any], day: str, person: str, payload: Mapping[str, bytes]) -> bytes:
    """The README for whoever finds the archive, with the commands written out."""
    commands = []
    for path in sorted(payload):
        if path.startswith("issued/record/signatures/") and path.endswith(".json"):
            statement = st.parse(payload[path])
            role, signer = layout.namespace(statement["role"]), statement["person"]["id"]
            moment = moments.verify_time(statement["time"])
            commands.append(
                f"{statement['role']} by {statement['person'].get('name', signer)}, {statement['time']}:\n\n"
                f"    ssh-keygen -Y verify -f KEYS -I {signer} -n {role} \\\n        -O verify-time={moment} \\\n"
                f"        -s data/{path}.sig < data/{path}\n"
            )
    fields = {
        "number": document["number"],
        "revision": document["revision"],
        "title": " ".join(str(document["title"]).split()),
        "day": day,
        "archivist": person,
        "moment": moments.verify_time(moments.end_of(day)),
        "signatures": "\n".join(commands),
    }
    text = (_DATA / "README.txt").read_text("utf-8")
    return re.sub(r"\{(\w+)\}", lambda found: str(fields[found[1]]), text).encode("utf-8")


def _write_folder(folder: Path, files: Mapping[str, bytes]) -> None:
    """Write the bag's folder whole, or leave one that is the same."""
    if folder.is_dir():
        same = bag.files_of(folder) == set(files) and all((folder / p).read_bytes() == c for p, c in files.items())
        if same:
            return
        raise RecordError(f"{folder} is there already and holds something else", remedy="remove it, or use --into DIR")
    writes.write_tree(folder, files)


def plain_json(content: bytes) -> Any:
    """JSON from an archive; ValueError where it is none, nested beyond reason included."""
    try:
        return json.loads(content)
    except RecursionError as err:
        raise ValueError("nested too deeply") from err
