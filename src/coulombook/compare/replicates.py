"""Replicate runs pooled into points of a series, with the scatter between runs as errors of their own.

A point is a catalyst (or an electrode) at one level. Its mean carries the errors of its runs, and one error more for
each run: the scatter that the stated uncertainties do not explain (see `coulombook.compare.repeatability`). Such an
error belongs to the electrode and not to the run where scatter is common to all: an electrode that gives more than its
like at one level does so at the next, so that nothing averages out between two levels.
"""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from coulombook.compare.repeatability import Groups, Repeatability, repeatability
from coulombook.compare.series import Point, series_points
from coulombook.uncertainty.linearised import (
    FloatArray,
    IntArray,
    Linearised,
    Number,
    gather,
    linear_map,
    nominal,
    sparse_map,
)
from coulombook.uncertainty.scatter import pool

if TYPE_CHECKING:
    from scipy.sparse import csr_array


_LIKE = 2.0  # replicates further apart than this factor are not alike in anything


@dataclass(frozen=True, slots=True, eq=False)
class Scatter:
    """Which errors are scatter, and how well it is known.

    Columns from ``first`` on are scatter; ``group`` says of each which estimate its size comes from, and ``freedom``
    of each estimate its degrees of freedom.
    """

    first: int
    group: IntArray
    freedom: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class Series:
    """Points of one quantity. (n,) each.

    ``mean`` and ``potential_volt`` carry the same errors, those of the scatter with them. ``agreement`` is the
    probability that replicates which differ by their stated uncertainties alone scatter more; NaN for a single run.
    """

    points: tuple[Point, ...]
    mean: Linearised
    potential_volt: Linearised
    deviation: FloatArray  # between the runs of a point, NaN for a single one
    agreement: FloatArray
    replicates: tuple[FloatArray, ...]  # values of the runs of each point
    electrodes: IntArray  # number of them
    repeatability: Repeatability
    scatter: Scatter

    def of(self, owner: str) -> IntArray:
        """Places of the points of one catalyst or electrode, by potential."""
        own = [place for place, point in enumerate(self.points) if point.catalyst == owner]
        potential = nominal(self.potential_volt)
        return np.array(sorted(own, key=lambda place: potential[place]), dtype=np.intp)


def pool_series(
    x: Linearised,
    potential_volt: Linearised,
    owner: Sequence[str],
    level: Sequence[str],
    electrode: Sequence[Hashable],
) -> Series:
    """Pool the runs of each owner at each level.

    Parameters
    ----------
    x, potential_volt : (n_runs,) Linearised
        A quantity of each run, and the potential it was had at. [V] A run whose quantity is NaN is left out.
    owner, level : (n_runs,) sequences of str
        Whose series the run belongs to, and the level its replicates share.
    electrode : (n_runs,) sequence
        Runs with equal ones were made with one electrode.
    """
    known = np.flatnonzero(np.isfinite(nominal(x)) & np.isfinite(nominal(potential_volt)))
    found = series_points(
        [owner[run] for run in known.tolist()], [level[run] for run in known.tolist()], [""] * len(known)
    )
    points = tuple(
        Point(one.catalyst, one.level, one.product, known[one.rows].astype(np.intp)) for one in found
    )
    runs = np.concatenate([one.rows for one in points]) if points else np.zeros(0, dtype=np.intp)
    group = np.repeat(np.arange(len(points)), [len(one.rows) for one in points]).astype(np.intp)
    values = gather(x, runs)
    pooled = pool(values, group, len(points))
    owners = list(dict.fromkeys(point.catalyst for point in points))
    groups = Groups(
        np.array([owners.index(point.catalyst) for point in points], dtype=np.intp),
        nominal(pooled.mean),
        pooled.deviation**2,
        _explained(values, nominal(pooled.mean), group),
        pooled.count - 1,
        _counting(points, electrode),
    )
    repeats = repeatability(groups)
    averaging = sparse_map(group, np.arange(len(runs)), 1.0 / pooled.count[group], (len(points), len(runs)))
    potential = linear_map(averaging, gather(potential_volt, runs))
    assert isinstance(pooled.mean, Linearised)
    assert isinstance(potential, Linearised)
    loading, scatter = _scatter_errors(repeats, points, electrode, x.jacobian.shape[1])
    nothing = sparse_map([], [], [], loading.shape)
    return Series(
        points,
        widened(pooled.mean, loading),
        widened(potential, nothing),
        pooled.deviation,
        _agreement(groups),
        tuple(nominal(x)[one.rows] for one in points),
        np.array([len({electrode[run] for run in one.rows.tolist()}) for one in points], dtype=np.intp),
        repeats,
        scatter,
    )


