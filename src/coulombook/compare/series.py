"""Series: a catalyst's results against potential, replicates pooled."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from coulombook.uncertainty.linearised import (
    FloatArray,
    IntArray,
    Number,
    gather,
    nominal,
    standard_uncertainty,
)
from coulombook.uncertainty.scatter import pool


@dataclass(frozen=True, slots=True, eq=False)
class PooledValue:
    """One quantity pooled over replicate runs, (n_groups,) each.

    ``u`` holds the propagated uncertainty with all that the runs share (it does not average out) and the scatter
    between runs that their own uncertainties leave unexplained.
    """

    mean: FloatArray
    deviation: FloatArray  # NaN for a single run
    u: FloatArray


def pool_runs(x: Number, group: IntArray, groups: int) -> PooledValue:
    """Mean over replicate runs with its uncertainty; see `coulombook.uncertainty.scatter.pool`."""
    pooled = pool(x, group, groups)
    u = np.sqrt(standard_uncertainty(pooled.mean) ** 2 + pooled.unexplained / pooled.count)
    return PooledValue(nominal(pooled.mean), pooled.deviation, u)


@dataclass(frozen=True, slots=True, eq=False)
class Point:
    """A point of a series: catalyst, level and product, with the ledger rows it pools."""

    catalyst: str
    level: str
    product: str
    rows: IntArray


def series_points(catalyst: Sequence[str], level: Sequence[str], product: Sequence[str]) -> list[Point]:
    """Points in order of first appearance, from the ledger's columns."""
    members: dict[tuple[str, str, str], list[int]] = {}
    for row, key in enumerate(zip(catalyst, level, product, strict=True)):
        members.setdefault(key, []).append(row)
    return [Point(*key, np.array(rows, dtype=np.intp)) for key, rows in members.items()]


def pool_points(x: Number, points: Sequence[Point]) -> PooledValue:
    """One quantity of the ledger's rows, pooled by point."""
    rows = np.concatenate([point.rows for point in points]) if points else np.zeros(0, dtype=np.intp)
    group = np.repeat(np.arange(len(points)), [len(point.rows) for point in points]).astype(np.intp)
    return pool_runs(gather(x, rows), group, len(points))
