"""One SSH signature in its armour, and nothing else in the file.

Source: OpenSSH, PROTOCOL.sshsig (blob: magic, version, public key, namespace, reserved, hash, signature).
"""

from __future__ import annotations

import base64
import binascii
import re
from dataclasses import dataclass

from trunnion.errors import RecordError

LARGEST = 64_000
_BLOCK = re.compile(
    rb"-----BEGIN SSH SIGNATURE-----\n((?:[A-Za-z0-9+/=]{1,76}\n)+)-----END SSH SIGNATURE-----\n?", re.DOTALL
)


@dataclass(frozen=True)
class Signature:
    """What a signature says of itself: its key, namespace and hash; nothing of it is believed before it is verified."""

    key: bytes
    namespace: str
    hash: str
    signed: bytes

    @property
    def algorithm(self) -> str:
        """The kind of key, as OpenSSH names it."""
        return _Reader(self.key).text()


def parse_signature(content: bytes) -> Signature:
    """Read a signature file; RecordError unless it is exactly one armour block."""
    found = _BLOCK.fullmatch(content) if len(content) <= LARGEST else None
    if found is None:
        raise RecordError("the signature file is not exactly one SSH signature", remedy="sign again: trunnion sign")
    try:
        text = found[1].replace(b"\n", b"")
        blob = base64.b64decode(text, validate=True)
        if base64.b64encode(blob) != text or blob[:6] != b"SSHSIG":
            raise ValueError("its armour is not in order")
        reader = _Reader(blob[6:])
        if reader.number() != 1:
            raise ValueError("it is of another version")
        key, space, reserved, digest, signed = (reader.string() for _ in range(5))
        if reader.rest or reserved:
            raise ValueError("it holds more than it may")
        signature = Signature(key, space.decode("ascii"), digest.decode("ascii"), signed)
        _ = signature.algorithm
    except (ValueError, binascii.Error) as err:
        raise RecordError(f"the signature can't be read: {err}", remedy="sign again: trunnion sign") from err
    return signature


class _Reader:
    """Length-prefixed fields, as SSH writes them."""

    def __init__(self, content: bytes) -> None:
        self.rest = content

    def number(self) -> int:
        taken, self.rest = self.rest[:4], self.rest[4:]
        if len(taken) != 4:
            raise ValueError("it ends too early")
        return int.from_bytes(taken, "big")

    def string(self) -> bytes:
        length = self.number()
        if length > len(self.rest):
            raise ValueError("it ends too early")
        taken, self.rest = self.rest[:length], self.rest[length:]
        return taken

    def text(self) -> str:
        return self.string().decode("ascii")
