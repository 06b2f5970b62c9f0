"""Spearman's rank correlation, its probability by permutations, and its interval.

Electrodes of one catalyst are alike in more than roughness and no independent pairs: chance is told by orders of the
catalysts then (Hurlbert, Ecol. Monogr. 54 (1984) 187, on replicates that are none).

Sources: Spearman, Am. J. Psychol. 15 (1904) 72; Bonett & Wright, Psychometrika 65 (2000) 23 (the variance of Fisher's z
for ranks, (1 + rho^2/2)/(n - 3)); Student's t with n - 2 degrees of freedom for more than eight pairs (Zar, J. Am.
Stat. Assoc. 67 (1972) 578). All from memory.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import lru_cache
from itertools import permutations

import numpy as np
from numpy.typing import NDArray

from coulombook.compare.statistics import student_p

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

FEWEST = 5  # pairs: with four, even a perfect order comes by chance once in twelve
MOST_EXACT = 8  # pairs whose orders are counted out: 8! = 40,320
EXACT, STUDENT = "permutations", "Student's t"


@dataclass(frozen=True, slots=True)
class RankCorrelation:
    """Spearman's coefficient with its two-sided probability under no relation, and its interval.

    NaN wherever it cannot be told: nothing varies, or there are too few independent pairs for an interval.
    """

    count: int
    independent: int  # pairs that chance may exchange
    rho: float
    p: float
    method: str
    low: float
    high: float


def spearman(x: FloatArray, y: FloatArray, level: float = 0.95) -> RankCorrelation:
    """Rank correlation of pairs, equal values sharing the mean of their ranks.

    An interval by Fisher's z is endless for a perfect order: such a coefficient is taken half a step of ranks short of
    1, with the ends still at 1 (common practice for proportions, here by analogy, no source).

    Examples
    --------
    >>> found = spearman(np.array([1.0, 8.0, 57.0, 58.0, 84.0]), np.array([0.9, 0.2, 2.4, 2.3, 4.3]))
    >>> round(found.rho, 6), round(found.p, 4)  # 1 - 6 (1 + 1 + 1 + 1 + 0)/(5 x 24), and 16 of 120 orders
    (0.8, 0.1333)
    """
    count = len(x)
    ranks = midranks(x), midranks(y)
    rho = _correlation(*ranks)
    if not math.isfinite(rho):
        return RankCorrelation(count, count, math.nan, math.nan, "", math.nan, math.nan)
    exact = count <= MOST_EXACT
    p = _by_permutations(*ranks) if exact else _by_student(rho, count)
    low, high = interval(rho, count, level)
    return RankCorrelation(count, count, rho, p, EXACT if exact else STUDENT, low, high)


def spearman_of_kinds(x: FloatArray, y: FloatArray, kind: IntArray, level: float = 0.95) -> RankCorrelation:
    """Rank correlation of pairs of which those of one kind, (n,), are no independent ones.

    The coefficient is that of all pairs. Its probability is that of the means of the kinds, and its interval has as
    many pairs as there are kinds. Pairs that are all of one kind, or each of another, are independent.
    """
    whole = spearman(x, y, level)
    _, kind = np.unique(kind, return_inverse=True)
    kinds = int(kind.max(initial=-1)) + 1
    if kinds in (1, len(x)) or not math.isfinite(whole.rho):
        return whole
    count = np.bincount(kind)
    of_means = spearman(np.bincount(kind, x) / count, np.bincount(kind, y) / count, level)
    low, high = interval(whole.rho, kinds, level)
    return replace(whole, independent=kinds, p=of_means.p, method=of_means.method, low=low, high=high)


def midranks(x: FloatArray) -> FloatArray:
    """Ranks from 1, equal values sharing their mean.

    >>> midranks(np.array([3.0, 1.0, 3.0]))
    array([2.5, 1. , 2.5])
    """
    _, inverse, counts = np.unique(x, return_inverse=True, return_counts=True)
    last = np.cumsum(counts)
    result: FloatArray = (last - 0.5 * (counts - 1))[inverse]
    return result


def interval(rho: float, count: int, level: float) -> tuple[float, float]:
    """Interval of a rank correlation by Fisher's z; NaN for fewer than five pairs."""
    from scipy.special import ndtri

    if count < FEWEST:
        return math.nan, math.nan
    # the sum of squared differences of ranks goes in steps of two
    nearest = 1.0 - 6.0 / (count**3 - count)
    held = min(max(rho, -nearest), nearest)
    z = math.atanh(held)
    reach = float(ndtri(0.5 + 0.5 * level)) * math.sqrt((1.0 + 0.5 * held**2) / (count - 3))
    low, high = math.tanh(z - reach), math.tanh(z + reach)
    return (-1.0 if rho < -nearest else low), (1.0 if rho > nearest else high)


def _correlation(a: FloatArray, b: FloatArray) -> float:
    a, b = a - a.mean(), b - b.mean()
    size = math.sqrt(float(a @ a) * float(b @ b))
    return float(a @ b) / size if size > 0 else math.nan


def _by_permutations(a: FloatArray, b: FloatArray) -> float:
    """Share of all orders whose coefficient is as far from zero."""
    a, b = a - a.mean(), b - b.mean()
    sums = np.abs(b[_orders(len(b))] @ a)
    # ranks are halves: what rounding leaves between equal sums is far below a quarter
    return float(np.mean(sums >= abs(float(a @ b)) - 0.125))


@lru_cache(maxsize=MOST_EXACT)
def _orders(count: int) -> NDArray[np.intp]:
    return np.array(list(permutations(range(count))), dtype=np.intp)


def _by_student(rho: float, count: int) -> float:
    if abs(rho) >= 1.0:
        return 0.0
    return student_p(rho * math.sqrt((count - 2) / (1.0 - rho**2)), count - 2)
