"""Monte Carlo: the same measurement function, evaluated for draws of its inputs (JCGM 101:2008).

Runs that are pooled into one point of a series are drawn together; the rest of the day waits its turn, so that memory
does not grow with the number of runs. Every error column has its own stream of random numbers, made from the seed and
its place: an error that runs share is the same error in whichever turn it is drawn.
"""

from __future__ import annotations

from collections.abc import Callable, Hashable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from coulombook.balance.evaluate import Outcome, SignalWeights, evaluate
from coulombook.balance.gas_plan import list_injections
from coulombook.balance.make_plan import make_plan
from coulombook.balance.plan import Plan
from coulombook.balance.readings import FloatArray
from coulombook.balance.settle import Settled
from coulombook.findings import Findings
from coulombook.uncertainty.linearised import IntArray, Linearised, Number, nominal

# of one turn: rows of draws that are evaluated at a time
CHUNK = 4096

# Quantities that cannot be negative. Where a normal distribution would put more than 3e-7 of its draws below zero (zero
# within five standard deviations), a lognormal one of the same mean and standard deviation takes its place.
_NEAR_ZERO = 0.2
_POSITIVE = (
    "peak area", "check area", "check mole fraction", "integral", "standard integral", "standard amount", "aliquot",
    "compartment volume", "electrode area", "scan area", "scan rate", "inlet flow", "outlet flow", "tracer flow",
    "headspace", "pressure", "temperature", "feed co2", "specific capacitance",
)  # fmt: skip


@dataclass(frozen=True, slots=True, eq=False)
class Drawn:
    """Draws of one turn: the runs of ``day_runs`` (places in the day) and what came out for them.

    ``efficiency`` (n_products, n_draws) with ``products`` the rows of the ledger they stand for; ``total``,
    ``c2_plus``, ``ratio`` (n_runs, n_draws).
    """

    day_runs: IntArray
    products: IntArray
    efficiency: FloatArray
    total: FloatArray
    c2_plus: FloatArray
    ratio: FloatArray


def draw_day(
    settled: Settled,
    groups: Sequence[Sequence[int]],
    count: int,
    seed: int,
    progress: Callable[[int, int], None] | None = None,
) -> Iterator[Drawn]:
    """Draw each group of runs in turn.

    Parameters
    ----------
    settled
        The settled account of the day.
    groups : sequence of sequences of int
        Runs (places in the day) that are drawn together; each in one group.
    count : int
        Number of draws M; JCGM 101 asks for 1e4/(1 - level) and more.
    seed : int
        The same seed gives the same draws.
    """
    places = {
        name: {label: place for place, label in enumerate(labels)}
        for name, labels in _labels(settled.plan).items()
    }
    for done, runs in enumerate(groups, start=1):
        yield _draw_group(settled, list(runs), places, count, seed)
        if progress is not None:
            progress(done, len(groups))


def _draw_group(
    settled: Settled,
    runs: list[int],
    places: dict[str, dict[Hashable, int]],
    count: int,
    seed: int,
) -> Drawn:
    plan = _part_of(settled.plan, runs)
    rows = {
        name: np.array([places[name][label] for label in labels], dtype=np.intp)
        for name, labels in _labels(plan).items()
    }
    inputs = {
        name: _Rows(settled.inputs.numbers[name], rows[name], name in _POSITIVE)
        for name in settled.inputs.nominal
    }
    scatter = _Rows(settled.scatter, rows["group"], False)
    liquid_scatter = _Rows(settled.liquid_scatter, rows["liquid group"], False)
    columns = np.unique(np.concatenate([one.columns for one in (*inputs.values(), scatter, liquid_scatter)]))
    streams = [np.random.Generator(np.random.SFC64([seed, int(column)])) for column in columns]
    weights = SignalWeights(
        _renormalised(settled.weights.standard[rows["standard integral"]], plan.liquid.standard_vial),
        _renormalised(settled.weights.analyte[rows["integral"]], plan.liquid.signal_analyte),
        settled.weights.u_ratio[rows["integral"]],
    )
    counted = settled.detection.counted[rows["product"]]
    products, n_runs = len(plan.products.run), len(runs)
    drawn = Drawn(
        np.array(runs, dtype=np.intp),
        rows["product"],
        np.empty((products, count)),
        *(np.empty((n_runs, count)) for _ in range(3)),
    )
    normals = np.empty((len(columns), min(CHUNK, count)))
    for first in range(0, count, CHUNK):
        held = slice(first, min(first + CHUNK, count))
        part = normals[:, : held.stop - first]
        for stream, row in zip(streams, part, strict=True):
            stream.standard_normal(out=row)
        x = {name: one.draw(part, columns) for name, one in inputs.items()}
        scattered = scatter.draw(part, columns), liquid_scatter.draw(part, columns)
        outcome = evaluate(plan, x, weights, counted, *scattered)
        _keep(drawn, held, outcome)
    return drawn


def _keep(drawn: Drawn, held: slice, outcome: Outcome) -> None:
    for kept, name in (
        (drawn.efficiency, "faradaic_efficiency"),
        (drawn.total, "total"),
        (drawn.c2_plus, "c2_plus"),
        (drawn.ratio, "ratio"),
    ):
        kept[:, held] = nominal(getattr(outcome, name)).T


