"""Tafel slopes and onset potentials from the partial currents of a catalyst's levels.

Cathodic currents count as positive, so that ln j rises as the potential falls; the Tafel slope is given as the positive
number of volts per decade, dE/d(log10 j) with its sign changed. An exchange current density would be an extrapolation
over many decades and is not given.

Which levels are straight is decided by evidence. A bend is a square beside the line, or a break of the line at a level,
with three levels before it; the shapes are tried together (Bonferroni). Where chance makes no such bend, the highest
overpotential is taken off until none is left, judged more strictly then, for the series is known to bend. At least
three levels are kept.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from coulombook.compare.trend import Lines, Points, fit_lines
from coulombook.uncertainty.linearised import (
    FloatArray,
    IntArray,
    Number,
    gather,
    nominal,
    standard_uncertainty,
)
from coulombook.uncertainty.scatter import pool

FEWEST_LEVELS = 3
BEND_CHANCE = 0.01  # below which a bend is no chance; the level of the usual test of linearity, ISO 8466-1
_BENT_CHANCE = (
    0.157  # likewise in a series that is known to bend: Akaike's criterion takes the bend from there on
)
_BREAKS = 6  # that are tried at most

STRAIGHT, FALLS, RISES = "straight", "falls away", "rises away"
FEW, BENT, FLAT = "cannot tell", "no straight range", "no rise"

WITHIN, BELOW, ABOVE = "within the levels", "below the lowest level", "not reached"


class Tafel(NamedTuple):
    """Straight ranges of series, (n_series,) each; NaN where there is none.

    ``low`` and ``high`` are the ends of the interval of the slope, ``high`` infinite where the current may as well not
    rise at all. ``levels`` counts those of the straight range, from the lowest overpotential. ``bend_p`` is the
    probability that chance alone bends the whole series so far, and ``falls`` tells whether it bends downwards.
    """

    slope_volt: FloatArray
    u_slope_volt: FloatArray
    low_volt: FloatArray
    high_volt: FloatArray
    levels: IntArray
    bend_p: FloatArray
    falls: FloatArray
    verdict: tuple[str, ...]


def tafel(
    points: Points, series: IntArray, level: IntArray, n_series: int, confidence: float = 0.95
) -> Tafel:
    """Tafel slopes of series of runs.

    Parameters
    ----------
    points : Points
        Of runs, (n_runs,): x the potential [V], y the natural logarithm of a current density, in any unit.
    series : (n_runs,) int array
        The series of each run, ascending.
    level : (n_runs,) int array
        The level of each run within its series: 0, 1, ... from the least negative potential.
    n_series : int
    confidence : float
        Level of confidence of the intervals.
    """
    count = np.zeros(n_series, dtype=np.intp)
    np.maximum.at(count, series, level + 1)
    slope, u, half, bend_p, falls = (np.full(n_series, np.nan) for _ in range(5))
    kept = np.zeros(n_series, dtype=np.intp)
    tried = np.where(count >= FEWEST_LEVELS, count, 0)
    while (ahead := np.flatnonzero(tried)).size:
        found = _lines_of(points, series, level, ahead, tried)
        p, downwards = _bend(found)
        whole = tried[ahead] == count[ahead]
        bend_p[ahead[whole]], falls[ahead[whole]] = p[whole], downwards[whole]
        straight = p >= np.where(whole, BEND_CHANCE, _BENT_CHANCE)
        done = ahead[straight]
        slope[done], u[done] = found.slope.value[straight], found.slope.u[straight]
        half[done] = found.slope.half_width(confidence)[straight]
        kept[done] = tried[done]
        # a level at a time; of very many levels a twentieth
        tried[ahead] -= np.maximum(1, tried[ahead] // 20)
        # nothing tells how far chance bends a series: fewer levels would tell no more
        tried[ahead[straight | np.isnan(p) | (tried[ahead] < FEWEST_LEVELS)]] = 0
    rising = slope + half < 0
    with np.errstate(divide="ignore", invalid="ignore"):
        per_decade = np.where(rising, -math.log(10.0) / slope, np.nan)
        low = math.log(10.0) / np.maximum(half - slope, 0.0)
        high = np.where(rising, -math.log(10.0) / (slope + half), np.where(np.isnan(slope), np.nan, np.inf))
        u_per_decade = per_decade * u / np.abs(slope)
    verdict = []
    for number in range(n_series):
        if math.isnan(bend_p[number]):
            verdict.append(FEW)
        elif not kept[number]:
            verdict.append(BENT)
        elif not rising[number]:
            verdict.append(FLAT)
        elif kept[number] == count[number]:
            verdict.append(STRAIGHT)
        else:
            verdict.append(FALLS if falls[number] else RISES)
    return Tafel(per_decade, u_per_decade, low, high, kept, bend_p, falls, tuple(verdict))


def _lines_of(points: Points, series: IntArray, level: IntArray, ahead: IntArray, tried: IntArray) -> Lines:
    """Lines through the first ``tried`` levels of the series ``ahead``."""
    place = np.full(len(tried), -1, dtype=np.intp)
    place[ahead] = np.arange(ahead.size)
    rows = np.flatnonzero(level < tried[series])
    group = place[series[rows]]
    shapes = _bends(points.x[rows], level[rows], group, tried[ahead])
    return fit_lines(points, rows, group, ahead.size, shapes=shapes)


def _bends(x: FloatArray, level: IntArray, group: IntArray, levels: IntArray) -> FloatArray:
    """Shapes that bend a line: a square, and breaks at levels; those that a group has no room for are zero."""
    first = np.cumsum(levels) - levels
    place = first[group] + level
    mean = np.bincount(place, weights=x) / np.bincount(place)
    shapes = [(x - mean[first][group]) ** 2]
    most = int(min(_BREAKS, levels.max() - FEWEST_LEVELS))
    for number in range(most):
        # breaks from the third level to the last but one, spread evenly where there are more than are tried
        room = levels - FEWEST_LEVELS
        at = FEWEST_LEVELS - 1 + np.where(room > most, number * (room - 1) // max(most - 1, 1), number)
        after = np.maximum(mean[first + np.minimum(at, levels - 1)][group] - x, 0.0)
        shapes.append(np.where((number < room)[group], after, 0.0))
    return np.stack(shapes)


def _bend(found: Lines) -> tuple[FloatArray, FloatArray]:
    """Probability of the clearest bend by chance, for all shapes tried, and whether it leads downwards; NaN without."""
    p = np.stack([one.p for one in found.beside])
    known = ~np.isnan(p)
    # half of what is allowed to chance goes to the square, the rest to the breaks alike
    breaks = known[1:].sum(axis=0)
    p[0] *= np.where(breaks > 0, 2.0, 1.0)
    p[1:] *= 2.0 * breaks
    clearest = np.argmin(np.where(known, p, np.inf), axis=0)
    every = np.arange(p.shape[1])
    value = np.stack([one.value for one in found.beside])[clearest, every]
    return np.minimum(p[clearest, every], 1.0), (value < 0).astype(np.float64)


class Onset(NamedTuple):
    """Potentials at which series pass a current density, (n_series,); NaN where they do not within their levels."""

    potential_volt: FloatArray
    u_potential_volt: FloatArray
    verdict: tuple[str, ...]


def onset(
    potential_volt: Number,
    log_current: Number,
    series: IntArray,
    level: IntArray,
    n_series: int,
    log_threshold: float,
) -> Onset:
    """Potential at which the current of each series first passes a threshold, from the least negative potential on.

    Between the two neighbouring levels, replicates averaged, ln j is taken as linear in the potential: monotone, and
    never beyond the levels. All errors take part, those that shift every potential with them.

    Parameters
    ----------
    potential_volt, log_current : (n_runs,) numbers
        Potential and natural logarithm of the current density of each run.
    series, level : (n_runs,) int arrays
        As in `tafel`.
    log_threshold : float
        Logarithm of the threshold, in the same unit.
    """
    first = np.zeros(n_series + 1, dtype=np.intp)
    np.maximum.at(first, series + 1, level + 1)
    first = np.cumsum(first)
    e, y = (pool(one, first[series] + level, int(first[-1])) for one in (potential_volt, log_current))
    mean = nominal(y.mean)
    verdict, above, held = [], [], []
    for number in range(n_series):
        passed = np.flatnonzero(mean[first[number] : first[number + 1]] >= log_threshold)
        verdict.append(ABOVE if not passed.size else WITHIN if passed[0] else BELOW)
        if verdict[-1] == WITHIN:
            above.append(first[number] + passed[0])
            held.append(number)
    value, u = np.full(n_series, np.nan), np.full(n_series, np.nan)
    if held:
        b = np.array(above, dtype=np.intp)
        a = b - 1
        e_a, e_b, y_a, y_b = gather(e.mean, a), gather(e.mean, b), gather(y.mean, a), gather(y.mean, b)
        found = e_a + (e_b - e_a) * ((log_threshold - y_a) / (y_b - y_a))
        share = (log_threshold - mean[a]) / (mean[b] - mean[a])
        steep = (nominal(e_b) - nominal(e_a)) / (mean[b] - mean[a])
        scatter = y.unexplained / y.count
        square = steep**2 * ((1.0 - share) ** 2 * scatter[a] + share**2 * scatter[b])
        value[held] = nominal(found)
        u[held] = np.sqrt(standard_uncertainty(found) ** 2 + square)
    return Onset(value, u, tuple(verdict))
