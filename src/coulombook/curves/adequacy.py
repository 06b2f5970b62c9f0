"""Tests of a calibration curve: its form, its replicates, the scatter of its points.

Each takes the points with the covariance V of their responses, known up to a common factor: the diagonal of the
weights, and what the errors of the standards add. With V = I they are the tests of the textbooks. None means
there is nothing to test: too few points, no replicates, or no scatter at all.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coulombook.curves.fit import fit_polynomial, scaled_design
from coulombook.curves.quantiles import chi2_tail, f_quantile, f_tail, student_tail
from coulombook.curves.weights import point_weights

FloatArray = NDArray[np.float64]

# a residual of this share of the responses is the rounding of the fit, not scatter
ROUNDING = 1e-12
FEWEST_FOR_RANKS = 5
COMPARED_WEIGHTS = ("equal", "1/x", "1/x^2")


@dataclass(frozen=True, slots=True)
class FTest:
    """A test whose statistic follows Fisher's F under the null hypothesis."""

    value: float
    upper: int  # degrees of freedom
    lower: int
    p: float

    def critical(self, level: float = 0.99) -> float:
        """The value that is passed with probability 1 - level under the null hypothesis."""
        return f_quantile(level, self.upper, self.lower)


@dataclass(frozen=True, slots=True)
class Homogeneity:
    """Test of the scatter's evenness; ``method`` is "Bartlett" (of replicates) or "rank correlation" (of residuals)."""

    value: float
    p: float
    method: str


@dataclass(frozen=True, slots=True, eq=False)
class Whitened:
    """A least-squares fit in coordinates where all responses have unit variance (up to a common factor)."""

    root: FloatArray  # (n, n) lower Cholesky factor of V
    q: FloatArray  # (n, p)
    residual: FloatArray  # (n,)
    square: float  # sum of squared residuals
    rounding: float  # what rounding alone would leave of it


def whiten(x: FloatArray, y: FloatArray, powers: Sequence[int], covariance: FloatArray) -> Whitened:
    """Generalised least squares of a polynomial with chosen powers."""
    powers = tuple(powers)
    centre, scale, _ = scaled_design(x, powers)
    root = np.asarray(np.linalg.cholesky(covariance), dtype=np.float64)
    basis = np.linalg.solve(root, ((x - centre) / scale)[:, None] ** np.array(powers))
    target = np.linalg.solve(root, y)
    q = np.linalg.qr(basis)[0]
    residual = target - q @ (q.T @ target)
    # once more: the first residual holds the rounding of the projection
    residual = residual - q @ (q.T @ residual)
    rounding = (ROUNDING * float(np.linalg.norm(target))) ** 2
    return Whitened(root, q, residual, float(residual @ residual), rounding)


def mandel(x: FloatArray, y: FloatArray, powers: Sequence[int], covariance: FloatArray) -> FTest | None:
    """Does a square term lower the residual variance more than chance would?

    TV = [(n - p) s1^2 - (n - p - 1) s2^2] / s2^2 against F(1, n - p - 1); for the line p = 2, the linearity test of
    Mandel (The Statistical Analysis of Experimental Data, 1964) and ISO 8466-1. A line through zero is tested
    against a quadratic through zero; a quadratic tells by the same comparison with the line whether its square term is
    needed.
    """
    without = tuple(power for power in powers if power < 2)
    freedom = x.size - len(without) - 1
    different = np.unique(x if 0 in without else x[x != 0.0]).size
    if freedom < 1 or different < len(without) + 1:
        return None
    simple, bent = (whiten(x, y, chosen, covariance) for chosen in (without, (*without, 2)))
    if simple.square <= simple.rounding:
        return None
    gain = max(simple.square - bent.square, 0.0)
    value = gain / (bent.square / freedom) if bent.square > bent.rounding else math.inf
    return FTest(value, 1, freedom, f_tail(value, 1, freedom))


