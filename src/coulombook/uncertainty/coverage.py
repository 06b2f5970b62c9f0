"""Coverage intervals from draws, and whether the law of propagation may be used (JCGM 101:2008, clauses 7 and 8)."""

from __future__ import annotations

import math

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
    value: FloatArray, u: FloatArray, factor: float, low: FloatArray, high: FloatArray
) -> NDArray[np.bool_]:
    """Whether value +- factor u agrees with the drawn interval within the numerical tolerance (JCGM 101:2008, 8.1)."""
    tolerance = np.array([numerical_tolerance(one) for one in u])
    with np.errstate(invalid="ignore"):
        below = np.abs(value - factor * u - low) <= tolerance
        above = np.abs(value + factor * u - high) <= tolerance
    result: NDArray[np.bool_] = below & above
    return result
