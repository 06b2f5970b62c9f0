"""Budgets put together: what share of an output's variance each source has, in one run or over the day."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from coulombook.book.tables import Table

TOTAL = "total FE"


@dataclass(frozen=True, slots=True)
class SourceShare:
    """One source: its share of the variance (a fraction, the mean over the runs that have the output), and its u.

    ``u`` is that of the one run asked for, in the unit of the budget's table; None over several runs.
    """

    source: str
    shared: str
    share: float
    u: float | None


def outputs_of(budget: Table, run: str | None = None) -> tuple[str, ...]:
    """The outputs a budget knows of, for one run or any."""
    return tuple(dict.fromkeys(str(row["output"]) for row in budget.records() if run in (None, row["run"])))


def runs_of(budget: Table) -> tuple[str, ...]:
    """The runs a budget knows of."""
    return tuple(dict.fromkeys(map(str, budget.column("run"))))


def source_shares(budget: Table, output: str, run: str | None = None) -> tuple[int, list[SourceShare]]:
    """Number of runs that have the output, and its sources, largest first."""
    rows = [row for row in budget.records() if row["output"] == output and run in (None, row["run"])]
    runs = {row["run"] for row in rows}
    sums: dict[tuple[str, str], float] = {}
    u: dict[tuple[str, str], float] = {}
    for row in rows:
        key = (str(row["source"]), str(row["shared"]))
        sums[key] = sums.get(key, 0.0) + _number(row["share / %"]) / 100.0
        u[key] = _number(row["u / %"])
    found = [
        SourceShare(*key, share / len(runs), u[key] if len(runs) == 1 else None)
        for key, share in sums.items()
    ]
    return len(runs), sorted(found, key=lambda one: -one.share)


def _number(cell: object) -> float:
    return float(cell) if isinstance(cell, int | float) else 0.0


def largest(shares: Iterable[SourceShare], least: float) -> tuple[list[SourceShare], list[SourceShare]]:
    """Those of at least this share, and the rest."""
    shares = list(shares)
    return [one for one in shares if one.share >= least], [one for one in shares if one.share < least]
