"""The sheets of the gas side: peaks, outlet flow and current of each injection, FE of each product in it."""

from __future__ import annotations

import numpy as np

from coulombook.balance.evaluate import drift_factor
from coulombook.balance.gas_plan import GasPlan
from coulombook.balance.readings import OutletFlow
from coulombook.book import Cell
from coulombook.book.entries import MILLIAMPERE, PPM, UMOL
from coulombook.curves.inverse import invert
from coulombook.report.workbook.cells import FIRST_ROW, Sheet, Sheets, listed
from coulombook.report.workbook.curves import COEFFICIENTS, CurveCells, inverse
from coulombook.report.workbook.place import Account, found_in, picked, runs_of, spreads, values, yes_no
from coulombook.uncertainty.linearised import IntArray, Number


class PeakOrder:
    """The peaks in the order of their readings, so that the channels of one product stand together."""

    def __init__(self, gas: GasPlan) -> None:
        reading, peak = gas.channel_mean.nonzero()
        counted = dict(zip(peak.tolist(), reading.tolist(), strict=True))
        by_place = {
            (int(injection), species.name): number
            for number, (injection, species) in enumerate(
                zip(gas.reading_injection, gas.reading_species, strict=True)
            )
        }
        # a peak left out of its reading's mean has no weight there, and is found by its injection and analyte
        reading_of = [
            counted[number]
            if number in counted
            else by_place[gas.injections.index[one.run, one.injection], one.analyte]
            for number, one in enumerate(gas.peaks)
        ]
        self.order: IntArray = np.argsort(np.array(reading_of, dtype=np.intp), kind="stable")
        self.held = runs_of(np.array(reading_of, dtype=np.intp)[self.order], len(gas.reading_injection))


def gas_sheet(account: Account, sheets: Sheets, curves: CurveCells, peaks: PeakOrder) -> Sheet:
    """One row per peak: from its area to the mole fraction."""
    plan, x = account.settled.plan, account.x
    gas, order = plan.gas, peaks.order
    ordered = [gas.peaks[number] for number in order]
    sheet = Sheet(
        "gas",
        "Gas peaks",
        "From peak area to mole fraction, through the drift of the detector and the curve of the channel.",
        len(ordered),
        frozen=2,
        parted="run",
    )
    sheet.text("run", [one.run for one in ordered])
    sheet.text("injection", [one.injection for one in ordered])
    sheet.text("time / s", [one.time_second for one in ordered], "on the log's clock")
    sheet.text("channel", [one.channel for one in ordered])
    sheet.text("analyte", [one.analyte for one in ordered])
    area = sheet.entered("peak area", [one.peak_area for one in ordered], "detector units")
    sheet.entered("used", yes_no(one.used for one in ordered), "yes or no", choices=("yes", "no"))
    divisor, drift = "", values(drift_factor(plan, x))
    if len(plan.day.checks):
        divisor = sheet.formula(
            "drift factor",
            _drift_formulas(gas, order, sheets["checks"]),
            drift[order],
            "between the checks before and after, linear in time",
        )
    b0, b1, b2 = curves.enter(sheet, gas.peak_curve[order])
    a0, a1, a2 = (x[name][gas.peak_curve[order]] for name in COEFFICIENTS)
    found = values(invert(a0, a1, a2, (x["peak area"] / drift)[order]), PPM)
    sheet.formula(
        "mole fraction / ppm",
        (
            inverse(
                f"{b0}{r}", f"{b1}{r}", f"{b2}{r}", f"{area}{r}/{divisor}{r}" if divisor else f"{area}{r}"
            )
            for r in sheet.lines
        ),
        found,
        "where the curve responds with area / drift factor"
        if divisor
        else "where the curve responds with the area",
        u=_spread_of_peaks(account, peaks),
    )
    found_in(sheet, [one.origin for one in ordered])
    return sheet


def _drift_formulas(gas: GasPlan, order: IntArray, checks: Sheet) -> list[str | None]:
    """Weights of time on the drift factors of the checks; none for a peak that no check corrects."""
    row_of = {
        number: FIRST_ROW + row for row, number in enumerate(np.flatnonzero(gas.check_curve >= 0).tolist())
    }
    column, drift = checks["drift factor"], gas.drift
    formulas: list[str | None] = []
    for number in order.tolist():
        held = slice(drift.indptr[number], drift.indptr[number + 1])
        parts = [
            f"{weight!r}*{column}{row_of[check]}" if weight != 1.0 else f"{column}{row_of[check]}"
            for check, weight in zip(drift.indices[held].tolist(), drift.data[held].tolist(), strict=True)
        ]
        formulas.append("=" + "+".join(parts) if parts else None)
    return formulas


def _spread_of_peaks(account: Account, peaks: PeakOrder) -> list[Cell]:
    """Uncertainty of the reading that each peak belongs to: it decides how many digits are worth showing."""
    u = spreads(account.settled.readings.mole_fraction, PPM)
    return [u[reading] for reading, (first, stop) in enumerate(peaks.held) for _ in range(first, stop)]


