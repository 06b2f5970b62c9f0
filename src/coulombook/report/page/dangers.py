"""Cautions: what this day's outlet gas could do, beside the published limits, and who may judge it."""

from __future__ import annotations

from collections.abc import Mapping

from coulombook.book import Book, Cell
from coulombook.book.cautions import MIXTURE, safety_sources
from coulombook.report.page.html import Html, element, join
from coulombook.report.page.tables import book_table
from coulombook.report.page.words import bare, number_of

Row = Mapping[str, Cell]

DEFERS = (
    "Ventilation, gas detection, pressure relief, electrical protection and the choice of people who may judge them "
    "follow your local codes and belong in the hands of licensed professionals. No figure here is a safety figure: the "
    "concentrations are those of single injections from the undiluted outlet, not of the room, and a limit that is "
    "missing is not a limit that does not exist."
)
_POISON = (
    "Carbon monoxide poisons without a smell; hydrogen and hydrocarbons burn and explode in air over wide ranges; CO2 "
    "itself, of which the outlet mostly consists, suffocates. Closed cells and gas lines can burst under pressure."
)


def show_cautions(book: Book) -> Html:
    """Sentences about the worst of the day, the table, and where the limits are from."""
    table = book.tables.get("cautions")
    rows = {str(row["substance"]): row for row in table.records()} if table is not None else {}
    said = [_carbon_monoxide(rows), _flammable(rows)]
    return join(
        element("p", _POISON),
        element("ul", (element("li", one) for one in said if one)) if any(said) else None,
        element("p", element("strong", DEFERS)),
        book_table(
            table,
            "Highest concentrations in the undiluted outlet, any injection, beside limits that hold for air",
        )
        if table is not None
        else None,
        element("p", "Limits: ", "; ".join(safety_sources()), ". Look up the text in force.", class_="aside")
        if rows
        else None,
    )


def _carbon_monoxide(rows: Mapping[str, Row]) -> str:
    row = rows.get("carbon monoxide", {})
    times, ppm = number_of(row.get("times exposure limit")), number_of(row.get("highest / ppm"))
    if times is None or ppm is None:
        return ""
    danger = number_of(row.get("dangerous / ppm"))
    beyond = (
        f" It lies above the {bare(danger, 4)} ppm that are immediately dangerous to life or health."
        if danger is not None and ppm > danger
        else ""
    )
    return (
        f"Carbon monoxide reached {bare(ppm, 3)} ppm in the outlet (run {row['run']}, injection {row['injection']}), "
        f"{bare(times, 3)} times the exposure limit of a working day: thinned by less than that, it is over the limit."
        f"{beyond}"
    )


def _flammable(rows: Mapping[str, Row]) -> str:
    row = rows.get(MIXTURE, {})
    share = number_of(row.get("of flammable limit / %"))
    if share is None:
        return ""
    where = f"run {row['run']}, injection {row['injection']}"
    if share >= 100.0:
        return (
            f"What burns reached {bare(share, 3)} % of the lower flammable limit in the undiluted outlet ({where}): "
            "where it meets air it can pass through its flammable range."
        )
    return (
        f"What burns reached {bare(share, 3)} % of the lower flammable limit in the undiluted outlet ({where}), by Le "
        "Chatelier's rule and without the CO2 that raises the limit. A leak of other gas, or one that gathers, is not "
        "in that figure."
    )
