"""The sheet that says what the workbook is, what its cells mean, and what it was made from."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from enum import Enum

import coulombook
from coulombook.balance.readings import OutletFlow
from coulombook.book import Book
from coulombook.report.workbook.cells import Kind, Sheet


class Line(Enum):
    """What a line of the sheet is."""

    TITLE = "title"
    SECTION = "section"
    PLAIN = "plain"
    STYLE = "style"  # a kind of cell, shown as such
    SHEET = "sheet"  # a sheet of the workbook, with a way to it


@dataclass(frozen=True, slots=True)
class Said:
    """One line: up to three cells."""

    line: Line
    cells: tuple[str, ...] = ()
    kind: Kind | None = None


CHARTS = "charts", "Faradaic efficiency and partial current density against potential"  # sheet, title


def about_lines(book: Book, sheets: Sequence[Sheet], *, charts: bool) -> Iterator[Said]:
    """The sheet from top to bottom; ``charts`` tells whether there are any."""
    yield Said(Line.TITLE, (book.title or book.day,))
    yield Said(
        Line.PLAIN,
        ("", f"Audit workbook of the day '{book.day}', written by coulombook {coulombook.__version__}."),
    )
    yield Said(Line.PLAIN)
    yield Said(Line.SECTION, ("Cells",))
    for kind in (Kind.ENTERED, Kind.FORMULA, Kind.COMPUTED):
        yield Said(Line.STYLE, tuple(kind.value.split(": ", 1)), kind)
    for said in (
        "An empty cell means that there is no such value. Every head reads quantity / unit; u(...) is a standard "
        "uncertainty (k = 1). Cells keep every digit and show two digits of the uncertainty, where one is known.",
        "The line under the heads says how a column is found; 'file' and 'row' say where a reading stands in the day's "
        "files. Columns and constants have names: ledger_FE, gas_peak_area, Faraday_constant.",
    ):
        yield Said(Line.PLAIN, ("", said))
    yield Said(Line.PLAIN)
    yield Said(Line.SECTION, ("What follows a change, and what does not",))
    for said in _limits(book):
        yield Said(Line.PLAIN, ("", said))
    yield Said(Line.PLAIN)
    yield Said(Line.SECTION, ("Sheets",))
    listed = [(sheet.name, sheet.title) for sheet in sheets]
    for cells in (*listed[:1], *([CHARTS] if charts else []), *listed[1:]):
        yield Said(Line.SHEET, cells)
    yield Said(Line.PLAIN)
    yield Said(Line.SECTION, ("Options of the tally",))
    for name, value in book.options.items():
        yield Said(Line.PLAIN, (name, value or "-"))
    yield Said(Line.PLAIN)
    yield Said(Line.SECTION, ("Files read, with their SHA-256 as they were then",))
    for one in book.inputs:
        yield Said(Line.PLAIN, (one.sha256, one.path))
    yield Said(Line.PLAIN)
    yield Said(Line.SECTION, ("Cautions",))
    yield Said(
        Line.PLAIN,
        (
            "",
            "The outlet gas may hold carbon monoxide, which poisons, and hydrogen and hydrocarbons, which burn. Local "
            "codes and licensed practice decide on ventilation, pressure and electrical safety; no figure here does.",
        ),
    )


def _limits(book: Book) -> Iterator[str]:
    yield (
        "Formulas lead from peak area and integral, through the coefficients of the curves, to mole fraction, molar "
        "rate, amount, Faradaic efficiency, partial current density, totals and ratios. Change an entered cell and "
        "they follow; so they do when 'used' of a peak, or 'counted' of a product, is changed."
    )
    yield (
        "These stay as the tally computed them: standard uncertainties, budgets and tests; the coefficients of the "
        "curves (fitted to the sheet of standards) and their limits; 'counted' (whether a product was detected) and "
        "its status; the weights of several signals of one analyte; charges, currents and mean potentials, which are "
        "integrals of the logs; the weights in time of drift checks."
    )
    settled = book.settled
    if settled is None:
        return
    plan = settled.plan
    if plan.headspace.any():
        yield (
            "This day has a headspace: the current an injection is held against is what the gas volume remembers of "
            "the log with the mixing time of the tally. No formula follows it: after a change that moves the outlet "
            "flow, tally again."
        )
    if plan.outlet_flow is OutletFlow.BALANCE:
        yield "The outlet flow follows from the carbon balance by formulas, injection by injection."
