"""The sheets of runs: what was entered, the charge and potential, the flows."""

from __future__ import annotations

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np

from coulombook.amounts.gas import molar_density
from coulombook.amounts.water import saturated_water_vapour_pascal, saturation_terms
from coulombook.balance.evaluate import carbon_to_liquid_mol_per_s, dry_outlet, molar_flow
from coulombook.balance.plan import FlowPlan
from coulombook.balance.readings import OutletFlow
from coulombook.book.entries import MA_PER_CM2, MILLIAMPERE, UMOL, level_of
from coulombook.cell.potential import TABLE_TEMPERATURE_KELVIN, nernst_slope_volt, reference_potential_volt
from coulombook.report.workbook.cells import Column, Kind, Sheet, Sheets, listed
from coulombook.report.workbook.place import (
    CM2,
    KPA,
    ML,
    ML_PER_MIN,
    Account,
    any_finite,
    found_in,
    runs_of,
    spreads,
    values,
)


class FlowHeads(NamedTuple):
    """Heads of one flow in the sheet of runs: as a volume, what kind of volume, and as an amount."""

    volume: str
    kind: str
    molar: str


def flow_heads(which: str) -> FlowHeads:
    """Heads of one flow."""
    return FlowHeads(f"{which} / mL/min", f"{which} measured as", f"{which} / umol/s")


def flows_used(account: Account) -> Iterator[tuple[str, FlowPlan]]:
    """The flows that have a part in the day's numbers, with their plans."""
    plan = account.settled.plan
    if any_finite(plan.inlet.value):
        yield "inlet flow", plan.inlet
    if plan.outlet_flow is OutletFlow.MEASURED:
        yield "outlet flow", plan.outlet
    if plan.outlet_flow is OutletFlow.TRACER:
        yield "tracer flow", plan.tracer


def runs_sheet(account: Account) -> Sheet:
    """One row per run: what the table of runs says."""
    plan, x = account.settled.plan, account.x
    runs = plan.runs
    sheet = Sheet("runs", "Runs", "What the table of runs says of each hold.", len(runs))
    sheet.text("run", account.runs)
    sheet.text("catalyst", [run.catalyst for run in runs])
    sheet.text("electrode", [run.electrode for run in runs])
    sheet.text("level", [level_of(run) for run in runs], "what replicates share")
    sheet.entered("electrode area / cm^2", x["electrode area"] * CM2, "geometric")
    sheet.entered("pH", x["ph"])
    sheet.entered("temperature / K", x["temperature"])
    sheet.entered("pressure / kPa", x["pressure"] * KPA)
    sheet.add(
        Column(
            "resistance / ohm",
            Kind.ENTERED,
            listed(x["resistance"]),
            "entered, or from an impedance spectrum (computed)",
            kinds=[Kind.COMPUTED if run.resistance_from else Kind.ENTERED for run in runs],
        )
    )
    sheet.entered("compensated", x["compensated"], "fraction of the ohmic drop the potentiostat removed")
    if plan.headspace.any():
        sheet.entered("headspace / mL", x["headspace"] * ML, "gas volume of the cell")
    if plan.outlet_flow is OutletFlow.BALANCE:
        sheet.entered(
            "carbonate uptake / umol/s", x["carbonate uptake"] * UMOL, "CO2 lost to the electrolyte"
        )
    for which, flow in flows_used(account):
        _enter_flow(sheet, which, flow)
    sheet.text("log", [run.trace for run in runs], "of the potentiostat")
    found_in(sheet, [run.origin for run in runs])
    return sheet


def _enter_flow(sheet: Sheet, which: str, flow: FlowPlan) -> None:
    heads = flow_heads(which)
    volume = flow.standard + flow.actual > 0
    if volume.any():
        sheet.entered(heads.volume, np.where(volume, flow.value * ML_PER_MIN, np.nan), "as a volume")
        kinds = np.where(flow.standard > 0, "standard", np.where(flow.actual > 0, "actual", ""))
        sheet.text(heads.kind, kinds.tolist(), "volume at the standard, or at the run's own T and p")
    if flow.molar.any():
        sheet.entered(heads.molar, np.where(flow.molar > 0, flow.value * UMOL, np.nan), "as an amount")


