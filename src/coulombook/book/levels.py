"""What the runs of one level have in common: total FE, C2+/C1 and potential, pooled as the series pools products."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from coulombook.balance.settle import Settled
from coulombook.book.entries import PERCENT
from coulombook.book.judgements import series_groups
from coulombook.book.tables import Book, Cell
from coulombook.compare.series import PooledValue, pool_runs
from coulombook.uncertainty.linearised import Number, gather, nominal


@dataclass(frozen=True, slots=True)
class Level:
    """A level of a catalyst; what cannot be had is None, and what has no known uncertainty has u 0."""

    catalyst: str
    level: str
    runs: tuple[str, ...]
    potential_volt: float | None
    u_potential_volt: float | None
    total_percent: float | None
    u_total_percent: float | None
    ratio: float | None  # C2+/C1
    u_ratio: float | None


def levels_of(book: Book) -> tuple[Level, ...]:
    """Every level of every catalyst, in the order of the runs.

    A book without its settled account does not know what the runs share, so that a level of several runs has there
    neither total nor ratio, only its mean potential.
    """
    if book.settled is not None:
        return _pooled(book.settled, book)
    members: dict[tuple[Cell, Cell], list[dict[str, Cell]]] = {}
    for row in book.tables["summary"].records():
        members.setdefault((row["catalyst"], row["level"]), []).append(row)
    return tuple(_told(str(catalyst), str(level), rows) for (catalyst, level), rows in members.items())


def _pooled(settled: Settled, book: Book) -> tuple[Level, ...]:
    groups, outcome = series_groups(settled), settled.outcome
    summary = list(book.tables["summary"].records())
    held = np.array([number for numbers in groups for number in numbers], dtype=np.intp)
    owner = np.repeat(np.arange(len(groups)), [len(one) for one in groups]).astype(np.intp)

    def pooled(x: Number) -> PooledValue:
        return pool_runs(gather(x, held), owner, len(groups))

    potential = pooled(outcome.electrical.potential_rhe_volt)
    total, ratio = pooled(outcome.total), _ratios(outcome.ratio, groups)
    return tuple(
        Level(
            str(summary[numbers[0]]["catalyst"]),
            str(summary[numbers[0]]["level"]),
            tuple(settled.plan.runs[one].name for one in numbers),
            _finite(potential.mean[place]),
            _finite(potential.u[place]),
            _finite(total.mean[place] * PERCENT),
            _finite(total.u[place] * PERCENT),
            *ratio[place],
        )
        for place, numbers in enumerate(groups)
    )


def _ratios(x: Number, groups: list[list[int]]) -> list[tuple[float | None, float | None]]:
    """C2+/C1 of each group over the runs that have one."""
    able = np.isfinite(nominal(x))
    kept = [[one for one in numbers if able[one]] for numbers in groups]
    places = [place for place, numbers in enumerate(kept) if numbers]
    found: list[tuple[float | None, float | None]] = [(None, None)] * len(groups)
    if places:
        held = np.array([one for place in places for one in kept[place]], dtype=np.intp)
        owner = np.repeat(np.arange(len(places)), [len(kept[place]) for place in places]).astype(np.intp)
        value = pool_runs(gather(x, held), owner, len(places))
        for number, place in enumerate(places):
            found[place] = _finite(value.mean[number]), _finite(value.u[number])
    return found


def _told(catalyst: str, level: str, rows: list[dict[str, Cell]]) -> Level:
    potentials = [value for row in rows if (value := _number(row["E vs RHE / V"])) is not None]
    alone = rows[0] if len(rows) == 1 else {}
    return Level(
        catalyst,
        level,
        tuple(str(row["run"]) for row in rows),
        sum(potentials) / len(potentials) if potentials else None,
        *(
            _number(alone.get(head))
            for head in (
                "u(E vs RHE) / V",
                "total FE / %",
                "u(total FE) / %",
                "C2+/C1",
                "u(C2+/C1)",
            )
        ),
    )


def _number(cell: Cell) -> float | None:
    return None if cell is None or isinstance(cell, str) else float(cell)


def _finite(value: float) -> float | None:
    return float(value) if math.isfinite(value) else None
