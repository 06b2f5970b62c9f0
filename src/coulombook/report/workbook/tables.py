"""Sheets of tables that are shown as they were computed, and of those of carbon and energy that formulas follow."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

import numpy as np

from coulombook.amounts.carbon import HYDROXIDE_PER_CARBONATE
from coulombook.book import Cell, Table
from coulombook.book.columns import Kind as Content
from coulombook.book.columns import about_tables
from coulombook.report.workbook.cells import FIRST_ROW, MOST_ROWS, Column, Kind, Sheet, Sheets
from coulombook.report.workbook.place import Account, runs_of

# what a table is called, and how many columns stay in sight
_TITLES = {
    "spectra": ("Impedance spectra", 1),
    "budget": ("Where the uncertainty comes from", 2),
    "explanations": ("What would explain an open balance", 2),
    "intervals": ("Coverage intervals by random draws", 2),
    "reconciliation": ("Adjusted to totals of 100 %", 2),
    "cautions": ("Cautions", 1),
    "findings": ("Findings", 2),
}
_LONG = frozenset({"text", "mend", "cause", "where", "told apart", "bench test"})
_SHOWN_ALONE = "Computed with the tally; nothing here follows a change of an entered cell."
_CAUTION = (
    "Highest concentrations in the outlet gas. Carbon monoxide poisons, hydrogen and hydrocarbons burn; nothing here "
    "says that a place is safe. Local codes and licensed practice decide."
)


def shown_table(table: Table) -> Sheet:
    """A table as it is written beside the workbook."""
    title, frozen = _TITLES.get(table.name, (table.name.capitalize(), 1))
    rows = table.rows[:MOST_ROWS]
    about = _CAUTION if table.name == "cautions" else _SHOWN_ALONE
    if len(rows) < len(table):
        about += f" The first {len(rows)} of {len(table)} rows: {table.name}.csv holds all of them."
    sheet = Sheet(table.name, title, about, len(rows), frozen=frozen, filtered=True)
    cells = Table(table.name, table.heads, rows)
    for head in table.heads:
        sheet.add(_shown(cells, head))
    return sheet


def _shown(table: Table, head: str) -> Column:
    known = about_tables()[table.name]
    about = next(one for one in known.columns if one.head == head)
    kind = Kind.TEXT if about.kind is Content.TEXT else Kind.COMPUTED
    of = _uncertainty(head, table.heads)
    return Column(
        head,
        kind,
        table.column(head),
        about.meaning,
        u=None if of is None else table.column(of),
        wide=head in _LONG,
    )


def _uncertainty(head: str, heads: Sequence[str]) -> str | None:
    """Head of the standard uncertainty that decides the digits of a column: its own of a u(...), else that beside it.

    >>> _uncertainty("FE / %", ("FE / %", "u(FE) / %")), _uncertainty("z", ("z",))
    ('u(FE) / %', None)
    """
    if head.startswith("u("):
        return head
    quantity, slash, unit = head.partition(" / ")
    name = f"u{slash}{unit}" if quantity in ("value", "u") else f"u({quantity}){slash}{unit}"
    return name if name in heads else None


def closure_sheet(account: Account, sheets: Sheets) -> Sheet:
    """One row per run with products, and one for the day."""
    table, summary = account.tables["closure"], sheets["summary"]
    row_of = {name: FIRST_ROW + number for number, name in enumerate(account.runs)}
    places = [row_of.get(str(run)) for run in table.column("run")]
    sheet = _derived(
        table, "Closure", "Whether each run, and the day as a whole (last row), adds up to 100 %."
    )
    total, spread = "total FE / %", "u(total FE) / %"

    def of_summary(head: str) -> Iterator[str | None]:
        return (None if place is None else f"={summary[head]}{place}" for place in places)

    formulas: dict[str, Callable[[], Iterator[str | None]]] = {
        total: lambda: of_summary(total),
        spread: lambda: of_summary(spread),
        "deviation / u": lambda: (
            f"=({sheet.letters[total]}{r}-100)/{sheet.letters[spread]}{r}" for r in sheet.lines
        ),
        "closure": lambda: of_summary("closure"),
    }
    return _fill(sheet, table, formulas)


def carbon_sheet(account: Account, sheets: Sheets) -> Sheet:
    """One row per run: where the CO2 went."""
    table, summary, charge, flow = (
        account.tables["carbon"],
        *(sheets[name] for name in ("summary", "charge", "flow")),
    )
    sheet = _derived(
        table,
        "Carbon",
        "Where the CO2 went. Totals by another outlet flow are computed with the tally, not by formulas.",
    )
    inlet = "inlet flow / umol/s"
    if inlet not in flow.letters:
        return _fill(sheet, table, {})
    return _fill(
        sheet,
        table,
        {
            "CO2 conversion / %": lambda: (f"={summary['CO2 conversion / %']}{r}" for r in sheet.lines),
            "carbonate bound / %": lambda: (
                f"={charge['current / mA']}{r}/1000"
                f"/({HYDROXIDE_PER_CARBONATE:g}*Faraday_constant*feed_CO2*{flow[inlet]}{r}/1000000)*100"
                for r in sheet.lines
            ),
        },
    )


def efficiencies_sheet(account: Account, sheets: Sheets) -> Sheet:
    """One row per run and detected product: shares of carbon and of energy."""
    plan, table = account.settled.plan, account.tables["efficiencies"]
    ledger, charge, flow = (sheets[name] for name in ("ledger", "charge", "flow"))
    rows = np.flatnonzero(account.settled.detection.detected)
    places = (rows + FIRST_ROW).tolist()
    runs = plan.products.run[rows]
    of_runs = [
        (run + FIRST_ROW, *held) for run, held in enumerate(runs_of(plan.products.run, len(plan.runs)))
    ]
    sheet = _derived(
        table, "Carbon and energy efficiency", "Of each detected product; energy by the Gibbs convention."
    )
    sheet.frozen = 2
    equilibrium = "E equilibrium vs RHE / V"

    def each(formula: Callable[[int, int, int], str]) -> Iterator[str]:
        """One formula per record, from its own row, that of its ledger, and that of its run."""
        return (
            formula(r, place, run + FIRST_ROW)
            for r, place, run in zip(sheet.lines, places, runs.tolist(), strict=True)
        )

    def carbon(place: int) -> str:
        return f"{ledger['amount / umol']}{place}*{ledger['CO2 per molecule']}{place}"

    def converted(run: int) -> str:
        _, first, stop = of_runs[run - FIRST_ROW]
        return "SUMPRODUCT(" + ",".join(
            ledger.span(head, first, stop) for head in ("counted", "CO2 per molecule", "amount / umol")
        ) + ")"  # fmt: skip

    def energy(r: int, place: int) -> str:
        return f"={ledger['FE / %']}{place}*(oxygen_potential-{sheet.letters[equilibrium]}{r})"

    formulas: dict[str, Callable[[], Iterator[str | None]]] = {
        "share of converted CO2 / %": lambda: each(
            lambda r, place, run: f"={carbon(place)}/{converted(run)}*100"
        ),
        "cathodic energy efficiency / %": lambda: each(
            lambda r, place, run: f"{energy(r, place)}/(oxygen_potential-{charge['E vs RHE / V']}{run})"
        ),
    }
    if "inlet flow / umol/s" in flow.letters:
        inlet = flow["inlet flow / umol/s"]
        formulas["carbon efficiency / %"] = lambda: each(
            lambda r, place, run: (
                f"={carbon(place)}/({charge['duration / s']}{run}*feed_CO2*{inlet}{run})*100"
            )
        )
    if "U / V" in charge.letters:
        formulas["full-cell energy efficiency / %"] = lambda: each(
            lambda r, place, run: f"{energy(r, place)}/{charge['U / V']}{run}"
        )
    return _fill(sheet, table, formulas)


def _derived(table: Table, title: str, about: str) -> Sheet:
    return Sheet(table.name, title, about, len(table))


def _fill(sheet: Sheet, table: Table, formulas: dict[str, Callable[[], Iterator[str | None]]]) -> Sheet:
    """Add every column of a table: by its formulas where there are any, else as it was computed."""
    for head in table.heads:
        shown = _shown(table, head)
        if head not in formulas:
            sheet.add(shown)
            continue
        found: list[Cell] = list(shown.values)
        sheet.formula(head, formulas[head](), found, shown.how, u=shown.u)
    return sheet
