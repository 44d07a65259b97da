"""Both ways of verifying, over kinds of keys, dates, namespaces, revocation and patterns: equal answers or none."""

from __future__ import annotations

import itertools
import shutil
import subprocess
from pathlib import Path

import pytest

from trunnion.errors import RecordError
from trunnion.records.armour import parse_signature
from trunnion.records.keylist import matches, parse_keys
from trunnion.records.verification import Keys, Outcome, verify

MESSAGE = b'{"stated": "exactly this"}\n'
NAMESPACE = "checked@trunnion"
AT = "2031-05-28T12:00:00Z"
KINDS = {"ed25519": (), "rsa": ("-b", "2048"), "ecdsa": ()}
OPTIONS = {
    "none": "",
    "namespace": 'namespaces="checked@trunnion"',
    "another namespace": 'namespaces="prepared@trunnion"',
    "namespace pattern": 'namespaces="*@trunnion"',
    "refused namespace": 'namespaces="!checked@*,*"',
    "valid": 'valid-after="20310101Z",valid-before="20320101Z"',
    "not yet valid": 'valid-after="20310601Z"',
    "no more valid": 'valid-before="203105281159Z"',
    "last second": 'valid-before="20310528120000Z"',
    "first second": 'valid-after="20310528120000Z"',
    "local dates": 'valid-after="20300101",valid-before="20320101"',
    "authority": "cert-authority",
    "unknown option": 'flavour="sweet"',
}
PRINCIPALS = ["c1", "c?", "*", "p1", "!c1,*", "p1,c1", "C1", '"c1"']
pytestmark = pytest.mark.needs("ssh-keygen")


@pytest.fixture(scope="module")
def signed(tmp_path_factory, make_key) -> dict[str, tuple[str, bytes]]:
    """By kind of key: the public line, and a signature of MESSAGE in NAMESPACE."""
    folder = tmp_path_factory.mktemp("kinds")
    made = {}
    for kind, more in KINDS.items():
        path = make_key(folder / kind, kind, *more)
        command = ["ssh-keygen", "-Y", "sign", "-f", path, "-n", NAMESPACE]
        done = subprocess.run(command, input=MESSAGE, capture_output=True, check=True)
        made[kind] = ((folder / f"{kind}.pub").read_text().strip(), done.stdout)
    return made


def both(signature: bytes, keys: Keys, *, person="c1", namespace=NAMESPACE, at=AT, message=MESSAGE):
    asked = {"person": person, "namespace": namespace, "at": at, "keys": keys}
    return verify(message, signature, **asked), verify(message, signature, **asked, fallback=True)


def require_agreement(program, fallback) -> None:
    assert program.outcome in (Outcome.GOOD, Outcome.BAD)
    assert fallback.outcome in (program.outcome, Outcome.UNVERIFIED)


@pytest.mark.parametrize("kind", KINDS)
def test_both_routes_agree_or_the_fallback_says_that_it_can_not(signed, kind: str) -> None:
    public, signature = signed[kind]
    other = signed["rsa" if kind == "ed25519" else "ed25519"][0]
    good = unverified = 0
    for principal, option in itertools.product(PRINCIPALS, OPTIONS.values()):
        listed = f"{principal} {option} {public}\n".replace("  ", " ").encode()
        lists = (None, other.encode() + b"\n", public.encode() + b"\n")
        for revoked in lists if principal in ("c1", "!c1,*") else lists[:1]:
            program, fallback = both(signature, Keys(listed, revoked))
            require_agreement(program, fallback)
            if revoked is not None and revoked.startswith(public.encode()):
                assert program.outcome is Outcome.BAD, "a revoked key fails at every stated time"
            good += fallback.good
            unverified += fallback.outcome is Outcome.UNVERIFIED
    assert (good > 0) == (kind != "ecdsa"), "the fallback knows Ed25519 and RSA only"
    assert unverified > 0


@pytest.mark.parametrize("person", ["c1", "c2", "p1", "c1 ", "C1", "-c1", ""])
@pytest.mark.parametrize("namespace", [NAMESPACE, "prepared@trunnion", "file", "*"])
def test_persons_and_namespaces_are_judged_alike(signed, person: str, namespace: str) -> None:
    public, signature = signed["ed25519"]
    keys = Keys(f'c1 namespaces="*@trunnion" {public}\n'.encode())
    program, fallback = both(signature, keys, person=person, namespace=namespace)
    require_agreement(program, fallback)
    assert program.good == (person == "c1" and namespace == NAMESPACE)


