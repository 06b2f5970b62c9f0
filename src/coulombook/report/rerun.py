"""Results made again held against those that were written: the same bytes, or where they part."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from coulombook.book import Book, Cell, Table
from coulombook.report.stored import Stored, StoredError, read_book


@dataclass(frozen=True, slots=True)
class Difference:
    """How a table made again parts from the one that was written, at the cell that parts most.

    ``size`` is relative for numbers; infinite for texts and for rows that one of the two lacks.
    """

    table: str
    cells: int  # that differ
    where: str
    head: str
    written: str
    again: str
    size: float


@dataclass(frozen=True, slots=True, eq=False)
class Rerun:
    """What came of it. ``identical`` and ``different`` are names of files."""

    changed_inputs: tuple[str, ...]
    identical: tuple[str, ...]
    different: tuple[str, ...]
    differences: tuple[Difference, ...]

    @property
    def same(self) -> bool:
        """Whether nothing has changed, neither what went in nor what came out."""
        return not (self.changed_inputs or self.different)


def changed_inputs(stored: Stored, book: Book) -> tuple[str, ...]:
    """Input files that are not those of the manifest: changed, gone or new."""
    now = {one.path: one.sha256 for one in book.inputs}
    then = {path: digest for path, (digest, _) in stored.manifest.inputs.items()}
    return tuple(sorted(path for path in now.keys() | then.keys() if now.get(path) != then.get(path)))


def compare(stored: Stored, book: Book, files: Mapping[str, bytes]) -> Rerun:
    """Hold files made again against a results folder.

    Parameters
    ----------
    stored : Stored
        The folder as it was written.
    book : Book
        Made again from the same day.
    files : mapping of file name to bytes
        What would be written for it.
    """
    identical: list[str] = []
    different: list[str] = []
    for name in stored.manifest.outputs:
        same = name in files and name not in stored.missing and _read(stored.folder / name) == files[name]
        (identical if same else different).append(name)
    return Rerun(
        changed_inputs(stored, book),
        tuple(sorted(identical)),
        tuple(sorted(different)),
        _differences(stored, book, different),
    )


def _read(path: Path) -> bytes:
    try:
        return path.read_bytes()
    except OSError as error:
        raise StoredError(f"'{path}' cannot be read: {error.strerror or error}") from error


def _differences(stored: Stored, book: Book, different: list[str]) -> tuple[Difference, ...]:
    tables = [
        name for name in book.tables if f"{name}.csv" in different and f"{name}.csv" not in stored.missing
    ]
    if not tables:
        return ()
    written = read_book(stored)
    found = (table_difference(written.tables[name], book.tables[name]) for name in tables)
    return tuple(one for one in found if one is not None)


def table_difference(written: Table, again: Table) -> Difference | None:
    """Where two tables of one name part most, row by row; None where their cells are the same."""
    count, worst = 0, None
    for place in range(max(len(written), len(again))):
        old = written.rows[place] if place < len(written) else (None,) * len(written.heads)
        new = again.rows[place] if place < len(again) else (None,) * len(again.heads)
        for head, one, other in zip(written.heads, old, new, strict=True):
            size = _apart(one, other)
            if size > 0:
                count += 1
                if worst is None or size > worst.size:
                    worst = Difference(
                        written.name, 0, f"row {place + 2}", head, _shown(one), _shown(other), size
                    )
    if worst is None:
        return None
    return Difference(written.name, count, worst.where, worst.head, worst.written, worst.again, worst.size)


def _apart(one: Cell, other: Cell) -> float:
    # an empty text and no value look alike in a file
    if one == other or {one, other} == {"", None}:
        return 0.0
    if isinstance(one, int | float) and isinstance(other, int | float):
        return abs(other - one) / max(abs(one), abs(other))
    return math.inf


def _shown(cell: Cell) -> str:
    return "nothing" if cell is None else repr(cell) if isinstance(cell, str) else str(cell)
