"""Coverage intervals from draws, and whether the law of propagation may be used (JCGM 101:2008, clauses 7 and 8)."""

from __future__ import annotations

import math
from dataclasses import dataclass
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from coulombook.uncertainty.linearised import FloatArray

SIGNIFICANT_DIGITS = 2


def shortest_interval(draws: FloatArray, level: float) -> tuple[FloatArray, FloatArray]:
    """Shortest interval that holds a share ``level`` of the draws (JCGM 101:2008, 7.7.4).

    Parameters
    ----------
    draws : (n_outputs, n_draws) float array
        Sorted in place along the last axis. A row with a NaN gives NaN.
    level : float
        Level of confidence, between 0 and 1.

    Returns
    -------
    low, high : (n_outputs,) float arrays
    """
    draws.sort(axis=-1)
    n = draws.shape[-1]
    span = min(max(round(level * n), 1), n - 1)
    width = draws[:, span:] - draws[:, : n - span]
    start = np.argmin(width, axis=-1)
    rows = np.arange(len(draws))
    # NaN sorts to the end, so that the last draw tells
    unknown = np.isnan(draws[:, -1])
    return (
        np.where(unknown, np.nan, draws[rows, start]),
        np.where(unknown, np.nan, draws[rows, start + span]),
    )


@dataclass(frozen=True, slots=True, eq=False)
class Coverage:
    """What draws of some outputs say, (n_outputs,) each; NaN where a draw is."""

    deviation: FloatArray  # standard deviation
    low: FloatArray  # shortest coverage interval
    high: FloatArray
    low_quantile: FloatArray  # interval that leaves out as much above as below
    high_quantile: FloatArray


def coverage(draws: FloatArray, level: float) -> Coverage:
    """Standard deviation and intervals at a level of confidence, of draws (n_outputs, n_draws).

    The draws are sorted in place, one output after the other, so that an output's draws stay in fast memory while they
    are looked at.
    """
    found = np.empty((5, len(draws)))
    for row, one in enumerate(draws):
        pair = one[None, :]
        found[1, row], found[2, row] = (end[0] for end in shortest_interval(pair, level))
        found[3, row], found[4, row] = (end[0] for end in symmetric_interval(pair, level))
        # about a draw near the middle, so that nothing cancels
        about = one - one[one.size // 2]
        found[0, row] = math.sqrt(max(about @ about - about.sum() ** 2 / one.size, 0.0) / (one.size - 1))
    return Coverage(*found)


def numerical_tolerance(u: float, digits: int = SIGNIFICANT_DIGITS) -> float:
    """Half a unit of the last of ``digits`` significant digits of u (JCGM 101:2008, 7.9.2); u's unit.

    >>> numerical_tolerance(0.0754), numerical_tolerance(12.3)
    (0.0005, 0.5)
    """
    if not u > 0 or not math.isfinite(u):
        return math.nan
    exponent = math.floor(math.log10(u)) - digits + 1
    # rounding to the digits may carry into the next decade: 0.0996 has the digits 0.10
    if round(u / 10.0**exponent) >= 10**digits:
        exponent += 1
    return 0.5 * 10.0**exponent


def propagation_validated(
    value: FloatArray, u: FloatArray, level: float, low: FloatArray, high: FloatArray, n_draws: int
) -> NDArray[np.bool_]:
    """Whether value +- k u agrees with the drawn interval (JCGM 101:2008, 8.1).

    Each end may differ by the numerical tolerance of u (two digits) and by twice the sampling error that n_draws leave
    to a quantile of a normal distribution.

    Parameters
    ----------
    value, u : (n_outputs,) float arrays
        By the law of propagation.
    level : float
        Level of confidence.
    low, high : (n_outputs,) float arrays
        Quantiles (1 - level)/2 and (1 + level)/2 of the draws.
    n_draws : int
    """
    normal = NormalDist()
    tail = (1.0 - level) / 2.0
    factor = normal.inv_cdf(1.0 - tail)
    sampling = math.sqrt(tail * (1.0 - tail) / n_draws) / normal.pdf(factor)
    tolerance = np.array([numerical_tolerance(one) for one in u.tolist()]) + 2.0 * sampling * u
    with np.errstate(invalid="ignore"):
        below = np.abs(value - factor * u - low) <= tolerance
        above = np.abs(value + factor * u - high) <= tolerance
    result: NDArray[np.bool_] = below & above
    return result


def symmetric_interval(sorted_draws: FloatArray, level: float) -> tuple[FloatArray, FloatArray]:
    """Quantiles (1 - level)/2 and (1 + level)/2 of draws (n_outputs, n_draws) that are sorted already; NaN as above."""
    n = sorted_draws.shape[-1]
    tail = (1.0 - level) / 2.0
    low = min(max(round(tail * n), 0), n - 1)
    # NaN sorts to the end, so that the last draw tells
    unknown = np.isnan(sorted_draws[:, -1])
    return (
        np.where(unknown, np.nan, sorted_draws[:, low]),
        np.where(unknown, np.nan, sorted_draws[:, n - 1 - low]),
    )
