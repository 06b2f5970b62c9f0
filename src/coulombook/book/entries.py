"""From the settled account to the rows of the book: SI inside, lab units on the page."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from coulombook.balance.readings import Run
from coulombook.balance.settle import Settled
from coulombook.balance.spectra_used import capacitances_of_sets, electrode_of, impedance_capacitances
from coulombook.balance.verdicts import closures, product_status
from coulombook.book.tables import Cell, Table
from coulombook.compare.series import pool_points, series_points
from coulombook.findings import Finding
from coulombook.uncertainty.budget import budget
from coulombook.uncertainty.linearised import IntArray, Number, nominal, standard_uncertainty

PERCENT = 100.0
PPM = 1e6
UMOL = 1e6
MILLIAMPERE = 1e3
MILLIFARAD = 1e3
MA_PER_CM2 = 0.1  # from A/m^2

Row = dict[str, Cell]


@dataclass(frozen=True, slots=True, eq=False)
class _Measured:
    """Values and standard uncertainties in the unit of the page."""

    value: list[float]
    u: list[float]

    @classmethod
    def of(cls, x: Number, unit: float) -> _Measured:
        return cls((nominal(x) * unit).tolist(), (standard_uncertainty(x) * unit).tolist())


def level_of(run: Run) -> str:
    """What replicates share: the level given, or the set potential or current, or the run alone."""
    if run.level is not None:
        return run.level
    if run.set_potential_volt is not None:
        return f"{run.set_potential_volt:g}"  # in V, as a number that readers of the table can sort by
    if run.set_current_ampere is not None:
        return f"{run.set_current_ampere * MILLIAMPERE:g} mA"
    return run.name


def enter(
    settled: Settled, findings: Sequence[Finding], judgements: Mapping[str, list[Row]] | None = None
) -> dict[str, Table]:
    """Every table of the book; ``judgements`` are the rows of tables that judge the day, by name."""
    status = product_status(settled)
    closure, _ = closures(settled)
    tables: Mapping[str, Iterable[Row]] = {
        "ledger": _ledger(settled, status),
        "summary": _summary(settled, closure),
        "injections": _injections(settled),
        "series": _series(settled),
        "surface": _surface(settled),
        **({"spectra": _spectra(settled)} if settled.plan.day.spectra else {}),
        "calibrations": _calibrations(settled),
        "budget": _budget(settled),
        **(judgements or {}),
        "findings": [
            {
                "severity": str(one.severity),
                "kind": one.kind,
                "where": one.where,
                "text": one.text,
                "mend": one.mend,
            }
            for one in findings
        ],
    }
    return {name: Table.of(name, rows) for name, rows in tables.items()}


def _run_cells(settled: Settled) -> list[Row]:
    """What every row about a run begins with."""
    potential = nominal(settled.outcome.electrical.potential_rhe_volt)
    return [
        {
            "run": run.name,
            "catalyst": run.catalyst,
            "electrode": run.electrode,
            "level": level_of(run),
            "E vs RHE / V": float(potential[number]),
        }
        for number, run in enumerate(settled.plan.runs)
    ]


def _ledger(settled: Settled, status: Sequence[str]) -> list[Row]:
    products, outcome = settled.plan.products, settled.outcome
    runs = _run_cells(settled)
    detected = settled.detection.detected
    limit = (settled.detection.efficiency_limit * PERCENT).tolist()
    amount = (nominal(outcome.amount_mol) * UMOL).tolist()
    fe = _Measured.of(outcome.faradaic_efficiency, PERCENT)
    j = _Measured.of(outcome.partial_current_density_ampere_per_m2, MA_PER_CM2)
    real = _Measured.of(outcome.real_partial_current_density_ampere_per_m2, MA_PER_CM2)
    return [
        {
            **runs[products.run[row]],
            "product": products.species[row],
            "group": products.group[row],
            "phase": products.phase[row],
            "electrons": int(products.electrons[row]),
            "amount / umol": amount[row],
            "FE / %": fe.value[row],
            "u(FE) / %": fe.u[row],
            "j / mA cm^-2": j.value[row],
            "u(j) / mA cm^-2": j.u[row],
            "j real / mA cm^-2": real.value[row],
            "u(j real) / mA cm^-2": _beside(real, row),
            "FE limit / %": None if detected[row] else limit[row],
            "status": status[row],
        }
        for row in range(len(products.run))
    ]


def _beside(measured: _Measured, row: int) -> float | None:
    """The uncertainty of a value that exists; none of a sum or ratio of nothing, whose zero is not known to be one."""
    value, u = measured.value[row], measured.u[row]
    return u if np.isfinite(value) and (value, u) != (0.0, 0.0) else None


def _finite(measured: _Measured, row: int) -> float | None:
    return measured.value[row] if np.isfinite(measured.value[row]) else None


def _summary(settled: Settled, closure: Sequence[str]) -> list[Row]:
    outcome, electrical = settled.outcome, settled.outcome.electrical
    cells = _run_cells(settled)
    potential = _Measured.of(electrical.potential_rhe_volt, 1.0)
    charge = nominal(electrical.charge_coulomb).tolist()
    density = (nominal(electrical.current_density_ampere_per_m2) * MA_PER_CM2).tolist()
    total = _Measured.of(outcome.total, PERCENT)
    hydrogen, c1 = _Measured.of(outcome.hydrogen, PERCENT), _Measured.of(outcome.c1, PERCENT)
    more = _Measured.of(outcome.c2_plus, PERCENT)
    ratio = _Measured.of(outcome.ratio, 1.0)
    molar = _Measured.of(outcome.ratio_molar, 1.0)
    roughness = _Measured.of(outcome.run_roughness_factor, 1.0)
    conversion = _Measured.of(outcome.co2_conversion, PERCENT)
    return [
        {
            **cells[row],
            "u(E vs RHE) / V": potential.u[row],
            "charge / C": charge[row],
            "j / mA cm^-2": density[row],
            "total FE / %": total.value[row],
            "u(total FE) / %": _beside(total, row),
            "H2 FE / %": hydrogen.value[row],
            "C1 FE / %": c1.value[row],
            "C2+ FE / %": more.value[row],
            "u(C2+ FE) / %": _beside(more, row),
            "C2+/C1": _finite(ratio, row),
            "u(C2+/C1)": _beside(ratio, row),
            "C2+/C1 molar": _finite(molar, row),
            "roughness factor": _finite(roughness, row),
            "u(roughness factor)": _beside(roughness, row),
            "CO2 conversion / %": _finite(conversion, row),
            "closure": closure[row],
        }
        for row in range(len(cells))
    ]


def _injections(settled: Settled) -> list[Row]:
    plan, readings = settled.plan, settled.readings
    gas = plan.gas
    x = (nominal(readings.mole_fraction) * PPM).tolist()
    outlet = (nominal(readings.outlet_mol_per_s) * UMOL).tolist()
    current = (nominal(readings.current_ampere) * MILLIAMPERE).tolist()
    u = standard_uncertainty(readings.faradaic_efficiency)
    # the scatter that the readings' own errors leave unexplained belongs to each injection as well
    unexplained = np.zeros(len(u))
    unexplained[gas.pooled_reading] = settled.injections.unexplained[gas.pooled_group]
    fe = _Measured(
        (nominal(readings.faradaic_efficiency) * PERCENT).tolist(),
        (np.sqrt(u**2 + unexplained) * PERCENT).tolist(),
    )
    rows: list[Row] = []
    for number in np.flatnonzero(gas.electrons > 0).tolist():
        injection = gas.reading_injection[number]
        rows.append(
            {
                "run": plan.runs[gas.injections.run[injection]].name,
                "injection": gas.injections.label[injection],
                "time / s": float(gas.injections.time_second[injection]),
                "product": gas.reading_species[number].name,
                "mole fraction / ppm": x[number],
                "outlet flow / umol/s": outlet[injection],
                "current / mA": current[injection],
                "FE / %": _finite(fe, number),
                "u(FE) / %": _beside(fe, number),
                "used": "yes" if gas.reading_used[number] else "no",
            }
        )
    return rows


def _series(settled: Settled) -> list[Row]:
    plan, outcome = settled.plan, settled.outcome
    runs = [plan.runs[number] for number in plan.products.run]
    points = series_points(
        [run.catalyst for run in runs], [level_of(run) for run in runs], plan.products.species
    )
    if not points:
        return []
    potential = nominal(outcome.electrical.potential_rhe_volt)[plan.products.run]
    fe = pool_points(outcome.faradaic_efficiency, points)
    j = pool_points(outcome.partial_current_density_ampere_per_m2, points)
    real = pool_points(outcome.real_partial_current_density_ampere_per_m2, points)

    def u_real(number: int) -> float | None:
        return float(real.u[number] * MA_PER_CM2) if np.isfinite(real.mean[number]) else None

    return [
        {
            "catalyst": point.catalyst,
            "level": point.level,
            "E vs RHE / V": float(potential[point.rows].mean()),
            "product": point.product,
            "runs": len(point.rows),
            "FE / %": float(fe.mean[number] * PERCENT),
            "s(FE) / %": float(fe.deviation[number] * PERCENT),
            "u(FE) / %": float(fe.u[number] * PERCENT),
            "j / mA cm^-2": float(j.mean[number] * MA_PER_CM2),
            "u(j) / mA cm^-2": float(j.u[number] * MA_PER_CM2),
            "j real / mA cm^-2": float(real.mean[number] * MA_PER_CM2),
            "u(j real) / mA cm^-2": u_real(number),
        }
        for number, point in enumerate(points)
    ]


def _surface(settled: Settled) -> list[Row]:
    surface, outcome = settled.plan.surface, settled.outcome
    plan = settled.plan
    spectra = capacitances_of_sets(surface, impedance_capacitances(plan.day, plan.spectra))
    capacitance = _Measured.of(outcome.capacitance_farad, MILLIFARAD)
    roughness = _Measured.of(outcome.roughness_factor, 1.0)
    return [
        {
            "electrode": electrode,
            "purpose": purpose,
            "capacitance / mF": capacitance.value[number],
            "u(capacitance) / mF": capacitance.u[number],
            "roughness factor": _finite(roughness, number),
            "u(roughness factor)": _beside(roughness, number),
            "linearity": surface.fits[number].r_squared,
            "exponent": surface.fits[number].exponent,
            "u(exponent)": surface.fits[number].u_exponent,
            "form": surface.fits[number].form,
            "capacitance by window / mF": surface.methods[number].by_window * MILLIFARAD,
            "capacitance by charge / mF": surface.methods[number].by_charge * MILLIFARAD,
            "capacitance by Brug / mF": None if one is None else one.brug_farad * MILLIFARAD,
            "capacitance by Hsu-Mansfeld / mF": None if one is None else one.hsu_mansfeld_farad * MILLIFARAD,
        }
        for number, ((electrode, purpose), one) in enumerate(zip(surface.owners, spectra, strict=True))
    ]


def _spectra(settled: Settled) -> list[Row]:
    plan = settled.plan
    rows: list[Row] = []
    for spectrum, one in zip(plan.day.spectra, plan.spectra, strict=True):
        if one is None:
            continue
        fit, check = one.fit, one.check
        blocking = not np.isfinite(fit.transfer_ohm)
        rows.append(
            {
                "file": spectrum.file,
                "run": spectrum.run,
                "electrode": electrode_of(spectrum, plan.day),
                "purpose": spectrum.purpose,
                "points": fit.points,
                "resistance / ohm": fit.resistance_ohm,
                "u(resistance) / ohm": fit.u_resistance_ohm,
                "charge transfer / ohm": None if blocking else fit.transfer_ohm,
                "u(charge transfer) / ohm": fit.u_transfer_ohm,
                "constant phase / F s^(a-1)": fit.admittance,
                "u(constant phase) / F s^(a-1)": fit.u_admittance,
                "exponent": fit.alpha,
                "u(exponent)": fit.u_alpha,
                "capacitance by Brug / mF": fit.brug_farad * MILLIFARAD,
                "capacitance by Hsu-Mansfeld / mF": fit.hsu_mansfeld_farad * MILLIFARAD,
                "misfit / %": fit.misfit * PERCENT,
                "Kramers-Kronig residual / %": None if check is None else check.residual * PERCENT,
                "Kramers-Kronig": None if check is None else "passed" if check.sound else "failed",
            }
        )
    return rows


def _calibrations(settled: Settled) -> list[Row]:
    rows: list[Row] = []
    for number, one in enumerate(settled.plan.curves.used):
        limit = settled.plan.curves.limits(number, 1)
        if one.curve is None:
            continue
        curve, standards = one.curve, one.standards
        lack = one.judgement.lack_of_fit if one.judgement else None
        u = np.sqrt(np.diag(curve.covariance))
        # gas curves are fitted against mole fraction; the page shows ppm. Liquid curves have a pure ratio for x
        unit = PPM if standards.kind == "gas" else 1.0
        row: Row = {
            "calibration": standards.calibration,
            "channel": standards.channel,
            "analyte": standards.analyte,
            "form": curve.form,
            "weights": curve.weights,
            "points": curve.points,
            "residual sd": curve.residual_sd,
            "lack of fit p": None if lack is None else lack.p,
            "detection limit / ppm": None if limit is None else limit.detection * unit,
            "quantification limit / ppm": None if limit is None else limit.quantification * unit,
            "lowest / ppm": curve.lowest * unit,
            "highest / ppm": curve.highest * unit,
        }
        for power in range(3):
            if curve.free[power]:
                row[f"a{power}"] = float(curve.coefficients[power] / unit**power)
                row[f"u(a{power})"] = float(u[power] / unit**power)
        rows.append(row)
    return rows


def _budget(settled: Settled) -> Iterator[Row]:
    """Contributions of each source to each product's FE, total and C2+ FE, C2+/C1 and real j of every run.

    The longest table of the book: its rows are made as they are asked for.
    """
    plan, outcome = settled.plan, settled.outcome
    everything = np.arange(len(plan.runs))
    owner = plan.products.run
    real = [f"j real {name}" for name in plan.products.species]
    outputs: list[tuple[Number, Sequence[str], IntArray, float]] = [
        (outcome.faradaic_efficiency, plan.products.species, owner, PERCENT),
        (outcome.total, ["total FE"] * len(plan.runs), everything, PERCENT),
        (outcome.c2_plus, ["C2+ FE"] * len(plan.runs), everything, PERCENT),
        (outcome.ratio, ["C2+/C1"] * len(plan.runs), everything, 1.0),
        (outcome.real_partial_current_density_ampere_per_m2, real, owner, MA_PER_CM2),
    ]
    parts = []
    for kind, (number, _, runs, unit) in enumerate(outputs):
        found = budget(number, settled.inputs.sources)
        share = found.share
        output, source = np.nonzero(np.nan_to_num(share) > 0)
        sizes = found.u[output, source] * unit, share[output, source] * PERCENT
        parts.append((runs[output], np.full(len(output), kind), output, source, *sizes))
        sources = found.sources  # the same for every output
    run, kinds, *columns = (np.concatenate(part) for part in zip(*parts, strict=True))
    order = np.lexsort((kinds, run))  # stable: within an output the sources keep their order
    cells = (column[order].tolist() for column in (run, kinds, *columns))
    for place, kind, output, source, u, percent in zip(*cells, strict=True):
        yield {
            "run": plan.runs[place].name,
            "output": outputs[kind][1][output],
            "source": sources[source].name,
            "shared": sources[source].shared,
            "u / %": u,
            "share / %": percent,
        }
