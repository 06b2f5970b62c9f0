"""A results folder read back: the book as it was written, without what it was computed from."""

from __future__ import annotations

import csv
import hashlib
import io
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from coulombook.book import TABLES, Book, Cell, InputFile, Table
from coulombook.book.columns import Column, Kind, about_tables
from coulombook.findings import Finding, Severity
from coulombook.report.exchange import restored
from coulombook.report.manifest import NAME as MANIFEST
from coulombook.report.manifest import Written, read_manifest
from coulombook.report.tables import original_text


class StoredError(Exception):
    """The folder holds no results that can be read; the message says why and what would do."""


@dataclass(frozen=True, slots=True, eq=False)
class Stored:
    """A results folder: where it lies, what its manifest says, and which files are not as they were written.

    ``interrupted`` says that a tally was killed while it replaced these results; they are those of before.
    """

    folder: Path
    manifest: Written
    changed: tuple[str, ...]
    missing: tuple[str, ...]
    interrupted: bool = False


def find_results(path: Path) -> tuple[Path, bool]:
    """The results folder meant by a path (itself, or ``results`` within a day folder), and whether it stood aside.

    It stands aside when a tally was killed while it replaced it; see `coulombook.report.exchange`.
    """
    for place in (path, path / "results"):
        folder, aside = restored(place)
        if (folder / MANIFEST).is_file():
            return folder, aside
    if not path.is_dir():
        state = "is a file, not a folder" if path.exists() else "does not exist"
        raise StoredError(f"the folder '{path}' {state}")
    raise StoredError(
        f"there are no results in '{path}'; make them with coulombook tally, or name their folder"
    )


def open_results(path: Path) -> Stored:
    """The results of a day folder, or in a results folder, held against their manifest.

    Raises
    ------
    StoredError
        There are none, or their manifest cannot be read.
    """
    try:
        folder, interrupted = find_results(path)
    except OSError as error:
        raise StoredError(f"'{path}' cannot be read: {error.strerror or error}") from error
    manifest = read_manifest(folder)
    if manifest is None:
        raise StoredError(f"'{folder / MANIFEST}' is no manifest of coulombook, or is damaged")
    changed, missing = [], []
    for name, digest in sorted(manifest.outputs.items()):
        try:
            content = (folder / name).read_bytes()
        except FileNotFoundError:
            missing.append(name)
            continue
        except OSError as error:
            raise StoredError(f"'{folder / name}' cannot be read: {error.strerror or error}") from error
        if hashlib.sha256(content).hexdigest() != digest:
            changed.append(name)
    return Stored(folder, manifest, tuple(changed), tuple(missing), interrupted)


def read_book(stored: Stored) -> Book:
    """The book of a results folder, from its tables.

    Raises
    ------
    StoredError
        A table is missing or is no table of this version.
    """
    tables = {}
    for name in TABLES:
        file = f"{name}.csv"
        # an older version wrote fewer tables
        if file in stored.manifest.outputs:
            tables[name] = _read_table(stored.folder / file, name)
    for name in ("ledger", "summary", "series", "findings"):
        if name not in tables:
            raise StoredError(f"the results in '{stored.folder}' have no {name}.csv")
    findings = tuple(
        Finding(
            Severity(str(row["severity"])),
            *(str(row[head] or "") for head in ("kind", "where", "text", "mend")),
        )
        for row in tables["findings"].records()
    )
    return Book(
        stored.manifest.day,
        stored.manifest.title,
        tables,
        findings,
        tuple(InputFile(path, *said) for path, said in stored.manifest.inputs.items()),
        stored.manifest.options,
    )


def _read_table(path: Path, name: str) -> Table:
    columns = {one.head: one for one in about_tables()[name].columns}
    try:
        text = path.read_bytes().decode("utf-8")
        lines = csv.reader(io.StringIO(text, newline=""), strict=True)
        heads = next(lines)
        unknown = sorted(set(heads) - columns.keys())
        if unknown:
            raise StoredError(f"'{path}' has the column '{unknown[0]}', which this version does not know")
        return Table.of(name, [_row(heads, cells, columns) for cells in lines])
    except StopIteration:
        raise StoredError(f"'{path}' is empty") from None
    except (OSError, ValueError, csv.Error) as error:
        raise StoredError(f"'{path}' cannot be read as a table: {error}") from error


def _row(heads: Iterable[str], cells: Iterable[str], columns: dict[str, Column]) -> dict[str, Cell]:
    return {head: _cell(text, columns[head].kind) for head, text in zip(heads, cells, strict=True)}


def _cell(text: str, kind: Kind) -> Cell:
    if kind is Kind.TEXT:
        return original_text(text) or None
    if not text:
        return None
    return int(text) if kind is Kind.WHOLE else float(text)
