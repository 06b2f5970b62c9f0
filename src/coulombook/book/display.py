"""How a book, its tables and its findings show themselves in a notebook."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from coulombook.book.columns import Kind, about_tables
from coulombook.findings import Finding
from coulombook.prose.display import html_table
from coulombook.prose.numbers import ABSENT, plain, with_uncertainty

if TYPE_CHECKING:
    from coulombook.book.tables import Book, Cell, Table

_DIGITS = 5


class FindingList(tuple[Finding, ...]):
    """Findings in the order they were seen; a tuple that a notebook shows as a table."""

    __slots__ = ()

    def _repr_html_(self) -> str:
        heads = ("severity", "kind", "where", "text", "mend")
        rows = [(str(one.severity), one.kind, one.where, one.text, one.mend) for one in self]
        return html_table(f"{len(self)} findings", heads, rows, heads)


def book_html(book: Book) -> str:
    """The summary of a book, and how many findings of each severity there are."""
    title = f"{book.day}: {book.title}" if book.title else book.day
    counts = {word: sum(one.severity == word for one in book.findings) for word in ("warn", "note")}
    told = f"{title}; findings: {counts['warn']} of severity warn, {counts['note']} of severity note"
    return table_html(book.tables["summary"], told)


def table_html(table: Table, caption: str | None = None) -> str:
    """A table with its values rounded to their uncertainties, which then need no column of their own."""
    about = about_tables().get(table.name)
    texts = [one.head for one in about.columns if one.kind is Kind.TEXT] if about else []
    spreads = {head: spread for head in table.heads if (spread := _spread_of(head)) in table.heads}
    shown = [
        head
        for head in table.heads
        if head not in spreads.values() and any(cell is not None for cell in table.column(head))
    ]
    columns = [_cells(table, head, spreads.get(head)) for head in shown]
    return html_table(caption or table.name, shown, list(zip(*columns, strict=True)), texts)


def _spread_of(head: str) -> str:
    """The head of a quantity's standard uncertainty: 'u(FE) / %' for 'FE / %'."""
    quantity, slash, unit = head.partition(" / ")
    return f"u({quantity}){slash}{unit}"


def _cells(table: Table, head: str, spread: str | None) -> Sequence[str]:
    values = table.column(head)
    uncertainties: Sequence[Cell] = table.column(spread) if spread else [None] * len(values)
    return [_cell(value, u) for value, u in zip(values, uncertainties, strict=True)]


def _cell(value: Cell, u: Cell) -> str:
    if value is None:
        return ABSENT
    if isinstance(value, str | int):
        return str(value)
    return with_uncertainty(value, float(u)) if isinstance(u, int | float) else plain(value, _DIGITS)
