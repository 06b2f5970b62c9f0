"""Rows of the table of kinetics: Tafel slopes and onset potentials of each catalyst's products."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.settle import Settled
from coulombook.book.entries import MA_PER_CM2, PERCENT, Row, level_of
from coulombook.compare.adjustment import holm
from coulombook.compare.kinetics import BEND_CHANCE, Onset, Tafel, onset, tafel
from coulombook.compare.trend import Points
from coulombook.findings import Findings
from coulombook.uncertainty.errors import DAY
from coulombook.uncertainty.linearised import (
    FloatArray,
    IntArray,
    Number,
    gather,
    linear_map,
    nominal,
    select,
    sparse_map,
    standard_uncertainty,
)

GEOMETRIC, REAL = "geometric", "real"
AS_GEOMETRIC = "as geometric"
MILLIVOLT = 1e3

_CO2_USED = "CO2 used"  # over all products of a run
_MUCH_USED = 0.5  # of the CO2 fed; common practice, no source
_SLOPE_HEADS = (
    "straight levels", "range", "from E vs RHE / V", "to E vs RHE / V", "Tafel slope / mV", "u(Tafel slope) / mV",
    "Tafel slope low / mV", "Tafel slope high / mV", "p of bend",
)  # fmt: skip


class _Key(NamedTuple):
    """What one series is of, and the names of its levels from the least negative potential."""

    catalyst: str
    product: str
    basis: str
    levels: tuple[str, ...]


class _Series(NamedTuple):
    """Series, over points (n,): results of runs."""

    keys: tuple[_Key, ...]
    run: IntArray
    current: IntArray  # place of each among the currents
    series: IntArray  # ascending
    level: IntArray  # within the series

    bounds: IntArray  # (n_series + 1,) first point of each

    def points_of(self, number: int, levels: int | None = None) -> IntArray:
        """The points of one series, or of so many of its lower levels."""
        held = np.arange(self.bounds[number], self.bounds[number + 1])
        return held if levels is None else held[self.level[held] < levels]


def kinetics_rows(settled: Settled, findings: Findings) -> list[Row]:
    """One row per catalyst, product and basis; doubts about transport go to ``findings``."""
    plan, outcome = settled.plan, settled.outcome
    current = _currents(settled)
    series = _series(settled, nominal(current))
    if not series.keys:
        return []
    confidence = plan.settings.level_of_confidence
    own = np.array([source.shared != DAY for source in settled.inputs.sources], dtype=bool)
    real = np.array([key.basis == REAL for key in series.keys])[series.series]
    roughness = gather(np.log(outcome.run_roughness_factor), series.run)
    y = np.log(gather(current, series.current)) - select(real, roughness, np.zeros(len(real)))
    e = gather(outcome.electrical.potential_rhe_volt, series.run)
    slope = tafel(Points.of(e, y, own), series.series, series.level, len(series.keys), confidence)
    threshold = float(np.log(plan.settings.onset_current_density_ampere_per_m2))
    start = onset(e, y, series.series, series.level, len(series.keys), threshold)
    _report(settled, series, slope, findings)
    return [
        _row(settled, series, number, slope, start)
        for number, key in enumerate(series.keys)
        if key.product != _CO2_USED
    ]


def _currents(settled: Settled) -> Number:
    """Partial current densities of the ledger's rows, and behind them the CO2 each run uses, in electrons."""
    products = settled.plan.products
    rows, runs = len(products.run), len(settled.plan.runs)
    share = products.carbon / products.electrons * settled.detection.counted
    both = sparse_map(
        np.concatenate([np.arange(rows), rows + products.run]),
        np.tile(np.arange(rows), 2),
        np.concatenate([np.ones(rows), share]),
        (rows + runs, rows),
    )
    return linear_map(both, settled.outcome.partial_current_density_ampere_per_m2)


def _series(settled: Settled, current: FloatArray) -> _Series:
    """Levels of each catalyst and product that follow one another with the product detected in all their runs."""
    plan = settled.plan
    potential = nominal(settled.outcome.electrical.potential_rhe_volt)
    rough = np.isfinite(nominal(settled.outcome.run_roughness_factor))
    sound = np.concatenate([settled.detection.detected, np.ones(len(plan.runs), dtype=bool)]) & (current > 0)
    names = [*plan.products.species, *[_CO2_USED] * len(plan.runs)]
    owner = [*plan.products.run.tolist(), *range(len(plan.runs))]
    runs_of: dict[str, dict[str, list[int]]] = {}
    for number, run in enumerate(plan.runs):
        runs_of.setdefault(run.catalyst, {}).setdefault(level_of(run), []).append(number)
    places_of: dict[str, dict[str, dict[str, list[int]]]] = {}
    for place, (name, number) in enumerate(zip(names, owner, strict=True)):
        run = plan.runs[number]
        places_of.setdefault(run.catalyst, {}).setdefault(name, {}).setdefault(level_of(run), []).append(
            place
        )
    keys: list[_Key] = []
    points: list[tuple[int, int, int, int]] = []
    for catalyst, members in runs_of.items():
        ordered = sorted(members, key=lambda level: -float(potential[members[level]].mean()))
        for product, places in places_of[catalyst].items():
            held = _neighbours([(level, places.get(level, [])) for level in ordered], sound)
            of_product = [(owner[one], one, level) for level, (_, of) in enumerate(held) for one in of]
            bases = [GEOMETRIC] if held else []
            if held and product != _CO2_USED and rough[[run for run, *_ in of_product]].all():
                bases.append(REAL)
            for basis in bases:
                points += [(run, place, len(keys), level) for run, place, level in of_product]
                keys.append(_Key(catalyst, product, basis, tuple(level for level, _ in held)))
    runs, currents, of_series, levels = np.array(points, dtype=np.intp).reshape(-1, 4).T
    bounds = np.searchsorted(of_series, np.arange(len(keys) + 1))
    return _Series(tuple(keys), runs, currents, of_series, levels, bounds)