def charge_sheet(account: Account, sheets: Sheets) -> Sheet:
    """One row per run: charge, current and potential."""
    settled, x = account.settled, account.x
    figures, electrical = settled.plan.figures, settled.electrical
    runs = sheets["runs"]
    sheet = Sheet(
        "charge",
        "Charge, current and potential",
        "From the integrals of each log to the current density and the potential against RHE. "
        "Cathodic current counts as positive.",
        len(figures),
    )
    sheet.text("run", account.runs)
    start = sheet.computed(
        "start / s", [one.start_second for one in figures], "of the window, on the log's clock"
    )
    stop = sheet.computed("stop / s", [one.stop_second for one in figures], "of the window")
    duration = sheet.formula(
        "duration / s",
        (f"={stop}{r}-{start}{r}" for r in sheet.lines),
        [one.stop_second - one.start_second for one in figures],
        "stop - start",
    )
    charge = sheet.computed(
        "charge / C",
        [one.charge_coulomb for one in figures],
        "-integral of I dt over the window of the log, trapezoidal",
        u=spreads(electrical.charge_coulomb),
    )
    current = sheet.formula(
        "current / mA",
        (f"={charge}{r}/{duration}{r}*1000" for r in sheet.lines),
        values(electrical.mean_current_ampere, MILLIAMPERE),
        "mean: charge / duration",
        u=spreads(electrical.mean_current_ampere, MILLIAMPERE),
    )
    area = runs["electrode area / cm^2"]
    sheet.formula(
        "j / mA cm^-2",
        (f"={current}{r}/{area}{r}" for r in sheet.lines),
        values(electrical.current_density_ampere_per_m2, MA_PER_CM2),
        "current / geometric area",
        u=spreads(electrical.current_density_ampere_per_m2, MA_PER_CM2),
    )
    potential = sheet.computed(
        "E logged / V",
        x["mean potential"],
        "time-weighted mean over the window, against the reference electrode",
    )
    temperature, kelvin = runs["temperature / K"], x["temperature"]
    reference = sheet.formula(
        "reference vs SHE / V",
        (
            f"=reference_potential+reference_coefficient*({temperature}{r}-{TABLE_TEMPERATURE_KELVIN!r})"
            for r in sheet.lines
        ),
        values(reference_potential_volt(x["potential"], x["temperature coefficient"], kelvin)),
        "at the run's temperature",
    )
    slope = sheet.formula(
        "RHE shift per pH / V",
        (f"=gas_constant*{temperature}{r}*LN(10)/Faraday_constant" for r in sheet.lines),
        values(nernst_slope_volt(kelvin)),
        "R T ln 10 / F",
    )
    ph, ohm, compensated = runs["pH"], runs["resistance / ohm"], runs["compensated"]
    sheet.formula(
        "E vs RHE / V",
        (
            f"={potential}{r}+{reference}{r}+{slope}{r}*{ph}{r}+(1-{compensated}{r})*{current}{r}/1000*{ohm}{r}"
            for r in sheet.lines
        ),
        values(electrical.potential_rhe_volt),
        "E logged + reference + shift x pH + (1 - compensated) x current x resistance",
        u=spreads(electrical.potential_rhe_volt),
    )
    if any_finite(x["cell voltage"]):
        sheet.computed("U / V", x["cell voltage"], "mean cell voltage over the window")
    sheet.text("log", [run.trace for run in settled.plan.runs], "of the potentiostat")
    return sheet


def flow_sheet(account: Account, sheets: Sheets) -> Sheet:
    """One row per run: the flows as amounts, and what the outlet flow is found from."""
    settled, x = account.settled, account.x
    plan = settled.plan
    mode = plan.outlet_flow
    sheet = Sheet(
        "flow",
        "Flows",
        f"Flows of each run as amounts. This day finds the outlet flow of each injection by: {mode}.",
        len(plan.runs),
    )
    sheet.text("run", account.runs)
    runs = sheets["runs"]
    used = list(flows_used(account))
    actual = any((flow.actual > 0).any() for _, flow in used)
    wet = mode is OutletFlow.MEASURED and plan.settings.meter_gas_wet
    if actual or plan.headspace.any() or wet:
        kelvin, kilopascal = runs["temperature / K"], runs["pressure / kPa"]
        sheet.formula(
            "gas density / mol m^-3",
            (f"={kilopascal}{r}*1000/(gas_constant*{kelvin}{r})" for r in sheet.lines),
            values(molar_density(x["pressure"], x["temperature"])),
            "p / (R T)",
        )
    if wet:
        _dry_gas(account, sheet, runs)
    for which, flow in used:
        _molar_flow(account, sheet, runs, which, flow)
    if mode is OutletFlow.BALANCE:
        _carbon_in_liquids(account, sheet, sheets)
    return sheet


