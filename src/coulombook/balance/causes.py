"""Candidate causes of a balance that does not close, each a relative error of quantities as entered.

A cause moves the total FE of every run in its own pattern. The pattern is the derivative of the measurement function
along the cause, taken by evaluating it once with one error per cause.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from coulombook.balance.evaluate import evaluate
from coulombook.balance.readings import FloatArray
from coulombook.balance.settle import Settled
from coulombook.uncertainty.linearised import Linearised, Number, nominal, sparse_map


@dataclass(frozen=True, slots=True, eq=False)
class Cause:
    """One candidate.

    ``pattern`` (R, k) is the change of each run's total FE per unit of each of its k parameters; the first
    parameter is the one reported. ``only_positive``: gas is lost, never gained.
    """

    kind: str
    where: str
    pattern: FloatArray
    only_positive: bool
    bench_test: str


def candidate_causes(settled: Settled) -> list[Cause]:
    """Every cause that can move the totals of this day at all."""
    causes = [*_entered(settled), *_lost(settled)]
    return [cause for cause in causes if np.abs(cause.pattern[:, 0]).max(initial=0.0) > 0]


@dataclass(frozen=True, slots=True, eq=False)
class _Load:
    """How a cause moves one block of inputs."""

    kind: str
    where: str
    block: str
    size: FloatArray
    bench_test: str


def _loads(settled: Settled) -> Iterator[_Load]:
    plan, x = settled.plan, settled.inputs.nominal
    gas, liquid = plan.gas, plan.liquid
    flow = plan.outlet_flow.entered
    yield _Load("outlet-flow", "", flow, x[flow], "measure the outlet flow with the cell at open circuit")
    channels = np.array([" ".join(peak.channel.split()) for peak in gas.peaks], dtype=object)
    products = np.array([peak.analyte for peak in gas.peaks], dtype=object)
    area = x["peak area"]
    for channel in dict.fromkeys(channels.tolist()):
        yield _Load(
            "gas-response",
            channel,
            "peak area",
            np.where(channels == channel, area, 0.0),
            f"inject check gas through the cell line on channel {channel}",
        )
    for product in dict.fromkeys(products.tolist()):
        if product != plan.settings.tracer:
            yield _Load(
                "curve",
                product,
                "peak area",
                np.where(products == product, area, 0.0),
                f"inject an independent standard of {product}",
            )
    signals = np.array([signal.analyte for signal in liquid.signals], dtype=object)
    for product in dict.fromkeys(signals.tolist()):
        yield _Load(
            "curve",
            product,
            "integral",
            np.where(signals == product, x["integral"], 0.0),
            f"measure a weighed solution of {product} with the same internal standard",
        )
    yield _Load(
        "internal-standard",
        "",
        "standard amount",
        x["standard amount"],
        "weigh a fresh internal standard and measure one vial again with it",
    )
    yield _Load(
        "compartment-volume",
        "",
        "compartment volume",
        x["compartment volume"],
        "weigh the electrolyte before and after a run",
    )
    # as of every entered quantity: positive when the logged reduction current is too large
    mean = nominal(settled.electrical.mean_current_ampere).mean()
    yield _Load(
        "current-offset",
        "",
        "current offset",
        np.full(len(plan.runs), mean),
        "log the current at open circuit and across a known resistor",
    )


def _entered(settled: Settled) -> list[Cause]:
    """Causes that are errors of entered quantities: one evaluation with one error per cause."""
    loads = [load for load in _loads(settled) if np.nan_to_num(load.size).any()]
    # a product on two channels, or in gas and liquid, is one cause per table
    numbers: dict[str, Number] = dict(settled.inputs.nominal)
    for block in {load.block for load in loads}:
        values = settled.inputs.nominal[block]
        columns = [column for column, load in enumerate(loads) if load.block == block]
        sizes = np.nan_to_num(np.array([loads[column].size for column in columns])).T
        rows, places = np.nonzero(sizes)
        matrix = sparse_map(rows, np.array(columns)[places], sizes[rows, places], (len(values), len(loads)))
        numbers[block] = Linearised(values, matrix)
    total = evaluate(settled.plan, numbers, settled.weights, settled.detection.counted).total
    if not isinstance(total, Linearised):
        return []
    patterns = total.jacobian.toarray()
    return [
        Cause(load.kind, load.where, patterns[:, [column]], False, load.bench_test)
        for column, load in enumerate(loads)
    ]


def _lost(settled: Settled) -> list[Cause]:
    """Causes that take a share away: lost gas, crossover, a vial that was not taken, an unmeasured product."""
    plan, outcome = settled.plan, settled.outcome
    products = plan.products
    n = len(plan.runs)
    counted = settled.detection.counted
    gas_part = counted * (products.from_gas @ nominal(settled.injections.mean))
    gas = np.bincount(products.run, weights=gas_part, minlength=n).astype(np.float64)
    liquid_part = counted * (products.from_liquid @ nominal(settled.liquids.faradaic_efficiency))
    liquid = np.bincount(products.run, weights=liquid_part, minlength=n).astype(np.float64)
    causes = [
        Cause(
            "gas-lost", "", -gas[:, None], True, "pressure-test the gas line from the cell to the sample loop"
        )
    ]
    measured = np.bincount(products.run, minlength=n) > 0
    # every run, whatever its residual: what chance alone can do is judged with the same candidates
    for run in np.flatnonzero(measured & (gas > 0)):
        one = np.zeros((n, 1))
        one[run] = -gas[run]
        causes.append(
            Cause(
                "gas-lost",
                plan.runs[run].name,
                one,
                True,
                f"repeat run {plan.runs[run].name} after a leak test",
            )
        )
    alone = _runs_without_anolyte(settled)
    if (liquid * alone).any():
        causes.append(Cause("crossover", "", -(liquid * alone)[:, None], True, "take an anolyte vial"))
    for place, missing in _compartments_missing(settled):
        one = np.zeros((n, 1))
        one[place] = -1.0
        name = plan.runs[place].name
        causes.append(
            Cause("crossover", name, one, True, f"run {name} has no vial of the {missing}: measure one")
        )
    potential = nominal(outcome.electrical.potential_rhe_volt)
    causes.append(
        Cause(
            "unmeasured-product",
            "",
            -np.ones((n, 1)),
            True,
            "look for a product that neither detector sees: trap the outlet, integrate the whole spectrum",
        )
    )
    span = float(np.ptp(potential)) if n else 0.0
    if n >= 4 and span > 0:
        # a share that grows with the overpotential: mean share, and its change over the day's range of potential
        causes.append(
            Cause(
                "unmeasured-product",
                "growing with potential",
                -np.column_stack([np.ones(n), -(potential - potential.mean()) / span]),
                True,
                "look for a product at the most negative potential that neither detector sees",
            )
        )
    return causes


def _runs_without_anolyte(settled: Settled) -> FloatArray:
    """1 for runs whose liquid was sampled in a single compartment, so that what crossed over is not seen."""
    return np.array([float(len(sampled) == 1) for sampled in _compartments(settled)])


def _compartments(settled: Settled) -> list[set[str]]:
    """The compartments that were sampled, of each run."""
    samplings = settled.plan.liquid.samplings
    compartments: list[set[str]] = [set() for _ in settled.plan.runs]
    for run, compartment in zip(samplings.run.tolist(), samplings.compartment, strict=True):
        compartments[run].add(compartment)
    return compartments


def _compartments_missing(settled: Settled) -> list[tuple[int, str]]:
    """Runs that lack a compartment which more than half of the day's runs sampled, and which."""
    compartments = _compartments(settled)
    count = Counter(one for sampled in compartments for one in sampled)
    usual = [one for one, runs in count.items() if 2 * runs > len(compartments)]
    return [
        (run, " and ".join(one for one in usual if one not in sampled))
        for run, sampled in enumerate(compartments)
        if not sampled.issuperset(usual)
    ]


def names(causes: Sequence[Cause]) -> list[str]:
    """How the table of explanations calls each cause."""
    return [f"{cause.kind} ({cause.where})" if cause.where else cause.kind for cause in causes]
