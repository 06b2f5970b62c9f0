"""Evaluate a plan with all its uncertainties: the settled account of a day."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from coulombook.balance.detection import Detection, detect
from coulombook.balance.evaluate import (
    Electrical,
    GasReadings,
    Liquids,
    Outcome,
    PerProton,
    SignalWeights,
    charge_to_sampling,
    close_books,
    read_electrical,
    read_injections,
    read_liquids,
    signal_ratios,
    standard_signals,
    standards_of_vials,
)
from coulombook.balance.plan import Plan, make_inputs
from coulombook.balance.readings import FloatArray
from coulombook.constants import FARADAY_CONSTANT
from coulombook.uncertainty.errors import Inputs
from coulombook.uncertainty.linearised import (
    IntArray,
    Linearised,
    Number,
    gather,
    linear_map,
    nominal,
    sparse_map,
    standard_uncertainty,
)
from coulombook.uncertainty.scatter import Pooled, pool


@dataclass(frozen=True, slots=True, eq=False)
class Settled:
    """A plan, its inputs, and everything the measurement function made of them."""

    plan: Plan
    inputs: Inputs
    weights: SignalWeights
    electrical: Electrical
    liquids: Liquids
    readings: GasReadings
    injections: Pooled  # used readings of each gas product of a run
    scatter: Number  # (GP,) error of the mean over injections that the readings' own errors do not explain
    liquid_scatter: Number  # (LP,) likewise of the means over replicate vials
    detection: Detection
    outcome: Outcome


def settle(plan: Plan) -> Settled:
    """Evaluate the plan once with numbers that carry their errors."""
    inputs = make_inputs(plan)
    x = inputs.numbers
    weights = signal_weights(plan, inputs)
    electrical = read_electrical(plan, x)
    liquids = read_liquids(plan, x, weights)
    readings = read_injections(plan, x, electrical, liquids)
    gas = plan.gas
    injections = pool(
        gather(readings.faradaic_efficiency, gas.pooled_reading), gas.pooled_group, len(gas.group_run)
    )
    scatter = _scatter(plan, inputs, injections)
    liquid_scatter = _liquid_scatter(plan, inputs, liquids)
    detection = detect(plan, inputs, readings, liquids, weights)
    mean = injections.mean + scatter
    liquid_efficiency = liquids.faradaic_efficiency + liquid_scatter
    outcome = close_books(plan, x, electrical, readings, mean, liquid_efficiency, detection.counted)
    return Settled(
        plan,
        inputs,
        weights,
        electrical,
        liquids,
        readings,
        injections,
        scatter,
        liquid_scatter,
        detection,
        outcome,
    )


def _scatter(plan: Plan, inputs: Inputs, injections: Pooled) -> Number:
    """The unexplained scatter of the injections as errors of the means, (GP,).

    Its variance is unexplained / m for each product. Products of a run scatter together when what varies is common to
    them (sample loop, flow, current), and on their own when it is not; so each injection gets one error, with a loading
    on each product in proportion to that product's residual. The covariance of two products is then the one their
    residuals show.
    """
    gas = plan.gas
    columns = inputs.reserved[0] + gas.reading_injection[gas.pooled_reading]
    return _unexplained(injections, gas.pooled_group, columns, len(inputs.sources))


def _unexplained(pooled: Pooled, group: IntArray, columns: IntArray, errors: int) -> Linearised:
    """Errors of the means of repeats, zero so far, whose variances are unexplained / m; see `_scatter`."""
    groups = len(pooled.count)
    square = np.bincount(group, weights=pooled.residual**2, minlength=groups)
    held = (pooled.unexplained > 0) & (square > 0)
    size = np.zeros(groups)
    size[held] = np.sqrt(pooled.unexplained[held] / (pooled.count[held] * square[held]))
    loading = size[group] * pooled.residual
    return Linearised(np.zeros(groups), sparse_map(group, columns, loading, (groups, errors)))


def _liquid_scatter(plan: Plan, inputs: Inputs, liquids: Liquids) -> Number:
    """The unexplained scatter of replicate vials as errors of the Faradaic efficiencies, (LP,).

    By the same rule as that of injections: one error for each vial, with a loading on each of its products.
    """
    liquid = plan.liquid
    replicates = liquid.replicate_mean
    group = np.repeat(np.arange(replicates.shape[0]), np.diff(replicates.indptr))
    analyte = replicates.indices.astype(np.intp)
    pooled = pool(gather(liquids.concentration_mol_per_m3, analyte), group, replicates.shape[0])
    columns = inputs.reserved[1] + liquid.analyte_vial[analyte]
    concentration = _unexplained(pooled, group, columns, len(inputs.sources))
    volume = liquid.volume_mean @ np.nan_to_num(inputs.nominal["compartment volume"])
    charge = nominal(charge_to_sampling(plan, inputs.nominal))[liquid.product_sampling]
    per_concentration = liquid.electrons * FARADAY_CONSTANT * volume / charge
    return linear_map(liquid.compartments, concentration * per_concentration)


def signal_weights(plan: Plan, inputs: Inputs) -> SignalWeights:
    """Weights by which the signals that speak of one thing are combined.

    Either equal, or by 1/u^2 of the signal's own integral and curve; what the signals of a vial share (the internal
    standard) moves them together and has no say. Equal where an uncertainty is zero.
    """
    liquid = plan.liquid
    standards = standard_signals(plan, inputs.numbers)
    standard = _weights(plan, standards.relaxed, liquid.standard_vial, len(liquid.vials))
    fixed = PerProton(nominal(standards.measured), nominal(standards.relaxed))
    ratios = signal_ratios(plan, inputs.numbers, standards_of_vials(plan, fixed, standard))
    analyte = _weights(plan, ratios, liquid.signal_analyte, len(liquid.analyte_vial))
    return SignalWeights(standard, analyte, standard_uncertainty(ratios))


def _weights(plan: Plan, x: Number, group: IntArray, groups: int) -> FloatArray:
    u = standard_uncertainty(x)
    usable = np.isfinite(u) & (u > 0)
    whole = np.bincount(group, weights=~usable, minlength=groups) == 0
    raw = np.ones(len(group))
    if plan.settings.weighted_signals:
        weighted = whole[group]
        raw[weighted] = 1.0 / u[weighted] ** 2
    result: FloatArray = raw / np.bincount(group, weights=raw, minlength=groups)[group]
    return result
