"""Archives touched by chance and by people: what matters is noticed, and nothing crashes."""

from __future__ import annotations

import importlib.util
import json
import random
import shutil
import sys
from pathlib import Path

import bagit
import pytest

from trunnion.records import bag
from trunnion.records.audit import Verdict, audit
from trunnion.records.statements import canonical

pytestmark = pytest.mark.needs("ssh-keygen")
_SPEC = importlib.util.spec_from_file_location("forging", Path(__file__).with_name("forging.py"))
assert _SPEC is not None
assert _SPEC.loader is not None
forging = importlib.util.module_from_spec(_SPEC)
sys.modules["forging"] = forging
_SPEC.loader.exec_module(forging)


def verdict(path: Path, keys: Path) -> Verdict:
    return audit(path, signers=(keys / "allowed_signers").read_bytes()).verdict


def forger(root: Path, seed: int, keys: Path):
    made = forging.Forger(root, seed)
    made.keys = keys
    return made


def attacked(original: Path, root: Path, attack, seed: int, keys: Path):
    """A fresh copy with one attack carried out and every digest put right; its bag is valid."""
    shutil.rmtree(root, ignore_errors=True)
    shutil.copytree(original, root)
    made = forger(root, seed, keys)
    attack(made)
    made.settle()
    assert bag.problems(root) == [], attack.__name__
    assert bagit.Bag(str(root)).is_valid(), attack.__name__
    return made


def test_attackers_without_keys_fail_though_every_digest_is_right(archived_once, people_keys, tmp_path, count) -> None:
    """300 adversarial changes in the full run; bagit (a program of its own) finds each altered bag valid."""
    attacks = (*forging.SIGNED_BY_PEOPLE, *forging.SIGNED_BY_ARCHIVIST)
    for seed in range(count(300)):
        attack = attacks[seed % len(attacks)]
        attacked(archived_once / "MIN-001-A", tmp_path / "MIN-001-A", attack, seed, people_keys)
        assert verdict(tmp_path / "MIN-001-A", people_keys) is Verdict.NOT_VALID, (attack.__name__, seed)


@pytest.mark.parametrize("attack", forging.SIGNED_BY_PEOPLE, ids=lambda attack: attack.__name__)
def test_an_attacker_with_the_archivists_key_fails_at_what_people_signed(
    archived_once, people_keys, tmp_path, attack
) -> None:
    made = attacked(archived_once / "MIN-001-A", tmp_path / "MIN-001-A", attack, 7, people_keys)
    made.archivist(people_keys / "a1")
    found = audit(made.root, signers=(people_keys / "allowed_signers").read_bytes())
    assert found.rows[2].mark.value == "good", "the archive's own signature holds"
    assert found.verdict is Verdict.NOT_VALID


def test_what_only_the_archivist_signs_is_only_as_good_as_that_key(archived_once, people_keys, tmp_path) -> None:
    """Stated, not hidden: pages are vouched for by the archive's signature and by nothing else."""
    made = attacked(archived_once / "MIN-001-A", tmp_path / "MIN-001-A", forging.page, 7, people_keys)
    made.archivist(people_keys / "a1")
    assert verdict(made.root, people_keys) is Verdict.VALID


def test_a_forged_archive_with_keys_of_its_own_is_never_valid(archived_once, people_keys, tmp_path, make_key) -> None:
    """Everything made anew: notebook, people's signatures, key list, archive's signature; all by the forger's keys."""
    root = Path(shutil.copytree(archived_once / "MIN-001-A", tmp_path / "MIN-001-A"))
    made = forger(root, 3, people_keys)
    forging.notebook_text(made)
    lines = []
    for person, role in (("p1", "prepared"), ("c1", "checked"), ("a1", "approved")):
        key = make_key(tmp_path / person)
        more = ",archived@trunnion" if person == "a1" else ""
        lines.append(
            f'{person} namespaces="{role}@trunnion{more}" {(tmp_path / f"{person}.pub").read_text().strip()}\n'
        )
        path = made.statement(role)
        statement = canonical(json.loads(path.read_bytes()))
        path.with_name(path.name + ".sig").write_bytes(made.sign(key, f"{role}@trunnion", statement))
    (root / forging.RECORD / "allowed_signers").write_text("".join(lines))
    made.settle()
    made.archivist(tmp_path / "a1")
    assert bagit.Bag(str(root)).is_valid()
    assert audit(root).verdict is Verdict.CONSISTENT, "by its own list; it never says valid"
    assert verdict(root, people_keys) is Verdict.NOT_VALID