class _Rows:
    """Some rows of a block of inputs, drawn from normals of the errors they depend on."""

    def __init__(self, number: Number, rows: IntArray, positive: bool) -> None:
        self.value = nominal(number)[rows]
        self._jacobian = number.jacobian[rows] if isinstance(number, Linearised) else None
        self.columns = (
            np.zeros(0, dtype=np.intp) if self._jacobian is None else np.unique(self._jacobian.indices)
        )
        self._positive = positive and bool((self.value[np.isfinite(self.value)] > 0).all())

    def draw(self, normals: FloatArray, columns: IntArray) -> FloatArray:
        """(n_draws, n) from normals (n_columns, n_draws), whose columns of the day are ``columns``."""
        shape = (normals.shape[1], len(self.value))
        if self._jacobian is None or not self.columns.size:
            return np.broadcast_to(self.value, shape)
        held = self._jacobian[:, self.columns]
        moved = (held @ normals[np.searchsorted(columns, self.columns)]).T
        drawn: FloatArray = self.value + moved
        if self._positive:
            u = np.sqrt(np.asarray(held.multiply(held).sum(axis=1)).ravel())
            near = u > _NEAR_ZERO * self.value
            # lognormal with the mean and the standard deviation of the input: ln x is normal with variance
            # ln(1 + (u/x)^2)
            spread = np.sqrt(np.log1p((u[near] / self.value[near]) ** 2))
            drawn[:, near] = self.value[near] * np.exp(spread * moved[:, near] / u[near] - 0.5 * spread**2)
        return drawn


def _renormalised(weights: FloatArray, group: IntArray) -> FloatArray:
    """Weights that add up to one in each group; they do already, unless the group was cut."""
    if not len(group):
        return weights
    result: FloatArray = weights / np.bincount(group, weights=weights)[group]
    return result


def _part_of(plan: Plan, runs: list[int]) -> Plan:
    """The plan of some runs of the day, with all its checks, blanks, scans and calibrations."""
    day = plan.day
    names = {day.runs[run].name for run in runs}
    vials = tuple(vial for vial in day.vials if vial.blank or vial.run in names)
    kept = {vial.name for vial in vials}
    part = replace(
        day,
        runs=tuple(day.runs[run] for run in runs),
        peaks=tuple(peak for peak in day.peaks if peak.run in names),
        vials=vials,
        signals=tuple(signal for signal in day.signals if signal.vial in kept),
    )
    unheard = Findings()
    injections = list_injections(part, unheard)
    figures = [plan.figures[run] for run in runs]
    return make_plan(part, injections, figures, plan.scans, unheard, plan.spectra)


def _labels(plan: Plan) -> dict[str, list[Hashable]]:
    """A name for every element of every block of inputs, unique in its block, the same in every part of the day."""
    gas, liquid, surface = plan.gas, plan.liquid, plan.surface
    run = [one.name for one in plan.runs]
    peaks: list[Hashable] = [(one.run, one.injection, one.channel, one.analyte) for one in gas.peaks]
    injections: list[Hashable] = [
        (run[number], label) for number, label in zip(gas.injections.run, gas.injections.label, strict=True)
    ]
    vials: list[Hashable] = [vial.name for vial in liquid.vials]
    signals: list[Hashable] = [(one.vial, one.analyte, one.signal) for one in liquid.signals]
    standards: list[Hashable] = [(one.vial, one.analyte, one.signal) for one in liquid.standard_signals]
    curves: list[Hashable] = [*((one.standards.calibration, one.name) for one in plan.curves.used), "slope 1"]
    checks: list[Hashable] = list(range(len(gas.check_area)))
    scans: list[Hashable] = list(range(len(surface.scan_electrode)))
    by_run = (
        "electrode area", "ph", "temperature", "pressure", "resistance", "compensated", "headspace", "carbonate uptake",
        "inlet flow", "outlet flow", "tracer flow", "current gain", "current offset", "current noise", "mean potential",
        "potential noise", "cell voltage",
    )  # fmt: skip
    once = (
        "potential", "temperature coefficient", "standard temperature", "standard pressure", "dead time", "feed co2",
        "specific capacitance",
    )  # fmt: skip
    return {
        **{name: list[Hashable](run) for name in by_run},
        **{name: list[Hashable](["once"]) for name in once},
        **dict.fromkeys(("a0", "a1", "a2"), curves),
        "peak area": peaks,
        **dict.fromkeys(("check area", "check mole fraction"), checks),
        **dict.fromkeys(("injection delay", "injection current noise"), injections),
        **dict.fromkeys(("compartment volume", "aliquot", "standard amount"), vials),
        **dict.fromkeys(("integral", "t1"), signals),
        **dict.fromkeys(("standard integral", "standard t1"), standards),
        **dict.fromkeys(("scan area", "scan rate", "charging current"), scans),
        "capacitance scatter": list[Hashable](surface.electrodes),
        "group": [
            (run[number], one.name) for number, one in zip(gas.group_run, gas.group_species, strict=True)
        ],
        "liquid group": [
            (run[number], one.name)
            for number, one in zip(liquid.group_run, liquid.group_species, strict=True)
        ],
        "product": [
            (run[number], name) for number, name in zip(plan.products.run, plan.products.species, strict=True)
        ],
    }
