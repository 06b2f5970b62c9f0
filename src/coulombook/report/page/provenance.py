"""Where the page comes from: inputs with their fingerprints, the version, the options."""

from __future__ import annotations

import coulombook
from coulombook.book import Book
from coulombook.report.page.html import Html, element, join
from coulombook.report.page.tables import Column, Datum, show_table, text_datum


def show_provenance(book: Book) -> Html:
    """What was read, and by what. Without a time, so that the same day gives the same page."""
    options = ", ".join(f"{name} {value or 'none'}" for name, value in book.options.items())
    columns = [
        Column("file", [text_datum(one.path) for one in book.inputs], numeric=False),
        Column("size / byte", [Datum(str(one.size_byte), one.size_byte) for one in book.inputs]),
        Column("SHA-256", [Datum(one.sha256, kind="digest") for one in book.inputs], numeric=False),
    ]
    return join(
        element(
            "p",
            f"coulombook {coulombook.__version__}; options: {options or 'none'}. The time of writing and the versions "
            "of Python and the libraries stand in manifest.json beside this page.",
        ),
        element(
            "details",
            element("summary", f"{len(book.inputs)} files were read"),
            show_table("Inputs with their size and SHA-256", columns, name="inputs"),
        )
        if book.inputs
        else None,
    )
