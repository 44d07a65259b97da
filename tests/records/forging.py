"""An attacker without keys: changes an archive and puts right every digest and manifest that can be put right."""

from __future__ import annotations

import hashlib
import json
import random
import re
import subprocess
from collections.abc import Callable
from pathlib import Path
from typing import Any

from trunnion.calculations.digest import content_digest
from trunnion.calculations.notebooks import canonical_bytes
from trunnion.records import bag
from trunnion.records.contents import results_digest
from trunnion.records.statements import canonical

ITEM = "application/vnd.trunnion.item+json"
RECORD = "data/issued/record"


def sha256(content: bytes) -> str:
    return hashlib.sha256(content).hexdigest()


class Forger:
    """A bag in a folder, changed consistently."""

    def __init__(self, root: Path, seed: int) -> None:
        self.root = root
        self.chance = random.Random(seed)

    # --- files ---

    def json(self, name: str) -> Any:
        return json.loads((self.root / name).read_bytes())

    def put(self, name: str, value: Any) -> None:
        content = value if isinstance(value, bytes) else canonical_bytes(value)
        (self.root / name).write_bytes(content)

    def replace(self, name: str, old: str, new: str) -> None:
        path = self.root / name
        text = path.read_text("utf-8")
        assert old in text, (name, old)
        path.write_text(text.replace(old, new), "utf-8")

    def both(self, change: Callable[[Any], None]) -> None:
        """Change results.json in both places."""
        results = self.json("data/issued/results.json")
        change(results)
        for name in ("data/issued/results.json", "data/package/results.json"):
            self.put(name, results)

    def specs(self, old: str, new: str) -> None:
        for folder in ("data/workbook", "data/issued", "data/package"):
            self.replace(f"{folder}/workbook.yaml", old, new)

    def statement(self, role: str) -> Path:
        (path,) = (self.root / RECORD / "signatures").glob(f"{role}-*.json")
        return path

    def restate(self, role: str, change: Callable[[Any], None]) -> None:
        path = self.statement(role)
        statement = json.loads(path.read_bytes())
        change(statement)
        path.write_bytes(canonical(statement))

    def body_of(self, name: str) -> Path:
        entry = next(e for e in self.json("data/issued/results.json")["calculations"] if e["id"] == name)
        return self.root / "data/package/bodies" / f"{entry['key']}.ipynb"

    def rewrite_body(self, name: str, change: Callable[[Any], None]) -> None:
        """Change a notebook, its sheet, and every digest that speaks of it."""
        path = self.body_of(name)
        body = json.loads(path.read_bytes())
        change(body)
        path.write_bytes(canonical_bytes(body))
        (sheet,) = (self.root / "data/package").glob(f"{name}-*.ipynb")
        former = json.loads(sheet.read_bytes())
        added = [cell for cell in former["cells"] if "trunnion-sheet" in cell["metadata"].get("tags", [])]
        head, tail = added[:-1], added[-1:]
        sheet.write_bytes(canonical_bytes({**body, "cells": [*head, *body["cells"], *tail]}))

        def put(results: Any) -> None:
            for entry in results["calculations"]:
                if entry["id"] == name:
                    entry["digest"] = content_digest(body)

        self.both(put)
        digests = self.json("data/issued/digests.json")
        digests["calculations"][name] |= {"digest": content_digest(body), "sha256": sha256(path.read_bytes())}
        self.put("data/issued/digests.json", digests)

    def claim(self) -> None:
        """Make the statements claim what the results now say; their signatures stay those of the former words."""
        results = self.json("data/issued/results.json")
        entries = {entry["id"]: entry for entry in results["calculations"]}

        def put(statement: Any) -> None:
            for covered in statement.get("calculations", []):
                entry = entries[covered["id"]]
                covered.update(body=entry["digest"], results=results_digest(entry))

        for role in ("prepared", "checked", "approved"):
            self.restate(role, put)

    # --- putting right ---

    def settle(self) -> None:
        """Every digest of the issue, every manifest and the size: as if the archive had been made so."""
        digests = self.json("data/issued/digests.json")
        for folder, key in (("data/issued", "files"), ("data/package", "outputs")):
            top = self.root / folder
            names = [path.relative_to(top).as_posix() for path in sorted(top.rglob("*")) if path.is_file()]
            digests[key] = {name: sha256((top / name).read_bytes()) for name in names if name != "digests.json"}
        self.put("data/issued/digests.json", digests)
        self.manifests()

    def manifests(self) -> None:
        files = {name: (self.root / name).read_bytes() for name in bag.files_of(self.root)}
        payload = {name: content for name, content in files.items() if name.startswith("data/")}
        size = sum(len(content) for content in payload.values())
        info = (self.root / bag.INFO).read_text()
        info = re.sub(r"Payload-Oxum: .*", f"Payload-Oxum: {size}.{len(payload)}", info)
        files[bag.INFO] = info.encode()
        files[bag.MANIFEST] = bag.manifest(payload)
        tags = {n: c for n, c in files.items() if n not in payload and n not in (bag.TAGS, bag.SIGNATURE)}
        files[bag.TAGS] = bag.manifest(tags)
        for name in (bag.INFO, bag.MANIFEST, bag.TAGS):
            (self.root / name).write_bytes(files[name])

    def sign(self, key: Path, namespace: str, content: bytes) -> bytes:
        command = ["ssh-keygen", "-Y", "sign", "-f", str(key), "-n", namespace]
        return subprocess.run(command, input=content, capture_output=True, check=True).stdout

    def archivist(self, key: Path) -> None:
        """Sign the tag manifest anew: an attacker who holds the archivist's key, and no other."""
        content = (self.root / bag.TAGS).read_bytes()
        (self.root / bag.SIGNATURE).write_bytes(self.sign(key, "archived@trunnion", content))

    def digit(self, text: str) -> str:
        """The text with one digit changed."""
        places = [found.start() for found in re.finditer(r"\d", text)]
        at = self.chance.choice(places)
        return f"{text[:at]}{(int(text[at]) + self.chance.randint(1, 9)) % 10}{text[at + 1 :]}"


