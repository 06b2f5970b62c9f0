"""The sheets of the liquid side: signals, vials, concentrations, and what each compartment holds."""

from __future__ import annotations

from collections.abc import Sequence
from math import degrees
from typing import TYPE_CHECKING

import numpy as np

from coulombook.amounts.liquid import concentration_mol_per_m3, tube_amount_mol
from coulombook.balance.evaluate import (
    PerProton,
    charge_to_sampling,
    per_proton,
    response_ratios,
    standard_signals,
    standards_of_vials,
)
from coulombook.balance.readings import FloatArray, Signal, Species
from coulombook.book.entries import PERCENT, UMOL
from coulombook.report.workbook.cells import FIRST_ROW, Sheet, Sheets, joined
from coulombook.report.workbook.curves import CurveCells, inverse
from coulombook.report.workbook.place import ML, Account, found_in, picked, runs_of, spreads, values
from coulombook.uncertainty.linearised import IntArray, gather, linear_map, nominal, sparse_map

if TYPE_CHECKING:
    from scipy.sparse import csr_array

RELAXED, MEASURED = "standard per proton, relaxed", "standard per proton"


class SignalOrder:
    """Signals in the order of what they speak of, so that those of one thing stand together."""

    def __init__(self, group: IntArray, groups: int) -> None:
        self.order: IntArray = np.argsort(group, kind="stable")
        self.held = runs_of(group[self.order], groups)


def internal_standards_sheet(account: Account, order: SignalOrder) -> Sheet:
    """One row per signal of an internal standard."""
    settled, x = account.settled, account.x
    liquid = settled.plan.liquid
    signals = [liquid.standard_signals[number] for number in order.order]
    sheet = Sheet(
        "standard signals",
        "Signals of the internal standards",
        "What the integrals of the products are held against, vial by vial.",
        len(signals),
        frozen=2,
    )
    sheet.text("vial", [one.vial for one in signals])
    sheet.text("standard", [one.analyte for one in signals])
    sheet.text("signal", [one.signal for one in signals])
    found = standard_signals(settled.plan, x)
    _per_proton(
        sheet,
        signals,
        PerProton(nominal(found.measured)[order.order], nominal(found.relaxed)[order.order]),
        _saturated(account),
    )
    sheet.computed(
        "weight",
        settled.weights.standard[order.order],
        "among the standard's signals in the vial: 1/u^2, or equal",
    )
    found_in(sheet, [one.origin for one in signals])
    return sheet


def _saturated(account: Account) -> bool:
    """Whether any signal of the day tells how far it was saturated."""
    liquid = account.settled.plan.liquid
    return any(one.relaxation_second is not None for one in (*liquid.signals, *liquid.standard_signals))


def _per_proton(
    sheet: Sheet, signals: Sequence[Signal], found: PerProton, saturated: bool
) -> tuple[str, str]:
    """Add the columns from integral to integral per proton, as measured and as relaxed; their letters."""
    protons = sheet.entered("protons", [one.protons for one in signals], "that give the signal")
    integral = sheet.entered("integral", [one.integral for one in signals], "detector units")
    measured = sheet.formula(
        "integral per proton",
        (f"={integral}{r}/{protons}{r}" for r in sheet.lines),
        values(found.measured),
        "integral / protons",
    )
    if not saturated:
        return measured, measured
    known = [one.relaxation_second is not None for one in signals]
    t1 = sheet.entered("T1 / s", [one.relaxation_second for one in signals], "relaxation time, where known")
    repetition = sheet.entered(
        "repetition / s",
        [one.repetition_second if k else None for one, k in zip(signals, known, strict=True)],
        "from pulse to pulse",
    )
    angle = sheet.entered(
        "flip angle / deg",
        [
            degrees(np.pi / 2 if one.flip_angle_radian is None else one.flip_angle_radian) if k else None
            for one, k in zip(signals, known, strict=True)
        ],
    )
    factor = sheet.formula(
        "saturation factor",
        (
            f"=SIN(RADIANS({angle}{r}))*(1-EXP(-{repetition}{r}/{t1}{r}))"
            f"/(1-EXP(-{repetition}{r}/{t1}{r})*COS(RADIANS({angle}{r})))"
            if k
            else None
            for r, k in zip(sheet.lines, known, strict=True)
        ),
        np.where(known, values(found.measured) / values(found.relaxed), 1.0),
        "sin a (1 - E) / (1 - E cos a), E = exp(-TR/T1)",
    )
    relaxed = sheet.formula(
        "relaxed per proton",
        (f"={measured}{r}/{factor}{r}" for r in sheet.lines),
        values(found.relaxed),
        "as full relaxation would have given it",
    )
    return measured, relaxed


