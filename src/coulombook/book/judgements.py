"""Rows of the tables that judge a day: explanations, intervals by draws, reconciliation."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np

from coulombook.balance.closing import reconcile_day
from coulombook.balance.draws import Drawn
from coulombook.balance.explain import Explained
from coulombook.balance.settle import Settled
from coulombook.book.entries import PERCENT, Row, level_of
from coulombook.findings import Findings
from coulombook.uncertainty.coverage import Coverage, propagation_validated
from coulombook.uncertainty.linearised import FloatArray, nominal, standard_uncertainty


def explanation_rows(explained: Explained) -> list[Row]:
    """Candidate causes, best first."""
    return [
        {
            "rank": rank,
            "cause": one.cause,
            "where": one.where,
            "estimate / %": one.estimate * PERCENT,
            "u(estimate) / %": one.u * PERCENT,
            "evidence": one.evidence,
            "told apart": "; ".join(one.apart) or "yes",
            "bench test": one.bench_test,
        }
        for rank, one in enumerate(explained.ranked, start=1)
    ]


def series_groups(settled: Settled) -> list[list[int]]:
    """Runs that one point of a series pools, in order of first appearance."""
    groups: dict[tuple[str, str], list[int]] = {}
    for number, run in enumerate(settled.plan.runs):
        groups.setdefault((run.catalyst, level_of(run)), []).append(number)
    return list(groups.values())


def interval_rows(settled: Settled, drawn: Iterable[Drawn], count: int, findings: Findings) -> list[Row]:
    """Shortest coverage intervals of every FE, total, C2+ FE and C2+/C1, by run; doubts go to ``findings``."""
    plan, outcome = settled.plan, settled.outcome
    level = plan.settings.level_of_confidence
    keyed: list[tuple[int, int, Row]] = []
    for part in drawn:
        runs = part.day_runs
        outputs: Sequence[tuple[Coverage, FloatArray, FloatArray, Sequence[int], Sequence[str], float]] = [
            (
                part.efficiency,
                nominal(outcome.faradaic_efficiency)[part.products],
                standard_uncertainty(outcome.faradaic_efficiency)[part.products],
                plan.products.run[part.products].tolist(),
                [plan.products.species[row] for row in part.products],
                PERCENT,
            ),
            *(
                (
                    draws,
                    nominal(number)[runs],
                    standard_uncertainty(number)[runs],
                    runs.tolist(),
                    [name] * len(runs),
                    unit,
                )
                for draws, number, name, unit in (
                    (part.total, outcome.total, "total FE", PERCENT),
                    (part.c2_plus, outcome.c2_plus, "C2+ FE", PERCENT),
                    (part.ratio, outcome.ratio, "C2+/C1", 1.0),
                )
            ),
        ]
        for kind, (draws, value, u, owner, names, unit) in enumerate(outputs):
            quantiles = draws.low_quantile, draws.high_quantile
            agrees = propagation_validated(value, u, level, *quantiles, count)
            for row in np.flatnonzero(np.isfinite(value)).tolist():
                keyed.append(
                    (
                        owner[row],
                        kind,
                        {
                            "run": plan.runs[owner[row]].name,
                            "output": names[row],
                            "value / %": float(value[row] * unit),
                            "u / %": float(u[row] * unit),
                            "u(draws) / %": float(draws.deviation[row] * unit),
                            "low / %": float(draws.low[row] * unit),
                            "high / %": float(draws.high[row] * unit),
                            "propagation": "agrees" if agrees[row] or u[row] == 0 else "differs",
                        },
                    )
                )
    keyed.sort(key=lambda one: one[:2])
    table = [entry for _, _, entry in keyed]
    differing: dict[str, list[str]] = {}
    for entry in table:
        if entry["propagation"] == "differs":
            differing.setdefault(str(entry["run"]), []).append(str(entry["output"]))
    if differing:
        total = sum(map(len, differing.values()))
        first = "; ".join(f"{run}: {', '.join(outputs)}" for run, outputs in list(differing.items())[:3])
        findings.add(
            "propagation-not-validated",
            "intervals",
            f"for {total} of {len(table)} outputs the interval by propagation differs from that by {count} draws "
            f"({first}{'; ...' if len(differing) > 3 else ''})",
            "use the intervals of intervals.csv where it matters",
        )
    return table


def reconciliation_rows(settled: Settled) -> list[Row]:
    """Measured and adjusted FE side by side. Raises ValueError when a run has no uncertainty to be adjusted with."""
    plan = settled.plan
    rows, _, found = reconcile_day(settled)
    measured = nominal(settled.outcome.faradaic_efficiency)[rows]
    u = standard_uncertainty(settled.outcome.faradaic_efficiency)[rows]
    return [
        {
            "run": plan.runs[plan.products.run[row]].name,
            "product": plan.products.species[row],
            "FE / %": float(measured[number] * PERCENT),
            "u(FE) / %": float(u[number] * PERCENT),
            "adjusted FE / %": float(found.value[number] * PERCENT),
            "u(adjusted FE) / %": float(found.u[number] * PERCENT),
            "z": float(found.z[number]),
        }
        for number, row in enumerate(rows)
    ]