def injections_sheet(account: Account, gas: Sheet, peaks: PeakOrder) -> Sheet:
    """One row per injection and product, as far as the mole fraction; `finish_injections` adds the rest."""
    settled = account.settled
    plan = settled.plan.gas
    held = _products(plan)
    rows = account.tables["injections"]
    sheet = Sheet(
        "injections",
        "Gas products, injection by injection",
        "From mole fraction and outlet flow to the Faradaic efficiency of each product in each injection.",
        len(held),
        frozen=3,
        parted="run",
    )
    for head in ("run", "injection"):
        sheet.text(head, rows.column(head))
    sheet.text("product", rows.column("product"))
    sheet.text("time / s", rows.column("time / s"), "on the log's clock")
    sheet.computed("electrons", [int(one) for one in plan.electrons[held]], "n, per molecule")
    sheet.computed("CO2 per molecule", [plan.reading_species[one].carbon for one in held], "c")
    sheet.formula(
        "mole fraction / ppm",
        (_mean_of_channels(gas, *peaks.held[reading]) for reading in held),
        values(settled.readings.mole_fraction, PPM)[held],
        "of the used peaks of the injection: their mean over channels",
        u=picked(spreads(settled.readings.mole_fraction, PPM), held),
    )
    return sheet


def _products(gas: GasPlan) -> list[int]:
    """Readings of products: those of a tracer form no product."""
    found: list[int] = np.flatnonzero(gas.electrons > 0).tolist()
    return found


def _mean_of_channels(gas: Sheet, first: int, stop: int) -> str:
    if stop - first == 1:
        return f"={gas['mole fraction / ppm']}{FIRST_ROW + first}"
    fraction, used = gas.span("mole fraction / ppm", first, stop), gas.span("used", first, stop)
    # where no peak is used the reading stands for all of them, and is not used itself
    return (
        f'=IF(COUNTIF({used},"yes")=0,AVERAGE({fraction}),'
        f'SUMPRODUCT(({used}="yes")*1,{fraction})/COUNTIF({used},"yes"))'
    )


def outlet_sheet(account: Account, sheets: Sheets, peaks: PeakOrder) -> Sheet:
    """One row per injection: the outlet flow, and the current its products are held against."""
    settled = account.settled
    plan, readings = settled.plan, settled.readings
    injections = plan.gas.injections
    runs = [FIRST_ROW + int(run) for run in injections.run]
    sheet = Sheet(
        "outlet",
        "Outlet flow and current of each injection",
        "The current is the mean of the log over the window before the injection (dead time taken off); with a "
        "headspace it is what the gas volume remembers of the log, which no formula here follows.",
        len(runs),
        frozen=2,
        parted="run",
    )
    sheet.text("run", [account.runs[int(run)] for run in injections.run])
    sheet.text("injection", injections.label)
    sheet.text("time / s", listed(injections.time_second), "on the log's clock")
    if plan.outlet_flow is OutletFlow.TRACER:
        _tracer(account, sheet, sheets["gas"], peaks)
    outlet = sheet.formula(
        "outlet flow / umol/s",
        _outlet_formulas(account, sheet, sheets, runs),
        values(readings.outlet_mol_per_s, UMOL),
        {
            OutletFlow.INLET: "the inlet flow",
            OutletFlow.MEASURED: "as metered, dry",
            OutletFlow.TRACER: "tracer flow / mole fraction of the tracer",
            OutletFlow.BALANCE: "(inlet - carbon in liquids - carbonate) / (1 - sum of (1 - c) x)",
        }[plan.outlet_flow],
        u=spreads(readings.outlet_mol_per_s, UMOL),
    )
    if plan.headspace.any():
        _mixing(account, sheet, sheets, outlet, runs)
    mixed = plan.headspace[injections.run]
    sheet.computed(
        "current / mA",
        values(readings.current_ampere, MILLIAMPERE),
        "from the log",
        u=spreads(readings.current_ampere, MILLIAMPERE),
    )
    sheet.text(
        "current is", ["remembered by the headspace" if one else "mean of the window" for one in mixed]
    )
    usable = np.concatenate([one.usable for one in plan.figures]) if plan.figures else np.zeros(0, dtype=bool)
    sheet.computed("has a current", yes_no(usable), "whether the window lies in the run")
    found_in(sheet, injections.origin)
    return sheet


def _tracer(account: Account, sheet: Sheet, gas: Sheet, peaks: PeakOrder) -> None:
    plan, readings = account.settled.plan, account.settled.readings
    place = plan.gas.tracer_reading
    fraction, u = values(readings.mole_fraction, PPM), spreads(readings.mole_fraction, PPM)
    sheet.formula(
        "tracer / ppm",
        (_mean_of_channels(gas, *peaks.held[one]) if one >= 0 else None for one in place.tolist()),
        [fraction[one] if one >= 0 else None for one in place.tolist()],
        "mole fraction of the tracer",
        u=[u[one] if one >= 0 else None for one in place.tolist()],
    )