def number_in_results(f: Forger) -> None:
    amount = f.chance.choice([0.001, 0.5, 5.0, -0.25])

    def change(results: Any) -> None:
        entry = f.chance.choice(results["calculations"])
        for name in ("lo", "hi", "attained"):
            entry["results"][0][name] += amount

    f.both(change)
    f.claim()


def number_everywhere(f: Forger) -> None:
    """Notebook output, results, digests and statements agree on the wrong number."""
    name = f.chance.choice(["C01", "C02"])
    amount = f.chance.choice([0.001, 0.5, 5.0, -0.25])

    def shift(result: Any) -> None:
        for key in ("lo", "hi", "attained"):
            result[key] += amount

    def change(body: Any) -> None:
        for cell in body["cells"]:
            for output in cell.get("outputs", []):
                item = output.get("data", {}).get(ITEM, {})
                if item.get("kind") == "result":
                    shift(item)

    f.rewrite_body(name, change)
    f.both(lambda results: [shift(e["results"][0]) for e in results["calculations"] if e["id"] == name])
    f.claim()


def notebook_text(f: Forger) -> None:
    f.rewrite_body(f.chance.choice(["C01", "C02"]), lambda body: body["cells"][0].update(source="# Another purpose"))
    f.claim()


def spec_limit(f: Forger) -> None:
    old, new = f.chance.choice([("at least: 20 deg", "at least: 2 deg"), ("at most: 7 deg", "at most: 70 deg")])
    f.specs(old, new)
    words = {"at least: 20 deg": ("20 deg", "2 deg"), "at most: 7 deg": ("7 deg", "70 deg")}[old]
    f.both(lambda results: [
        row.update(limit=words[1], asks=row["asks"].replace(words[0], words[1]))
        for row in results["requirements"] if row["limit"] == words[0]
    ])  # fmt: skip


