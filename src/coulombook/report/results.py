"""Write the results folder, whole or not at all (`coulombook.report.exchange`), and nothing but a folder of ours."""

from __future__ import annotations

import os
from collections.abc import Mapping
from datetime import UTC, datetime
from fnmatch import fnmatch
from pathlib import Path

from coulombook.book import TABLES, Book, Table
from coulombook.report.datapackage import NAME as DATAPACKAGE
from coulombook.report.datapackage import datapackage_text
from coulombook.report.exchange import replace_folder
from coulombook.report.lock import BusyError
from coulombook.report.manifest import NAME as MANIFEST
from coulombook.report.manifest import RESULTS, manifest_text, read_manifest
from coulombook.report.tables import csv_text

# What file managers and office programs leave lying in a folder; nobody misses it.
_LITTER = (".DS_Store", "Thumbs.db", "desktop.ini", "~$*", ".~lock.*#")


class ResultsError(Exception):
    """The results cannot be written to the place asked for; the message says why and what would do."""


def write_results(
    book: Book, out: Path, *, created: datetime | None = None, tables_only: bool = False
) -> Path:
    """Write one CSV per table, their description and the manifest into the folder ``out``, and return its path.

    Parameters
    ----------
    book : Book
        A table of the contract that the book lacks is written with its heads alone.
    out : Path
        Is made, with its parents, or replaced if it is empty or was written by coulombook.
    created : datetime, optional
        With time zone; now, if not given.
    tables_only : bool
        Leave out what people open instead of reading tables: see `_documents`.

    Raises
    ------
    ResultsError
        ``out`` holds something that coulombook did not write, or cannot be written; what was there is
        untouched.
    """
    check_destination(out)
    return write_folder(book, result_files(book, tables_only=tables_only), out, created=created)


def write_folder(
    book: Book,
    files: Mapping[str, bytes],
    out: Path,
    *,
    holds: str = RESULTS,
    created: datetime | None = None,
) -> Path:
    """Write files made from a book, and their manifest, into a folder of its own; see `write_results`.

    ``holds`` says what they are; a folder is only replaced by one that holds the same.
    """
    check_destination(out, holds)
    when = created or datetime.now(UTC)
    # the manifest last: a folder that has one is whole
    files = {**files, MANIFEST: manifest_text(book, files, when, holds).encode("utf-8")}
    try:
        replace_folder(_real(out), files, lambda folder: _check(folder, out, holds))
    except BusyError as error:
        raise ResultsError(
            f"the {holds} folder '{out}' is being written by {error.holder}, which took longer than "
            f"{error.patience_second:g} s; try again when that has ended, or give another --out"
        ) from error
    except OSError as error:
        raise ResultsError(
            f"the {holds} cannot be written to '{out}': {error.strerror or error}; "
            "close programs that have its files open, check the space and rights there, or give another --out"
        ) from error
    return out


def result_files(book: Book, *, tables_only: bool = False) -> dict[str, bytes]:
    """Every file of the results but the manifest, which also knows the time; the same book gives the same bytes."""
    files = _tables(book)
    if not tables_only:
        files |= _documents(book)
    files[DATAPACKAGE] = datapackage_text(book, files).encode("utf-8")
    return files


def check_destination(out: Path, holds: str = RESULTS) -> None:
    """Raise `ResultsError` unless ``out`` is absent, empty, or a folder of results (or figures) as it was written."""
    _check(_real(out), out, holds)


def _check(target: Path, out: Path, holds: str) -> None:
    """See `check_destination`; ``target`` is the folder looked at, ``out`` the one that is spoken of."""
    if not os.path.lexists(target):
        return
    if not target.is_dir():
        raise ResultsError(f"'{out}' is a file; give a folder to --out")
    try:
        present = {one.name for one in target.iterdir()}
    except OSError as error:
        raise ResultsError(f"the folder '{out}' cannot be read: {error.strerror or error}") from error
    present = {name for name in present if not any(fnmatch(name, litter) for litter in _LITTER)}
    if not present:
        return
    # a system may rename a folder whose files it lets nobody remove
    if not os.access(target, os.W_OK):
        raise ResultsError(f"the folder '{out}' is protected against writing; give another folder to --out")
    written = read_manifest(target)
    if written is None:
        raise ResultsError(
            f"the folder '{out}' is not empty and was not written by coulombook; "
            "give a new or empty folder to --out"
        )
    if written.holds != holds:
        raise ResultsError(
            f"the folder '{out}' holds {written.holds}, not {holds}; give another folder to --out"
        )
    strangers = sorted(present - written.outputs.keys() - {MANIFEST})
    if strangers:
        more = f" and {len(strangers) - 1} more" if len(strangers) > 1 else ""
        raise ResultsError(
            f"the {holds} folder '{out}' holds '{strangers[0]}'{more}, which coulombook did not write "
            "and would delete; move it elsewhere or give another --out"
        )


def _tables(book: Book) -> dict[str, bytes]:
    """The CSV files, by name."""
    tables = {name: book.tables.get(name, Table.of(name, [])) for name in TABLES} | dict(book.tables)
    if "findings" not in book.tables:
        tables["findings"] = findings_table(book)
    return {
        f"{name}.csv": csv_text(table).encode("utf-8", "backslashreplace") for name, table in tables.items()
    }


def _documents(book: Book) -> dict[str, bytes]:
    """What people open, by file name; a book that has lost what it was computed from has none."""
    if book.settled is None:
        return {}
    from coulombook.report.page import NAME as PAGE
    from coulombook.report.page import page_html
    from coulombook.report.workbook import NAME as WORKBOOK
    from coulombook.report.workbook import DayTooLong, workbook_bytes

    try:
        workbook = workbook_bytes(book)
    except DayTooLong as error:
        raise ResultsError(f"the day is too long for a workbook: {error}; give --tables-only") from error
    return {WORKBOOK: workbook, PAGE: page_html(book).encode("utf-8")}


def findings_table(book: Book) -> Table:
    """The findings as a table, in the order they were seen."""
    return Table.of(
        "findings",
        [
            {
                "severity": str(one.severity),
                "kind": one.kind,
                "where": one.where,
                "text": one.text,
                "mend": one.mend,
            }
            for one in book.findings
        ],
    )


def _real(out: Path) -> Path:
    # a link is followed: the folder it points to is replaced, not the link
    return Path(os.path.realpath(out))
