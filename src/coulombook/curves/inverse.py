"""Response of a calibration curve, and its inverse on the rising branch.

A line through zero is (0, a1, 0), a line (a0, a1, 0), a quadratic (a0, a1, a2): one pair of expressions
serves them all, so that readings on curves of different forms can be evaluated together.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from coulombook.uncertainty.linearised import Number

FloatArray = NDArray[np.float64]


def response(a0: Number, a1: Number, a2: Number, x: Number) -> Number:
    """Response of a curve at x, a0 + a1 x + a2 x^2. [raw detector units]

    Every argument may be a float, an array, or a `Linearised`; they broadcast.
    """
    return a0 + (a1 + a2 * x) * x


def invert(a0: Number, a1: Number, a2: Number, y: Number) -> Number:
    """The x at which a rising curve responds with y, 2 (y - a0) / (a1 + sqrt(a1^2 + 4 a2 (y - a0))).

    This is the root (-a1 + sqrt(D)) / (2 a2) of the quadratic multiplied through by a1 + sqrt(D). In this
    form

    - a2 = 0 needs no case of its own: it becomes (y - a0) / a1;
    - there is no cancellation when a2 is small, where the schoolbook form loses its digits;
    - the slope of the response at the root, a1 + 2 a2 x, is +sqrt(D), so the root always lies on the rising
      branch, whatever the sign of a2.

    Parameters
    ----------
    a0, a1, a2 : float, array or `Linearised`
        Coefficients of the curve; they broadcast against ``y``.
    y : float, array or `Linearised`
        Response. [raw detector units]

    Returns
    -------
    float, array or `Linearised`
        x in the unit the curve was fitted in. NaN where `invertible` says no.
    """
    rise = y - a0
    # NaN is the answer there, and `invertible` tells of it; a warning of numpy's would be noise on the screen
    with np.errstate(invalid="ignore", divide="ignore"):
        return 2.0 * rise / (a1 + np.sqrt(a1**2 + 4.0 * a2 * rise))


def invertible(a0: FloatArray, a1: FloatArray, a2: FloatArray, y: FloatArray) -> NDArray[np.bool_]:
    """Whether a curve reaches y on a rising branch, for every element.

    False beyond the vertex of a quadratic that bends down (or below the vertex of one that bends up), for a
    line that does not rise, and for NaN.
    """
    rise = np.asarray(y, dtype=float) - a0
    square = np.square(a1) + 4.0 * np.asarray(a2) * rise
    # at the vertex itself the slope is zero and the inverse has no derivative, hence "above" and not "at or
    # above"
    with np.errstate(invalid="ignore"):
        result: NDArray[np.bool_] = (square > 0.0) & (a1 + np.sqrt(square) != 0.0)
    return result
