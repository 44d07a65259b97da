"""Is this signature good: this person, this role, exactly this content, at its stated time?

`ssh-keygen -Y verify` answers wherever it is installed. Without it, `sshsig` checks the arithmetic of Ed25519 and RSA
keys and the rules for principal, namespace, dates and revoked keys are our own; whatever they do not cover is "not
verified: needs ssh-keygen", never "good".
"""

from __future__ import annotations

import enum
import os
import shutil
import subprocess
import tempfile
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

from trunnion.calculations.digest import sha256
from trunnion.errors import RecordError
from trunnion.records import moments
from trunnion.records.armour import Signature, parse_signature
from trunnion.records.keylist import KeyList, fingerprint, parse_keys, public_blob

NEEDS = "needs ssh-keygen"
PROGRAM = "ssh-keygen"
_PATIENCE = 60.0  # seconds for one verification
_FALLBACK_KEYS = ("ssh-ed25519", "ssh-rsa")
_FALLBACK_HASHES = ("sha256", "sha512")
_answers: dict[tuple[str | None, ...], Verified] = {}  # of this process: the same question is asked for sheet and page
_SHORTEST_RSA = 256  # bytes of a 2048 bit modulus; ssh-keygen judges shorter ones


class Outcome(enum.Enum):
    """What verification says."""

    GOOD = "good"
    BAD = "not good"
    UNVERIFIED = "not verified"


@dataclass(frozen=True)
class Verified:
    """The outcome, why, the fingerprint of the key, and the program that judged."""

    outcome: Outcome
    why: str = ""
    fingerprint: str = ""
    route: str = ""

    @property
    def good(self) -> bool:
        """Whether it is good."""
        return self.outcome is Outcome.GOOD

    @property
    def text(self) -> str:
        """The outcome in words."""
        return f"{self.outcome.value}: {self.why}" if self.why else self.outcome.value


@dataclass(frozen=True)
class Keys:
    """The keys to trust: an `allowed_signers` list, and revoked keys (public keys, one a line, or a KRL)."""

    signers: bytes
    revoked: bytes | None = None

    @cached_property
    def listed(self) -> KeyList:
        """The list as read here."""
        return parse_keys(self.signers)


def verify(
    message: bytes, signature: bytes, *, person: str, namespace: str, at: str, keys: Keys, fallback: bool | None = None
) -> Verified:
    """Verify a signature of `person` in `namespace` at the stated time `at`.

    `fallback` True takes the in-process route, None only where ssh-keygen is missing.
    """
    try:
        read = parse_signature(signature)
        moments.seconds(at)
    except RecordError as err:
        return Verified(Outcome.BAD, err.fault.cause)
    if not _plain_name(person):
        return Verified(Outcome.BAD, f"{person!r} is no id of a person", fingerprint(read.key))
    program = None if fallback else shutil.which(PROGRAM)
    parts = (message, signature, keys.signers, keys.revoked or b"", b"" if keys.revoked is None else b"listed")
    asked = (program, person, namespace, at, *(sha256(part) for part in parts))
    if asked not in _answers:
        if program is None:
            _answers[asked] = _in_process(message, signature, read, person, namespace, at, keys)
        else:
            _answers[asked] = _by_program(program, message, signature, read, person, namespace, at, keys)
    return _answers[asked]


def _plain_name(person: str) -> bool:
    return bool(person) and person.isprintable() and not person.startswith("-") and len(person) < 200


def _by_program(
    program: str, message: bytes, signature: bytes, read: Signature, person: str, namespace: str, at: str, keys: Keys
) -> Verified:
    with tempfile.TemporaryDirectory(prefix="trunnion-verify-") as scratch:
        folder = Path(scratch)
        (folder / "signature").write_bytes(signature)
        (folder / "signers").write_bytes(keys.signers)
        command = [program, "-Y", "verify", "-f", str(folder / "signers"), "-I", person, "-n", namespace]
        command += ["-s", str(folder / "signature"), "-O", f"verify-time={moments.verify_time(at)}"]
        if keys.revoked is not None:
            (folder / "revoked").write_bytes(keys.revoked)
            command += ["-r", str(folder / "revoked")]
        environment = {**os.environ, "LC_ALL": "C"}
        try:
            done = subprocess.run(command, input=message, capture_output=True, timeout=_PATIENCE, env=environment)
        except (OSError, subprocess.TimeoutExpired) as err:
            return Verified(Outcome.UNVERIFIED, f"{PROGRAM} did not answer ({type(err).__name__})")
        told = done.stderr.decode("utf-8", "replace").replace(scratch + os.sep, "").strip().split("\n")[-1]
    key = fingerprint(read.key)
    if done.returncode == 0:
        return Verified(Outcome.GOOD, "", key, PROGRAM)
    return Verified(Outcome.BAD, told or "the key may not sign this", key, PROGRAM)


def _in_process(
    message: bytes, signature: bytes, read: Signature, person: str, namespace: str, at: str, keys: Keys
) -> Verified:
    key = fingerprint(read.key)

    def unverified(why: str) -> Verified:
        return Verified(Outcome.UNVERIFIED, f"{NEEDS} ({why})", key, "sshsig")

    if read.algorithm not in _FALLBACK_KEYS or read.hash not in _FALLBACK_HASHES:
        return unverified(f"keys of the kind {read.algorithm}")
    if read.algorithm == "ssh-rsa" and len(read.key) < _SHORTEST_RSA:
        return unverified("a short RSA key")
    refused = _revoked(read.key, keys.revoked)
    if refused is None:
        return unverified("this list of revoked keys")
    arithmetic = _arithmetic(message, signature, namespace)
    if arithmetic is None:
        return unverified("this signature")
    why = arithmetic or refused or _not_granted(read, person, namespace, at, keys.listed)
    if not why:
        return Verified(Outcome.GOOD, "", key, "sshsig")
    if keys.listed.unread and not (arithmetic or refused):
        return unverified(f"line {keys.listed.unread[0][0]} of the key list")
    return Verified(Outcome.BAD, why, key, "sshsig")


def _arithmetic(message: bytes, signature: bytes, namespace: str) -> str | None:
    """Why the signature is not one of this message and namespace; "" if it is; None if that can't be told here."""
    try:
        import sshsig
    except ImportError:
        return None
    try:
        sshsig.check_signature(message, signature, namespace)
    except sshsig.InvalidSignature:
        return "the signature is not one of this content and role"
    except Exception:  # what else this library meets in hostile bytes (it asserts): never "good"
        return None
    return ""


def _revoked(blob: bytes, revoked: bytes | None) -> str | None:
    """Why the key is refused; "" if it is not; None if the list can't be read here."""
    listed = []
    for line in (revoked or b"").split(b"\n"):
        text = line.decode("utf-8", "replace").strip()
        if not text or text.startswith("#"):
            continue
        try:
            listed.append(public_blob(text)[1])
        except ValueError:
            return None
    return "the key is revoked" if blob in listed else ""


def _not_granted(read: Signature, person: str, namespace: str, at: str, keys: KeyList) -> str:
    own = [entry for entry in keys.of(read.key) if entry.stands_for(person)]
    if not own:
        return f"the key is not listed for {person}"
    granted = [entry for entry in own if entry.grants(namespace)]
    if not granted:
        return f"the key may not sign as {namespace}"
    moment = moments.seconds(at)
    for entry in granted:
        early = entry.valid_after is not None and moment < entry.valid_after
        late = entry.valid_before is not None and moment > entry.valid_before
        if not (early or late):
            return ""
    return "the key was not valid at the stated time"
