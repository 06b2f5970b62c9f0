"""Catalysts against one another at one level: differences and ratios with intervals in which shared errors cancel.

What two catalysts share (one flow meter, one curve) moves both and leaves their difference or ratio nearly alone; what
is each run's own, and the scatter between runs that nobody declared, does not.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from coulombook.compare.statistics import holm, student_p, student_quantile
from coulombook.uncertainty.linearised import (
    FloatArray,
    IntArray,
    Linearised,
    Number,
    gather,
    linear_map,
    nominal,
    sparse_map,
    standard_uncertainty,
)
from coulombook.uncertainty.scatter import pool


@dataclass(frozen=True, slots=True)
class Pair:
    """One catalyst against another. ``ratio`` is NaN where a mean is not above zero.

    ``p`` is that of equal means, ``p_adjusted`` after Holm over all pairs of the family; ``effect`` is the difference
    in standard deviations of a single run.
    """

    one: str
    other: str
    difference: float
    u: float
    low: float
    high: float
    ratio: float
    ratio_low: float
    ratio_high: float
    degrees_of_freedom: float
    p: float
    p_adjusted: float
    effect: float


@dataclass(frozen=True, slots=True, eq=False)
class Contest:
    """Catalysts at one level, best mean first, with all their pairs."""

    catalysts: tuple[str, ...]
    mean: FloatArray
    u: FloatArray
    runs: tuple[int, ...]
    pairs: tuple[Pair, ...]

    def tied_with_best(self, alpha: float) -> tuple[str, ...]:
        """Catalysts that the data cannot tell from the best one."""
        best = self.catalysts[0]
        return tuple(pair.other for pair in self.pairs if pair.one == best and not pair.p_adjusted < alpha)


def contest(x: Number, catalyst: Sequence[str], level: float = 0.95) -> Contest:
    """Compare catalysts by runs of one level.

    The scatter between runs is taken as common to the catalysts of the level, so that a few replicates of each are
    enough to know it; beyond what the runs' own uncertainties explain it enters with its degrees of freedom
    (Welch-Satterthwaite).

    Parameters
    ----------
    x : (n_runs,) numbers
        One quantity of each run.
    catalyst : (n_runs,) sequence of str
    level : float
        Level of confidence of the intervals.
    """
    names = list(dict.fromkeys(catalyst))
    place = {name: number for number, name in enumerate(names)}
    group = np.array([place[name] for name in catalyst], dtype=np.intp)
    found = pool(x, group, len(names))
    scatter = _common_scatter(x, group, len(names))
    mean, count = nominal(found.mean), found.count
    u = np.sqrt(standard_uncertainty(found.mean) ** 2 + scatter.unexplained / count)
    order = sorted(range(len(names)), key=lambda number: -mean[number])
    ranked = [(a, b) for place_a, a in enumerate(order) for b in order[place_a + 1 :]]
    raw = [_pair(found.mean, count, scatter, names, a, b, level) for a, b in ranked]
    adjusted = holm([pair.p for pair in raw])
    pairs = tuple(replace(pair, p_adjusted=p) for pair, p in zip(raw, adjusted, strict=True))
    return Contest(
        tuple(names[number] for number in order),
        mean[order],
        u[order],
        tuple(int(count[number]) for number in order),
        pairs,
    )


@dataclass(frozen=True, slots=True)
class _Scatter:
    """Variance of a run about its catalyst's mean: all of it, and what the runs' uncertainties leave unexplained."""

    variance: float
    unexplained: float
    degrees_of_freedom: int


def _common_scatter(x: Number, group: IntArray, groups: int) -> _Scatter:
    pooled = pool(x, group, groups)
    freedom = int((pooled.count - 1).sum())
    if freedom == 0:
        return _Scatter(math.nan, 0.0, 0)
    variance = float((pooled.residual**2).sum()) / freedom
    explained = 0.0
    if isinstance(x, Linearised):
        n = len(group)
        own = standard_uncertainty(x) ** 2
        averaging = sparse_map(group, np.arange(n), 1.0 / pooled.count[group], (groups, n))
        within = (averaging @ own - standard_uncertainty(linear_map(averaging, x)) ** 2) * pooled.count
        explained = float(within.sum()) / freedom
    return _Scatter(variance, max(0.0, variance - explained), freedom)


def _pair(
    mean: Number, count: FloatArray, scatter: _Scatter, names: Sequence[str], a: int, b: int, level: float
) -> Pair:
    one, other = (gather(mean, np.array([number], dtype=np.intp)) for number in (a, b))
    weight = 1.0 / count[a] + 1.0 / count[b]
    value, u, freedom = _with_scatter(one - other, scatter, weight)
    half = _quantile(freedom, level) * u
    p = math.nan if not u > 0 else _tail(value / u, freedom)
    x_a, x_b = float(nominal(one)[0]), float(nominal(other)[0])
    ratio = ratio_low = ratio_high = math.nan
    if x_a > 0 and x_b > 0:
        # on the logarithm, where a relative error that both share cancels exactly
        relative = 1.0 / (count[a] * x_a**2) + 1.0 / (count[b] * x_b**2)
        logarithm, u_log, freedom_log = _with_scatter(np.log(one) - np.log(other), scatter, relative)
        reach = _quantile(freedom_log, level) * u_log
        ratio, ratio_low, ratio_high = (math.exp(logarithm + shift) for shift in (0.0, -reach, reach))
    deviation = math.sqrt(scatter.variance) if scatter.variance > 0 else math.nan
    return Pair(
        names[a], names[b], value, u, value - half, value + half, ratio, ratio_low, ratio_high, freedom, p, p,
        value / deviation,
    )  # fmt: skip


def _with_scatter(x: Number, scatter: _Scatter, weight: float) -> tuple[float, float, float]:
    """Value, standard uncertainty and degrees of freedom of a contrast whose runs weigh ``weight`` in its variance."""
    square = float(standard_uncertainty(x)[0]) ** 2 + scatter.unexplained * weight
    freedom = math.inf
    if scatter.unexplained > 0:
        freedom = scatter.degrees_of_freedom * square**2 / (scatter.variance * weight) ** 2
    return float(nominal(x)[0]), math.sqrt(square), freedom


def _quantile(freedom: float, level: float) -> float:
    # Student's t with more than 1e9 degrees of freedom is the normal distribution to nine digits
    return student_quantile(min(freedom, 1e9), level)


def _tail(t: float, freedom: float) -> float:
    return student_p(t, min(freedom, 1e9))
