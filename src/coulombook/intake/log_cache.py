"""Numbers of untidy logs kept between tallies, outside the day folder: safe to delete, and never trusted over the file.

Only what the patient reader took seconds for is kept; a tidy log is read anew in less time than it takes to know it
again (decision 19). An entry is found by the content of the log, so that a changed log never meets an old one. Whatever
is wrong with an entry or its place, the log is read as if there were no cache.
"""

from __future__ import annotations

import contextlib
import hashlib
import io
import json
import os
import stat
import sys
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.readings import FloatArray
from coulombook.findings import KINDS, Finding, finding
from coulombook.intake.digest import sha256_of

VARIABLE = "COULOMBOOK_CACHE"  # "off", or a folder
FROM_BYTE = 2_000_000  # below it reading a log patiently takes less than 0.2 s
LARGEST_ENTRY_BYTE = 500_000_000
LARGEST_BYTE = 2_000_000_000  # of all entries together
_READER = 1  # raised whenever the patient reader reads something otherwise
_MARK = b"coulombook log 1\n"
_LONGEST_HEADER = 1_000_000
_WRITABLE_BY_OTHERS = stat.S_IWGRP | stat.S_IWOTH


@dataclass(frozen=True, slots=True, eq=False)
class Kept:
    """What the patient reader made of a log: numbers by quantity, their rows, the first stamp, and what it told."""

    values: Mapping[str, FloatArray]  # (n,) each
    rows: NDArray[np.int64]  # (n,)
    first_stamp: datetime | None
    findings: tuple[Finding, ...]


def folder() -> Path | None:
    """Where entries are kept; None when that is switched off or no place is known."""
    told = os.environ.get(VARIABLE, "").strip()
    if told.casefold() == "off":
        return None
    if told:
        return Path(told) / "logs"
    try:
        home = Path.home()
    except RuntimeError:
        return None
    if sys.platform == "win32":
        base = Path(os.environ.get("LOCALAPPDATA") or home / "AppData" / "Local") / "coulombook" / "cache"
    elif sys.platform == "darwin":
        base = home / "Library" / "Caches" / "coulombook"
    else:
        # the XDG base directory specification has relative paths ignored
        given = os.environ.get("XDG_CACHE_HOME", "")
        base = (Path(given) if os.path.isabs(given) else home / ".cache") / "coulombook"
    return base / "logs"


def key_of(path: Path, told: Sequence[Any]) -> str:
    """The key of a log read in some way: ``told`` is everything beside its content that the numbers depend on."""
    content = json.dumps([_READER, sha256_of(path)[0], *told], sort_keys=True, default=str)
    return hashlib.sha256(content.encode()).hexdigest()


def load(key: str) -> Kept | None:
    """The entry of a key; None when there is none, or none that is whole and this user's own."""
    place = folder()
    if place is None:
        return None
    path = place / key
    try:
        data = _own_file(path)
        if data is None:
            return None
        kept = _unpacked(data, key)
        os.utime(path)  # the oldest by use go first
    except (OSError, ValueError, KeyError, TypeError, MemoryError, OverflowError, RecursionError):
        return None
    return kept


def _own_file(path: Path) -> bytes | None:
    before = path.lstat()
    if not stat.S_ISREG(before.st_mode) or before.st_size > LARGEST_ENTRY_BYTE:
        return None
    # an entry that somebody else may write is nobody's word
    if hasattr(os, "geteuid") and (before.st_uid != os.geteuid() or before.st_mode & _WRITABLE_BY_OTHERS):
        return None
    return path.read_bytes()


def _unpacked(data: bytes, key: str) -> Kept:
    """An entry from its bytes. Raises ValueError, KeyError or TypeError for whatever it should not be."""
    if not data.startswith(_MARK):
        raise ValueError("another file")
    end = data.index(b"\n", len(_MARK), len(_MARK) + _LONGEST_HEADER)
    header: dict[str, Any] = json.loads(data[len(_MARK) : end])
    payload = memoryview(data)[end + 1 :]
    if header["key"] != key or header["sha256"] != hashlib.sha256(payload).hexdigest():
        raise ValueError("another entry, or a damaged one")
    table = np.load(io.BytesIO(payload), allow_pickle=False)
    quantities = header["quantities"]
    if table.dtype != np.float64 or table.ndim != 2 or len(table) != len(quantities) + 1 or not table.size:
        raise ValueError("no table of numbers")
    if not np.isfinite(table).all() or not all(isinstance(one, str) for one in quantities):
        raise ValueError("no numbers")
    findings = []
    for kind, where, text, mend in header["findings"]:
        if kind not in KINDS or KINDS[kind][0] == "stop":
            raise ValueError("no finding of a log that was read")
        findings.append(finding(kind, str(where), str(text), str(mend)))
    stamp = header["first stamp"]
    return Kept(
        {quantity: table[place].copy() for place, quantity in enumerate(quantities)},
        table[-1].astype(np.int64),
        None if stamp is None else datetime.fromisoformat(stamp),
        tuple(findings),
    )


def _packed(kept: Kept, key: str) -> bytes:
    stream = io.BytesIO()
    np.save(stream, np.array([*kept.values.values(), kept.rows], dtype=np.float64), allow_pickle=False)
    payload = stream.getvalue()
    header = {
        "key": key,
        "sha256": hashlib.sha256(payload).hexdigest(),
        "quantities": list(kept.values),
        "first stamp": None if kept.first_stamp is None else kept.first_stamp.isoformat(),
        "findings": [[one.kind, one.where, one.text, one.mend] for one in kept.findings],
    }
    return _MARK + json.dumps(header).encode() + b"\n" + payload


def keep(key: str, kept: Kept) -> None:
    """Write an entry, whole or not at all, and make room for it; nothing happens where it cannot be written."""
    place = folder()
    if place is None or kept.rows.nbytes * (len(kept.values) + 1) > LARGEST_ENTRY_BYTE // 2:
        return
    import tempfile  # with its own imports some milliseconds that most days need not spend

    part = None
    try:
        place.mkdir(mode=0o700, parents=True, exist_ok=True)
        handle, part = tempfile.mkstemp(dir=place, suffix=".part")
        with os.fdopen(handle, "wb") as stream:
            stream.write(_packed(kept, key))
        os.replace(part, place / key)
        _make_room(place)
    except (OSError, MemoryError):
        if part is not None:
            with contextlib.suppress(OSError):
                os.unlink(part)


def _make_room(place: Path) -> None:
    """Remove the entries used longest ago, and what interrupted writers left, until the rest is small enough."""
    entries = []
    with os.scandir(place) as found:
        for one in found:
            with contextlib.suppress(OSError):
                if one.is_file(follow_symlinks=False):
                    status = one.stat(follow_symlinks=False)
                    entries.append((status.st_mtime, status.st_size, one.path))
    total = sum(size for _, size, _ in entries)
    for _, size, path in sorted(entries):
        if total <= LARGEST_BYTE:
            return
        with contextlib.suppress(OSError):
            os.unlink(path)
            total -= size
