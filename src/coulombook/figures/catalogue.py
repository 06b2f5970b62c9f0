"""Every figure of a book: its name, what it says, what it draws, and how."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING

from coulombook.book.shares import TOTAL, outputs_of
from coulombook.book.tables import Book, Table
from coulombook.figures import data, details
from coulombook.figures.results import draw
from coulombook.figures.sheet import shown
from coulombook.figures.single import draw_capacitance, draw_curve, draw_spectrum, draw_trace
from coulombook.library.picture import LEVEL

if TYPE_CHECKING:
    from matplotlib.axes import Axes

KINDS = {
    "fe": "Faradaic efficiencies of each catalyst against potential",
    "partial-currents": "partial current densities of each catalyst, on each basis of area",
    "selectivity": "C2+/C1 of all catalysts against potential",
    "closure": "total Faradaic efficiency of each run",
    "budget": "what the uncertainty of the total comes from",
    "trace": "the log of each run, with its injections",
    "curve": "each calibration curve the day used, with its residuals",
    "capacitance": "charging current of each electrode against scan rate",
    "spectrum": "each impedance spectrum",
}
"""Kinds of figures, and what they are of."""

_LONGEST = 60  # characters of a file's name, without its ending
_U = "Bars of uncertainty are standard uncertainties (k = 1)."


@dataclass(frozen=True, slots=True, eq=False)
class Drawing:
    """One figure of a book.

    ``name`` is unique within the book and fit for a file's name; ``draw`` takes axes or None, and the width of the
    sheet in mm.
    """

    name: str
    kind: str
    title: str
    caption: str
    data: Table
    draw: Callable[[Axes | None, float], Axes]


def drawings_of(book: Book, kinds: frozenset[str] | None = None) -> tuple[Drawing, ...]:
    """Every figure that the book has something for, of some kinds or of all."""
    taken: set[str] = set()
    found = []
    for kind, about in _PARTS.items():
        if kinds is not None and kind not in kinds:
            continue
        for parts, title, caption, table, paint in about(book):
            if len(table):
                found.append(Drawing(_name(kind, parts, taken), kind, title, caption, table, paint))
    return tuple(found)


_Part = tuple[tuple[str, ...], str, str, Table, Callable[["Axes | None", float], "Axes"]]


def _of_table(table: Table) -> Callable[[Axes | None, float], Axes]:
    return partial(draw, table)


def _efficiencies(book: Book) -> Iterator[_Part]:
    for catalyst in data.catalysts_of(book):
        table = data.fe_against_potential(book, catalyst)
        yield (
            (catalyst,),
            f"Faradaic efficiencies of {shown(catalyst)}",
            f"Faradaic efficiency of each product of {shown(catalyst, 200)} against potential, runs of a level pooled; "
            f"the diamond is their total. {_U}",
            table,
            _of_table(table),
        )


def _currents(book: Book) -> Iterator[_Part]:
    bases: tuple[data.Basis, ...] = ("geometric", "real")
    for catalyst in data.catalysts_of(book):
        for basis in bases:
            table = data.partial_currents(book, catalyst, basis)
            yield (
                (catalyst, basis),
                f"Partial current densities of {shown(catalyst)} on {basis} area",
                f"Partial current density of each product of {shown(catalyst, 200)} on {basis} area, reduction counted "
                f"positive, runs of a level pooled. {_U}",
                table,
                _of_table(table),
            )


def _selectivity(book: Book) -> Iterator[_Part]:
    table = data.selectivity(book)
    text = "Faradaic efficiency of products of two carbons and more over that of one, runs of a level pooled."
    yield (), "C2+/C1 against potential", f"{text} {_U}", table, _of_table(table)


def _closure(book: Book) -> Iterator[_Part]:
    table = data.closure(book)
    level = (
        f"{data.number(table.column('level of confidence / %')[0]) or 0.0:.4g} %" if len(table) else "95 %"
    )
    text = f"Total Faradaic efficiency of each run, with its interval at a level of confidence of {level}."
    yield (), "Total Faradaic efficiency of each run", text, table, _of_table(table)


def _budget(book: Book) -> Iterator[_Part]:
    if "budget" in book.tables and TOTAL in outputs_of(book.tables["budget"]):
        table = data.budget(book)
        text = "Share of each source in the variance of the total Faradaic efficiency, mean over the runs."
        yield (), "Uncertainty of the total by source", text, table, _of_table(table)


def _traces(book: Book) -> Iterator[_Part]:
    if book.settled is None or not book.pictures:
        return
    scale = details.potential_scale(book)
    for run in book.settled.plan.runs:
        table = details.trace(book, run.name)
        text = (
            f"Current and potential of run {shown(run.name, 200)} as logged, cathodic current negative: lowest and "
            "highest value of each stretch; its injections, and what their currents are averaged over."
        )
        yield (run.name,), f"Log of run {shown(run.name)}", text, table, partial(draw_trace, table, scale)


def _curves(book: Book) -> Iterator[_Part]:
    for name in details.curves_of(book):
        table = details.curve(book, name)
        text = (
            f"Standards of {shown(name, 200)}, the curve through them with its bands at {100.0 * LEVEL:.0f} %, and the "
            "residuals."
        )
        yield (name,), f"Calibration curve {shown(name)}", text, table, partial(draw_curve, table)


def _capacitances(book: Book) -> Iterator[_Part]:
    for electrode in () if book.settled is None else book.settled.plan.surface.electrodes:
        table = details.capacitance(book, electrode)
        text = (
            f"Charging current of electrode {shown(electrode, 200)} in the middle of its window against scan rate; the "
            "slope of the line is the capacitance."
        )
        yield (
            (electrode,),
            f"Capacitance of {shown(electrode)}",
            text,
            table,
            partial(draw_capacitance, table),
        )


def _spectra(book: Book) -> Iterator[_Part]:
    for file in details.spectra_of(book):
        table = details.spectrum(book, file)
        text = f"Impedance of {shown(file, 200)} as measured, and the fitted circuit."
        yield (file,), f"Impedance spectrum {shown(file)}", text, table, partial(draw_spectrum, table)


_PARTS: dict[str, Callable[[Book], Iterator[_Part]]] = {
    "fe": _efficiencies,
    "partial-currents": _currents,
    "selectivity": _selectivity,
    "closure": _closure,
    "budget": _budget,
    "trace": _traces,
    "curve": _curves,
    "capacitance": _capacitances,
    "spectrum": _spectra,
}


def _name(kind: str, parts: tuple[str, ...], taken: set[str]) -> str:
    """A name of small letters, digits and dashes alone, whatever the parts hold; a number where it is taken."""
    plain = re.sub(r"[^a-z0-9]+", "-", "-".join([kind, *parts]).casefold())[:_LONGEST].strip("-")
    name, count = plain, 1
    while name in taken:
        count += 1
        name = f"{plain}-{count}"
    taken.add(name)
    return name
