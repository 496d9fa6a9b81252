"""Which bytes a run was made of."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass


@dataclass(frozen=True, order=True)
class Fingerprint:
    """A file's name inside the contest folder, its SHA-256 in hexadecimal, its size in bytes."""

    file: str
    sha256: str
    size: int


def fingerprint(data: bytes, *, file: str) -> Fingerprint:
    """Fingerprint the bytes that were read, so that a file changed since cannot be taken for them."""
    return Fingerprint(file, hashlib.sha256(data).hexdigest(), len(data))
