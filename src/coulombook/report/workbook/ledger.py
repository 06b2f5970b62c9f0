"""The sheets that sum up: ledger, summary, series."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from coulombook.book.entries import PERCENT, level_of
from coulombook.compare.series import series_points
from coulombook.report.workbook.cells import FIRST_ROW, Sheet, Sheets, joined
from coulombook.report.workbook.place import Account, picked, runs_of, values
from coulombook.uncertainty.linearised import IntArray, nominal

COUNTED = "counted"
_NAMES = ("catalyst", "electrode", "level")


def ledger_sheet(account: Account, sheets: Sheets) -> Sheet:
    """One row per run and product, as in the table of that name, with what its FE is made of."""
    settled = account.settled
    plan, table = settled.plan, account.tables["ledger"]
    products = plan.products
    charge = sheets["charge"]
    places = (products.run + FIRST_ROW).tolist()
    sheet = Sheet(
        "ledger",
        "Ledger",
        "What each product took of the charge of its run. Products below detection keep their estimate here and are "
        "left out of totals (counted = 0).",
        len(places),
        frozen=2,
        parted="run",
    )
    sheet.text("run", table.column("run"))
    sheet.text("product", table.column("product"))
    for head in _NAMES:
        sheet.text(head, table.column(head))
    sheet.formula(
        "E vs RHE / V",
        (f"={charge['E vs RHE / V']}{place}" for place in places),
        table.column("E vs RHE / V"),
        "of the run",
        u=picked(account.column("summary", "u(E vs RHE) / V"), products.run.tolist()),
    )
    sheet.text("group", table.column("group"))
    sheet.text("phase", table.column("phase"))
    electrons = sheet.computed("electrons", table.column("electrons"), "n, per molecule, from CO2")
    sheet.computed("CO2 per molecule", [int(one) for one in products.carbon], "c")
    sheet.computed(
        COUNTED, [int(one) for one in settled.detection.counted], "1: enters totals; 0: below detection"
    )
    parts = [
        sheet.formula(f"{phase} FE / %", formulas, found, how)
        for phase, formulas, found, how in (
            (
                "gas",
                _gas_formulas(account, sheets, sheet.letters["product"]),
                np.where(np.diff(products.from_gas.indptr) > 0, _gas_efficiency(account), np.nan),
                "mean over the used injections",
            ),
            (
                "liquid",
                _liquid_formulas(account, sheets),
                np.where(np.diff(products.from_liquid.indptr) > 0, _liquid_efficiency(account), np.nan),
                "sum over the compartments",
            ),
        )
    ]
    u = table.column("u(FE) / %")
    fe = sheet.formula(
        "FE / %",
        (f"=N({parts[0]}{r})+N({parts[1]}{r})" for r in sheet.lines),
        table.column("FE / %"),
        "gas + liquid",
        u=u,
    )
    sheet.computed("u(FE) / %", u, "standard uncertainty", u=u)
    sheet.formula(
        "amount / umol",
        (
            f"={fe}{r}/100*{charge['charge / C']}{place}/({electrons}{r}*Faraday_constant)*1000000"
            for r, place in zip(sheet.lines, places, strict=True)
        ),
        table.column("amount / umol"),
        "FE x charge / (n F)",
        u=_relative(table.column("amount / umol"), table.column("FE / %"), u),
    )
    u = table.column("u(j) / mA cm^-2")
    density = sheet.formula(
        "j / mA cm^-2",
        (
            f"={fe}{r}/100*{charge['j / mA cm^-2']}{place}"
            for r, place in zip(sheet.lines, places, strict=True)
        ),
        table.column("j / mA cm^-2"),
        "FE x current density, geometric area",
        u=u,
    )
    sheet.computed("u(j) / mA cm^-2", u, "standard uncertainty", u=u)
    real, u = table.column("j real / mA cm^-2"), table.column("u(j real) / mA cm^-2")
    roughness = _roughness_cells(account, sheets)
    sheet.formula(
        "j real / mA cm^-2",
        (
            None if (cell := roughness[run]) is None else f"={density}{r}/{cell}"
            for r, run in zip(sheet.lines, products.run.tolist(), strict=True)
        ),
        real,
        "j / roughness factor",
        u=u,
    )
    sheet.computed("u(j real) / mA cm^-2", u, "standard uncertainty", u=u)
    sheet.computed(
        "FE limit / %", table.column("FE limit / %"), "FE at the detection limit, if below detection"
    )
    sheet.text("status", table.column("status"))
    return sheet


def _relative(of: Sequence[object], like: Sequence[object], u: Sequence[object]) -> list[float | None]:
    """Uncertainties that tell how many digits of a value are worth showing, as of one it is proportional to."""
    return [
        abs(a / b) * s
        if isinstance(a, float) and isinstance(b, float) and isinstance(s, float) and b
        else None
        for a, b, s in zip(of, like, u, strict=True)
    ]


def _gas_efficiency(account: Account) -> np.ndarray:
    products = account.settled.plan.products
    return np.asarray(products.from_gas @ nominal(account.settled.injections.mean)) * PERCENT


def _liquid_efficiency(account: Account) -> np.ndarray:
    products = account.settled.plan.products
    return np.asarray(products.from_liquid @ values(account.settled.liquids.faradaic_efficiency)) * PERCENT


def _gas_formulas(account: Account, sheets: Sheets, product: str) -> list[str | None]:
    plan = account.settled.plan
    made = sheets["injections"]
    injections = plan.gas.injections.run[plan.gas.reading_injection[plan.gas.electrons > 0]]
    of_runs = runs_of(injections, len(plan.runs))
    formulas: list[str | None] = []
    for row, (run, found) in enumerate(
        zip(plan.products.run.tolist(), np.diff(plan.products.from_gas.indptr).tolist(), strict=True)
    ):
        if not found:
            formulas.append(None)
            continue
        names, used, efficiency = (made.span(head, *of_runs[run]) for head in ("product", "used", "FE / %"))
        # EXACT, for a comparison by = takes capitals and small letters for the same
        chosen = f'EXACT({names},{product}{FIRST_ROW + row})*({used}="yes")'
        formulas.append(f"=SUMPRODUCT({chosen},{efficiency})/SUMPRODUCT({chosen})")
    return formulas


def _liquid_formulas(account: Account, sheets: Sheets) -> list[str | None]:
    plan = account.settled.plan
    column = sheets["compartments"]["FE / %"]
    of_product, compartments = plan.products.from_liquid, plan.liquid.compartments
    formulas: list[str | None] = []
    for row in range(len(plan.products.run)):
        rows = [
            int(part)
            for group in of_product.indices[of_product.indptr[row] : of_product.indptr[row + 1]]
            for part in compartments.indices[compartments.indptr[group] : compartments.indptr[group + 1]]
        ]
        if not rows:
            formulas.append(None)
        elif len(rows) == 1:
            formulas.append(f"={column}{FIRST_ROW + rows[0]}")
        else:
            formulas.append(f"=SUM({joined(column, rows)})")
    return formulas


def _roughness_cells(account: Account, sheets: Sheets) -> list[str | None]:
    """Cell of the roughness factor of each run's electrode, None where it has none."""
    surface = account.settled.plan.surface
    cells: list[str | None] = [None] * len(account.runs)
    if surface.judged:
        for run, electrode in zip(*(places.tolist() for places in surface.runs.nonzero()), strict=True):
            cells[run] = f"{sheets['surface']['roughness factor']}{FIRST_ROW + electrode}"
    return cells


