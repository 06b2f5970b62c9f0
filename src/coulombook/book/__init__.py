"""The book: everything a tally produced, and how the settled account is entered into its tables."""

from coulombook.book.tables import (
    CALIBRATIONS,
    FINDINGS,
    INJECTIONS,
    LEDGER,
    SERIES,
    SUMMARY,
    SURFACE,
    TABLES,
    Book,
    Cell,
    InputFile,
    Table,
)

__all__ = [
    "CALIBRATIONS",
    "FINDINGS",
    "INJECTIONS",
    "LEDGER",
    "SERIES",
    "SUMMARY",
    "SURFACE",
    "TABLES",
    "Book",
    "Cell",
    "InputFile",
    "Table",
]
