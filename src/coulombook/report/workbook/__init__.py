"""The audit workbook: every number of a day, laid out in live formulas from peak area to charge balance."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime

from coulombook.book import Book

NAME = "book.xlsx"

# a day without any date; the format knows none before 1980
_NO_DATE = datetime(1980, 1, 1)


class DayTooLong(ValueError):
    """A day has more readings than a sheet has rows; the message says of what."""


def workbook_bytes(book: Book) -> bytes:
    """The workbook of a book that holds what it was computed from (``book.settled``).

    The same book gives the same bytes.

    Raises
    ------
    ValueError
        The book is without it.
    DayTooLong
        There are more readings of one kind than a sheet has rows.
    """
    from coulombook.report.workbook.about import about_lines
    from coulombook.report.workbook.assemble import assemble
    from coulombook.report.workbook.cells import MOST_ROWS
    from coulombook.report.workbook.write import written

    if book.settled is None:
        raise ValueError("a workbook needs what the tables were computed from")
    sheets, charts = assemble(book)
    for sheet in sheets:
        if sheet.rows > MOST_ROWS:
            raise DayTooLong(f"the sheet '{sheet.name}' would need {sheet.rows:,} rows of {MOST_ROWS:,}")
    return written(
        sheets, charts, about_lines(book, sheets, charts=bool(charts)), book.title or book.day, _date(book)
    )


def _date(book: Book) -> datetime:
    """The day's own date: as its settings say, else that of its first run."""
    assert book.settled is not None
    day = book.settled.plan.day
    if day.settings.date is not None:
        return datetime(day.settings.date.year, day.settings.date.month, day.settings.date.day)
    return min(_starts(book), default=_NO_DATE)


def _starts(book: Book) -> Iterator[datetime]:
    assert book.settled is not None
    for run in book.settled.plan.runs:
        if run.started is not None:
            yield run.started.replace(tzinfo=None, microsecond=0)
