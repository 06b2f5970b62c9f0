"""One quantity judged: series, contests at every level and common potential, rankings, and its way with roughness."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from coulombook.compare.pairs import Contest, contest, family
from coulombook.compare.potentials import interpolate
from coulombook.compare.rank_correlation import RankCorrelation, spearman_of_kinds
from coulombook.compare.ranking import Ranking, rank
from coulombook.compare.replicates import Series, pool_series
from coulombook.compare.statistics import Difference, Sample, Variance, one_way, welch
from coulombook.comparison.quantities import Quantity
from coulombook.comparison.runs import ComparedRuns
from coulombook.uncertainty.linearised import FloatArray, Linearised, gather, nominal, standard_uncertainty

LEVEL, POTENTIAL = "level", "potential"


@dataclass(frozen=True, slots=True, eq=False)
class Value:
    """One catalyst or electrode at one point. ``deviation`` and ``agreement`` are NaN where there is one run."""

    owner: str
    value: float
    u: float
    potential_volt: float
    u_potential_volt: float
    runs: int
    electrodes: int
    deviation: float
    agreement: float


@dataclass(frozen=True, slots=True, eq=False)
class Judged:
    """One point: the catalysts there, their contest and ranking. ``variance`` and ``tests`` are by replicates alone."""

    at: str  # LEVEL or POTENTIAL
    point: str  # name of the level
    potential_volt: float  # NaN of a level
    values: tuple[Value, ...]
    contest: Contest
    ranking: Ranking
    variance: Variance | None
    tests: dict[tuple[str, str], Difference]


@dataclass(frozen=True, slots=True, eq=False)
class Verdicts:
    """A quantity at all points, levels first."""

    quantity: Quantity
    series: Series
    points: tuple[Judged, ...]

    def at(self, kind: str) -> tuple[Judged, ...]:
        """Points of one kind at which there is anything to compare."""
        return tuple(one for one in self.points if one.at == kind and len(one.values) > 1)


@dataclass(frozen=True, slots=True, eq=False)
class AlongRoughness:
    """A quantity against the roughness factor, over electrodes, at one point."""

    quantity: Quantity
    at: str
    point: str
    potential_volt: float
    values: tuple[Value, ...]  # by electrode
    correlation: RankCorrelation


def potential_name(potential_volt: float) -> str:
    """A common potential as one would write it: with two decimals, or more where it has more.

    >>> potential_name(-1.0), potential_name(-0.925)
    ('-1.00', '-0.925')
    """
    short = f"{potential_volt:.2f}"
    return short if float(short) == potential_volt else f"{potential_volt:g}"


def judge(runs: ComparedRuns, quantity: Quantity, potentials: Sequence[float], level: float) -> Verdicts:
    """Judge one quantity at every level and at every potential; levels and potentials are a family each."""
    series = _series(runs, quantity, runs.catalyst)
    at_levels = [_at_level(series, name) for name in _levels(series)]
    there = [_at_potential(series, quantity, volt) for volt in potentials]
    points = [judged for fields in (at_levels, there) for judged in _family(fields, series, quantity, level)]
    return Verdicts(quantity, series, tuple(points))


def along_roughness(
    runs: ComparedRuns, quantity: Quantity, potentials: Sequence[float], level: float, names: Sequence[str]
) -> list[AlongRoughness]:
    """Rank correlation of a quantity with the roughness factor at every level and potential.

    ``names`` are those of the electrodes, by run. Electrodes without a roughness factor are left out.
    """
    catalysts = list(dict.fromkeys(runs.catalyst))
    kind_of = {name: catalysts.index(one) for name, one in zip(names, runs.catalyst, strict=True)}
    rough = {
        name: float(value)
        for name, value in zip(names, nominal(runs.roughness_factor), strict=True)
        if np.isfinite(value)
    }
    series = _series(runs, quantity, names)
    found = []
    for name in _levels(series):
        places = [place for place, point in enumerate(series.points) if point.level == name]
        found.append((LEVEL, name, math.nan, _values_of_points(series, places)))
    for volt in potentials:
        found.append((POTENTIAL, potential_name(volt), volt, _values_at(series, quantity, volt)[0]))
    result = []
    for at, point, volt, every in found:
        values = tuple(one for one in every if one.owner in rough)
        x = np.array([rough[one.owner] for one in values])
        y = np.array([one.value for one in values])
        if len(values) > 2:
            kind = np.array([kind_of[one.owner] for one in values], dtype=np.intp)
            correlation = spearman_of_kinds(x, y, kind, level)
            result.append(AlongRoughness(quantity, at, point, volt, values, correlation))
    return result


def _series(runs: ComparedRuns, quantity: Quantity, owner: Sequence[str]) -> Series:
    return pool_series(quantity.of(runs), runs.potential_rhe_volt, owner, runs.level, runs.electrode)


def _levels(series: Series) -> list[str]:
    return list(dict.fromkeys(point.level for point in series.points))


@dataclass(frozen=True, slots=True, eq=False)
class _Field:
    """Who meets at one point, before anybody is judged."""

    at: str
    point: str
    potential_volt: float
    values: tuple[Value, ...]
    mean: Linearised
    replicates: dict[str, FloatArray]  # of a level


def _at_level(series: Series, name: str) -> _Field:
    places = [place for place, point in enumerate(series.points) if point.level == name]
    mean = gather(series.mean, np.array(places, dtype=np.intp))
    assert isinstance(mean, Linearised)
    replicates = {series.points[place].catalyst: series.replicates[place] for place in places}
    return _Field(LEVEL, name, math.nan, _values_of_points(series, places), mean, replicates)


def _at_potential(series: Series, quantity: Quantity, volt: float) -> _Field:
    values, mean = _values_at(series, quantity, volt)
    return _Field(POTENTIAL, potential_name(volt), volt, values, mean, {})


def _family(fields: Sequence[_Field], series: Series, quantity: Quantity, level: float) -> list[Judged]:
    """The points with their pairs judged together, and ranked by that."""
    alone = [
        contest(one.mean, [value.owner for value in one.values], series.scatter, level) for one in fields
    ]
    together = family([one.pairs for one in alone])
    result = []
    for field, contested, pairs in zip(fields, alone, together, strict=True):
        found = replace(contested, pairs=pairs)
        result.append(
            Judged(
                field.at,
                field.point,
                field.potential_volt,
                field.values,
                found,
                rank(found, level, lowest_first=quantity.lowest_first),
                _analysis(list(field.replicates.values())),
                _tests(found, field.replicates, level),
            )
        )
    return result


def _tests(
    found: Contest, replicates: Mapping[str, FloatArray], level: float
) -> dict[tuple[str, str], Difference]:
    """Welch's test of every pair with replicates on either side."""
    samples = {owner: Sample.of(values) for owner, values in replicates.items() if len(values) > 1}
    return {
        (pair.one, pair.other): welch(samples[pair.one], samples[pair.other], level)
        for pair in found.pairs
        if pair.one in samples and pair.other in samples
    }


def _values_of_points(series: Series, places: Sequence[int]) -> tuple[Value, ...]:
    u, u_potential = standard_uncertainty(series.mean), standard_uncertainty(series.potential_volt)
    return tuple(
        Value(
            series.points[place].catalyst,
            float(series.mean.value[place]),
            float(u[place]),
            float(series.potential_volt.value[place]),
            float(u_potential[place]),
            len(series.points[place].rows),
            int(series.electrodes[place]),
            float(series.deviation[place]),
            float(series.agreement[place]),
        )
        for place in places
    )


def _values_at(series: Series, quantity: Quantity, volt: float) -> tuple[tuple[Value, ...], Linearised]:
    there = interpolate(series, volt, logarithm=quantity.logarithm)
    u = standard_uncertainty(there.mean)
    values = tuple(
        Value(
            owner,
            float(there.mean.value[place]),
            float(u[place]),
            volt,
            0.0,
            int(there.runs[place]),
            int(there.electrodes[place]),
            math.nan,
            math.nan,
        )
        for place, owner in enumerate(there.owners)
    )
    return values, there.mean


def _analysis(groups: Sequence[FloatArray]) -> Variance | None:
    if len(groups) < 2 or all(len(group) < 2 for group in groups):
        return None
    return one_way(groups)
