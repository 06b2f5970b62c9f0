"""Numbers of several days under one another, with the errors the days share as one error.

Each day's numbers carry their dependence on unit errors of that day. Days are independent, so that their errors stand
in blocks; but where two days are wrong by the same thing (one calibration curve, one specific capacitance), its columns
must be one column, or the difference between the days would seem to hold an error that cancels.
"""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from dataclasses import dataclass

import numpy as np

from coulombook.uncertainty.linearised import (
    IntArray,
    Linearised,
    Number,
    nominal,
    sparse_map,
)


@dataclass(frozen=True, slots=True, eq=False)
class SharedErrors:
    """The column that each error of each day takes in the common numbering."""

    columns: tuple[IntArray, ...]  # one (n_errors of the day,) for each day
    count: int


def share_errors(keys: Sequence[Sequence[Hashable | None]]) -> SharedErrors:
    """Number the errors of all days.

    ``keys`` holds, for each day, what each of its errors is known by: errors of different days with equal keys are one
    error, and None is nobody else's. Within a day every error keeps a column of its own, equal keys or not.

    >>> [one.tolist() for one in share_errors([["curve", None], [None, "curve"]]).columns]
    [[0, 1], [2, 0]]
    """
    known: dict[tuple[Hashable, int], int] = {}
    columns, count = [], 0
    for day in keys:
        seen: dict[Hashable, int] = {}
        places = []
        for key in day:
            if key is None:
                places.append(count)
                count += 1
                continue
            seen[key] = seen.get(key, -1) + 1
            place = known.setdefault((key, seen[key]), count)
            count += place == count
            places.append(place)
        columns.append(np.array(places, dtype=np.intp))
    return SharedErrors(tuple(columns), count)


def stack(days: Sequence[Number], shared: SharedErrors) -> Linearised:
    """One quantity of all days, in their order, carrying the errors of all of them."""
    values, rows, places, weights = [], [], [], []
    first = 0
    for x, columns in zip(days, shared.columns, strict=True):
        values.append(nominal(x))
        if isinstance(x, Linearised):
            entries = x.jacobian.tocoo()
            rows.append(first + entries.row)
            places.append(columns[entries.col])
            weights.append(entries.data)
        first += len(values[-1])
    empty = np.zeros(0)
    jacobian = sparse_map(
        np.concatenate([*rows, empty]),
        np.concatenate([*places, empty]),
        np.concatenate([*weights, empty]),
        (first, shared.count),
    )
    return Linearised(np.concatenate(values), jacobian)