def vials_sheet(account: Account, sheets: Sheets, order: SignalOrder) -> Sheet:
    """One row per vial: what went into it, and its internal standard."""
    settled, x = account.settled, account.x
    plan = settled.plan
    vials = plan.liquid.vials
    sheet = Sheet(
        "vials", "Vials", "What went into each tube, and the signal of its internal standard.", len(vials)
    )
    sheet.text("vial", [one.name for one in vials])
    sheet.text("run", [one.run for one in vials])
    sheet.text("compartment", [one.compartment for one in vials])
    sheet.text("role", ["blank" if one.blank else "sample" for one in vials])
    sheet.text("time / s", [one.time_second for one in vials], "empty: at the end of the run")
    sheet.text("standard", [one.standard for one in vials])
    sheet.entered("standard amount / umol", x["standard amount"] * UMOL, "in the tube")
    sheet.entered("aliquot / mL", x["aliquot"] * ML, "of electrolyte in the tube")
    sheet.entered("compartment volume / mL", x["compartment volume"] * ML)
    measured = standard_signals(plan, x)
    standard = standards_of_vials(
        plan, PerProton(nominal(measured.measured), nominal(measured.relaxed)), settled.weights.standard
    )
    signals = sheets["standard signals"]
    columns = [(MEASURED, "integral per proton", standard.measured)]
    if _saturated(account):
        columns.append((RELAXED, "relaxed per proton", standard.relaxed))
    for head, of, found in columns:
        sheet.formula(
            head,
            (_weighed(signals, of, *held) if held[0] < held[1] else None for held in order.held),
            values(found),
            "weighted mean of the standard's signals",
        )
    found_in(sheet, [one.origin for one in vials])
    return sheet


def _weighed(sheet: Sheet, head: str, first: int, stop: int) -> str:
    if stop - first == 1:
        return f"={sheet[head]}{FIRST_ROW + first}"
    return f"=SUMPRODUCT({sheet.span('weight', first, stop)},{sheet.span(head, first, stop)})"


def liquid_sheet(account: Account, sheets: Sheets, curves: CurveCells, order: SignalOrder) -> Sheet:
    """One row per signal of a product: from its integral to its amount ratio to the internal standard."""
    settled, x = account.settled, account.x
    plan = settled.plan
    liquid, at = plan.liquid, order.order
    signals = [liquid.signals[number] for number in at]
    vials = [liquid.vials[number] for number in liquid.signal_vial[at]]
    sheet = Sheet(
        "liquid",
        "Liquid signals",
        "From integral to amount ratio: per proton, over the internal standard of the vial, through the signal's curve "
        "if it has one.",
        len(signals),
        frozen=3,
        parted="vial",
    )
    sheet.text("vial", [one.vial for one in signals])
    sheet.text("analyte", [one.analyte for one in signals])
    sheet.text("signal", [one.signal for one in signals])
    sheet.text("run", [one.run for one in vials])
    found = per_proton(liquid.signals, x["integral"], x["t1"])
    saturated = _saturated(account)
    measured, relaxed = _per_proton(
        sheet, signals, PerProton(nominal(found.measured)[at], nominal(found.relaxed)[at]), saturated
    )
    of_vials = standards_of_vials(
        plan,
        PerProton(*(nominal(one) for one in _pair(standard_signals(plan, x)))),
        settled.weights.standard,
    )
    counted = (liquid.signal_curve[at] < 0).tolist()
    places = (liquid.signal_vial[at] + FIRST_ROW).tolist()
    tube = sheets["vials"]
    by_count = (relaxed, tube[RELAXED if saturated else MEASURED])
    columns = [by_count if count else (measured, tube[MEASURED]) for count in counted]
    ratio = sheet.formula(
        "response ratio",
        (
            f"={own}{r}/{standard}{place}"
            for r, (own, standard), place in zip(sheet.lines, columns, places, strict=True)
        ),
        values(response_ratios(plan, x, of_vials))[at],
        "per proton over the standard's; relaxed where no curve holds the saturation",
    )
    a0, a1, a2 = curves.enter(sheet, liquid.signal_curve[at])
    u = settled.weights.u_ratio[at].tolist()
    sheet.formula(
        "amount ratio",
        (
            f"={ratio}{r}" if count else inverse(f"{a0}{r}", f"{a1}{r}", f"{a2}{r}", f"{ratio}{r}")
            for r, count in zip(sheet.lines, counted, strict=True)
        ),
        values(settled.liquids.amount_ratio)[at],
        "where the curve responds with the ratio; the ratio itself without a curve",
        u=u,
    )
    sheet.computed(
        "weight", settled.weights.analyte[at], "among the analyte's signals in the vial: 1/u^2, or equal"
    )
    found_in(sheet, [one.origin for one in signals])
    return sheet


