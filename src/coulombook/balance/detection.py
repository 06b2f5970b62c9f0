"""Which products were detected, and what Faradaic efficiency would have been.

A product counts as detected when its reading exceeds the decision limit of its curve (the critical value of ISO
11843-1), the repeats being the injections that were averaged. One that was not carries the detection limit as FE.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coulombook.amounts.gas import charge_rate_ampere
from coulombook.balance.evaluate import GasReadings, Liquids, charge_to_sampling
from coulombook.balance.plan import Plan
from coulombook.balance.readings import FloatArray
from coulombook.constants import FARADAY_CONSTANT
from coulombook.uncertainty.errors import Inputs
from coulombook.uncertainty.linearised import nominal


@dataclass(frozen=True, slots=True, eq=False)
class Detection:
    """Per row of the ledger, (Q,): whether detected, and the FE at the detection limit (NaN without one)."""

    detected: NDArray[np.bool_]
    efficiency_limit: FloatArray

    @property
    def counted(self) -> FloatArray:
        """1 for products that enter totals, 0 for those below detection."""
        return self.detected.astype(np.float64)


def detect(plan: Plan, inputs: Inputs, readings: GasReadings, liquids: Liquids) -> Detection:
    """Judge every product; a product of gas and liquid, or of several compartments, is detected if a part of it is."""
    gas_detected, gas_limit = _gas(plan, readings)
    liquid_detected, liquid_limit = _liquid(plan, inputs, liquids)
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
    # on several channels the one that sees least decides
    decision, detection = np.full(groups, np.inf), np.full(groups, np.inf)
    channels = gas.channel_mean
    for reading, number in zip(held.tolist(), group.tolist(), strict=True):
        for peak in channels.indices[channels.indptr[reading] : channels.indptr[reading + 1]]:
            found = plan.curves.limits(int(gas.peak_curve[peak]), int(count[number]))
            decision[number] = min(decision[number], found.decision if found else -np.inf)
            detection[number] = min(detection[number], found.detection if found else np.inf)
    known = np.isfinite(decision)
    return (~known | (x > decision)).astype(np.float64), np.where(known, detection * slope, np.nan)


def _liquid(plan: Plan, inputs: Inputs, liquids: Liquids) -> tuple[FloatArray, FloatArray]:
    """1 where detected, and the FE limit, of each liquid product of a run, (LP,) each.

    The blank is taken off before the decision: what is found must exceed the blank, not zero.
    """
    liquid, x = plan.liquid, inputs.nominal
    vial = liquid.analyte_vial
    per_ratio = x["standard amount"][vial] / x["aliquot"][vial]  # mol/m^3 per unit of amount ratio
    net_ratio = nominal(liquids.concentration_mol_per_m3) / per_ratio
    decision, detection = np.full(len(vial), np.inf), np.full(len(vial), np.inf)
    for curve, analyte in zip(liquid.signal_curve.tolist(), liquid.signal_analyte.tolist(), strict=True):
        found = plan.curves.limits(curve, 1)
        decision[analyte] = min(decision[analyte], found.decision if found else -np.inf)
        detection[analyte] = min(detection[analyte], found.detection if found else np.inf)
    known = np.isfinite(decision)
    detected = ~known | (net_ratio > decision)
    charge = nominal(charge_to_sampling(plan, x))[liquid.product_sampling]
    volume = liquid.volume_mean @ np.nan_to_num(x["compartment volume"])
    at_limit = liquid.replicate_mean @ np.where(known, detection * per_ratio, 0.0)
    limit = liquid.electrons * FARADAY_CONSTANT * at_limit * volume / charge
    any_known = liquid.compartments @ ((liquid.replicate_mean @ known.astype(float)) > 0).astype(float) > 0
    return (
        ((liquid.compartments @ (liquid.replicate_mean @ detected.astype(float))) > 0).astype(np.float64),
        np.where(any_known, liquid.compartments @ limit, np.nan),
    )
