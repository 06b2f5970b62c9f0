"""Write the results folder, whole or not at all.

Everything is written into a folder beside the final one and flushed to the disk; only then does it take the
final name. A results folder that is there already steps aside first and comes back if the exchange fails,
so that at every moment either the old results or the new ones are whole on the disk.
"""

from __future__ import annotations

import os
import shutil
from collections.abc import Mapping
from contextlib import suppress
from datetime import UTC, datetime
from fnmatch import fnmatch
from pathlib import Path

from coulombook.book import TABLES, Book, Table
from coulombook.report.datapackage import NAME as DATAPACKAGE
from coulombook.report.datapackage import datapackage_text
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
    target = _real(out)
    when = created or datetime.now(UTC)
    files = {**files, MANIFEST: manifest_text(book, files, when, holds).encode("utf-8")}
    fresh = _sibling(target, "new")
    try:
        try:
            target.parent.mkdir(parents=True, exist_ok=True)
            _fill(fresh, files)
            _exchange(target, fresh)
        finally:
            # after the exchange there is nothing of that name left to remove
            shutil.rmtree(fresh, ignore_errors=True)
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
    target = _real(out)
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
    from coulombook.report.workbook import workbook_bytes

    return {WORKBOOK: workbook_bytes(book), PAGE: page_html(book).encode("utf-8")}


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


def _fill(folder: Path, files: Mapping[str, bytes]) -> None:
    folder.mkdir()
    for name, content in files.items():
        with open(folder / name, "xb") as stream:
            stream.write(content)
            stream.flush()
            os.fsync(stream.fileno())
    _flush_folder(folder)


def _exchange(target: Path, fresh: Path) -> None:
    if not os.path.lexists(target):
        os.rename(fresh, target)
    else:
        aside = _sibling(target, "old")
        os.rename(target, aside)
        try:
            os.rename(fresh, target)
        except BaseException:
            os.rename(aside, target)
            raise
        # the new results are in place: what cannot be removed of the old ones harms nothing
        shutil.rmtree(aside, ignore_errors=True)
    _flush_folder(target.parent)


def _flush_folder(folder: Path) -> None:
    """Bring the names in a folder to the disk, where a folder can be opened for that (not on Windows)."""
    with suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _real(out: Path) -> Path:
    # a link is followed: the folder it points to is replaced, not the link
    return Path(os.path.realpath(out))


def _sibling(target: Path, word: str) -> Path:
    # a random name, so that two tallies of one day never share it; mkdir with the usual rights, unlike
    # tempfile's
    return target.with_name(f".{target.name}.{os.urandom(4).hex()}.{word}")