def _pair(one: PerProton) -> tuple[FloatArray, FloatArray]:
    return nominal(one.measured), nominal(one.relaxed)


def samples_sheet(account: Account, sheets: Sheets, order: SignalOrder) -> Sheet:
    """One row per analyte of a vial: its concentration, the blank taken off."""
    settled, x = account.settled, account.x
    plan = settled.plan
    liquid = plan.liquid
    vials = [liquid.vials[number] for number in liquid.analyte_vial]
    signals, tube = sheets["liquid"], sheets["vials"]
    places = (liquid.analyte_vial + FIRST_ROW).tolist()
    sheet = Sheet(
        "samples",
        "Concentrations",
        "The signals of one analyte put together, its amount in the tube, and its concentration in the compartment.",
        len(vials),
        frozen=2,
        parted="vial",
    )
    sheet.text("vial", [one.name for one in vials])
    sheet.text("analyte", [one.name for one in liquid.analyte_species])
    sheet.text("run", [one.run for one in vials])
    sheet.text("role", ["blank" if one.blank else "sample" for one in vials])
    weights = sparse_map(
        liquid.signal_analyte,
        np.arange(len(liquid.signals)),
        settled.weights.analyte,
        (len(vials), len(liquid.signals)),
    )
    combined = linear_map(weights, nominal(settled.liquids.amount_ratio))
    ratio = sheet.formula(
        "amount ratio",
        (_weighed(signals, "amount ratio", *held) for held in order.held),
        values(combined),
        "weighted mean of the analyte's signals",
    )
    in_tube = tube_amount_mol(combined, gather(x["standard amount"], liquid.analyte_vial))
    amount = sheet.formula(
        "in the tube / umol",
        (
            f"={ratio}{r}*{tube['standard amount / umol']}{place}"
            for r, place in zip(sheet.lines, places, strict=True)
        ),
        values(in_tube, UMOL),
        "ratio x standard amount",
    )
    aliquot = tube["aliquot / mL"]
    found = concentration_mol_per_m3(in_tube, gather(x["aliquot"], liquid.analyte_vial))
    measured = sheet.formula(
        "measured / mmol/L",
        (f"={amount}{r}/{aliquot}{place}" for r, place in zip(sheet.lines, places, strict=True)),
        values(found),
        "in the tube / aliquot",
    )
    blanks = liquid.blanks
    u = spreads(settled.liquids.concentration_mol_per_m3)
    blank = sheet.formula(
        "blank / mmol/L",
        (_mean(measured, _columns(blanks, row)) for row in range(len(vials))),
        values(linear_map(blanks, found)),
        "mean of the blanks of the compartment; 0 without one",
        u=u,
    )
    net = sheet.formula(
        "concentration / mmol/L",
        (f"={measured}{r}-{blank}{r}" for r in sheet.lines),
        values(settled.liquids.concentration_mol_per_m3),
        "measured - blank",
        u=u,
    )
    sheet.formula(
        "withdrawn / umol",
        (f"={net}{r}*{aliquot}{place}" for r, place in zip(sheet.lines, places, strict=True)),
        values(settled.liquids.concentration_mol_per_m3 * gather(x["aliquot"], liquid.analyte_vial), UMOL),
        "concentration x aliquot: what the sampling took away",
    )
    return sheet