def verdict_hidden(f: Forger) -> None:
    def change(results: Any) -> None:
        row = f.chance.choice(results["requirements"])
        row["verdict"] = row["candidates"][0]["verdict"] = f.chance.choice(["does not meet", "not shown"])

    f.both(change)


def requirement_removed(f: Forger) -> None:
    text = (f.root / "data/workbook/workbook.yaml").read_text()
    row = next(line for line in text.splitlines(keepends=True) if "id: R2" in line)
    f.specs(row, "")
    f.specs(", shows: [R2]", "")
    f.both(lambda results: results["requirements"].pop())


def data_file(f: Forger) -> None:
    """The input changed, and everything that lists it; the notebook was run on another one."""
    path = f.root / "data/workbook/data/numbers.csv"
    path.write_text(f.digit(path.read_text()))
    digest = sha256(path.read_bytes())

    def change(results: Any) -> None:
        for entry in results["calculations"]:
            for file in entry["inputs"]:
                file["sha256"] = digest

    f.both(change)
    f.claim()


def swapped_calculations(f: Forger) -> None:
    def change(statement: Any) -> None:
        first, second = statement["calculations"]
        first["id"], second["id"] = second["id"], first["id"]
        statement["calculations"] = [second, first]

    f.restate(f.chance.choice(["prepared", "checked", "approved"]), change)


def another_role(f: Forger) -> None:
    old, new = f.chance.choice([("prepared", "checked"), ("prepared", "approved"), ("checked", "approved")])
    path, taken = f.statement(old), f.statement(new)
    name = path.name.replace(old, new)
    statement = json.loads(path.read_bytes()) | {"role": new}
    taken.with_name(taken.name + ".sig").unlink()
    taken.unlink()
    path.with_name(name).write_bytes(canonical(statement))
    path.with_name(name + ".sig").write_bytes(path.with_name(path.name + ".sig").read_bytes())


def another_revision(f: Forger) -> None:
    """Replay: signatures of revision A in an archive that calls itself B throughout."""
    f.both(lambda results: results["document"].update(revision="B"))
    f.specs("revision: A", "revision: B")
    for name in ("digests.json", "record/record.json"):
        record = f.json(f"data/issued/{name}")
        record["document"]["revision"] = "B"
        f.put(f"data/issued/{name}", record)
    f.replace(bag.INFO, "revision A", "revision B")
    if f.chance.random() < 0.5:
        for role in ("prepared", "checked", "approved"):
            f.restate(role, lambda statement: statement["document"].update(revision="B"))


def another_document(f: Forger) -> None:
    f.both(lambda results: results["document"].update(number="MIN-002"))
    f.specs("number: MIN-001", "number: MIN-002")
    for name in ("digests.json", "record/record.json"):
        record = f.json(f"data/issued/{name}")
        record["document"]["number"] = "MIN-002"
        f.put(f"data/issued/{name}", record)
    f.replace(bag.INFO, "MIN-001", "MIN-002")


def another_time(f: Forger) -> None:
    role = f.chance.choice(["prepared", "checked", "approved"])
    f.restate(role, lambda statement: statement.update(time=statement["time"].replace("05-28", "05-27")))


def another_person(f: Forger) -> None:
    role = f.chance.choice(["prepared", "checked", "approved"])
    f.restate(
        role, lambda statement: statement.update(person={"id": f.chance.choice(["p1", "c1", "a1", "x1"]), "name": "X"})
    )


def another_method(f: Forger) -> None:
    f.restate("checked", lambda s: s.update(method={"of check": "alternate calculation", "reference": "HC-9"}))


