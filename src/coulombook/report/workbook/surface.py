"""The sheets of real area: capacitance scans, and the roughness factor of each electrode."""

from __future__ import annotations

import numpy as np

from coulombook.balance.scan_verdicts import scan_sets
from coulombook.balance.surface_plan import SurfacePlan
from coulombook.book.entries import MILLIAMPERE, MILLIFARAD
from coulombook.report.workbook.cells import FIRST_ROW, Sheet
from coulombook.report.workbook.place import CM2, Account, found_in, runs_of, values

MILLIVOLT = 1e3


def scans_sheet(account: Account) -> Sheet:
    """One row per scan that counts."""
    plan = account.settled.plan
    surface = plan.surface
    scans = [plan.day.scans[number] for number in _counted(account)]
    owners = [surface.owners[number] for number in surface.scan_electrode]
    sheet = Sheet(
        "scans",
        "Capacitance scans",
        "Charging current of each voltammogram that counts; its slope against scan rate is the capacitance.",
        len(scans),
        parted="electrode",
    )
    sheet.text("electrode", [electrode for electrode, _ in owners])
    sheet.text("purpose", [purpose for _, purpose in owners])
    sheet.entered("electrode area / cm^2", surface.electrode_area_m2 * CM2, "geometric")
    sheet.entered("scan rate / mV/s", surface.scan_rate_volt_per_second * MILLIVOLT)
    sheet.computed(
        "charging current / mA",
        surface.charging_current_ampere * MILLIAMPERE,
        "half the difference of anodic and cathodic current in the middle of the window",
    )
    sheet.text("voltammogram", [scan.file for scan in scans])
    found_in(sheet, [scan.origin for scan in scans])
    return sheet


def _counted(account: Account) -> list[int]:
    """Places of the scans that count, in the order of the plan."""
    plan = account.settled.plan
    sets = scan_sets(plan.day.scans)
    return [
        number
        for owner in plan.surface.owners
        for number in sets[owner]
        if np.isfinite(plan.scans.charging_ampere[number])
    ]


def surface_sheet(account: Account, scans: Sheet) -> Sheet:
    """One row per electrode, with what the table of surfaces says of it."""
    settled = account.settled
    surface, outcome = settled.plan.surface, settled.outcome
    table = account.tables["surface"]
    count = len(surface.electrodes)
    held = runs_of(surface.scan_electrode, count)
    sheet = Sheet(
        "surface",
        "Real area",
        "Capacitance of each electrode, over its area and over the specific capacitance of a smooth surface.",
        count,
        frozen=2,
    )
    sheet.text("electrode", table.column("electrode"))
    sheet.text("purpose", table.column("purpose"))
    u = table.column("u(capacitance) / mF")
    capacitance = sheet.formula(
        "capacitance / mF",
        (
            f"=SLOPE({scans.span('charging current / mA', *one)},{scans.span('scan rate / mV/s', *one)})*1000"
            for one in held
        ),
        table.column("capacitance / mF"),
        "slope of charging current against scan rate",
        u=u,
    )
    sheet.computed("u(capacitance) / mF", u, "standard uncertainty", u=u)
    area = sheet.formula(
        "electrode area / cm^2",
        (f"=AVERAGE({scans.span('electrode area / cm^2', *one)})" for one in held),
        values(surface.mean @ surface.electrode_area_m2, CM2),
        "of its scans",
    )
    specific = values(outcome.capacitance_farad, MILLIFARAD * 1e3) / values(
        surface.mean @ surface.electrode_area_m2, CM2
    )
    per_area = sheet.formula(
        "specific capacitance / uF/cm^2",
        (f"={capacitance}{r}*1000/{area}{r}" for r in sheet.lines),
        specific,
        "capacitance / area",
    )
    u = table.column("u(roughness factor)")
    sheet.formula(
        "roughness factor",
        (f"={per_area}{r}/{_smooth(surface, per_area)}" if surface.judged else None for r in sheet.lines),
        table.column("roughness factor"),
        "over the specific capacitance of a smooth surface",
        u=u,
    )
    sheet.computed("u(roughness factor)", u, "standard uncertainty", u=u)
    for head in table.heads[table.heads.index("linearity") :]:
        if head == "purpose":
            continue
        if head == "form":
            sheet.text(head, table.column(head), "line or power law")
        else:
            sheet.computed(head, table.column(head))
    return sheet


def _smooth(surface: SurfacePlan, per_area: str) -> str:
    """The cell of what is taken as smooth: an electrode, or a constant."""
    return "specific_capacitance" if surface.smooth is None else f"{per_area}${FIRST_ROW + surface.smooth}"
