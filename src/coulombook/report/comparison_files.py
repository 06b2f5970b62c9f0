"""The folder of a comparison: its tables as CSV and a manifest, whole or not at all."""

from __future__ import annotations

from datetime import datetime
from pathlib import Path

from coulombook.book import Book
from coulombook.comparison.order import Comparison
from coulombook.report.results import write_folder
from coulombook.report.tables import csv_text

COMPARISON = "comparison"


def write_comparison(comparison: Comparison, out: Path, *, created: datetime | None = None) -> Path:
    """Write one CSV per table and the manifest into the folder ``out``, and return its path.

    Raises `coulombook.report.results.ResultsError` as `coulombook.report.results.write_results` does; a folder of
    results is no place for a comparison.
    """
    book = Book(
        "; ".join(comparison.days),
        comparison.verdict,
        comparison.tables,
        comparison.findings,
        comparison.inputs,
        comparison.options,
    )
    files = {
        f"{name}.csv": csv_text(table).encode("utf-8", "backslashreplace")
        for name, table in comparison.tables.items()
    }
    return write_folder(book, files, out, holds=COMPARISON, created=created)