def _mean(column: str, rows: Sequence[int]) -> str | None:
    if not rows:
        return None
    return f"={column}{FIRST_ROW + rows[0]}" if len(rows) == 1 else f"=AVERAGE({joined(column, rows)})"


def compartments_sheet(account: Account, sheets: Sheets) -> Sheet:
    """One row per product of a compartment: its amount and Faradaic efficiency up to the last sampling."""
    settled, x = account.settled, account.x
    plan = settled.plan
    liquid = plan.liquid
    samples, tube = sheets["samples"], sheets["vials"]
    count = len(liquid.product_sampling)
    species = _products_of_compartments(account)
    sheet = Sheet(
        "compartments",
        "Liquid products, compartment by compartment",
        "From concentration to the amount made up to the last sampling, and its Faradaic efficiency.",
        count,
        frozen=3,
        parted="run",
    )
    samplings = liquid.samplings
    of = liquid.product_sampling.tolist()
    sheet.text("run", [account.runs[int(samplings.run[one])] for one in of])
    sheet.text("compartment", [samplings.compartment[one] for one in of])
    sheet.text("product", [one.name for one in species])
    sheet.computed("electrons", [int(one) for one in liquid.electrons], "n, per molecule")
    sheet.computed("CO2 per molecule", [one.carbon for one in species], "c")
    mean = linear_map(liquid.replicate_mean, settled.liquids.concentration_mol_per_m3)
    concentration = sheet.formula(
        "concentration / mmol/L",
        (
            _mean(samples["concentration / mmol/L"], _columns(liquid.replicate_mean, row))
            for row in range(count)
        ),
        values(mean),
        "mean of the vials of the last sampling",
        u=spreads(mean),
    )
    volume = sheet.formula(
        "volume / mL",
        (_mean(tube["compartment volume / mL"], _columns(liquid.volume_mean, row)) for row in range(count)),
        values(linear_map(liquid.volume_mean, np.nan_to_num(x["compartment volume"])), ML),
        "of the compartment at that sampling",
    )
    earlier = settled.liquids.concentration_mol_per_m3 * gather(x["aliquot"], liquid.analyte_vial)
    withdrawn = sheet.formula(
        "withdrawn before / umol",
        (
            f"=SUM({joined(samples['withdrawn / umol'], rows)})"
            if (rows := _columns(liquid.withdrawn, row))
            else None
            for row in range(count)
        ),
        values(linear_map(liquid.withdrawn, earlier), UMOL),
        "by earlier samplings",
    )
    amount = sheet.formula(
        "amount / umol",
        (f"={concentration}{r}*{volume}{r}+{withdrawn}{r}" for r in sheet.lines),
        values(settled.liquids.amount_mol, UMOL),
        "concentration x volume + withdrawn",
        u=spreads(settled.liquids.amount_mol, UMOL),
    )
    charge = charge_to_sampling(plan, settled.inputs.numbers)
    passed = sheet.computed(
        "charge to sampling / C",
        values(charge)[liquid.product_sampling],
        "from the log",
        u=picked(spreads(charge), of),
    )
    electrons = sheet.letters["electrons"]
    efficiency = settled.liquids.compartment_efficiency
    sheet.formula(
        "FE / %",
        (f"={electrons}{r}*Faraday_constant*{amount}{r}/1000000/{passed}{r}*100" for r in sheet.lines),
        values(efficiency, PERCENT),
        "n F x amount / charge",
        u=spreads(efficiency, PERCENT),
    )
    return sheet


def _products_of_compartments(account: Account) -> list[Species]:
    liquid = account.settled.plan.liquid
    product, compartment = liquid.compartments.nonzero()
    of = dict(zip(compartment.tolist(), product.tolist(), strict=True))
    return [liquid.group_species[of[row]] for row in range(len(of))]


def _columns(matrix: csr_array, row: int) -> list[int]:
    """What a row of a linear map takes its mean or sum of."""
    found: list[int] = matrix.indices[matrix.indptr[row] : matrix.indptr[row + 1]].tolist()
    return found
