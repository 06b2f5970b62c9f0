"""Carbon and energy: where the CO2 went, what the choice of flow does, and how much energy the products hold."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from coulombook.amounts.carbon import carbon_efficiency, carbonate_bound
from coulombook.balance.evaluate import dioxide_fed_mol_per_s, evaluate
from coulombook.balance.plan import Plan
from coulombook.balance.readings import FloatArray, OutletFlow
from coulombook.balance.settle import Settled
from coulombook.balance.verdicts import allowed_deviation
from coulombook.cell.energy import cathodic_energy_efficiency, full_cell_energy_efficiency
from coulombook.findings import Findings
from coulombook.species import equilibrium_potential_rhe_volt, oxygen_potential_rhe_volt
from coulombook.uncertainty.linearised import IntArray, Number, gather, linear_map, nominal, sparse_map


@dataclass(frozen=True, slots=True, eq=False)
class CarbonAccount:
    """Carbon of each run, (R,); NaN where the flow it needs is unknown.

    ``outlet_by`` names how the outlet flow of ``total_at_outlet`` was found, "" where it was not.
    """

    conversion: Number
    carbonate_bound: Number
    total_at_inlet: FloatArray
    total_at_outlet: FloatArray
    outlet_by: tuple[str, ...]


@dataclass(frozen=True, slots=True, eq=False)
class ProductEfficiencies:
    """Products that were detected: ``rows`` (n,) of the ledger, and figures of each, (n,), NaN where unknown.

    ``of_fed`` and ``of_converted`` are NaN for a product without carbon.
    """

    rows: IntArray
    of_fed: Number
    of_converted: Number
    equilibrium_volt: Number
    cathodic: Number
    full_cell: Number


def carbon_account(settled: Settled) -> CarbonAccount:
    """Conversion, the most that carbonate could take, and the totals if the flow had been taken otherwise."""
    plan = settled.plan
    fed = dioxide_fed_mol_per_s(plan, settled.inputs.numbers, settled.readings)
    with np.errstate(divide="ignore", invalid="ignore"):
        bound = carbonate_bound(settled.electrical.mean_current_ampere, fed)
    at_inlet = _total_with(settled, OutletFlow.INLET)
    at_outlet = np.full(len(plan.runs), np.nan)
    by = np.full(len(plan.runs), "", dtype=object)
    for way in _outlet_ways(plan):
        found = _total_with(settled, way)
        fresh = np.isnan(at_outlet) & np.isfinite(found)
        at_outlet[fresh], by[fresh] = found[fresh], str(way)
    return CarbonAccount(settled.outcome.co2_conversion, bound, at_inlet, at_outlet, tuple(by.tolist()))


def _outlet_ways(plan: Plan) -> Iterator[OutletFlow]:
    """Ways to an outlet flow that is not the inlet's: the day's own, then those nearest to a measurement."""
    tracer = plan.gas.tracer_reading
    can = {
        OutletFlow.MEASURED: bool(np.isfinite(plan.outlet.value).any()),
        OutletFlow.TRACER: bool(len(tracer)) and bool((tracer >= 0).all()),
        OutletFlow.BALANCE: bool(np.isfinite(plan.inlet.value).any()),
    }
    # the day's own way first
    for way in sorted(can, key=lambda way: way is not plan.outlet_flow):
        if can[way]:
            yield way


def _total_with(settled: Settled, way: OutletFlow) -> FloatArray:
    """Total FE of each run, by the measurement function with the outlet flow found another way, (R,)."""
    plan = settled.plan
    if way is plan.outlet_flow:
        total = nominal(settled.outcome.total)
    else:
        other = replace(plan, day=replace(plan.day, settings=replace(plan.settings, outlet_flow=way)))
        with np.errstate(divide="ignore", invalid="ignore"):
            total = nominal(
                evaluate(other, settled.inputs.nominal, settled.weights, settled.detection.counted).total
            )
    # a run without gas has the same total by any flow, known or not
    return np.where(_has_gas(plan), total, np.nan)


def _has_gas(plan: Plan) -> NDArray[np.bool_]:
    has: NDArray[np.bool_] = np.bincount(plan.gas.group_run, minlength=len(plan.runs)) > 0
    return has


def report_flow(settled: Settled, account: CarbonAccount, findings: Findings) -> None:
    """Warn of a day that takes the inlet flow for the outlet's though that moves totals beyond their intervals."""
    plan = settled.plan
    if plan.outlet_flow is not OutletFlow.INLET:
        return
    moved = account.total_at_outlet - account.total_at_inlet
    with np.errstate(invalid="ignore"):
        held = np.flatnonzero(np.abs(moved) > allowed_deviation(settled))
    if not held.size:
        return
    most = int(held[np.abs(moved[held]).argmax()])
    findings.add(
        "flow-matters",
        f"{len(held)} of {len(plan.runs)} runs",
        f"the inlet flow stands for the outlet flow; with the outlet flow ({account.outlet_by[most]}) the total of run "
        f"{plan.runs[most].name} would move by {moved[most] * 100:+.2g} %, more than its interval at the "
        f"{plan.settings.level_of_confidence:.0%} level",
        'measure the outlet flow, or add a tracer, or set outlet_flow = "balance" in [gas]',
    )


