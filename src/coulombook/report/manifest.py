"""The manifest: what went in, what made it, what came out.

It lets a reader check years later that the files beside it are the ones that were written, and from which
inputs. It is also how a results folder is known as ours before it is replaced.
"""

from __future__ import annotations

import hashlib
import json
import sys
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

import coulombook
from coulombook.book import Book

NAME = "manifest.json"
RESULTS, FIGURES = "results", "figures"  # what the folder of a manifest holds
_PROGRAM = "coulombook"
_LIBRARIES = ("matplotlib", "numpy", "openpyxl", "pandas", "pint", "scipy", "xlsxwriter")


@dataclass(frozen=True, slots=True, eq=False)
class Written:
    """What a manifest says about the folder it lies in."""

    holds: str
    version: str
    created: str
    day: str
    title: str
    options: Mapping[str, str]
    libraries: Mapping[str, str]
    inputs: Mapping[str, tuple[str, int]]  # path -> SHA-256, size in bytes
    outputs: Mapping[str, str]  # name of a file written beside it -> SHA-256


def manifest_text(book: Book, outputs: Mapping[str, bytes], created: datetime, holds: str = RESULTS) -> str:
    """The manifest of one folder of results or figures as JSON, keys sorted.

    Parameters
    ----------
    book : Book
        Its inputs (with SHA-256 and size) and options are listed.
    outputs : mapping of file name to bytes
        The other files of the folder, as written.
    created : datetime
        With time zone.
    holds : str
        `RESULTS` or `FIGURES`.
    """
    content = {
        "program": _PROGRAM,
        "holds": holds,
        "version": coulombook.__version__,
        "python": sys.version.split()[0],
        # only what was loaded has had a part in the numbers
        "libraries": {
            name: str(getattr(sys.modules[name], "__version__", "unknown"))
            for name in _LIBRARIES
            if name in sys.modules
        },
        "created": created.isoformat(timespec="seconds"),
        "day": book.day,
        "title": book.title,
        "options": dict(book.options),
        "inputs": {one.path: {"sha256": one.sha256, "bytes": one.size_byte} for one in book.inputs},
        "outputs": {
            name: {"sha256": hashlib.sha256(content).hexdigest(), "bytes": len(content)}
            for name, content in outputs.items()
        },
    }
    return json.dumps(content, indent=2, sort_keys=True, ensure_ascii=True) + "\n"


def read_manifest(folder: Path) -> Written | None:
    """What the manifest in a folder says, or None where there is none of ours."""
    try:
        content = json.loads((folder / NAME).read_text(encoding="utf-8"))
    except (OSError, ValueError, RecursionError):
        return None
    if not isinstance(content, dict) or content.get("program") != _PROGRAM:
        return None
    return Written(
        holds=_text(content, "holds") or RESULTS,
        version=_text(content, "version"),
        created=_text(content, "created"),
        day=_text(content, "day"),
        title=_text(content, "title"),
        options=_texts(content, "options"),
        libraries=_texts(content, "libraries"),
        inputs={path: (_text(said, "sha256"), _size(said)) for path, said in _records(content, "inputs")},
        outputs={name: _text(said, "sha256") for name, said in _records(content, "outputs")},
    )


def _text(content: Mapping[str, object], word: str) -> str:
    return str(content.get(word, ""))


def _texts(content: Mapping[str, object], word: str) -> dict[str, str]:
    return {key: str(value) for key, value in _mapping(content, word).items()}


def _mapping(content: Mapping[str, object], word: str) -> Mapping[str, object]:
    found = content.get(word)
    return found if isinstance(found, dict) else {}


def _records(content: Mapping[str, object], word: str) -> list[tuple[str, Mapping[str, object]]]:
    return [(key, said) for key, said in _mapping(content, word).items() if isinstance(said, dict)]


def _size(said: Mapping[str, object]) -> int:
    size = said.get("bytes")
    return size if isinstance(size, int) else 0
