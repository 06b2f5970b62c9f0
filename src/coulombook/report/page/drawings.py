"""The figures of a book as parts of the page: each drawn once, by the same functions that draw it for print."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping

from coulombook.book import Book, Cell, Table
from coulombook.figures import COLUMN_MM, KINDS, PAGE_MM, Drawing, drawings_of, inline_svg
from coulombook.figures.data import MARK
from coulombook.report.page.html import Html, element, join
from coulombook.report.page.svg import Styles, adopt
from coulombook.report.page.tables import spread_heads
from coulombook.report.page.words import bare, measured, number_of, parted

MOST = 40  # figures of one kind: a page of hundreds would take minutes to draw and long to open
_LEFT = "{count} more: coulombook figures draws them."
_WIDE = frozenset({"closure", "budget"})  # kinds that have a line of the page to themselves
TRACE = "trace"  # logs are drawn by the page itself, so that they can be looked into
_UNSAID = frozenset({MARK, "level", "unit of u"})
_PLAIN = frozenset({"product", "log"})  # what a row is, where its other words say so already


class Drawings:
    """Hands out the figures of a book by kind; what nobody asked for is left for the end of the page."""

    def __init__(self, book: Book, styles: Styles) -> None:
        self._styles, self._number = styles, 0
        self._kinds: dict[str, list[Drawing]] = {}
        for one in drawings_of(book, frozenset(KINDS) - {TRACE}):
            self._kinds.setdefault(one.kind, []).append(one)

    def take(self, kind: str) -> list[Html]:
        """The figures of one kind, with a word about those that are too many."""
        every = self._kinds.pop(kind, [])
        drawn = [self._drawn(one) for one in every[:MOST]]
        return drawn if len(every) <= MOST else [*drawn, element("p", _LEFT.format(count=len(every) - MOST))]

    def by(self, kind: str, head: str) -> dict[str, Html]:
        """The figures of one kind, by what their tables say under a head; the tables stand for those beyond."""
        return {str(one.data.column(head)[0]): self._drawn(one) for one in self._kinds.pop(kind, [])[:MOST]}

    def rest(self) -> list[Html]:
        """Every figure of a kind that was not taken."""
        return [figure for kind in list(self._kinds) for figure in self.take(kind)]

    def _drawn(self, one: Drawing) -> Html:
        self._number += 1
        axes = one.draw(None, PAGE_MM if one.kind in _WIDE else COLUMN_MM)
        svg = inline_svg(axes.figure.get_figure(root=True), salt=f"page {self._number}")
        return element(
            "figure",
            adopt(svg, self._number, self._styles, label=one.title, marks=said_by_marks(one.data)),
            element("figcaption", one.caption),
            class_=f"figure {one.kind}",
        )


def grid_of(figures: list[Html], kind: str = "") -> Html | None:
    """Figures side by side, as many as fit."""
    return element("div", join(figures), class_=f"figures {kind}".strip()) if figures else None


def said_by_marks(table: Table) -> dict[str, str]:
    """What each mark of a figure says: the row of its table in words, for marks of one row alone."""
    rows = [row for row in table.records() if row[MARK] is not None]
    count = Counter(row[MARK] for row in rows)
    spread = spread_heads(table.heads)
    # what every row says is said by the figure's own title
    same = {head for head in table.heads if len({row[head] for row in rows}) == 1}
    said = {str(row[MARK]): _said(table, row, spread, same) for row in rows if count[row[MARK]] == 1}
    # a standard of a curve has a second mark, its residual
    return said | {f"{mark}:residual": text for mark, text in said.items() if mark.startswith("curve:")}


def _said(table: Table, row: Mapping[str, Cell], spread: Mapping[str, str], same: set[str]) -> str:
    words = ", ".join(
        str(cell)
        for head, cell in row.items()
        if isinstance(cell, str) and head not in same and head not in _UNSAID and cell not in _PLAIN
    )
    return ": ".join(part for part in (words, ", ".join(_values(table, row, spread))) if part)


def _values(table: Table, row: Mapping[str, Cell], spread: Mapping[str, str]) -> Iterator[str]:
    hidden = {*spread.values()}
    for head in table.heads:
        value = number_of(row[head])
        if value is None or head in hidden:
            continue
        quantity, unit = parted(head)
        u = number_of(row[spread[head]]) if head in spread else None
        yield f"{quantity} {measured(value, u) if u is not None else bare(value)} {unit}".rstrip()