def swapped_signatures(f: Forger) -> None:
    first, second = (f.statement(role) for role in f.chance.sample(["prepared", "checked", "approved"], 2))
    paths = [path.with_name(path.name + ".sig") for path in (first, second)]
    contents = [path.read_bytes() for path in paths]
    for path, content in zip(paths, reversed(contents), strict=True):
        path.write_bytes(content)


def signature_removed(f: Forger) -> None:
    path = f.statement(f.chance.choice(["prepared", "checked", "approved"]))
    path.with_name(path.name + ".sig").unlink()
    path.unlink()


def preparer_approves(f: Forger) -> None:
    """The preparer grants himself the approval in spec, record and key list, and signs with his own key."""
    f.specs("signs as: [prepared]", "signs as: [prepared, approved]")
    record = f.json(f"{RECORD}/record.json")
    record["people"][0]["signs_as"] = ["prepared", "approved"]
    f.put(f"{RECORD}/record.json", record)
    f.replace(f"{RECORD}/allowed_signers", "prepared@trunnion", "prepared@trunnion,approved@trunnion")
    path = f.statement("approved")
    statement = json.loads(path.read_bytes()) | {"person": {"id": "p1", "name": "Ada Mill"}}
    path.write_bytes(canonical(statement))
    key = f.keys / "p1"  # type: ignore[attr-defined]
    path.with_name(path.name + ".sig").write_bytes(f.sign(key, "approved@trunnion", canonical(statement)))


def two_names(f: Forger) -> None:
    """The preparer lists his key under the checker's name too, and checks himself."""
    keys = f.root / RECORD / "allowed_signers"
    line = keys.read_text().splitlines()[0]
    keys.write_text(keys.read_text() + line.replace("p1 ", "c1 ").replace("prepared@", "checked@") + "\n")
    path = f.statement("checked")
    key = f.keys / "p1"  # type: ignore[attr-defined]
    path.with_name(path.name + ".sig").write_bytes(f.sign(key, "checked@trunnion", path.read_bytes()))


# Seen by archivist's signature alone: nobody else signs these bytes.
def page(f: Forger) -> None:
    path = f.root / "data/package/package.html"
    path.write_text(f.digit(path.read_text("utf-8")), "utf-8")


def pdf(f: Forger) -> None:
    path = f.root / "data/package/package.pdf"
    content = bytearray(path.read_bytes())
    content[f.chance.randrange(len(content))] ^= 1 << f.chance.randrange(8)
    path.write_bytes(bytes(content))


def sheet_sign_off(f: Forger) -> None:
    f.replace("data/package/C01-tiny-margin.ipynb", "Bo Carr", "Someone Else")


def key_list(f: Forger) -> None:
    path = f.root / RECORD / "allowed_signers"
    path.write_text(path.read_text() + (f.keys / "stranger.pub").read_text().replace("ssh-", "x1 ssh-", 1))  # type: ignore[attr-defined]


def environment(f: Forger) -> None:
    record = f.json(f"{RECORD}/environment.json")
    record["distributions"]["numpy"] = f"9.{f.chance.randrange(99)}"
    f.put(f"{RECORD}/environment.json", record)


def template(f: Forger) -> None:
    f.replace("data/workbook/templates/tiny-sum.ipynb", "Tiny sum", "Another sum")


def finder(f: Forger) -> None:
    f.replace("README.txt", "Call it KEYS", "Take it from this archive and call it KEYS")


def findings(f: Forger) -> None:
    f.put(f"{RECORD}/findings.json", [])
    f.replace(f"{RECORD}/findings.json", "[]", "[ ]")


SIGNED_BY_PEOPLE = (
    number_in_results, number_everywhere, notebook_text, spec_limit, verdict_hidden, requirement_removed, data_file,
    swapped_calculations, another_role, another_revision, another_document, another_time, another_person,
    another_method, swapped_signatures, signature_removed, preparer_approves, two_names,
)  # fmt: skip
SIGNED_BY_ARCHIVIST = (page, pdf, sheet_sign_off, key_list, environment, template, finder, findings)
