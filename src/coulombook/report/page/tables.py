"""Tables of the page: a value and its uncertainty in one cell, in full precision behind it.

What is shown is rounded; sorting and copying use the figures to twelve digits, in ``data-v`` and ``data-u``. A text
that a spreadsheet would take for a formula is copied with the same guard as in the CSV files (``data-c``).
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from coulombook.balance.verdicts import OVER, SHORT
from coulombook.book import Cell, Table
from coulombook.book.closures import OPEN
from coulombook.book.columns import about_tables
from coulombook.report.page.html import Html, element, join
from coulombook.report.page.words import DASH, bare, measured, number_of, parted
from coulombook.report.tables import harmless_text

_SPREAD = re.compile(r"u\((.+)\)( / .+)?")
_MANY = 12  # columns, from which on paper needs smaller letters
_LONG = 34  # characters
_DOUBTS = frozenset({SHORT, OVER, OPEN})  # verdicts that ask for a look
Row = Mapping[str, Cell]


@dataclass(frozen=True, slots=True)
class Datum:
    """One cell: as shown, and as it is sorted and copied."""

    shown: str
    value: float | int | None = None
    u: float | None = None
    kind: str = ""  # a word for the style sheet


@dataclass(frozen=True, slots=True)
class Column:
    """A column under the head of the files; ``u_head`` is that of the uncertainty shown in the same cells."""

    head: str
    cells: Sequence[Datum]
    u_head: str = ""
    meaning: str = ""
    numeric: bool = True
    shares: bool = False  # of one decimal, in a table that holds nothing else: what is shown is all there is


def text_datum(cell: Cell) -> Datum:
    """A cell of words; long ones may be broken into lines."""
    text = DASH if cell is None else str(cell)
    return Datum(text, kind="doubt" if text in _DOUBTS else "long" if len(text) > _LONG else "")


def number_datum(cell: Cell, u: Cell = None) -> Datum:
    """A cell of a number, with its standard uncertainty where there is one."""
    value, spread = number_of(cell), number_of(u)
    if isinstance(cell, int):
        return Datum(str(cell), cell)
    return Datum(measured(value, spread) if spread is not None else bare(value), value, spread)


def spread_heads(heads: Iterable[str]) -> dict[str, str]:
    """The head of each quantity's uncertainty, by the head of the quantity, where a table has both.

    >>> spread_heads(["FE / %", "u(FE) / %", "u / %"])
    {'FE / %': 'u(FE) / %'}
    """
    heads = list(heads)
    found = {}
    for head in heads:
        match = _SPREAD.fullmatch(head)
        if match and (of := match[1] + (match[2] or "")) in heads:
            found[of] = head
    return found


def columns_of(table: Table, rows: Sequence[Row], leave_out: Iterable[str] = ()) -> list[Column]:
    """Columns of a table of the book, of some of its rows; a column without any value is left out."""
    spread = spread_heads(table.heads)
    hidden = {*leave_out, *spread.values()}
    about = about_tables().get(table.name)
    meaning = {one.head: one.meaning for one in about.columns} if about else {}
    columns = []
    for head in table.heads:
        cells = [row[head] for row in rows]
        if head in hidden or all(cell is None for cell in cells):
            continue
        numeric = not any(isinstance(cell, str) for cell in cells)
        u_head = spread.get(head, "") if numeric else ""
        data = [
            (number_datum(row[head], row[u_head] if u_head else None) if numeric else text_datum(row[head]))
            for row in rows
        ]
        columns.append(Column(head, data, u_head, meaning.get(head, ""), numeric))
    return columns


def show_table(
    caption: str, columns: Sequence[Column], *, name: str = "", like: str = "", titled: bool = True
) -> Html:
    """A table with its caption; the first column heads the rows.

    Without a caption the ``name`` is one for screen readers, where the heading above says the same. Tables that are
    ``like`` one another say what their heads mean only where they are ``titled``: the script lets the others take it
    from there.
    """
    heads = element("tr", (_head(column, titled) for column in columns))
    rows = zip(*(column.cells for column in columns), strict=True)
    body = element("tbody", (_row(columns, row) for row in rows))
    return element(
        "div",
        element(
            "table",
            element("caption", caption or name, class_=None if caption else "unseen"),
            element("thead", heads),
            body,
            class_=" ".join(
                kind
                for kind, holds in (
                    ("wide", len(columns) > _MANY),
                    ("shares", any(column.shares for column in columns)),
                )
                if holds
            )
            or None,
            data_like=like or None,
        ),
        class_="scroll",
        role="region",
        tabindex=0,
        aria_label=f"table: {name or caption}",
    )


def book_table(
    table: Table,
    caption: str,
    *,
    rows: Sequence[Row] | None = None,
    leave_out: Iterable[str] = (),
    name: str = "",
    like: str = "",
    titled: bool = True,
) -> Html | None:
    """A table of the book, or some of its rows; None where there are none."""
    rows = list(table.records()) if rows is None else rows
    if not rows:
        return None
    return show_table(caption, columns_of(table, rows, leave_out), name=name, like=like, titled=titled)


def _head(column: Column, titled: bool) -> Html:
    quantity, unit = parted(column.head)
    return element(
        "th",
        quantity,
        join(" ", element("span", unit, class_="unit")) if unit else None,
        scope="col",
        class_="n" if column.numeric else None,
        title=(column.meaning or None) if titled else None,
        data_h=column.head,
        data_uh=column.u_head or None,
    )


def _row(columns: Sequence[Column], row: Sequence[Datum]) -> Html:
    return element(
        "tr",
        (
            _cell(column, datum, first=not place)
            for place, (column, datum) in enumerate(zip(columns, row, strict=True))
        ),
    )


def _cell(column: Column, datum: Datum, *, first: bool) -> Html:
    if column.numeric:
        # a cell with a figure is set to the right by that alone
        right = "" if datum.value is not None or column.shares else "n"
        kind = " ".join(one for one in (right, datum.kind) if one)
        return element(
            "td",
            datum.shown,
            class_=kind or None,
            data_v=None if datum.value is None else _full(datum.value),
            data_u=None if datum.u is None or not column.u_head else _full(datum.u),
        )
    guarded = harmless_text(datum.shown)
    copied = guarded if guarded != datum.shown else None
    if first:
        return element("th", datum.shown, scope="row", class_=datum.kind or None, data_c=copied)
    return element("td", datum.shown, class_=datum.kind or None, data_c=copied)


def _full(value: float) -> str:
    """A figure to twelve digits: more than any reading holds."""
    return str(value) if isinstance(value, int) else f"{value:.12g}"
