"""The parts of the page in the order they are read: a tired person may stop at any of them and has the best of it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from coulombook.book import Book, Table
from coulombook.report.explain_view import verdict
from coulombook.report.page.dangers import show_cautions
from coulombook.report.page.drawings import Drawings, grid_of
from coulombook.report.page.explanation import show_explanation
from coulombook.report.page.findings import show_findings
from coulombook.report.page.html import Html, element, join
from coulombook.report.page.provenance import show_provenance
from coulombook.report.page.runs import show_runs
from coulombook.report.page.tables import Column, Datum, book_table, show_table, text_datum
from coulombook.report.page.verdict import show_verdicts
from coulombook.report.page.words import counted, sentence, typeset
from coulombook.report.pivot import CatalystTable, catalyst_tables

MOST_ROWS = 3000  # of one table; a longer one is left to its file
# tables that stand in a part of their own, or whose rows stand with their runs
_PLACED = ("summary", "ledger", "injections", "budget", "closure", "findings", "explanations", "cautions",
           "surface", "spectra", "calibrations")  # fmt: skip
_COMPARED = ("series", "kinetics", "stability")
_HEADINGS = {
    "series": "Replicates pooled: one line per catalyst, level and product",
    "kinetics": "Kinetics: Tafel slopes and onsets",
    "stability": "Change in the course of each run",
    "carbon": "Carbon: where the CO2 went",
    "efficiencies": "Carbon and energy efficiency of each product",
    "intervals": "Coverage intervals by random draws",
    "reconciliation": "Readings adjusted to their balance",
}
_NOT_SHOWN = "Its rows stand in {name}.csv alone: there are {rows} of them."


@dataclass(frozen=True, slots=True)
class Part:
    """One part: its id, its heading, a shorter word for the list of contents, and what it shows."""

    name: str
    heading: str
    short: str
    content: Html


def parts_of(book: Book, drawings: Drawings) -> list[Part]:
    """Every part that has something to show."""
    return [
        Part(name, heading, short, content)
        for name, heading, short, content in _parts(book, drawings)
        if content is not None
    ]


def _parts(book: Book, drawings: Drawings) -> Iterator[tuple[str, str, str, Html | None]]:
    yield "verdict", "The day in short", "Verdict", _verdict(book)
    yield (
        "efficiencies",
        "Faradaic efficiency against potential",
        "Efficiencies",
        _efficiencies(book, drawings),
    )
    yield (
        "currents",
        "Partial current densities",
        "Currents",
        grid_of(drawings.take("partial-currents"), "pairs"),
    )
    yield "selectivity", "More carbon or less: C2+/C1", "C2+/C1", grid_of(drawings.take("selectivity"))
    yield "closure", "How each run closes", "Closure", _closure(book, drawings)
    yield "findings", "What to do", "What to do", show_findings(book.findings)
    yield "balance", "Why the balance is open", "Open balance", show_explanation(book)
    yield "runs", "Each run", "Runs", show_runs(book)
    yield "curves", "Calibration curves", "Curves", _curves(book, drawings)
    yield "surface", "Capacitance and real area", "Real area", _surface(book, drawings)
    yield "comparison", "Series and comparison", "Comparison", _comparison(book)
    yield (
        "uncertainty",
        "Where the uncertainty comes from",
        "Uncertainty",
        grid_of(drawings.take("budget"), "single"),
    )
    yield "more", "Further tables", "More tables", _further(book, drawings)
    yield "cautions", "Cautions", "Cautions", show_cautions(book)
    yield "provenance", "Provenance", "Provenance", show_provenance(book)


def _verdict(book: Book) -> Html:
    told = verdict(book) if {"closure", "explanations"} <= book.tables.keys() else None
    return join(show_verdicts(book), element("p", sentence(told), class_="day") if told else None)


def _efficiencies(book: Book, drawings: Drawings) -> Html:
    figures = drawings.by("fe", "catalyst")
    return join(
        join(
            element("h3", table.catalyst, class_="catalyst"),
            element("div", figures.get(table.catalyst), element("div", _levels(table)), class_="beside"),
        )
        for table in catalyst_tables(book)
    )


def _levels(table: CatalystTable) -> Html:
    """The table that the terminal shows, levels across."""
    # from the most negative potential on, as the figure beside it goes
    levels = tuple(reversed(table.levels))
    first = [product for _, product in table.products]
    rows = [*first, "total FE", "closure"]
    groups = [group for group, _ in table.products] + ["", ""]

    def cells(place: int) -> list[Datum]:
        level = levels[place]
        found = [typeset(level.efficiency.get(product, "-")) for product in first]
        return [Datum(one) for one in (*found, typeset(level.total), level.closure)]

    columns = [
        Column("product", [text_datum(one) for one in rows], numeric=False),
        Column("group", [text_datum(one) for one in groups], numeric=False),
        *(
            Column(
                f"{typeset(level.potential)} V",
                cells(place),
                meaning=f"level {level.name}, {level.runs} runs, {level.current_density} mA cm^-2",
            )
            for place, level in enumerate(levels)
        ),
    ]
    return join(
        show_table("FE in per cent at each potential against RHE", columns, name=f"FE of {table.catalyst}"),
        [element("p", line, class_="aside") for line in table.marks],
    )


def _closure(book: Book, drawings: Drawings) -> Html:
    summary = book.tables["summary"]
    return join(
        grid_of(drawings.take("closure"), "single"),
        _whole(summary, "One line per run", ("electrode",)),
    )


def _curves(book: Book, drawings: Drawings) -> Html | None:
    figures = drawings.take("curve")
    table = (
        _whole(book.tables["calibrations"], "Curves that were used")
        if "calibrations" in book.tables
        else None
    )
    return (
        join(table, _folded(f"{len(figures)} curves with their standards and residuals", figures))
        if table or figures
        else None
    )


def _folded(summary: str, figures: Sequence[Html]) -> Html | None:
    return (
        element("details", element("summary", summary), grid_of(list(figures), "small")) if figures else None
    )


def _surface(book: Book, drawings: Drawings) -> Html | None:
    scans, spectra = drawings.take("capacitance"), drawings.take("spectrum")
    tables = [
        _whole(book.tables[name], caption)
        for name, caption in (("surface", "Capacitance of each electrode"), ("spectra", "Impedance spectra"))
        if name in book.tables
    ]
    figures = [*scans, *spectra]
    if not any(tables) and not figures:
        return None
    return join(tables, _folded(f"{len(figures)} fits", figures))


def _comparison(book: Book) -> Html | None:
    tables = [_folded_table(book.tables[name]) for name in _COMPARED if name in book.tables]
    return join(tables) if any(tables) else None


def _folded_table(table: Table) -> Html | None:
    heading = _HEADINGS.get(table.name, table.name)
    shown = _whole(table, heading)
    if shown is None:
        return None
    return element("details", element("summary", f"{heading} ({counted(len(table), 'row')})"), shown)


def _further(book: Book, drawings: Drawings) -> Html | None:
    """Tables and figures that no other part shows, so that a new one appears by itself."""
    placed = {*_PLACED, *_COMPARED}
    tables = [
        shown
        for name, table in book.tables.items()
        if name not in placed and (shown := _folded_table(table)) is not None
    ]
    rest = grid_of(drawings.rest())
    return join(tables, rest) if tables or rest else None


def _whole(table: Table, caption: str, leave_out: Sequence[str] = ()) -> Html | None:
    if len(table) > MOST_ROWS:
        return element("p", _NOT_SHOWN.format(name=table.name, rows=len(table)))
    return book_table(table, caption, leave_out=leave_out)
