"""Variances a curve predicts: of a reading at x, and of the curve itself there."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coulombook.curves.fit import Curve
from coulombook.curves.inverse import response

FloatArray = NDArray[np.float64]


def curve_response(curve: Curve, x: ArrayLike) -> FloatArray:
    """Response of the curve at x. [raw detector units]"""
    a0, a1, a2 = curve.coefficients
    result: FloatArray = np.asarray(response(a0, a1, a2, np.asarray(x, dtype=float)))
    return result


def slope(curve: Curve, x: ArrayLike) -> FloatArray:
    """Derivative of the response at x, a1 + 2 a2 x. [raw detector units per unit of x]"""
    _, a1, a2 = curve.coefficients
    result: FloatArray = a1 + 2.0 * a2 * np.asarray(x, dtype=float)
    return result


def reading_variance(curve: Curve, x: ArrayLike) -> FloatArray:
    """Variance of a single reading at x, v0 + v1 x + v2 x^2 + c f(x)^2. [response squared]

    It is the residual variance over the weight a standard would have at x: v0 = s^2 for equal weights,
    v1 = s^2 mean(1/x) and v2 = s^2 mean(1/x^2) for those of the same name; with "replicates" and "both" the variance
    function of the replicates. Below the lowest standard it is held at its value there: nothing was measured that would
    show a scatter falling to zero.
    """
    held = _held(curve, x)
    v0, v1, v2, c = curve.scatter
    result: FloatArray = v0 + v1 * held + v2 * held**2 + c * np.square(curve_response(curve, held))
    return result


def _held(curve: Curve, x: ArrayLike) -> FloatArray:
    held: FloatArray = np.maximum(np.asarray(x, dtype=float), curve.lowest)
    return held


def curve_variance(curve: Curve, x: ArrayLike, covariance: FloatArray | None = None) -> FloatArray:
    """Variance of the curve at x from the covariance of its coefficients, or a part of that. [response squared]"""
    x = np.asarray(x, dtype=float)
    basis = np.stack((np.ones_like(x), x, x**2), axis=-1)
    if covariance is None:
        # from the root: a variance that is the small difference of large terms cannot come out negative
        result: FloatArray = np.sum(np.square(basis @ curve.factor), axis=-1)
        return result
    part: FloatArray = np.maximum(np.einsum("...i,ij,...j->...", basis, covariance, basis), 0.0)
    return part


def reading_freedom(curve: Curve, x: ArrayLike) -> FloatArray:
    """Degrees of freedom of `reading_variance` at x. [1]

    Those of the residual variance where one number gives all. Where replicates gave a function v0 + c y^2 they are
    2 v^2/var(v) at the response concerned: fewer, at the ends, than all replicates together have.
    """
    held = _held(curve, x)
    if curve.scatter_function is None:
        return np.full(held.shape, curve.scatter_freedom)
    return curve.scatter_function.freedom(curve_response(curve, held))


def prediction(
    curve: Curve, x: ArrayLike, repeats: ArrayLike = 1, known: ArrayLike | None = None
) -> tuple[FloatArray, FloatArray]:
    """Variance of the mean of so many readings at x about the curve, and its effective degrees of freedom.

    The part that scatter makes, of the reading and in the curve, has the degrees of freedom of the scatter; what
    certificates make, and a ``known`` variance of the reading in place of the curve's, counts as known
    (Welch-Satterthwaite, JCGM 100:2008, G.4). Zero degrees of freedom: nothing is known of the scatter.
    """
    x = np.asarray(x, dtype=float)
    of_curve = curve_variance(curve, x)
    scattered = np.maximum(of_curve - curve_variance(curve, x, curve.certificate), 0.0)
    if known is None:
        reading = reading_variance(curve, x) / np.asarray(repeats, dtype=float)
        scattered = scattered + reading
        freedom = reading_freedom(curve, x)
    else:
        reading = np.asarray(known, dtype=float)
        freedom = np.full(x.shape, curve.scatter_freedom)
    total = of_curve + reading
    if curve.degrees_of_freedom < 1:
        return total, np.zeros_like(total)
    with np.errstate(divide="ignore", invalid="ignore"):
        effective = np.where(scattered > 0.0, np.square(total / scattered) * freedom, np.inf)
    return total, effective


def range_distance(curve: Curve, x: ArrayLike) -> FloatArray:
    """How far x lies outside the calibrated range, as a share of the range's width: below 0 under it, 0 within. [1]"""
    x = np.asarray(x, dtype=float)
    width = curve.highest - curve.lowest
    below, above = np.minimum(x - curve.lowest, 0.0), np.maximum(x - curve.highest, 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        result: FloatArray = np.where(below + above == 0.0, 0.0, (below + above) / width)
    return result