def summary_sheet(account: Account, sheets: Sheets) -> Sheet:
    """One row per run, as in the table of that name."""
    plan, table = account.settled.plan, account.tables["summary"]
    ledger, charge, flow = (sheets[name] for name in ("ledger", "charge", "flow"))
    held = runs_of(plan.products.run, len(plan.runs))
    sheet = Sheet(
        "summary",
        "Summary",
        "One row per run: where its charge went, and whether the balance closes.",
        len(plan.runs),
    )

    def copied(head: str, of: str, u: Sequence[object] | None = None) -> str:
        return sheet.formula(head, (f"={of}{r}" for r in sheet.lines), table.column(head), "of the run", u=u)  # type: ignore[arg-type]

    sheet.text("run", table.column("run"))
    for head in _NAMES:
        sheet.text(head, table.column(head))
    u = table.column("u(E vs RHE) / V")
    copied("E vs RHE / V", charge["E vs RHE / V"], u)
    sheet.computed("u(E vs RHE) / V", u, "standard uncertainty", u=u)
    copied("charge / C", charge["charge / C"])
    copied("j / mA cm^-2", charge["j / mA cm^-2"])
    u = table.column("u(total FE) / %")
    total = sheet.formula(
        "total FE / %",
        (f"={_sum(ledger, 'FE / %', one)}" for one in held),
        table.column("total FE / %"),
        "sum of the products that count",
        u=u,
    )
    spread = sheet.computed("u(total FE) / %", u, "with all covariances", u=u)
    u = table.column("u(C2+ FE) / %")
    groups = [
        sheet.formula(
            head,
            (f"={_sum(ledger, 'FE / %', one, which)}" for one in held),
            table.column(head),
            how,
            u=u if which == ">1" else None,
        )
        for head, which, how in (
            ("H2 FE / %", "=0", "hydrogen"),
            ("C1 FE / %", "=1", "one carbon"),
            ("C2+ FE / %", ">1", "two carbons and more"),
        )
    ]
    sheet.computed("u(C2+ FE) / %", u, "with all covariances", u=u)
    u = table.column("u(C2+/C1)")
    sheet.formula(
        "C2+/C1",
        (f'=IF({groups[1]}{r}=0,"",{groups[2]}{r}/{groups[1]}{r})' for r in sheet.lines),
        table.column("C2+/C1"),
        "by charge",
        u=u,
    )
    sheet.computed("u(C2+/C1)", u, "with all covariances", u=u)
    molar = table.column("C2+/C1 molar")
    sheet.formula(
        "C2+/C1 molar",
        (
            f"={_sum(ledger, 'amount / umol', one, '>1')}/{_sum(ledger, 'amount / umol', one, '=1')}"
            for one in held
        ),
        molar,
        "by amount",
        u=_relative(molar, table.column("C2+/C1"), u),
    )
    u = table.column("u(roughness factor)")
    sheet.formula(
        "roughness factor",
        (None if cell is None else f"={cell}" for cell in _roughness_cells(account, sheets)),
        table.column("roughness factor"),
        "of the run's electrode",
        u=u,
    )
    sheet.computed("u(roughness factor)", u, "standard uncertainty", u=u)
    sheet.formula(
        "CO2 conversion / %",
        _conversion(sheet, ledger, charge, flow, held),
        table.column("CO2 conversion / %"),
        "CO2 in products / (CO2 fed x duration)",
        u=account.column("carbon", "u(CO2 conversion) / %") if "carbon" in account.tables else None,
    )
    sheet.formula(
        "closure",
        (
            f"=IF(ABS({total}{r}/100-1)<=coverage_factor*SQRT(({spread}{r}/100)^2+unaccounted^2)+1E-9,"
            f'"closed",IF({total}{r}<100,"short","over"))'
            for r in sheet.lines
        ),
        table.column("closure"),
        "whether the total differs from 100 % by more than its uncertainty allows",
    )
    return sheet


