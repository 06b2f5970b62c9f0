"""Weighted least squares by polynomials that are orthonormal over the points, for one curve or many at once.

The coefficients in such polynomials are sums over the points, so that there is no system to be solved, and curves of
as many points each are fitted together. x is scaled (and centred where the form has an intercept) before, and every
polynomial is made orthogonal twice, so that badly scaled standards keep their digits.

Sources: Forsythe, J. SIAM 5 (1957) 74 (orthogonal polynomials of the points); Giraud, Langou & Rozloznik, Comput.
Math. Appl. 50 (2005) 1069 (twice is enough; from memory).
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]


def to_plain(powers: tuple[int, ...], centre: FloatArray, scale: FloatArray) -> FloatArray:
    """Matrices (..., k, k) that turn coefficients in ((x - centre)/scale)^k into coefficients in x^k."""
    matrix = np.zeros((*np.shape(centre), len(powers), len(powers)))
    for column, power in enumerate(powers):
        for row, lower in enumerate(powers[: column + 1]):
            # a form that lacks lower powers is not centred, and has its own power alone
            matrix[..., row, column] = math.comb(power, lower) * (-centre) ** (power - lower) * scale**-power
    return matrix


def has_all_powers(powers: tuple[int, ...]) -> bool:
    """Whether x may be shifted: a shift mixes all lower powers."""
    return powers == tuple(range(len(powers))) and len(powers) > 1


def orthonormal(x: FloatArray, root: FloatArray, powers: tuple[int, ...]) -> tuple[FloatArray, FloatArray]:
    """Polynomials of the given powers that are orthonormal over points weighted with ``root`` squared.

    Parameters
    ----------
    x, root : (..., n_points) float arrays
        Points and the square roots of their weights.
    powers : tuple of int
        Ascending.

    Returns
    -------
    q : (..., n_points, k) float array
        The polynomials at the points, times ``root``.
    back : (..., k, k) float array
        Coefficients in powers of x (rows) of each polynomial (columns).
    """
    # about the mean of the weights: what is near it would cancel when it is told in powers of x
    mean = (np.square(root) * x).sum(axis=-1) / np.square(root).sum(axis=-1)
    centre = mean if has_all_powers(powers) else np.zeros(mean.shape)
    scale = np.abs(x - centre[..., None]).max(axis=-1)
    t = (x - centre[..., None]) / scale[..., None]
    size = len(powers)
    q = np.empty((*x.shape, size))
    own = np.zeros((*x.shape[:-1], size, size))  # coefficients of each polynomial in powers of t
    for column, power in enumerate(powers):
        value = root * t**power
        made = np.zeros((*x.shape[:-1], size))
        made[..., column] = 1.0
        for _ in range(2 if column else 0):
            for before in range(column):
                share = (q[..., before] * value).sum(axis=-1, keepdims=True)
                value = value - share * q[..., before]
                made = made - share * own[..., before]
        length = np.sqrt(np.square(value).sum(axis=-1, keepdims=True))
        q[..., column] = value / length
        own[..., column] = made / length
    return q, to_plain(powers, centre, scale) @ own


def quality(
    residual: FloatArray, y: FloatArray, weight: FloatArray, powers: tuple[int, ...]
) -> tuple[FloatArray, FloatArray]:
    """Residual standard deviation of a point of mean weight, and R^2, (...,) each.

    ``residual`` (..., n_points) is weighted already; ``weight`` has a mean of 1. The deviation is 0 where no degree of
    freedom is left; R^2 is about the weighted mean, or about zero for a form without intercept.
    """
    points = y.shape[-1]
    freedom = points - len(powers)
    square = np.square(residual).sum(axis=-1)
    middle = (weight * y).sum(axis=-1, keepdims=True) / points if powers[0] == 0 else 0.0
    total = (weight * np.square(y - middle)).sum(axis=-1)
    sd = np.sqrt(square / freedom) if freedom else np.zeros(square.shape)
    with np.errstate(invalid="ignore", divide="ignore"):
        return sd, np.where(total > 0.0, 1.0 - square / total, np.nan)
