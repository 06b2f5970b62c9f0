"""Weights of calibration points."""

from __future__ import annotations

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
    levels = _Levels(x, y)
    if not (levels.freedom > 0.0).any():
        raise ValueError("weights from replicates need at least two points of the same x; there are none")
    if not (levels.spread > 0.0).any():
        raise ValueError("weights from replicates need replicates that differ; there is no variance")
    if levels.count.min() >= ENOUGH_REPLICATES and (levels.spread > 0.0).all():
        own: FloatArray = (levels.spread / levels.freedom)[levels.member]
        return own
    c0, c1 = levels.variance_function()
    pooled: FloatArray = (c0 + c1 * np.square(levels.mean))[levels.member]
    return pooled


def replicate_variance_function(x: FloatArray, y: FloatArray) -> tuple[float, float]:
    """c0 and c1 of the variance c0 + c1 y^2 of a single response of mean y, from replicates.

    The function `replicate_variance` describes, for readings that are no standards, however many replicates a
    level has. Raises ValueError as that does.
    """
    levels = _Levels(x, y)
    if not (levels.spread > 0.0).any():
        raise ValueError("replicates that differ are needed; there are none")
    return levels.variance_function()


def smooth_variance(y: FloatArray, variance: FloatArray) -> tuple[float, float]:
    """c0 and c1 of the variance c0 + c1 y^2 through variances given for each response."""
    return _variance_function(np.square(y), variance, np.ones_like(variance))


class _Levels:
    """Points gathered by their x."""

    __slots__ = ("count", "freedom", "mean", "member", "spread")

    def __init__(self, x: FloatArray, y: FloatArray) -> None:
        _, member = np.unique(x, return_inverse=True)
        self.member = member.reshape(-1)
        self.count = np.bincount(self.member).astype(float)
        self.mean = np.bincount(self.member, weights=y) / self.count
        self.spread = np.bincount(self.member, weights=np.square(y - self.mean[self.member]))
        self.freedom = self.count - 1.0

    def variance_function(self) -> tuple[float, float]:
        known = self.freedom > 0.0
        variance = np.divide(self.spread, self.freedom, out=np.zeros_like(self.spread), where=known)
        return _variance_function(np.square(self.mean), variance, self.freedom)


def _variance_function(square: FloatArray, variance: FloatArray, freedom: FloatArray) -> tuple[float, float]:
    """c0 and c1 of c0 + c1 square, fitted to variances with their degrees of freedom; none is below zero."""
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
        losses = [float(weight @ np.square(variance - c0 - c1 * share)) for c0, c1 in candidates]
        c0, c1 = candidates[int(np.argmin(losses))]
        following = c0 + c1 * share
        if np.allclose(following, fitted, rtol=1e-12, atol=0.0):
            break
        fitted = following
    return float(c0), float(c1 / scale)
