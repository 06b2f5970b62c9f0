"""Which products were detected, and what Faradaic efficiency would have been.

A product counts as detected when its reading exceeds the decision limit of its curve (the critical value of ISO
11843-1), the repeats being the injections or vials that were averaged. One that was not carries the detection limit as
FE.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coulombook.amounts.gas import charge_rate_ampere
from coulombook.balance.evaluate import GasReadings, Liquids, SignalWeights, charge_to_sampling
from coulombook.balance.plan import Plan
from coulombook.balance.readings import FloatArray
from coulombook.constants import FARADAY_CONSTANT
from coulombook.uncertainty.errors import Inputs
from coulombook.uncertainty.linearised import IntArray, nominal


@dataclass(frozen=True, slots=True, eq=False)
class Detection:
    """Per row of the ledger, (Q,): whether detected, and the FE at the detection limit (NaN without one)."""

    detected: NDArray[np.bool_]
    efficiency_limit: FloatArray

    @property
    def counted(self) -> FloatArray:
        """1 for products that enter totals, 0 for those below detection."""
        return self.detected.astype(np.float64)


def detect(
    plan: Plan, inputs: Inputs, readings: GasReadings, liquids: Liquids, weights: SignalWeights
) -> Detection:
    """Judge every product; a product of gas and liquid, or of several compartments, is detected if a part of it is."""
    gas_detected, gas_limit = _gas(plan, readings)
    liquid_detected, liquid_limit = _liquid(plan, inputs, liquids, weights)
    products = plan.products
    detected = (products.from_gas @ gas_detected + products.from_liquid @ liquid_detected) > 0
    return Detection(detected, products.from_gas @ gas_limit + products.from_liquid @ liquid_limit)


def _gas(plan: Plan, readings: GasReadings) -> tuple[FloatArray, FloatArray]:
    """1 where detected, and the FE limit, of each gas product of a run, (GP,) each."""
    gas = plan.gas
    groups, held, group = len(gas.group_run), gas.pooled_reading, gas.pooled_group
    count = np.bincount(group, minlength=groups)
    x = np.bincount(group, weights=nominal(readings.mole_fraction)[held], minlength=groups) / count
    injection = gas.reading_injection
    outlet, current = nominal(readings.outlet_mol_per_s), nominal(readings.current_ampere)
    # an injection without current has no efficiency; the verdicts tell of it
    current = np.where(current == 0.0, np.nan, current)
    per_x = nominal(charge_rate_ampere(gas.electrons, outlet[injection])) / current[injection]
    slope = np.bincount(group, weights=per_x[held], minlength=groups) / count
    decision, detection = _of_channels(plan, count)
    known = np.isfinite(decision)
    return (~known | (x > decision)).astype(np.float64), np.where(known, detection * slope, np.nan)


def _of_channels(plan: Plan, count: IntArray) -> tuple[FloatArray, FloatArray]:
    """Decision and detection limit of the mean mole fraction of each gas product of a run, (GP,); infinite without one.

    The mean over channels scatters with all of them: the limits of its channels, each times the weight the channel has
    in the mean, add up in squares.
    """
    gas = plan.gas
    channels = gas.channel_mean
    shares: list[dict[int, list[float]]] = [{} for _ in count]
    for reading, number in zip(gas.pooled_reading.tolist(), gas.pooled_group.tolist(), strict=True):
        held = slice(channels.indptr[reading], channels.indptr[reading + 1])
        for peak, share in zip(channels.indices[held], channels.data[held].tolist(), strict=True):
            shares[number].setdefault(int(gas.peak_curve[peak]), []).append(share)
    decision, detection = np.full(len(count), np.inf), np.full(len(count), np.inf)
    for number, by_curve in enumerate(shares):
        weighed = [(curve, len(of), sum(of) / float(count[number])) for curve, of in by_curve.items()]
        decision[number], detection[number] = _combined(plan, weighed)
    return decision, detection


def _combined(plan: Plan, weighed: Sequence[tuple[int, int, float]]) -> tuple[float, float]:
    """Limits of a weighted mean of readings on several curves, given as curve, repeats and weight; infinite without."""
    decision = detection = 0.0
    for curve, repeats, weight in weighed:
        found = plan.curves.limits(curve, repeats)
        if found is None or not np.isfinite(found.decision):
            return np.inf, np.inf
        decision = math.hypot(decision, weight * found.decision)
        detection = math.hypot(detection, weight * found.detection)
    return decision, detection


def _liquid(
    plan: Plan, inputs: Inputs, liquids: Liquids, weights: SignalWeights
) -> tuple[FloatArray, FloatArray]:
    """1 where detected, and the FE limit, of each liquid product of a run, (LP,) each.

    A compartment is judged by the mean concentration of its vials at the last sampling, blanks taken off: what is found
    must exceed the blank, not zero, and the blanks scatter as well.
    """
    liquid, x = plan.liquid, inputs.nominal
    vial = liquid.analyte_vial
    per_ratio = x["standard amount"][vial] / x["aliquot"][vial]  # mol/m^3 per unit of amount ratio
    vials = np.diff(liquid.replicate_mean.indptr)  # of each product of a compartment, (L,)
    repeats = np.ones(len(vial), dtype=np.intp)
    repeats[liquid.replicate_mean.indices] = np.repeat(vials, vials)
    signals: list[list[tuple[int, int, float]]] = [[] for _ in vial]
    for curve, analyte, weight in zip(
        liquid.signal_curve.tolist(), liquid.signal_analyte.tolist(), weights.analyte.tolist(), strict=True
    ):
        signals[analyte].append((curve, int(repeats[analyte]), weight))
    decision, detection = np.array([_combined(plan, of) for of in signals]).reshape(-1, 2).T
    # the mean of so many blanks is taken off, and scatters like a reading
    blanks = np.diff(liquid.blanks.indptr)
    widened = np.sqrt(1.0 + np.divide(repeats, blanks, out=np.zeros(len(vial)), where=blanks > 0))
    # without limits in one of the vials there are none of their mean
    mean = liquid.replicate_mean
    unknown = mean @ (~np.isfinite(decision)).astype(float) > 0
    finite = np.isfinite(decision) & np.isfinite(detection)
    at_decision = mean @ (per_ratio * np.where(np.isfinite(decision), decision * widened, 0.0))
    at_limit = mean @ (per_ratio * np.where(finite, detection * widened, 0.0))
    at_limit[mean @ (~finite).astype(float) > 0] = np.nan
    detected = unknown | (mean @ nominal(liquids.concentration_mol_per_m3) > at_decision)
    charge = nominal(charge_to_sampling(plan, x))[liquid.product_sampling]
    volume = liquid.volume_mean @ np.nan_to_num(x["compartment volume"])
    limit = liquid.electrons * FARADAY_CONSTANT * at_limit * volume / charge
    # a compartment without limits adds none to those of the others
    known = liquid.compartments @ np.isfinite(limit).astype(float) > 0
    return (
        (liquid.compartments @ detected.astype(float) > 0).astype(np.float64),
        np.where(known, liquid.compartments @ np.nan_to_num(limit), np.nan),
    )