def product_efficiencies(settled: Settled) -> ProductEfficiencies:
    """Carbon and energy efficiency of each detected product of each run."""
    plan, outcome, electrical = settled.plan, settled.outcome, settled.electrical
    rows = np.flatnonzero(settled.detection.detected)
    run = plan.products.run[rows]
    carbon = plan.products.carbon[rows]
    amount = gather(outcome.amount_mol, rows)
    duration = np.array([one.stop_second - one.start_second for one in plan.figures])
    fed = duration * dioxide_fed_mol_per_s(plan, settled.inputs.numbers, settled.readings)
    sums = sparse_map(run, np.arange(len(rows)), carbon, (len(plan.runs), len(rows)))
    converted = linear_map(sums, amount)
    # of a product without carbon there is nothing to tell
    held = np.where(carbon > 0, carbon, np.nan)
    equilibrium = _equilibrium(plan, rows, settled.inputs.numbers)
    oxygen = oxygen_potential_rhe_volt()
    efficiency = gather(outcome.faradaic_efficiency, rows)
    with np.errstate(divide="ignore", invalid="ignore"):
        return ProductEfficiencies(
            rows,
            carbon_efficiency(amount, held, gather(fed, run)),
            carbon_efficiency(amount, held, gather(converted, run)),
            equilibrium,
            cathodic_energy_efficiency(
                efficiency, equilibrium, gather(electrical.potential_rhe_volt, run), oxygen
            ),
            full_cell_energy_efficiency(
                efficiency, equilibrium, gather(settled.inputs.numbers["cell voltage"], run), oxygen
            ),
        )


def _equilibrium(plan: Plan, rows: IntArray, x: Mapping[str, Number]) -> Number:
    """Equilibrium potential of each product against RHE at its run's pH and 25 degC, NaN without a Gibbs energy.

    It is linear in pH, so that two points of it give the line along which the pH's uncertainty travels.
    """
    line: dict[str, tuple[float, float]] = {}
    for name in {plan.products.species[row] for row in rows}:
        species = plan.day.species[name]
        try:
            at_zero = equilibrium_potential_rhe_volt(species, 0.0)
            line[name] = (at_zero, equilibrium_potential_rhe_volt(species, 1.0) - at_zero)
        except ValueError:
            line[name] = (np.nan, np.nan)
    both = np.array([line[plan.products.species[row]] for row in rows]).reshape(-1, 2)
    equilibrium: Number = both[:, 0] + gather(x["ph"], plan.products.run[rows]) * both[:, 1]
    return equilibrium
