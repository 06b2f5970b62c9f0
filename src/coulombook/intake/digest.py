"""Fingerprints of input files."""

from __future__ import annotations

import hashlib
from pathlib import Path


def sha256_of(path: Path) -> tuple[str, int]:
    """SHA-256 of a file's bytes as hexadecimal digits (FIPS 180-4), and its size in bytes.

    Raises OSError, which names the file.
    """
    try:
        with path.open("rb") as stream:
            digest = hashlib.file_digest(stream, "sha256")
            return digest.hexdigest(), stream.tell()
    except OSError as error:
        # an error while reading, unlike one of opening, knows no name
        error.filename = error.filename or str(path)
        raise
