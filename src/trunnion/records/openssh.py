"""Signing through `ssh-keygen -Y sign`: keys people have already, agents and hardware keys included.

Trunnion opens no private key. Of a key file only its public half (`FILE.pub`) is read here.
"""

from __future__ import annotations

import shutil
import subprocess
from pathlib import Path

from trunnion.errors import RecordError
from trunnion.records.armour import parse_signature
from trunnion.records.keylist import public_blob


def sign(message: bytes, *, namespace: str, key: Path) -> bytes:
    """Sign with a key file, or with the agent's key whose public half the file is; RecordError says why it failed."""
    program = shutil.which("ssh-keygen")
    if program is None:
        raise RecordError("signing needs ssh-keygen, which is not installed", remedy="install OpenSSH's client tools")
    if not key.is_file():
        raise RecordError(f"there is no key file {key}", remedy="name it with --key, as in --key ~/.ssh/id_ed25519")
    done = subprocess.run([program, "-Y", "sign", "-f", str(key), "-n", namespace], input=message, capture_output=True)
    if done.returncode != 0:
        told = done.stderr.decode("utf-8", "replace").strip().split("\n")[-1]
        raise RecordError(f"ssh-keygen did not sign: {told}", remedy="check the key with: ssh-keygen -y -f FILE")
    parse_signature(done.stdout)
    return done.stdout


def public_key(key: Path) -> bytes:
    """The public key blob beside a key file; RecordError if there is none."""
    path = key if key.suffix == ".pub" else key.with_name(key.name + ".pub")
    try:
        return public_blob(path.read_text("utf-8", "replace"))[1]
    except (OSError, ValueError) as err:
        raise RecordError(
            f"{path} is not there or holds no public key", remedy=f"write it with: ssh-keygen -y -f {key} > {path}"
        ) from err


def agent_keys() -> list[str]:
    """Public key lines the agent offers; none where no agent runs."""
    program = shutil.which("ssh-add")
    if program is None:
        return []
    done = subprocess.run([program, "-L"], capture_output=True)
    return [
        line
        for line in done.stdout.decode("utf-8", "replace").split("\n")
        if line.startswith(("ssh-", "sk-", "ecdsa-"))
    ]