def _neighbours(levels: list[tuple[str, list[int]]], sound: NDArray[np.bool_]) -> list[tuple[str, list[int]]]:
    """The first levels in a row whose currents are all sound."""
    held: list[tuple[str, list[int]]] = []
    for level, places in levels:
        if places and sound[places].all():
            held.append((level, places))
        elif held:
            break
    return held


def _row(settled: Settled, series: _Series, number: int, slope: Tafel, start: Onset) -> Row:
    key, levels = series.keys[number], int(slope.levels[number])
    runs, straight = (series.run[series.points_of(number, some)] for some in (None, levels))
    potential = nominal(settled.outcome.electrical.potential_rhe_volt)[straight]
    row: Row = {
        "catalyst": key.catalyst,
        "product": key.product,
        "basis": key.basis,
        "runs": len(runs),
        "levels": len(key.levels),
        "straight levels": levels,
        "range": "; ".join(key.levels[:levels]) or None,
        "from E vs RHE / V": float(potential.max()) if levels else None,
        "to E vs RHE / V": float(potential.min()) if levels else None,
        "Tafel slope / mV": float(slope.slope_volt[number] * MILLIVOLT),
        "u(Tafel slope) / mV": float(slope.u_slope_volt[number] * MILLIVOLT),
        "Tafel slope low / mV": _finite(slope.low_volt[number] * MILLIVOLT),
        "Tafel slope high / mV": _finite(slope.high_volt[number] * MILLIVOLT),
        "p of bend": float(slope.bend_p[number]),
        "verdict": slope.verdict[number],
        "onset j / mA cm^-2": settled.plan.settings.onset_current_density_ampere_per_m2 * MA_PER_CM2,
        "E onset vs RHE / V": float(start.potential_volt[number]),
        "u(E onset) / V": float(start.u_potential_volt[number]),
        "onset": start.verdict[number],
    }
    if key.basis == REAL and _one_value(nominal(settled.outcome.run_roughness_factor)[runs]):
        # one factor moves all points alike
        row |= dict.fromkeys(_SLOPE_HEADS) | {"verdict": AS_GEOMETRIC}
    return row


def _one_value(values: FloatArray) -> bool:
    return bool((values == values[0]).all())


def _finite(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None


def _report(settled: Settled, series: _Series, found: Tafel, findings: Findings) -> None:
    """For each catalyst: partial currents that fall away from their lines, and whether transport may be why."""
    geometric = [number for number, key in enumerate(series.keys) if key.basis == GEOMETRIC]
    p = dict(zip(geometric, holm(found.bend_p[geometric].tolist()), strict=True))
    members: dict[str, list[int]] = {}
    for number in geometric:
        members.setdefault(series.keys[number].catalyst, []).append(number)
    for catalyst, numbers in members.items():
        falling = [number for number in numbers if p[number] < BEND_CHANCE and found.falls[number]]
        products = [
            series.keys[number].product + _beyond(settled, series, found, number)
            for number in falling
            if series.keys[number].product != _CO2_USED
        ]
        as_a_whole = len(falling) > len(products)
        used_up = _used_up(settled, np.concatenate([series.run[series.points_of(one)] for one in numbers]))
        told = [
            *([f"log j falls below a straight line for {', '.join(products)}"] if products else []),
            *(["the CO2 used as a whole does not keep up with the potential"] if as_a_whole else []),
            *used_up,
        ]
        if as_a_whole or used_up:
            findings.add(
                "transport-limit",
                catalyst,
                "; ".join(told),
                "read kinetics from the straight range of kinetics.csv only; feed or stir faster, and check the ohmic "
                "drop, before catalysts are compared there",
            )
        elif products:
            findings.add(
                "falls-away",
                catalyst,
                "; ".join([*told, "of the CO2 used as a whole that cannot be told"]),
                "read kinetics from the straight range of kinetics.csv only; a product that is reduced further, and "
                "sites taken by another, bend it as well as transport",
            )


def _used_up(settled: Settled, runs: IntArray) -> list[str]:
    """What to tell of the run that uses most of its CO2, where that is surely much."""
    conversion = settled.outcome.co2_conversion
    surely = nominal(conversion)[runs] - 2.0 * standard_uncertainty(conversion)[runs]
    if not (surely > _MUCH_USED).any():
        return []
    most = runs[np.nanargmax(surely)]
    return [
        f"run {settled.plan.runs[most].name} uses {nominal(conversion)[most] * PERCENT:.0f} % of the CO2 fed"
    ]


def _beyond(settled: Settled, series: _Series, found: Tafel, number: int) -> str:
    straight = series.run[series.points_of(number, int(found.levels[number]))]
    if not straight.size:
        return ""
    potential = nominal(settled.outcome.electrical.potential_rhe_volt)[straight]
    return f" (beyond {potential.min():.2f} V)"
