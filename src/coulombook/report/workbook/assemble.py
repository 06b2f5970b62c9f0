"""Every sheet of a day, built in the order in which formulas name each other, shown in the order people read."""

from __future__ import annotations

from collections.abc import Iterator

from coulombook.book import Book
from coulombook.report.workbook.cells import Sheet
from coulombook.report.workbook.charts import Chart, chart_data
from coulombook.report.workbook.constants import constants_sheet
from coulombook.report.workbook.curves import CurveCells, checks_sheet, curves_sheet, standards_sheet
from coulombook.report.workbook.gas import (
    PeakOrder,
    finish_injections,
    gas_sheet,
    injections_sheet,
    outlet_sheet,
)
from coulombook.report.workbook.ledger import ledger_sheet, series_sheet, summary_sheet
from coulombook.report.workbook.liquid import (
    SignalOrder,
    compartments_sheet,
    internal_standards_sheet,
    liquid_sheet,
    samples_sheet,
    vials_sheet,
)
from coulombook.report.workbook.place import Account
from coulombook.report.workbook.runs import charge_sheet, flow_sheet, runs_sheet
from coulombook.report.workbook.surface import scans_sheet, surface_sheet
from coulombook.report.workbook.tables import carbon_sheet, closure_sheet, efficiencies_sheet, shown_table

# as they stand in the workbook; what a day has nothing of is left out, other tables come before the findings
_ORDER = (
    "summary", "ledger", "series", "chart data", "charge", "flow", "outlet", "gas", "injections", "liquid",
    "standard signals", "vials", "samples", "compartments", "curves", "standards", "checks", "surface", "scans", "runs",
    "constants", "closure", "carbon", "efficiencies", "budget",
)  # fmt: skip
_LAST = ("cautions", "findings")
# tables whose numbers stand in sheets of other names
_ELSEWHERE = frozenset({"calibrations"})


def assemble(book: Book) -> tuple[list[Sheet], list[Chart]]:
    """The sheets in the order of reading, and the charts. The book holds what it was computed from."""
    assert book.settled is not None
    account = Account(book.settled, book.tables)
    sheets: dict[str, Sheet] = {}

    def add(sheet: Sheet) -> Sheet:
        sheets[sheet.name] = sheet
        return sheet

    plan = book.settled.plan
    add(constants_sheet(account))
    add(runs_sheet(account))
    add(charge_sheet(account, sheets))
    curves = CurveCells(account, add(curves_sheet(account)))
    add(standards_sheet(account, sheets))
    _add_liquids(account, sheets, curves)
    add(flow_sheet(account, sheets))
    if len(plan.day.checks):
        add(checks_sheet(account, curves))
    peaks = PeakOrder(plan.gas)
    gas = add(gas_sheet(account, sheets, curves, peaks))
    injections = add(injections_sheet(account, gas, peaks))
    add(outlet_sheet(account, sheets, peaks))
    finish_injections(account, injections, sheets, peaks)
    if plan.surface.electrodes:
        add(surface_sheet(account, add(scans_sheet(account))))
    ledger = add(ledger_sheet(account, sheets))
    add(summary_sheet(account, sheets))
    data, charts = chart_data(account, add(series_sheet(account, ledger)))
    add(data)
    for name, derived in (
        ("closure", closure_sheet),
        ("carbon", carbon_sheet),
        ("efficiencies", efficiencies_sheet),
    ):
        if name in book.tables:
            add(derived(account, sheets))
    for name, table in book.tables.items():
        if name not in sheets and name not in _ELSEWHERE:
            add(shown_table(table))
    return list(_in_order(sheets)), charts


def _add_liquids(account: Account, sheets: dict[str, Sheet], curves: CurveCells) -> None:
    liquid = account.settled.plan.liquid
    standards = SignalOrder(liquid.standard_vial, len(liquid.vials))
    signals = SignalOrder(liquid.signal_analyte, len(liquid.analyte_vial))
    sheets["standard signals"] = internal_standards_sheet(account, standards)
    sheets["vials"] = vials_sheet(account, sheets, standards)
    sheets["liquid"] = liquid_sheet(account, sheets, curves, signals)
    sheets["samples"] = samples_sheet(account, sheets, signals)
    sheets["compartments"] = compartments_sheet(account, sheets)


def _in_order(sheets: dict[str, Sheet]) -> Iterator[Sheet]:
    """Sheets that hold something, in the order of reading; the summary always."""
    others = [name for name in sheets if name not in _ORDER and name not in _LAST]
    for name in (*_ORDER, *others, *_LAST):
        if name in sheets and (sheets[name].rows or name == "summary"):
            yield sheets[name]
