"""Drift of a result over a run: a line through its injections, and when it would have lost a fifth.

The line is an assumption, and the time to 80 % of the start value an extension of it wherever that lies beyond the run.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from coulombook.compare.trend import Estimate, Points, fit_lines
from coulombook.uncertainty.linearised import FloatArray, IntArray, Number

FEWEST_INJECTIONS = 4
LOST = 0.2  # share of the start value whose loss is timed
FARTHEST = 3.0  # lengths of the injections' span up to which a line may be extended

STEADY, WITHIN, EXTENDED, BEYOND = "not reached", "within the run", "by extension", "far beyond the run"


class Drift(NamedTuple):
    """Lines against time, (n_groups,) each.

    ``start`` is the line's value at the first point, ``mean`` the mean with its uncertainty, ``slope`` per unit of
    time, ``span`` the time from the first to the last point. ``lost`` is the time from the first point at which the
    line has lost `LOST` of its start value, ``earliest`` and ``latest`` its interval: the latest is infinite where the
    slope may as well be zero, and ``lost`` is NaN there.
    """

    start: FloatArray
    mean: Estimate
    slope: Estimate
    span: FloatArray
    lost: FloatArray
    earliest: FloatArray
    latest: FloatArray
    verdict: tuple[str, ...]


def drift(
    time: FloatArray,
    y: Number,
    group: IntArray,
    groups: int,
    own: NDArray[np.bool_],
    kind: IntArray,
    confidence: float = 0.95,
) -> Drift:
    """Drift of each group of points.

    A few injections of a run tell little of how they scatter. What the injections of one kind of result (a product)
    scatter about their lines in all the runs of a day tells more, and counts for each of them, but for a run that
    scatters clearly more than the others: that one is judged by itself.

    Parameters
    ----------
    time : (n,) float array
    y : (n,) numbers
    group : (n,) int array
        Ascending; every group holds `FEWEST_INJECTIONS` points at least, at two different times.
    own : (n_errors,) bool array
        Which errors no two points of a group share.
    kind : (n_groups,) int array
        What each group is a result of.
    confidence : float
        Level of confidence of the intervals.
    """
    lines = fit_lines(Points.of(time, y, own), np.arange(len(time)), group, groups, kind=kind)
    first, last = np.full(groups, np.inf), np.full(groups, -np.inf)
    np.minimum.at(first, group, time)
    np.maximum.at(last, group, time)
    relative = lines.relative_slope(first)
    half = relative.half_width(confidence)
    steepest, flattest = relative.value - half, relative.value + half
    start = lines.mean.value + lines.slope.value * (first - lines.centre)
    # a value that is not above zero has no share to lose
    known = start > 0
    with np.errstate(divide="ignore"):
        earliest = np.where(known, np.where(steepest < 0, -LOST / steepest, np.inf), np.nan)
        falling = known & (flattest < 0)
        lost = np.where(falling, -LOST / relative.value, np.nan)
        latest = np.where(known, np.where(falling, -LOST / flattest, np.inf), np.nan)
    span = last - first
    verdict = np.select([~falling, lost <= span, lost <= FARTHEST * span], [STEADY, WITHIN, EXTENDED], BEYOND)
    return Drift(start, lines.mean, lines.slope, span, lost, earliest, latest, tuple(map(str, verdict)))