def _outlet_formulas(account: Account, sheet: Sheet, sheets: Sheets, runs: list[int]) -> list[str | None]:
    flow, made = sheets["flow"], sheets["injections"]
    match account.settled.plan.outlet_flow:
        case OutletFlow.INLET:
            return [f"={flow['inlet flow / umol/s']}{run}" for run in runs]
        case OutletFlow.MEASURED:
            return [f"={flow['outlet flow / umol/s']}{run}" for run in runs]
        case OutletFlow.TRACER:
            tracer, fraction = flow["tracer flow / umol/s"], sheet.letters["tracer / ppm"]
            return [
                f"={tracer}{run}/({fraction}{r}/1000000)" for r, run in zip(sheet.lines, runs, strict=True)
            ]
        case OutletFlow.BALANCE:
            inlet, liquids = flow["inlet flow / umol/s"], flow["carbon in liquids / umol/s"]
            uptake = sheets["runs"]["carbonate uptake / umol/s"]
            gas = account.settled.plan.gas
            of_injection = runs_of(gas.reading_injection[_products(gas)], len(runs))
            return [
                f"=({inlet}{run}-{liquids}{run}-{uptake}{run})/(1-{_net_gas(made, *held)})"
                for run, held in zip(runs, of_injection, strict=True)
            ]


def _net_gas(made: Sheet, first: int, stop: int) -> str:
    if first == stop:
        return "0"
    carbon, fraction = (made.span(head, first, stop) for head in ("CO2 per molecule", "mole fraction / ppm"))
    return f"SUMPRODUCT(1-{carbon},{fraction})/1000000"


def _mixing(account: Account, sheet: Sheet, sheets: Sheets, outlet: str, runs: list[int]) -> None:
    """Time constant of the headspace; the current was found with the value it had in the tally."""
    settled = account.settled
    volume, flow = sheets["runs"]["headspace / mL"], sheets["flow"]
    density = flow["gas density / mol m^-3"]
    dry = flow["dry share"] if "dry share" in flow.letters else ""
    mixing = settled.readings.mixing_time_second
    found = values(mixing)
    sheet.formula(
        "mixing time / s",
        (
            f"={volume}{run}*{density}{run}{f'*{dry}{run}' if dry else ''}/{outlet}{r}" if known else None
            for r, run, known in zip(sheet.lines, runs, np.isfinite(found).tolist(), strict=True)
        ),
        found,
        "headspace x gas density / outlet flow",
        u=spreads(mixing),
    )


def finish_injections(account: Account, sheet: Sheet, sheets: Sheets, peaks: PeakOrder) -> None:
    """From the mole fraction to the Faradaic efficiency of each product in each injection."""
    plan, rows = account.settled.plan.gas, account.tables["injections"]
    held = _products(plan)
    outlet, gas = sheets["outlet"], sheets["gas"]
    places = [FIRST_ROW + int(one) for one in plan.reading_injection[held]]
    flow = sheet.formula(
        "outlet flow / umol/s",
        (f"={outlet['outlet flow / umol/s']}{one}" for one in places),
        rows.column("outlet flow / umol/s"),
        "of the injection",
        u=_of_injections(account, held, account.settled.readings.outlet_mol_per_s, UMOL),
    )
    current = sheet.formula(
        "current / mA",
        (f"={outlet['current / mA']}{one}" for one in places),
        rows.column("current / mA"),
        "that belongs to the injection",
        u=_of_injections(account, held, account.settled.readings.current_ampere, MILLIAMPERE),
    )
    electrons, fraction = sheet.letters["electrons"], sheet.letters["mole fraction / ppm"]
    u = rows.column("u(FE) / %")
    sheet.formula(
        "FE / %",
        (
            f"={electrons}{r}*Faraday_constant*{fraction}{r}/1000000*{flow}{r}/1000000/({current}{r}/1000)*100"
            for r in sheet.lines
        ),
        rows.column("FE / %"),
        "n F x outlet flow / current",
        u=u,
    )
    sheet.computed("u(FE) / %", u, "standard uncertainty", u=u)
    sheet.formula(
        "used",
        (
            f'=IF(AND(COUNTIF({gas.span("used", *peaks.held[reading])},"yes")>0,'
            f'{outlet["has a current"]}{place}="yes"),"yes","no")'
            for reading, place in zip(held, places, strict=True)
        ),
        rows.column("used"),
        "whether the mean of the run takes it in",
    )


def _of_injections(account: Account, readings: list[int], x: Number, unit: float) -> list[Cell]:
    """Uncertainties of a quantity of injections, for the readings in them."""
    return picked(spreads(x, unit), account.settled.plan.gas.reading_injection[readings].tolist())