def _sum(ledger: Sheet, head: str, held: tuple[int, int], which: str | None = None) -> str:
    """Sum over the products of a run that count, or over those whose carbon number fits ``which``."""
    if held[0] == held[1]:
        return "0"
    counted, of = ledger.span(COUNTED, *held), ledger.span(head, *held)
    chosen = "" if which is None else f"({ledger.span('CO2 per molecule', *held)}{which})*"
    return f"SUMPRODUCT({chosen}{counted},{of})"


def _conversion(
    sheet: Sheet, ledger: Sheet, charge: Sheet, flow: Sheet, held: Sequence[tuple[int, int]]
) -> list[str | None]:
    if "inlet flow / umol/s" not in flow.letters:
        return [None] * sheet.rows
    inlet, duration = flow["inlet flow / umol/s"], charge["duration / s"]
    formulas: list[str | None] = []
    for r, (first, stop) in zip(sheet.lines, held, strict=True):
        made = "0"
        if first < stop:
            columns = (
                ledger.span(head, first, stop) for head in (COUNTED, "CO2 per molecule", "amount / umol")
            )
            made = f"SUMPRODUCT({','.join(columns)})"
        formulas.append(f"={made}/{duration}{r}/(feed_CO2*{inlet}{r})*100")
    return formulas


# a function takes 255 arguments, a formula 8192 characters
_MOST_REPLICATES = 200


def series_sheet(account: Account, ledger: Sheet) -> Sheet:
    """One row per catalyst, level and product, as in the table of that name: replicates pooled."""
    plan, table = account.settled.plan, account.tables["series"]
    runs = [plan.runs[number] for number in plan.products.run]
    points = series_points(
        [run.catalyst for run in runs], [level_of(run) for run in runs], plan.products.species
    )
    sheet = Sheet(
        "series",
        "Series",
        "Each catalyst against potential: means over the runs of one level, and their scatter.",
        len(table),
        frozen=3,
        parted="level",
    )
    rows = [point.rows for point in points]
    sheet.text("catalyst", table.column("catalyst"))
    sheet.text("level", table.column("level"))
    sheet.text("product", table.column("product"))
    sheet.formula(
        "E vs RHE / V",
        (_pooled("AVERAGE", ledger["E vs RHE / V"], one) for one in rows),
        table.column("E vs RHE / V"),
        "mean of the runs",
        u=picked(
            account.column("summary", "u(E vs RHE) / V"), [int(plan.products.run[one[0]]) for one in rows]
        ),
    )
    sheet.computed("runs", table.column("runs"), "that are pooled")
    for value, u in (
        ("FE / %", "u(FE) / %"),
        ("j / mA cm^-2", "u(j) / mA cm^-2"),
        ("j real / mA cm^-2", "u(j real) / mA cm^-2"),
    ):
        spread = table.column(u)
        sheet.formula(
            value, (_pooled("AVERAGE", ledger[value], one) for one in rows), table.column(value), "mean of the runs",
            u=spread,
        )  # fmt: skip
        if value == "FE / %":
            sheet.formula(
                "s(FE) / %",
                (_pooled("STDEV", ledger[value], one) for one in rows),
                table.column("s(FE) / %"),
                "standard deviation between the runs",
                u=spread,
            )
        sheet.computed(u, spread, "standard uncertainty of the mean", u=spread)
    return sheet


def _pooled(function: str, column: str, rows: IntArray) -> str | None:
    """A function of the cells of some rows; None where they are too many for it to list."""
    return f"={function}({joined(column, rows.tolist())})" if len(rows) <= _MOST_REPLICATES else None
