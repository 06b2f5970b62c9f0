"""Any table of a book on the terminal: in blocks of columns that fit, or as plain lines for a pipe."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TextIO

from rich.console import Console
from rich.text import Text

from coulombook.book import Cell, Table
from coulombook.book.columns import Kind, about_tables
from coulombook.prose.numbers import plain
from coulombook.prose.text import crop, visible
from coulombook.report.grid import GAP, Column, grid
from coulombook.report.tables import csv_cell

LONGEST_CELL = 30
_DIGITS = 5


def show_table(table: Table, console: Console) -> None:
    """Print a table in as many blocks as its columns need, each with the columns that tell the rows apart."""
    about = about_tables()[table.name]
    kinds = {one.head: one.kind for one in about.columns}
    columns = {
        head: _column(head, table.column(head), kinds[head])
        for head in table.heads
        if any(cell is not None for cell in table.column(head))
    }
    if not columns:
        console.print(Text("This table has no rows."))
        return
    keys = [head for head in about.key if head in columns] or [next(iter(columns))]
    rule = "-" if console.options.ascii_only else "\N{BOX DRAWINGS LIGHT HORIZONTAL}"
    for place, block in enumerate(_blocks(columns, keys, console.width)):
        if place:
            console.print()
        console.print(grid([columns[head] for head in block], rule=rule), soft_wrap=True)


def print_plain(table: Table, stream: TextIO) -> None:
    """The table as lines of cells parted by tabs, heads first, numbers in full; for programs that read on."""
    print("\t".join(table.heads), file=stream)
    for row in table.rows:
        print("\t".join(map(_plain_cell, row)), file=stream)


def _plain_cell(cell: Cell) -> str:
    # a tab or a line break within a text would part the cell
    return " ".join(visible(cell, 10_000).split()) if isinstance(cell, str) else csv_cell(cell)


def _column(head: str, cells: Sequence[Cell], kind: Kind) -> Column:
    quantity, _, unit = head.partition(" / ")
    if kind is Kind.TEXT:
        texts = tuple("" if cell is None else crop(visible(str(cell)), LONGEST_CELL) for cell in cells)
        return Column((unit, quantity) if not unit else (quantity, unit), texts, True)
    shown = tuple(
        "" if cell is None else str(cell) if isinstance(cell, int) else plain(float(cell), _DIGITS)
        for cell in cells
    )
    return Column((quantity, unit) if unit else ("", quantity), shown)


def _blocks(columns: dict[str, Column], keys: Sequence[str], room: int) -> Iterator[list[str]]:
    """Heads of each block: the keys, then as many others as the room takes, and one at the least."""
    own = sum(columns[head].width + GAP for head in keys)
    block: list[str] = []
    width = own
    others = [head for head in columns if head not in keys]
    for head in others:
        needed = columns[head].width + GAP
        if block and width + needed - GAP > room:
            yield [*keys, *block]
            block, width = [], own
        block.append(head)
        width += needed
    if block or not others:
        yield [*keys, *block]