@pytest.mark.parametrize("lines", [
    ["broken line", "GOOD"], ["GOOD", "broken line"], ["# comment", "", "GOOD"], ["c1 ssh-ed25519 AAAA", "GOOD"],
    ["c1 namespaces=\"x@y\" GOODKEY", "GOOD"],
    ['c1 namespaces="checked@trunnion" OTHER', "GOOD"], ["\tGOOD"], ["GOOD\r"],
])  # fmt: skip
def test_several_lines_are_judged_alike(signed, lines: list[str]) -> None:
    public, signature = signed["ed25519"]
    text = (
        "\n".join(lines).replace("GOODKEY", public).replace("GOOD", f"c1 {public}").replace("OTHER", signed["rsa"][0])
    )
    require_agreement(*both(signature, Keys(text.encode() + b"\n")))


def test_other_content_is_not_good_on_either_route(signed) -> None:
    for public, signature in signed.values():
        program, fallback = both(signature, Keys(f"c1 {public}\n".encode()), message=MESSAGE + b" ")
        assert program.outcome is Outcome.BAD
        assert fallback.outcome in (Outcome.BAD, Outcome.UNVERIFIED)


def test_a_file_that_is_not_exactly_one_armour_block_is_refused(signed) -> None:
    public, signature = signed["ed25519"]
    keys = Keys(f"c1 {public}\n".encode())
    lines = signature.split(b"\n")
    spoiled = {
        "two blocks": signature * 2,
        "text before": b"words\n" + signature,
        "text after": signature + b"words\n",
        "empty line": b"\n".join([lines[0], b"", *lines[1:]]),
        "spaces": signature.replace(b"\n", b" \n"),
        "windows line ends": signature.replace(b"\n", b"\r\n"),
        "no end": b"\n".join(lines[:-2]) + b"\n",
        "nothing": b"",
        "too much": signature.replace(lines[1], lines[1] * 2000),
    }
    for name, content in spoiled.items():
        for found in both(content, keys):
            assert found.outcome is Outcome.BAD, name
        with pytest.raises(RecordError):
            parse_signature(content)
    assert parse_signature(signature.rstrip(b"\n")).namespace == NAMESPACE


def test_a_key_revocation_list_needs_ssh_keygen(signed, tmp_path: Path) -> None:
    """A binary KRL (ssh-keygen -k) is judged by ssh-keygen; the fallback never calls the signature good."""
    public, signature = signed["ed25519"]
    (tmp_path / "key.pub").write_text(public + "\n")
    subprocess.run(["ssh-keygen", "-q", "-k", "-f", tmp_path / "krl", tmp_path / "key.pub"], check=True)
    keys = Keys(f"c1 {public}\n".encode(), (tmp_path / "krl").read_bytes())
    program, fallback = both(signature, keys)
    assert (program.outcome, fallback.outcome) == (Outcome.BAD, Outcome.UNVERIFIED)


def test_without_ssh_keygen_the_fallback_judges(signed, monkeypatch) -> None:
    monkeypatch.setattr(shutil, "which", lambda name: None)
    public, signature = signed["ed25519"]
    found = verify(MESSAGE, signature, person="c1", namespace=NAMESPACE, at=AT, keys=Keys(f"c1 {public}\n".encode()))
    assert (found.outcome, found.route) == (Outcome.GOOD, "sshsig")
    public, signature = signed["ecdsa"]
    found = verify(MESSAGE, signature, person="c1", namespace=NAMESPACE, at=AT, keys=Keys(f"c1 {public}\n".encode()))
    assert found.text == "not verified: needs ssh-keygen (keys of the kind ecdsa-sha2-nistp256)"


@pytest.mark.parametrize(("text", "patterns", "expected"), [
    ("p1", "p1", True), ("p1", "p?", True), ("p10", "p?", False), ("p1", "*", True), ("p1", "!p1,*", False),
    ("p1", "**", True), ("", "*", True), ("p1", "p*1*", True), ("p1x", "*p?", False), ("ab", "a*?b", False),
    ("a" * 150, "*a" * 70 + "*b", False), ("a*b", "a?b", True), ("", "", True), ("a", "", False),
    ("p1", "*,!p1", False), ("p1", "a,b", False), ("p.1", "p.1", True), ("px1", "p.1", False),
])  # fmt: skip
def test_patterns_as_ssh_config_5_has_them(text: str, patterns: str, expected: bool) -> None:
    assert matches(text, patterns) is expected


def test_people_who_share_a_key_are_one_person(signed) -> None:
    first, second = signed["ed25519"][0], signed["rsa"][0]
    listed = parse_keys(f"a {first}\nb {first}\nb {second}\nc {second}\nd {signed['ecdsa'][0]}\n".encode())
    assert listed.identities(["a", "b", "c", "d"]) == {"a": "a", "b": "a", "c": "a", "d": "d"}
