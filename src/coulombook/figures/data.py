"""What each figure draws, as a table: the same rows are drawn and written beside the figure.

The last column of every table, ``mark``, holds the id of the row's mark in the drawing (see
`coulombook.figures.marks.mark_id`); it is absent for a row that is not drawn, and shared by the rows of a line.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from statistics import NormalDist
from typing import Literal

from coulombook.book.levels import Level, levels_of
from coulombook.book.shares import TOTAL, largest, outputs_of, runs_of, source_shares
from coulombook.book.tables import Book, Cell, Table
from coulombook.figures.marks import mark_id
from coulombook.species import group_rank

Basis = Literal["geometric", "real"]

MARK = "mark"
PRODUCT, WHOLE = "product", "total"
CLOSED, SHORT, OVER = "closed", "short", "over"

EFFICIENCY = (
    "catalyst", "level", "E vs RHE / V", "u(E vs RHE) / V", "what", "product", "FE / %", "u(FE) / %", MARK,
)  # fmt: skip
CURRENTS = (
    "catalyst", "level", "E vs RHE / V", "u(E vs RHE) / V", "product", "j / mA cm^-2", "u(j) / mA cm^-2",
    "basis", MARK,
)  # fmt: skip
SELECTIVITY = (
    "catalyst", "level", "E vs RHE / V", "u(E vs RHE) / V", "C2+/C1", "u(C2+/C1)", "runs", MARK,
)  # fmt: skip
CLOSURE = (
    "run", "catalyst", "total FE / %", "u(total FE) / %", "low / %", "high / %", "level of confidence / %", "closure",
    MARK,
)  # fmt: skip
BUDGET = ("source", "shared", "share / %", "u", "unit of u", MARK)

_LEAST_SHARE, _MOST_SOURCES = 0.01, 10
_DEFAULT_LEVEL = 0.95
Row = dict[str, Cell]


def number(cell: Cell) -> float | None:
    """The number in a cell, or None."""
    return None if cell is None or isinstance(cell, str) else float(cell)


def known(what: str, name: str, names: Iterable[str]) -> str:
    """The name, if it is one of these; otherwise a ValueError that lists them."""
    names = list(dict.fromkeys(names))
    if name not in names:
        raise ValueError(f"there is no {what} '{name}'; known: {', '.join(names) or 'none'}")
    return name


def catalysts_of(book: Book) -> tuple[str, ...]:
    """The catalysts of a day, in the order of its runs."""
    return tuple(dict.fromkeys(str(one) for one in book.tables["summary"].column("catalyst")))


def products_of(book: Book) -> tuple[str, ...]:
    """Every product of a day, in the one order of all figures: hydrogen first, then by carbon number."""
    group = {str(row["product"]): str(row["group"] or "") for row in book.tables["ledger"].records()}
    return tuple(sorted(group, key=lambda one: group_rank(group[one])))


def _levels(book: Book, catalyst: str) -> list[Level]:
    """Levels of one catalyst, from the most negative potential on; those without potential last."""
    known("catalyst", catalyst, catalysts_of(book))
    found = [one for one in levels_of(book) if one.catalyst == catalyst]
    return sorted(found, key=lambda one: math.inf if one.potential_volt is None else one.potential_volt)


def _series(book: Book, catalyst: str) -> dict[tuple[str, str], Mapping[str, Cell]]:
    return {
        (str(row["level"]), str(row["product"])): row
        for row in book.tables["series"].records()
        if row["catalyst"] == catalyst
    }


def fe_against_potential(book: Book, catalyst: str) -> Table:
    """Faradaic efficiency of each product at each level, and the total of the level."""
    series, rows = _series(book, catalyst), []
    for level in _levels(book, catalyst):
        about: Row = {
            "catalyst": catalyst,
            "level": level.level,
            "E vs RHE / V": level.potential_volt,
            "u(E vs RHE) / V": level.u_potential_volt,
        }
        for name in products_of(book):
            row = series.get((level.level, name))
            value = None if row is None else number(row["FE / %"])
            if row is None or value is None:
                continue
            mark = mark_id("fe", catalyst, level.level, name)
            rows.append(about | {"what": PRODUCT, "product": name, "FE / %": value,
                                 "u(FE) / %": number(row["u(FE) / %"]), MARK: mark})  # fmt: skip
        if level.total_percent is not None:
            rows.append(about | {"what": WHOLE, "FE / %": level.total_percent, "u(FE) / %": level.u_total_percent,
                                 MARK: mark_id("fe-total", catalyst, level.level)})  # fmt: skip
    return Table.under("fe-against-potential", EFFICIENCY, rows)


def partial_currents(book: Book, catalyst: str, basis: Basis = "geometric") -> Table:
    """Partial current density of each product at each level, reduction positive, on one basis of area."""
    known("basis", basis, ("geometric", "real"))
    j = "j" if basis == "geometric" else "j real"
    series, rows = _series(book, catalyst), []
    for name in products_of(book):
        for level in _levels(book, catalyst):
            row = series.get((level.level, name))
            value = None if row is None else number(row[f"{j} / mA cm^-2"])
            if row is None or value is None:
                continue
            # a logarithmic axis has no place for the others
            drawn = value > 0.0 and level.potential_volt is not None
            rows.append({
                "catalyst": catalyst, "level": level.level, "E vs RHE / V": level.potential_volt,
                "u(E vs RHE) / V": level.u_potential_volt, "product": name, "j / mA cm^-2": value,
                "u(j) / mA cm^-2": number(row[f"u({j}) / mA cm^-2"]), "basis": basis,
                MARK: mark_id(f"j-{basis}", catalyst, level.level, name) if drawn else None,
            })  # fmt: skip
    return Table.under("partial-currents", CURRENTS, rows)


def selectivity(book: Book) -> Table:
    """C2+ over C1 Faradaic efficiency of each level of each catalyst."""
    rows: list[Row] = []
    for catalyst in catalysts_of(book):
        for level in _levels(book, catalyst):
            if level.ratio is None or level.potential_volt is None:
                continue
            rows.append({
                "catalyst": catalyst, "level": level.level, "E vs RHE / V": level.potential_volt,
                "u(E vs RHE) / V": level.u_potential_volt, "C2+/C1": level.ratio, "u(C2+/C1)": level.u_ratio,
                "runs": len(level.runs), MARK: mark_id("selectivity", catalyst, level.level),
            })  # fmt: skip
    return Table.under("selectivity", SELECTIVITY, rows)


def closure(book: Book) -> Table:
    """Total Faradaic efficiency of each run, with its interval at the day's level of confidence."""
    level = _DEFAULT_LEVEL if book.settled is None else book.settled.plan.settings.level_of_confidence
    factor = NormalDist().inv_cdf(0.5 + 0.5 * level)
    rows: list[Row] = []
    for row in book.tables["summary"].records():
        total, u = number(row["total FE / %"]), number(row["u(total FE) / %"]) or 0.0
        if total is None:
            continue
        rows.append({
            "run": row["run"], "catalyst": row["catalyst"], "total FE / %": total, "u(total FE) / %": u,
            "low / %": total - factor * u, "high / %": total + factor * u, "level of confidence / %": 100.0 * level,
            "closure": row["closure"], MARK: mark_id("closure", str(row["run"])),
        })  # fmt: skip
    return Table.under("closure", CLOSURE, rows)


