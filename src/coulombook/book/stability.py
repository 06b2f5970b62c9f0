"""Rows of the table of stability: what the injections of a run tell of its course."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from coulombook.balance.settle import Settled
from coulombook.book.entries import MA_PER_CM2, PERCENT, Row
from coulombook.compare.adjustment import holm
from coulombook.compare.stability import FEWEST_INJECTIONS, Drift, drift
from coulombook.findings import Findings
from coulombook.uncertainty.errors import READING
from coulombook.uncertainty.linearised import (
    FloatArray,
    IntArray,
    Number,
    gather,
    linear_map,
    nominal,
    select,
    sparse_map,
)

SECONDS_PER_HOUR = 3600.0
TOTAL, C2_PLUS = "gas total", "gas C2+"
_ENOUGH_FREEDOM = 10  # to know a standard deviation to a quarter of itself
QUANTITIES = (("FE / %", PERCENT), ("j / mA cm^-2", MA_PER_CM2))


class _Courses(NamedTuple):
    """Figures over the injections of runs: each course (n_courses,) has points (n,)."""

    run: IntArray
    name: tuple[str, ...]
    product: tuple[bool, ...]  # and not a sum of products
    group: IntArray  # (n,)
    injection: IntArray  # (n,)
    efficiency: Number  # (n,)


def stability_rows(settled: Settled, findings: Findings) -> list[Row]:
    """Drift of FE and partial current density of each gas product, of their total and of C2+, run by run."""
    courses = _courses(settled)
    if courses is None:
        return []
    plan = settled.plan
    groups = len(courses.name)
    confidence = plan.settings.level_of_confidence
    hour = plan.gas.injections.time_second[courses.injection] / SECONDS_PER_HOUR
    own = np.array([source.shared == READING for source in settled.inputs.sources], dtype=bool)
    area = gather(settled.inputs.numbers["electrode area"], courses.run[courses.group])
    current = gather(_currents(settled), courses.injection)
    found = [
        drift(hour, number, courses.group, groups, own, _kinds(courses), confidence)
        for number in (courses.efficiency, courses.efficiency * current / area)
    ]
    p = _adjusted(courses, found)
    _report(settled, courses, found, p, 1.0 - confidence, findings)
    count = np.bincount(courses.group, minlength=groups).tolist()
    charge = nominal(settled.outcome.electrical.charge_coulomb)[courses.run].tolist()
    columns = [_columns(one, unit, confidence) for one, (_, unit) in zip(found, QUANTITIES, strict=True)]
    return [
        {
            "run": plan.runs[run].name,
            "product": courses.name[place],
            "quantity": quantity,
            "injections": count[place],
            "charge / C": charge[place],
            **{head: column[place] for head, column in columns[number].items()},
            "p": float(p[number][place]),
            "verdict": found[number].verdict[place],
        }
        for place, run in enumerate(courses.run.tolist())
        for number, (quantity, _) in enumerate(QUANTITIES)
    ]


def _currents(settled: Settled) -> Number:
    """Current at the electrode that each injection tells of, (K,).

    What a headspace remembers at an injection is not yet the current of that moment.
    """
    plan, x = settled.plan, settled.inputs.numbers
    run = plan.gas.injections.run
    now = np.concatenate([one.injection_now_ampere for one in plan.figures])
    direct = now * (1.0 + gather(x["current gain"], run)) + gather(x["current offset"], run)
    return select(plan.headspace[run], direct, settled.readings.current_ampere)


def _courses(settled: Settled) -> _Courses | None:
    """Detected gas products with enough used injections, and sums of them where there are several to sum."""
    gas = settled.plan.gas
    injection = gas.reading_injection[gas.pooled_reading].tolist()
    carbon = [one.carbon for one in gas.group_species]
    entries: list[tuple[int, str, bool, list[list[int]]]] = []
    for run, members in _members(settled).items():
        of_member = {group: {injection[row]: row for row in rows} for group, rows in members.items()}
        sums = {gas.group_species[group].name: [group] for group in of_member}
        sums |= {
            name: chosen
            for name, chosen in (
                (TOTAL, list(of_member)),
                (C2_PLUS, [group for group in of_member if carbon[group] > 1]),
            )
            if len(chosen) > 1
        }
        for name, chosen in sums.items():
            # an injection that lacks a part has no sum
            whole = set.intersection(*(set(of_member[group]) for group in chosen))
            if _enough(settled, whole):
                parts = [[of_member[group][one] for group in chosen] for one in sorted(whole)]
                entries.append((run, name, name not in (TOTAL, C2_PLUS), parts))
    return _gathered(settled, entries) if entries else None


def _members(settled: Settled) -> dict[int, dict[int, list[int]]]:
    """Pooled readings of each detected gas product, by run and product of a run."""
    gas = settled.plan.gas
    detected = (settled.plan.products.from_gas.T @ settled.detection.counted > 0).tolist()
    owner = gas.group_run.tolist()
    members: dict[int, dict[int, list[int]]] = {}
    for row, group in enumerate(gas.pooled_group.tolist()):
        if detected[group]:
            members.setdefault(owner[group], {}).setdefault(group, []).append(row)
    return members


def _enough(settled: Settled, injections: set[int]) -> bool:
    time = settled.plan.gas.injections.time_second
    return len(injections) >= FEWEST_INJECTIONS and len({float(time[one]) for one in injections}) > 1


def _gathered(settled: Settled, entries: Sequence[tuple[int, str, bool, list[list[int]]]]) -> _Courses:
    gas = settled.plan.gas
    points = [(number, parts) for number, entry in enumerate(entries) for parts in entry[3]]
    rows = np.array([row for _, parts in points for row in parts], dtype=np.intp)
    place = np.repeat(np.arange(len(points)), [len(parts) for _, parts in points])
    total = sparse_map(place, rows, 1.0, (len(points), len(gas.pooled_reading)))
    return _Courses(
        np.array([run for run, *_ in entries], dtype=np.intp),
        tuple(name for _, name, *_ in entries),
        tuple(alone for _, _, alone, _ in entries),
        np.array([number for number, _ in points], dtype=np.intp),
        gas.reading_injection[gas.pooled_reading[[parts[0] for _, parts in points]]],
        linear_map(total, gather(settled.readings.faradaic_efficiency, gas.pooled_reading)),
    )


def _kinds(courses: _Courses) -> IntArray:
    """What scatters alike: a product, or all products where there are too few injections to know one of them."""
    names = {name: number for number, name in enumerate(dict.fromkeys(courses.name))}
    kind = np.array([names[name] for name in courses.name], dtype=np.intp)
    # two degrees of freedom of each course are spent on its line
    freedom = np.bincount(kind[courses.group]) - 2 * np.bincount(kind)
    return np.where(freedom[kind] < _ENOUGH_FREEDOM, len(names), kind)


def _adjusted(courses: _Courses, found: Sequence[Drift]) -> FloatArray:
    """Probability of each slope by chance, (n_quantities, n_courses), by Holm over the products of a run."""
    p = np.stack([one.slope.p for one in found])
    families: dict[int, list[int]] = {}
    for place, (run, alone) in enumerate(zip(courses.run.tolist(), courses.product, strict=True)):
        if alone:
            families.setdefault(run, []).append(place)
    for places in families.values():
        p[:, places] = np.reshape(holm(p[:, places].ravel().tolist()), (len(p), len(places)))
    return p


def _columns(found: Drift, unit: float, confidence: float) -> dict[str, list[float]]:
    half = found.slope.half_width(confidence)
    columns = {
        "span / h": found.span,
        "start": found.start * unit,
        "mean": found.mean.value * unit,
        "u(mean)": found.mean.u * unit,
        "drift / h^-1": found.slope.value * unit,
        "u(drift) / h^-1": found.slope.u * unit,
        "drift low / h^-1": (found.slope.value - half) * unit,
        "drift high / h^-1": (found.slope.value + half) * unit,
        "time to 80 % / h": found.lost,
        "earliest / h": found.earliest,
        "latest / h": found.latest,
    }
    # an interval without an end has an empty cell for it
    return {head: np.where(np.isfinite(column), column, np.nan).tolist() for head, column in columns.items()}


def _report(
    settled: Settled,
    courses: _Courses,
    found: Sequence[Drift],
    p: FloatArray,
    alpha: float,
    findings: Findings,
) -> None:
    """One finding for each run whose products drift by more than chance."""
    drifting: dict[int, list[str]] = {}
    for place, run in enumerate(courses.run.tolist()):
        told = [
            f"{quantity.partition(' / ')[0]} {one.slope.value[place] / one.start[place] * 100:+.2g} %/h"
            for number, (one, (quantity, _)) in enumerate(zip(found, QUANTITIES, strict=True))
            if courses.product[place] and p[number, place] < alpha
        ]
        if told:
            drifting.setdefault(run, []).append(f"{courses.name[place]} ({', '.join(told)})")
    for run, products in drifting.items():
        findings.add(
            "drifting-run",
            f"run {settled.plan.runs[run].name}",
            f"over its injections these change by more than chance would make them: {', '.join(products)}",
            "state the time a figure holds for; look at stability.csv and the log of the run",
        )
