"""Propagating the uncertainty of a day of 3,000 products, against the same model in `uncertainties`; prints JSON.

    python -m tests.benchmarks.uncertainty FOLDER REPEATS

Both sides start from the same readings and give the Faradaic efficiencies, totals and C2+/C1 of every run with
their standard uncertainties, and the covariance matrix of the products of every run.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Any

import numpy as np
from tests.benchmarks.days import CALIBRATIONS, write_day
from tests.benchmarks.measure import in_turns, timed
from uncertainties import correlated_values, covariance_matrix, ufloat
from uncertainties.umath import sqrt

from coulombook.balance.plan import Plan
from coulombook.balance.settle import settle
from coulombook.constants import FARADAY_CONSTANT, GAS_CONSTANT
from coulombook.findings import Findings
from coulombook.intake.day import open_day
from coulombook.tally import settle_day
from coulombook.uncertainty.linearised import Linearised, covariance, gather, nominal, standard_uncertainty

RUNS = 375  # of eight products each
Result = tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray, list[np.ndarray]]


def plan_of(folder: Path) -> Plan:
    """The plan of a day whose injections do not scatter, so that both models hold the same errors."""
    write_day(folder, RUNS, 100, noise=0.0)
    findings = Findings()
    settled = settle_day(open_day(folder, [CALIBRATIONS], findings), findings)
    if settled is None:
        raise RuntimeError(str(tuple(findings)))
    return settled.plan


def ours(plan: Plan) -> Result:
    """Efficiencies, their u, u of totals and of C2+/C1, covariance matrices, by coulombook."""
    outcome = settle(plan).outcome
    efficiency = outcome.faradaic_efficiency
    assert isinstance(efficiency, Linearised)
    rows = [np.flatnonzero(plan.products.run == number) for number in range(len(plan.runs))]
    return (
        nominal(efficiency),
        standard_uncertainty(efficiency),
        standard_uncertainty(outcome.total),
        standard_uncertainty(outcome.ratio),
        [covariance(gather(efficiency, held)) for held in rows],  # type: ignore[arg-type] # Linearised here
    )


def by_uncertainties(plan: Plan) -> Result:
    """The same by `uncertainties`, number by number."""
    gas, liquid, day = plan.gas, plan.liquid, plan.settings
    curves = [correlated_values(one.curve.coefficients, one.curve.covariance) for one in plan.curves.used]
    flow_error, amount_error, gain = ufloat(1, 0.01), ufloat(1, 0.01), ufloat(1, 0.002)
    check = [ufloat(area, 0.01 * area) for area in gas.check_area]
    factor = []
    for area, fraction, curve in zip(check, gas.check_mole_fraction, gas.check_curve, strict=True):
        a0, a1, a2 = curves[curve]
        factor.append(area / (a0 + (a1 + a2 * fraction) * fraction))

    def invert(curve: int, y: Any) -> Any:
        a0, a1, a2 = curves[curve]
        return 2 * (y - a0) / (a1 + sqrt(a1**2 + 4 * a2 * (y - a0)))

    density = day.standard_pressure_pascal / (GAS_CONSTANT * day.standard_temperature_kelvin)
    current = np.concatenate([one.injection_current_ampere for one in plan.figures])
    efficiency: dict[tuple[int, str], list[Any]] = {}
    drift = gas.drift.tocsr()
    for number, peak in enumerate(gas.peaks):
        held = slice(drift.indptr[number], drift.indptr[number + 1])
        drifted = sum(
            weight * factor[place]
            for weight, place in zip(drift.data[held], drift.indices[held], strict=True)
        )
        area = ufloat(peak.peak_area, 0.01 * peak.peak_area)
        injection = gas.reading_injection[number]
        run = gas.injections.run[injection]
        outlet = plan.outlet.value[run] * density * flow_error
        rate = invert(gas.peak_curve[number], area / drifted) * outlet
        species = gas.reading_species[number]
        value = species.electrons * FARADAY_CONSTANT * rate / (current[injection] * gain)
        efficiency.setdefault((int(run), species.name), []).append(value)

    standards: dict[int, Any] = {}
    for signal, vial in zip(liquid.standard_signals, liquid.standard_vial, strict=True):
        standards[int(vial)] = ufloat(signal.integral, 0.015 * signal.integral) / signal.protons
    concentration: dict[tuple[int, str], Any] = {}
    for number, signal in enumerate(liquid.signals):
        place = int(liquid.signal_vial[number])
        vial = liquid.vials[place]
        per_proton = ufloat(signal.integral, 0.015 * signal.integral) / signal.protons
        ratio = invert(liquid.signal_curve[number], per_proton / standards[place])
        in_tube = ratio * (vial.standard_amount_mol * amount_error)
        concentration[place, signal.analyte] = in_tube / vial.aliquot_m3
    blanks = {name: value for (place, name), value in concentration.items() if liquid.vials[place].blank}
    names = [run.name for run in plan.runs]
    for (place, name), value in concentration.items():
        vial = liquid.vials[place]
        if not vial.blank:
            run = names.index(vial.run)
            amount = (value - blanks.get(name, 0.0)) * vial.compartment_volume_m3
            electrons = plan.products.electrons[plan.products.species.index(name)]
            charge = plan.figures[run].charge_coulomb * gain
            efficiency[run, name] = [electrons * FARADAY_CONSTANT * amount / charge]

    products = plan.products
    means = [
        sum(values) / len(values)
        for key in zip(products.run.tolist(), products.species, strict=True)
        for values in [efficiency[key]]
    ]
    by_run: dict[int, list[int]] = {}
    for row, run in enumerate(products.run.tolist()):
        by_run.setdefault(run, []).append(row)
    total, ratio = [], []
    for rows in by_run.values():
        one = sum(means[row] for row in rows if products.carbon[row] == 1)
        more = sum(means[row] for row in rows if products.carbon[row] > 1)
        total.append(sum(means[row] for row in rows).std_dev)
        ratio.append((more / one).std_dev)
    return (
        np.array([one.nominal_value for one in means]),
        np.array([one.std_dev for one in means]),
        np.array(total),
        np.array(ratio),
        [np.array(covariance_matrix([means[row] for row in rows])) for rows in by_run.values()],
    )


def measure(folder: Path, repeats: int) -> dict[str, float]:
    """Seconds of both sides, after asserting that they agree."""
    plan = plan_of(folder)
    for one, other in zip(ours(plan)[:4], by_uncertainties(plan)[:4], strict=True):
        np.testing.assert_allclose(one, other, rtol=1e-8)
    for one, other in zip(ours(plan)[4], by_uncertainties(plan)[4], strict=True):
        np.testing.assert_allclose(one, other, rtol=1e-7, atol=1e-12)
    costs = in_turns(
        {"ours": timed(lambda: ours(plan)), "uncertainties": timed(lambda: by_uncertainties(plan))}, repeats
    )
    return {side: cost.second for side, cost in costs.items()} | {"outputs": len(plan.products.run)}


if __name__ == "__main__":
    print(json.dumps(measure(Path(sys.argv[1]), int(sys.argv[2]))))