def _dry_gas(account: Account, sheet: Sheet, runs: Sheet) -> None:
    """What is left of a wet volume when its water is taken off."""
    plan, x = account.settled.plan, account.x
    kelvin = runs["temperature / K"]
    theta, a, b, c = saturation_terms(x["temperature"])
    t = sheet.formula(
        "theta / K",
        (f"={kelvin}{r}+water_n9/({kelvin}{r}-water_n10)" for r in sheet.lines),
        values(theta),
        "IAPWS-IF97",
    )
    terms = []
    for name, n, value in (("A", ("1*", 1, 2), a), ("B", (3, 4, 5), b), ("C", (6, 7, 8), c)):
        first = "" if name == "A" else f"water_n{n[0]}*"
        terms.append(
            sheet.formula(
                f"{name} of IAPWS-IF97",
                (f"={first}{t}{r}^2+water_n{n[1]}*{t}{r}+water_n{n[2]}" for r in sheet.lines),
                values(value),
                "a quadratic in theta",
            )
        )
    va, vb, vc = terms
    vapour = sheet.formula(
        "water vapour / kPa",
        (f"=1000*(2*{vc}{r}/(SQRT({vb}{r}^2-4*{va}{r}*{vc}{r})-{vb}{r}))^4" for r in sheet.lines),
        values(saturated_water_vapour_pascal(x["temperature"]), KPA),
        "saturated: (2 C / (sqrt(B^2 - 4 A C) - B))^4",
    )
    pressure = runs["pressure / kPa"]
    wet_volume = plan.outlet.actual > 0
    sheet.formula(
        "dry share",
        (
            f"=1-{vapour}{r}/{pressure}{r}" if wet else None
            for r, wet in zip(sheet.lines, wet_volume, strict=True)
        ),
        values(dry_outlet(plan, x)),
        "1 - vapour / p; 1 for what is an amount already",
    )


def _molar_flow(account: Account, sheet: Sheet, runs: Sheet, which: str, flow: FlowPlan) -> None:
    plan, x = account.settled.plan, account.x
    heads = flow_heads(which)
    number = molar_flow(flow, account.settled.inputs.numbers, which)
    value = values(number, UMOL)
    dry = ""
    if which == "outlet flow" and "dry share" in sheet.letters:
        dry = f"*{sheet.letters['dry share']}"
        value = value * values(dry_outlet(plan, x))

    def formula(number: int, r: int) -> str | None:
        times = f"{dry}{r}" if dry else ""
        if flow.molar[number]:
            return f"={runs[heads.molar]}{r}{times}"
        if flow.standard[number]:
            return f"={runs[heads.volume]}{r}/60*standard_pressure*1000/(gas_constant*standard_temperature){times}"
        return f"={runs[heads.volume]}{r}/60*{sheet.letters['gas density / mol m^-3']}{r}{times}"

    sheet.formula(
        heads.molar,
        (formula(number, r) if np.isfinite(value[number]) else None for number, r in enumerate(sheet.lines)),
        value,
        "volume flow x p / (R T), at the standard or at the run's own" + (", x dry share" if dry else ""),
        u=spreads(number, UMOL),
    )


def _carbon_in_liquids(account: Account, sheet: Sheet, sheets: Sheets) -> None:
    settled = account.settled
    made, current = sheets["compartments"], sheets["charge"]["current / mA"]
    products = settled.plan.liquid.samplings.run[settled.plan.liquid.product_sampling]

    def formula(r: int, first: int, stop: int) -> str | None:
        if first == stop:
            return None
        carbon, electrons, efficiency = (
            made.span(head, first, stop) for head in ("CO2 per molecule", "electrons", "FE / %")
        )
        return f"=SUMPRODUCT({carbon},{efficiency}/{electrons})/100*{current}{r}*1000/Faraday_constant"

    sheet.formula(
        "carbon in liquids / umol/s",
        (
            formula(r, *held)
            for r, held in zip(sheet.lines, runs_of(products, len(account.runs)), strict=True)
        ),
        values(carbon_to_liquid_mol_per_s(settled.plan, settled.electrical, settled.liquids), UMOL),
        "sum over liquid products of CO2 per molecule x FE x current / (n F)",
    )