def _explained(values: Number, mean: FloatArray, group: IntArray) -> FloatArray:
    """Variance of a run that its uncertainty explains, (n_points,), with the errors of runs of that mean.

    An error that all runs share in proportion to their values moves unequal runs unequally, and would seem to explain a
    part of what sets them apart; runs that gave the mean it moves alike.
    """
    value = nominal(values)
    with np.errstate(divide="ignore", invalid="ignore"):
        factor = mean[group] / value
    # near zero an error is no share of the value
    factor = np.where((factor > 1.0 / _LIKE) & (factor < _LIKE), factor, 1.0)
    return pool(values * factor, group, len(mean)).explained


def _counting(points: Sequence[Point], electrode: Sequence[Hashable]) -> FloatArray:
    """Share of the degrees of freedom of each point that counts.

    Two electrodes compared at five levels are one comparison and not five, if one of them gives more than its like at
    every level. What counts are the comparisons that do not follow from others: of electrodes that met at one level or
    by way of others, their number less one.
    """
    circles: dict[str, list[set[Hashable]]] = {}
    freedom: dict[str, int] = {}
    for point in points:
        known = circles.setdefault(point.catalyst, [])
        met = set(_units(point, electrode))
        apart = [one for one in known if not one & met]
        circles[point.catalyst] = [*apart, met.union(*(one for one in known if one & met))]
        freedom[point.catalyst] = freedom.get(point.catalyst, 0) + len(point.rows) - 1
    independent = {catalyst: sum(len(one) - 1 for one in known) for catalyst, known in circles.items()}
    return np.array(
        [
            independent[point.catalyst] / freedom[point.catalyst] if freedom[point.catalyst] else 1.0
            for point in points
        ]
    )


def _units(point: Point, electrode: Sequence[Hashable]) -> list[Hashable]:
    """What each run of a point was made with; several runs of one electrode at one level are repeats of their own."""
    turn: dict[Hashable, int] = {}
    found: list[Hashable] = []
    for run in point.rows.tolist():
        made_with = electrode[run]
        turn[made_with] = turn.get(made_with, -1) + 1
        found.append((made_with, turn[made_with]))
    return found


def _scatter_errors(
    repeats: Repeatability, points: Sequence[Point], electrode: Sequence[Hashable], first: int
) -> tuple[csr_array, Scatter]:
    """Loadings (n_points, n_errors) of the scatter on the means of the points, and what the errors are."""
    known: dict[Hashable, int] = {}
    group, rows, columns, weights = [], [], [], []
    for place, point in enumerate(points):
        estimate = int(repeats.estimate[place])
        for unit in _units(point, electrode):
            key = (estimate, point.catalyst, unit)
            if key not in known:
                known[key] = len(known)
                group.append(estimate)
            rows.append(place)
            columns.append(known[key])
            weights.append(repeats.deviation[place] / len(point.rows))
    loading = sparse_map(rows, columns, weights, (len(points), len(known)))
    return loading, Scatter(first, np.array(group, dtype=np.intp), repeats.freedom)


def widened(x: Linearised, more: csr_array) -> Linearised:
    """The number with further errors beside those it has."""
    from scipy.sparse import csr_array as sparse
    from scipy.sparse import hstack

    return Linearised(x.value, sparse(hstack([x.jacobian, more])))


def _agreement(groups: Groups) -> FloatArray:
    """Probability of a larger scatter where the stated uncertainties are all there is. (n,)"""
    from scipy.special import chdtrc

    with np.errstate(divide="ignore", invalid="ignore"):
        chi_square = groups.freedom * groups.variance / groups.explained
    result: FloatArray = np.where(groups.explained > 0, chdtrc(groups.freedom, chi_square), np.nan)
    return result
