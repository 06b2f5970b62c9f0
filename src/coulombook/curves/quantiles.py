"""Quantiles and tails of the distributions the judgements need, from scipy.special.

scipy.special loads in a third of the time of scipy.stats and is imported where it is used.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]


def student_quantile(probability: float, freedom: ArrayLike) -> FloatArray:
    """Quantile of Student's t; of the normal distribution where ``freedom`` is infinite. NaN where it is zero."""
    from scipy.special import ndtri, stdtrit

    freedom = np.asarray(freedom, dtype=float)
    usable = np.isfinite(freedom) & (freedom > 0.0)
    found = stdtrit(np.where(usable, freedom, 1.0), probability)
    result: FloatArray = np.where(usable, found, np.where(np.isposinf(freedom), ndtri(probability), np.nan))
    return result


def student_tail(t: ArrayLike, freedom: float) -> FloatArray:
    """Probability of a value at or above |t| on either side (two-sided p) of Student's t."""
    from scipy.special import stdtr

    result: FloatArray = np.asarray(2.0 * stdtr(freedom, -np.abs(t)))
    return result


def f_quantile(probability: float, upper: float, lower: float) -> float:
    """Quantile of Fisher's F with ``upper`` and ``lower`` degrees of freedom."""
    from scipy.special import fdtri

    return float(fdtri(upper, lower, probability))


def f_tail(value: float, upper: float, lower: float) -> float:
    """Probability of Fisher's F at or above ``value``."""
    from scipy.special import fdtrc

    return 0.0 if math.isinf(value) else float(fdtrc(upper, lower, value))


def chi2_tail(value: float, freedom: float) -> float:
    """Probability of chi-square at or above ``value``."""
    from scipy.special import chdtrc

    return float(chdtrc(freedom, value))


def power_of_t(shift: float, threshold: float, freedom: float) -> float:
    """Probability that a t with noncentrality ``shift`` exceeds ``threshold``."""
    from scipy.special import nctdtr, ndtr

    if math.isinf(freedom):
        return float(ndtr(shift - threshold))
    return 1.0 - float(nctdtr(freedom, shift, threshold))