def test_even_a_trusted_list_with_one_key_under_two_names_is_one_person(archived_once, people_keys, tmp_path) -> None:
    made = attacked(archived_once / "MIN-001-A", tmp_path / "MIN-001-A", forging.two_names, 1, people_keys)
    made.archivist(people_keys / "a1")
    listed = (made.root / forging.RECORD / "allowed_signers").read_bytes()
    found = audit(made.root, signers=listed)
    assert found.verdict is Verdict.NOT_VALID
    assert any("prepared and checked by the same person" in row.found for row in found.rows)


def mutate(root: Path, chance: random.Random) -> tuple[dict[Path, bytes | None], str]:
    """One random change: flip, delete, add or swap; returns what was there before, to be put back."""
    files = sorted(path for path in root.rglob("*") if path.is_file())
    kinds = sorted({path.suffix for path in files})
    kind = chance.choice(kinds)
    path = chance.choice([path for path in files if path.suffix == kind])
    content = path.read_bytes()
    at = chance.randrange(len(content))
    what = chance.choice(["flip", "cut", "insert", "swap bytes", "delete file", "add file", "swap files", "empty"])
    if what == "flip":
        new = content[:at] + bytes([content[at] ^ 1 << chance.randrange(8)]) + content[at + 1 :]
    elif what == "cut":
        new = content[:at] + content[at + chance.randint(1, 20) :]
    elif what == "insert":
        new = content[:at] + chance.randbytes(chance.randint(1, 20)) + content[at:]
    elif what == "swap bytes":
        other = chance.randrange(len(content))
        changed = bytearray(content)
        changed[at], changed[other] = changed[other], changed[at]
        new = bytes(changed)
    elif what == "empty":
        new = b""
    elif what == "delete file":
        path.unlink()
        return {path: content}, f"{what} {path.name}"
    elif what == "add file":
        added = path.with_name(f"{chance.randrange(10**6)}{kind}")
        added.write_bytes(content)
        return {added: None}, f"{what} {added.name}"
    else:
        second = chance.choice(files)
        former = {path: content, second: second.read_bytes()}
        path.write_bytes(former[second])
        second.write_bytes(content)
        return former, f"{what} {path.name} {second.name}"
    path.write_bytes(new)
    return {path: content}, f"{what} {path.name} at {at}"


def test_random_changes_that_matter_are_noticed(archived_once, people_keys, tmp_path, count) -> None:
    """2,000 random changes in the full run. What does not matter: the line end after a signature's last line."""
    root = Path(shutil.copytree(archived_once / "MIN-001-A", tmp_path / "MIN-001-A"))
    for seed in range(count(2000)):
        former, what = mutate(root, random.Random(seed))
        same = all(old is not None and path.is_file() and path.read_bytes() == old for path, old in former.items())
        signature = root / bag.SIGNATURE
        line_end = (
            list(former) == [signature] and signature.is_file() and signature.read_bytes() == former[signature][:-1]
        )
        found = verdict(root, people_keys)
        expected = Verdict.VALID if same or line_end else Verdict.NOT_VALID
        assert found is expected, (seed, what)
        for path, old in former.items():
            path.unlink(missing_ok=True)
            if old is not None:
                path.write_bytes(old)
    assert verdict(root, people_keys) is Verdict.VALID


def test_random_changes_to_the_zip_are_refused_or_change_nothing(archived_once, people_keys, tmp_path, count) -> None:
    whole = (archived_once / "MIN-001-A.zip").read_bytes()
    path = tmp_path / "touched.zip"
    ends = [0, len(whole) - 200, len(whole) - 4000]
    for seed in range(count(500)):
        chance = random.Random(seed)
        at = min(len(whole) - 1, max(0, chance.choice([*ends, chance.randrange(len(whole))]) + chance.randrange(200)))
        changed = {
            "flip": whole[:at] + bytes([whole[at] ^ 1 << chance.randrange(8)]) + whole[at + 1 :],
            "cut": whole[:at] + whole[at + chance.randint(1, 50) :],
            "truncate": whole[:at],
            "insert": whole[:at] + chance.randbytes(3) + whole[at:],
        }[chance.choice(["flip", "cut", "truncate", "insert"])]
        path.write_bytes(changed)
        found = verdict(path, people_keys)
        assert found in (Verdict.NOT_VALID, Verdict.VALID)
        if found is Verdict.VALID:
            assert _content(path) == _content(archived_once / "MIN-001-A.zip"), seed


def _content(path: Path) -> dict[str, bytes]:
    from trunnion.records.reading import opened

    with opened(path) as root:
        return {name: (root / name).read_bytes() for name in bag.files_of(root)}
