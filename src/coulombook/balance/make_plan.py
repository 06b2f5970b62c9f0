"""Make the plan of a day from its tables and the figures of its traces."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.curves_used import CurvesUsed
from coulombook.balance.evaluate import SignalWeights, read_electrical, read_injections, read_liquids
from coulombook.balance.gas_plan import Injections, plan_gas
from coulombook.balance.liquid_plan import Samplings, plan_liquid
from coulombook.balance.plan import Plan, make_inputs, plan_flow, plan_products
from coulombook.balance.readings import Day, FloatArray, FlowKind, Run
from coulombook.balance.scan_verdicts import JudgedScans
from coulombook.balance.spectra_used import SpectrumFigures
from coulombook.balance.surface_plan import plan_surface
from coulombook.balance.trace_figures import TraceFigures, TraceRequest
from coulombook.cell.headspace import HALF_RANGE
from coulombook.findings import Findings
from coulombook.uncertainty.linearised import IntArray, nominal, standard_uncertainty

# without a flow to guess from, any mixing time will do to begin with: the second look is centred on the true one
_ANY_MIXING_TIME = 60.0


def trace_requests(day: Day, injections: Injections, samplings: Samplings) -> list[TraceRequest]:
    """What is asked of each run's log."""
    settings = day.settings
    return [
        TraceRequest(
            run.start_second,
            run.stop_second,
            injections.time_second[injections.of_run(number)],
            samplings.time_second[samplings.run == number],
            settings.current_window_second,
            settings.dead_time_second,
            _mixing_time_guess(
                run,
                len(injections.of_run(number)),
                settings.standard_pressure_pascal / settings.standard_temperature_kelvin,
            ),
        )
        for number, run in enumerate(day.runs)
    ]


def _mixing_time_guess(run: Run, count: int, standard_pascal_per_kelvin: float) -> FloatArray | None:
    """Time constant of the headspace if the outlet flow were the flow entered, for ``count`` injections. [s]"""
    if run.headspace_m3 is None:
        return None
    flow = run.outlet_flow or run.inlet_flow
    if flow is None or flow.kind is FlowKind.MOLAR or not flow.value > 0:
        return np.full(count, _ANY_MIXING_TIME)
    swelling = standard_pascal_per_kelvin * run.temperature_kelvin / run.pressure_pascal
    volume_flow = flow.value * (swelling if flow.kind is FlowKind.STANDARD else 1.0)
    return np.full(count, run.headspace_m3 / volume_flow)


def make_plan(
    day: Day,
    injections: Injections,
    figures: Sequence[TraceFigures],
    scans: JudgedScans,
    findings: Findings,
    spectra: Sequence[SpectrumFigures | None] = (),
) -> Plan:
    """Lay out the day; faults and doubts go to ``findings``."""
    usable = np.concatenate([one.usable for one in figures]) if figures else np.zeros(0, dtype=bool)
    _report_left_out(day, injections, usable, findings)
    curves = CurvesUsed(day.calibrations, findings)
    gas = plan_gas(day, injections, usable, curves, findings)
    liquid = plan_liquid(day, curves, findings)
    return Plan(
        day,
        scans,
        tuple(spectra),
        tuple(figures),
        curves,
        plan_flow([run.inlet_flow for run in day.runs]),
        plan_flow([run.outlet_flow for run in day.runs]),
        plan_flow([run.tracer_flow for run in day.runs]),
        gas,
        liquid,
        plan_surface(day, scans, findings),
        plan_products(day, gas, liquid),
        np.array([run.headspace_m3 is not None for run in day.runs], dtype=bool),
    )


def _report_left_out(day: Day, injections: Injections, usable: NDArray[np.bool_], findings: Findings) -> None:
    wanted = {(peak.run, peak.injection) for peak in day.peaks if peak.used}
    for number in np.flatnonzero(~usable):
        run, label = day.runs[injections.run[number]].name, injections.label[number]
        if (run, label) in wanted:
            findings.add(
                "injection-left-out",
                f"run {run}, injection {label} ({injections.origin[number]})",
                f"no current of the run belongs to its time, {injections.time_second[number]:g} s "
                "(dead time and current window considered); it was left out",
                "check the time of the injection, the run's start and stop, and the dead time; or mark it use = no",
            )


def recentred_requests(
    plan: Plan, requests: Sequence[TraceRequest], for_draws: bool = False
) -> dict[int, TraceRequest]:
    """Runs whose headspace mixes more slowly or quickly than guessed, with better guesses.

    ``for_draws``: the time constants will be drawn, and the currents are wanted as far as their uncertainties reach.

    The outlet flow, and with it the time constant, may depend on peak areas and on liquid products; it never depends on
    the currents of the injections, so that one second look settles it.
    """
    if not plan.headspace.any():
        return {}
    inputs = make_inputs(plan)
    x = inputs.numbers if for_draws else inputs.nominal
    equal = SignalWeights(
        _equal(plan.liquid.standard_vial, len(plan.liquid.vials)),
        _equal(plan.liquid.signal_analyte, len(plan.liquid.analyte_vial)),
        np.zeros(len(plan.liquid.signals)),
    )
    electrical = read_electrical(plan, x)
    readings = read_injections(plan, x, electrical, read_liquids(plan, x, equal))
    tau = nominal(readings.mixing_time_second)
    reach = _reach(standard_uncertainty(readings.mixing_time_second) / tau)
    again = {}
    for number in np.flatnonzero(plan.headspace).tolist():
        found = tau[plan.gas.injections.of_run(number)]
        guess = requests[number].mixing_time_second
        if guess is None or not found.size:
            continue
        found = np.where(np.isfinite(found) & (found > 0), found, guess)
        middle = np.full(found.shape, np.exp(np.log(found).mean()))
        # one centre for the run's injections saves passes over its log, as long as it stays near each of them
        better = middle if _near(found, middle) else found
        far = float(np.max(reach[plan.gas.injections.of_run(number)]))
        if not _near(better, guess) or far > HALF_RANGE:
            again[number] = replace(
                requests[number], mixing_time_second=better, mixing_reach=max(far, HALF_RANGE)
            )
    return again


# the interpolation of the mixed current reaches a factor 1.5 (0.405 in ln) either side of its centre; staying near it
# leaves room for the draws of a Monte Carlo
_WELL_INSIDE = 0.1

# of ln tau: farther no series goes
_FARTHEST = 3.0


def _reach(relative: FloatArray) -> FloatArray:
    """How far draws of time constants of a relative standard uncertainty stray from them, in ln tau.

    Beyond seven standard deviations; a normal distribution reaches farther down than up on this scale.
    """
    reach = _WELL_INSIDE + 7.0 * relative * (1.0 + 3.0 * relative)
    return np.where(np.isfinite(reach), np.minimum(reach, _FARTHEST), HALF_RANGE)


def _near(tau_second: FloatArray, centre_second: FloatArray) -> bool:
    return bool((np.abs(np.log(tau_second / centre_second)) <= _WELL_INSIDE).all())


def _equal(group: IntArray, groups: int) -> FloatArray:
    count = np.bincount(group, minlength=groups)
    result: FloatArray = 1.0 / count[group]
    return result