def lack_of_fit(
    x: FloatArray, y: FloatArray, powers: Sequence[int], variance: FloatArray, moved: FloatArray
) -> FTest | None:
    """Do the means of the levels deviate from the curve more than their replicates explain?

    F = [SS(lack of fit)/(k - p)] / [SS(pure error)/(n - k)], weighted by 1/variance (Draper & Smith, Applied
    Regression Analysis, chapter 1). Errors of the standards move whole levels: they are added to the covariance of the
    means, which leaves F as it is when there are none, and a little cautious otherwise.

    Parameters
    ----------
    variance : (n_points,) float array
        Variance of each response, up to a common factor.
    moved : (n_points, n_errors) float array
        What each error of the standards does to each response (slope times their factor).
    """
    powers = tuple(powers)
    levels, member = np.unique(x, return_inverse=True)
    member = member.reshape(-1)
    k, size = levels.size, len(powers)
    inner = x.size - k
    if inner < 1 or k - size < 1:
        return None
    weight = 1.0 / variance
    total = np.bincount(member, weights=weight)
    mean = np.bincount(member, weights=weight * y) / total
    pure = float(weight @ np.square(y - mean[member])) / inner
    if pure <= ROUNDING**2 * float(weight @ np.square(y)):
        return None
    moved_mean = np.zeros((k, moved.shape[1]))
    np.add.at(moved_mean, member, weight[:, None] * moved)
    moved_mean /= total[:, None]
    between = whiten(levels, mean, powers, np.diag(pure / total) + moved_mean @ moved_mean.T)
    value = between.square / (k - size)
    return FTest(value, k - size, inner, f_tail(value, k - size, inner))


def homogeneity(
    x: FloatArray, y: FloatArray, variance: FloatArray, studentised: FloatArray
) -> Homogeneity | None:
    """Is the scatter, over the standard deviation the weights assume, the same all along the curve?

    With replicates on two levels or more Bartlett's test (Proc. R. Soc. Lond. A 160 (1937) 268), for
    Levene's loses its size with three replicates, whose median always is one of them. Otherwise, and when the
    replicates of a level do not differ at all, Spearman's rank correlation of the absolute studentised residuals with
    x.
    """
    member = np.unique(x, return_inverse=True)[1].reshape(-1)
    count = np.bincount(member)
    level = y / np.sqrt(variance)
    mean = np.bincount(member, weights=level) / count
    spread = np.bincount(member, weights=np.square(level - mean[member]))
    several = count > 1
    if several.sum() > 1 and (spread[several] > 0.0).all():
        freedom, squares = (count - 1.0)[several], spread[several]
        k, total = freedom.size, float(freedom.sum())
        pooled = math.log(float(squares.sum()) / total)
        raw = total * pooled - float(freedom @ np.log(squares / freedom))
        value = raw / (1.0 + (float(np.sum(1.0 / freedom)) - 1.0 / total) / (3.0 * (k - 1)))
        return Homogeneity(value, chi2_tail(max(value, 0.0), k - 1), "Bartlett")
    size = np.abs(studentised)
    known = np.isfinite(size)
    if known.sum() < FEWEST_FOR_RANKS or np.unique(x[known]).size < 3 or np.ptp(size[known]) == 0.0:
        return None
    correlation = float(np.corrcoef(_ranks(size[known]), _ranks(x[known]))[0, 1])
    left = 1.0 - correlation**2
    freedom_of_t = int(known.sum()) - 2
    t = correlation * math.sqrt(freedom_of_t / left) if left > 0.0 else math.copysign(math.inf, correlation)
    return Homogeneity(correlation, float(student_tail(t, freedom_of_t)), "rank correlation")


def weights_aic(x: FloatArray, y: FloatArray, powers: Sequence[int]) -> dict[str, float]:
    """Akaike's criterion of the weightings that can be compared, the lower the better.

    -2 ln(likelihood) + 2 (p + 1) for independent normal responses of variance s^2, s^2 x and s^2 x^2, s^2 at its
    maximum. Those in x are left out when a standard is at or below zero; empty without scatter.
    """
    found = {}
    n = x.size
    for weights in COMPARED_WEIGHTS if (x > 0.0).all() else COMPARED_WEIGHTS[:1]:
        w = point_weights(x, y, weights)
        fit = fit_polynomial(x, y, powers, w)
        square = fit.residual_sd**2 * fit.degrees_of_freedom
        if square <= (ROUNDING**2) * float(w @ np.square(y)):
            return {}
        found[weights] = (
            n * math.log(2.0 * math.pi * square / n)
            + n
            - float(np.sum(np.log(w)))
            + 2.0 * (len(tuple(powers)) + 1)
        )
    return found


def _ranks(values: FloatArray) -> FloatArray:
    """Ranks from 1, equal values sharing their mean rank."""
    _, member, count = np.unique(values, return_inverse=True, return_counts=True)
    last = np.cumsum(count)
    result: FloatArray = (last - 0.5 * (count - 1.0))[member.reshape(-1)]
    return result