def budget(book: Book, run: str | None = None, output: str = TOTAL) -> Table:
    """Share of each source in the variance of an output: of one run, or the mean over the runs that have it."""
    table = book.tables["budget"]
    if run is not None:
        known("run with a budget", run, runs_of(table))
    known("budget of", output, outputs_of(table, run))
    _, shares = source_shares(table, output, run)
    shown, rest = largest(shares, _LEAST_SHARE)
    shown, rest = shown[:_MOST_SOURCES], [*shown[_MOST_SOURCES:], *rest]
    unit = "mA/cm^2" if output.startswith("j real ") else "1" if output == "C2+/C1" else "%"
    about = mark_id("budget", *([] if run is None else [run]), output)
    rows: list[Row] = [
        {"source": one.source, "shared": one.shared, "share / %": 100.0 * one.share, "u": one.u,
         "unit of u": None if one.u is None else unit, MARK: f"{about}:{mark_id(one.source, one.shared)}"}
        for one in shown
    ]  # fmt: skip
    if rest:
        square = [one.u for one in rest if one.u is not None]
        rows.append({
            "source": f"{len(rest)} smaller", "share / %": 100.0 * sum(one.share for one in rest),
            "u": math.hypot(*square) if len(square) == len(rest) else None,
            "unit of u": unit if len(square) == len(rest) else None, MARK: f"{about}:rest",
        })  # fmt: skip
    return Table.under("budget", BUDGET, rows)
