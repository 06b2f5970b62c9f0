"""Series of drawn results whose true line, errors and sharing are known."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from coulombook.compare.trend import Points
from coulombook.uncertainty.linearised import FloatArray, IntArray, Linearised, sparse_map


def number(
    value: FloatArray, own: float, shared: float, group: IntArray, first: int, errors: int
) -> Linearised:
    """Values (n,) with an error of its own each, in the columns from ``first``, and one that a group shares."""
    n = len(value)
    place = np.arange(n)
    rows = np.concatenate([place, place])
    columns = np.concatenate([first + place, first + n + group])
    sizes = np.concatenate([np.full(n, own), np.full(n, shared)])
    return Linearised(value, sparse_map(rows, columns, sizes, (n, errors)))


def points(
    x: FloatArray, y: FloatArray, group: IntArray, own: tuple[float, float], shared: tuple[float, float]
) -> Points:
    """Points whose x and y have errors (u_x, u_y) of their own, and others that all points of a group share."""
    n, groups = len(x), int(group.max()) + 1
    errors = 2 * (n + groups)
    alone: NDArray[np.bool_] = np.tile(np.repeat([True, False], [n, groups]), 2)
    return Points.of(
        number(x, own[0], shared[0], group, 0, errors),
        number(y, own[1], shared[1], group, n + groups, errors),
        alone,
    )
