"""Weights of calibration points."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

WEIGHTS = ("equal", "1/x", "1/x^2", "replicates", "both")
POINT_WEIGHTS = WEIGHTS[:-1]  # errors in both variables need a fit of their own, not weights

# From m replicates a level, weights 1/s^2 cost the estimate (m - 3)/(m - 5) in variance against known ones
# (Carroll & Cline, Biometrika 75 (1988) 35, from memory): without bound at five, 1.4 at ten. ISO 8466-1
# asks for ten as well.
ENOUGH_REPLICATES = 10
_STEPS = 50
_SETTLED = 1e-12  # relative change of the variances


@dataclass(frozen=True, slots=True, eq=False)
class VarianceFunction:
    """Variance c0 + c1 y^2 of a single response of mean y, with the covariance (2, 2) of c0 and c1.

    ``least_freedom`` is that of the least replicated level: at a level nothing is known less well than its
    own replicates tell.
    """

    c0: float
    c1: float
    covariance: FloatArray
    least_freedom: float

    def freedom(self, y: FloatArray) -> FloatArray:
        """Degrees of freedom of the variance at y, 2 v^2/var(v). [1]"""
        square = np.square(y)
        (s00, s01), (_, s11) = self.covariance
        spread = s00 + 2.0 * s01 * square + s11 * np.square(square)
        result: FloatArray = np.maximum(
            2.0 * np.square(self.c0 + self.c1 * square) / spread, self.least_freedom
        )
        return result


@dataclass(frozen=True, slots=True, eq=False)
class ReplicateScatter:
    """Scatter of replicates: the variance at each point, and that of any response."""

    variance: FloatArray  # (n_points,)
    function: VarianceFunction


def point_weights(x: FloatArray, y: FloatArray, weights: str) -> FloatArray:
    """Weight of each point, scaled to a mean of 1. [1]

    Parameters
    ----------
    x, y : (n_points,) float arrays
        Standards and responses.
    weights : str
        "equal"; "1/x" (variance grows with x); "1/x^2" (constant relative scatter); "replicates" (1 over the
        variance of the replicates at each level, see `replicate_variance`).

    Raises
    ------
    ValueError
        An unknown name; x at or below zero with "1/x" or "1/x^2"; no replicates, or replicates that do not
        scatter.
    """
    if weights == "equal":
        return np.ones_like(x)
    if weights in ("1/x", "1/x^2"):
        if not (x > 0.0).all():
            lowest = x[~(x > 0.0)][0]
            raise ValueError(f"weights {weights} need every x above zero; one is {lowest:g}")
        raw = 1.0 / x if weights == "1/x" else 1.0 / x**2
    elif weights == "replicates":
        raw = 1.0 / replicate_variance(x, y)
    else:
        raise ValueError(f"weights '{weights}' are not available; choose from {', '.join(POINT_WEIGHTS)}")
    scaled: FloatArray = raw / raw.mean()
    return scaled


def replicate_variance(x: FloatArray, y: FloatArray) -> FloatArray:
    """Variance of y at each point, from replicates (points of the same x). [y squared]

    With ten replicates or more at every level it is the variance found at the level. With fewer, single
    variances are too uncertain to weight with (from three replicates the ratio of two equal variances
    reaches 19 one time in twenty), so the levels are pooled by a variance function with an additive and a
    proportional part, var = c0 + c1 y^2 (Rocke & Lorenzato, Technometrics 37 (1995) 176), y being the
    level's mean; levels without replicates get its value too. It is fitted to the level variances by
    weighted least squares, each with its own variance 2 var^2/(n - 1), no part being negative.

    Raises
    ------
    ValueError
        No level has two points, or the replicates of no level differ.
    """
    return replicate_scatter(x, y).variance


def replicate_scatter(x: FloatArray, y: FloatArray) -> ReplicateScatter:
    """What `replicate_variance` describes, and the variance function for readings that are no standards.

    The function is fitted however many replicates a level has. Raises ValueError as `replicate_variance` does.
    """
    _, member = np.unique(x, return_inverse=True)
    member = member.reshape(-1)
    count = np.bincount(member).astype(float)
    mean = np.bincount(member, weights=y) / count
    spread = np.bincount(member, weights=np.square(y - mean[member]))
    freedom = count - 1.0
    replicated = freedom > 0.0
    if not replicated.any():
        raise ValueError("weights from replicates need at least two points of the same x; there are none")
    if not (spread > 0.0).any():
        raise ValueError("weights from replicates need replicates that differ; there is no variance")
    square, variance = (
        np.square(mean),
        np.divide(spread, freedom, out=np.zeros_like(spread), where=replicated),
    )
    function = _variance_function(square, variance, freedom)
    if count.min() >= ENOUGH_REPLICATES and (spread > 0.0).all():
        return ReplicateScatter(variance[member], function)
    return ReplicateScatter((function.c0 + function.c1 * square)[member], function)


def smooth_variance(y: FloatArray, variance: FloatArray) -> tuple[float, float]:
    """c0 and c1 of the variance c0 + c1 y^2 through variances given for each response."""
    function = _variance_function(np.square(y), variance, np.ones_like(variance))
    return function.c0, function.c1


def _variance_function(square: FloatArray, variance: FloatArray, freedom: FloatArray) -> VarianceFunction:
    """c0 + c1 square, fitted to variances with their degrees of freedom; neither is below zero."""
    scale = square.max() if square.max() > 0.0 else 1.0
    share = square / scale
    pooled = float(freedom @ variance / freedom.sum())
    fitted = np.full_like(variance, pooled)
    c0, c1 = pooled, 0.0
    for _ in range(_STEPS):
        weight = freedom / fitted**2
        candidates = []
        s1, sq, sqq = weight.sum(), weight @ share, weight @ share**2
        v1, vq = weight @ variance, weight @ (share * variance)
        determinant = s1 * sqq - sq * sq
        # two columns scaled to at most 1: a determinant this small means one replicated level, which tells
        # no slope
        if determinant > 1e-12 * s1 * sqq:
            candidates.append(((sqq * v1 - sq * vq) / determinant, (s1 * vq - sq * v1) / determinant))
        candidates = [one for one in candidates if min(one) >= 0.0]
        if not candidates:
            candidates = [(v1 / s1, 0.0)]
            # a purely proportional part would give a level at zero no variance at all
            if share.min() > 0.0:
                candidates.append((0.0, vq / sqq))
        c0, c1 = candidates[0]
        if len(candidates) > 1:
            losses = [float(weight @ np.square(variance - one - other * share)) for one, other in candidates]
            c0, c1 = candidates[int(np.argmin(losses))]
        following = c0 + c1 * share
        settled = (np.abs(following - fitted) <= _SETTLED * fitted).all()
        fitted = following
        if settled:
            break
    return VarianceFunction(
        float(c0),
        float(c1 / scale),
        _covariance(share, scale, fitted, freedom),
        float(freedom[freedom > 0.0].min()),
    )


def _covariance(share: FloatArray, scale: float, fitted: FloatArray, freedom: FloatArray) -> FloatArray:
    """Covariance of c0 and c1 from what the levels know, a variance v of nu degrees of freedom being known to 2 v^2/nu.

    Both parts count as free even where one came out as zero: that it is zero is not known.
    """
    weight = 0.5 * freedom / fitted**2
    s1, sq, sqq = weight.sum(), weight @ share, weight @ share**2
    determinant = s1 * sqq - sq * sq
    if determinant <= 1e-12 * s1 * sqq:
        return np.array([[1.0 / s1, 0.0], [0.0, 0.0]])
    result: FloatArray = np.array([[sqq, -sq / scale], [-sq / scale, s1 / scale**2]]) / determinant
    return result
