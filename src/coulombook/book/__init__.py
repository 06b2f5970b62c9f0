"""The book: everything a tally produced, and how the settled account is entered into its tables."""

from coulombook.book.tables import (
    BUDGET,
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
    "BUDGET",
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
