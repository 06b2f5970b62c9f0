"""Scatter of the responses that the errors of the standards leave unexplained.

The residuals of a fit, turned into independent components z_j, have the variances v + e_j: v is the variance of a
response of unit weight and e_j what the certificates of the standards make. v cannot be below zero, and a
difference of mean squares that happens to be zero does not prove responses without scatter. So v is estimated from
its posterior distribution, with Jeffreys's prior: v is such that

    sum_j 1/(v + e_j) = posterior mean of sum_j 1/(v + e_j),

which is the mean square of the residuals where the certificates add nothing, that mean square less e where they add
little, and 2 e/n for n components that do not scatter at all. Source of the idea: Box & Tiao, Bayesian Inference in
Statistical Analysis (1973), 5.2, on variance components that come out negative.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

# The posterior is summed over ln v, where it is a smooth bell: sums at steps far below its width are exact to rounding.
_LOWEST, _HIGHEST, _POINTS = -30.0, 20.0, 1000
_STEPS, _CLOSE = 200, 1e-14


def unexplained_variance(component: FloatArray, explained: FloatArray) -> tuple[float, float]:
    """The variance v and its degrees of freedom, sum_j v/(v + e_j) (one at least): the components that tell of it.

    Parameters
    ----------
    component : (n,) float array
        Independent components z_j of the residuals, at least one.
    explained : (n,) float array
        Variance e_j the errors of the standards give each.
    """
    square = np.square(component)
    mean = float(square.mean())
    if explained.max() <= _CLOSE * mean or mean == 0.0:
        return mean, float(component.size)
    scale = mean + float(explained.mean())
    v = scale * np.exp(np.linspace(_LOWEST, _HIGHEST, _POINTS))
    inverse = 1.0 / (v[:, None] + explained)
    logarithm = 0.5 * (
        np.sum(np.log(inverse) - square * inverse, axis=1) + np.log(np.sum(np.square(inverse), axis=1))
    ) + np.log(v)
    density = np.exp(logarithm - logarithm.max())
    target = float(density @ inverse.sum(axis=1) / density.sum())
    low, high = math.log(v[0]), math.log(v[-1])
    for _ in range(_STEPS):
        middle = 0.5 * (low + high)
        if float(np.sum(1.0 / (math.exp(middle) + explained))) > target:
            low = middle
        else:
            high = middle
        if high - low <= _CLOSE:
            break
    found = math.exp(0.5 * (low + high))
    return found, max(float(np.sum(found / (found + explained))), 1.0)


def components(residual: FloatArray, basis: FloatArray, moved: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Independent components of the residuals, and the variance the errors of the standards give each.

    Parameters
    ----------
    residual : (n_points,) float array
        Responses less any curve of the basis, all of unit weight.
    basis : (n_points, n_coefficients) float array
        Derivatives by the coefficients.
    moved : (n_points, n_errors) float array
        Derivatives by the errors of the standards, of unit variance.
    """
    complete = np.linalg.qr(basis, mode="complete")[0]
    outside = complete[:, basis.shape[1] :]
    explained, turn = np.linalg.eigh(outside.T @ moved @ moved.T @ outside)
    return turn.T @ (outside.T @ residual), np.maximum(explained, 0.0)
