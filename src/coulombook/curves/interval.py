"""The x of a reading, with its uncertainty and its interval.

The standard uncertainty is that of the law of propagation with the full covariance of the coefficients. The
interval is exact where the law's symmetric one is not: it holds every x that the reading does not contradict,

    |y - f(x)| <= t sqrt(v(x)/m + c(x)),

v(x)/m being the variance of the mean of m readings at x and c(x) that of the curve there. For an equally weighted line
these are the limits of Fieller (J. R. Stat. Soc. B 16 (1954) 175); the same holds for weighted lines and for
quadratics, since the response is linear in the coefficients whatever the form. It rests on normal scatter,
weights that are right, and a reading on the rising branch.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coulombook.curves.fit import Curve
from coulombook.curves.inverse import invert, invertible
from coulombook.curves.prediction import (
    curve_response,
    curve_variance,
    prediction,
    reading_variance,
    slope,
)
from coulombook.curves.quantiles import student_quantile

FloatArray = NDArray[np.float64]

_DOUBLINGS, _STEPS, _CLOSE = 60, 100, 4e-16


@dataclass(frozen=True, slots=True, eq=False)
class InverseEstimate:
    """x of each reading; arrays of the shape of the readings. [unit of x]

    An end is infinite where no x on that side contradicts the reading. ``asymmetry`` is (high - x)/(x - low),
    1 for a symmetric interval. Ends are NaN when the scatter is unknown (no degree of freedom), everything is
    where the curve does not reach the reading.
    """

    x: FloatArray
    u: FloatArray
    low: FloatArray
    high: FloatArray
    degrees_of_freedom: FloatArray  # effective ones

    @property
    def asymmetry(self) -> FloatArray:
        """Upper over lower arm of the interval. [1]"""
        up, down = self.high - self.x, self.x - self.low
        with np.errstate(divide="ignore", invalid="ignore"):
            result: FloatArray = np.where((up == 0.0) & (down == 0.0), 1.0, up / down)
        return result


def inverse_with_uncertainty(
    curve: Curve, y: ArrayLike, repeats: ArrayLike = 1, u_y: ArrayLike | None = None, level: float = 0.95
) -> InverseEstimate:
    """The x at which a curve responds with y.

    Parameters
    ----------
    curve : Curve
    y : array_like
        Readings, each the mean of ``repeats``. [raw detector units]
    repeats : int or array_like
        Readings averaged, at least 1.
    u_y : array_like, optional
        Standard uncertainty of each (mean) reading; by default the scatter of the curve's own points at that level,
        `coulombook.curves.prediction.reading_variance` over ``repeats``.
    level : float
        Level of confidence of the interval.

    Notes
    -----
    Student's t has the effective degrees of freedom of `coulombook.curves.prediction.prediction` at the estimate: those
    of the curve's scatter where all variance stems from it, more as certificates and a given ``u_y`` have their share.

    Raises
    ------
    ValueError
        Repeats below 1, a level not between 0 and 1, or a negative ``u_y``.

    Examples
    --------
    >>> from coulombook.curves.fit import fit_curve
    >>> curve = fit_curve([0, 2, 4, 6, 8, 10, 12], [2.1, 5.0, 9.0, 12.6, 17.3, 21.0, 24.7])
    >>> found = inverse_with_uncertainty(curve, 2.9)
    >>> [round(float(one), 3) for one in (found.x, found.u, found.low, found.high)]
    [0.716, 0.265, 0.019, 1.382]
    """
    y = np.asarray(y, dtype=float)
    repeats = np.asarray(repeats, dtype=float)
    if not (repeats >= 1.0).all():
        raise ValueError("a reading is the mean of one measurement at least")
    if not 0.0 < level < 1.0:
        raise ValueError(f"the level of confidence must lie between 0 and 1; it is {level:g}")
    known = None if u_y is None else np.square(np.asarray(u_y, dtype=float))
    if known is not None and not (np.asarray(u_y) >= 0.0).all():
        raise ValueError("the uncertainty of a reading must be at or above zero")
    a0, a1, a2 = (np.asarray(one) for one in curve.coefficients)
    reached = invertible(a0, a1, a2, y)
    x = np.full(y.shape, np.nan)
    x[reached] = np.asarray(invert(a0, a1, a2, y[reached]))

    total, freedom = prediction(curve, x, repeats, known)
    with np.errstate(divide="ignore", invalid="ignore"):
        u = np.sqrt(total) / slope(curve, x)
    t = student_quantile(0.5 + 0.5 * level, freedom)
    turn = float(-0.5 * a1 / a2) if a2 != 0.0 else np.inf

    def excess(at: FloatArray) -> FloatArray:
        reading = known if known is not None else reading_variance(curve, at) / repeats
        arm = t * np.sqrt(reading + curve_variance(curve, at))
        result: FloatArray = np.abs(y - curve_response(curve, at)) - arm
        return result

    low, high = (_end(x, sign * t * u, turn, excess) for sign in (-1.0, 1.0))
    return InverseEstimate(x, u, low, high, freedom)


def _end(
    x: FloatArray, step: FloatArray, turn: float, excess: Callable[[FloatArray], FloatArray]
) -> FloatArray:
    """Where ``excess`` turns positive on the way from x in the direction of ``step``, not beyond ``turn``."""
    near, span = x, step
    ahead = np.where(
        np.isfinite(turn) & (np.sign(turn - x) * np.sign(step) > 0.0), turn, np.copysign(np.inf, step)
    )
    farthest = np.abs(ahead - x)
    with np.errstate(invalid="ignore"):
        under = excess(near)
        far = x + np.sign(step) * np.minimum(np.abs(span), farthest)
        over = excess(far)
        open_ = ~(over > 0.0)
        for _ in range(_DOUBLINGS):
            going = open_ & (np.abs(span) < farthest)
            if not going.any():
                break
            near, under = np.where(going, far, near), np.where(going, over, under)
            span = np.where(going, 2.0 * span, span)
            far = x + np.sign(step) * np.minimum(np.abs(span), farthest)
            over = excess(far)
            open_ = ~(over > 0.0)
        # false position for all readings at once, the value kept at one end twice running halved (Illinois rule)
        side = np.zeros(x.shape)
        live, root = ~open_, far
        for _ in range(_STEPS):
            between = far - over * (far - near) / (over - under)
            root = np.where(live, between, root)
            live = live & (between != near) & (between != far) & (np.abs(far - near) > _CLOSE * np.abs(far))
            if not live.any():
                break
            found = excess(between)
            outside, inside = live & (found >= 0.0), live & (found < 0.0)
            under = np.where(outside & (side > 0.0), 0.5 * under, np.where(inside, found, under))
            over = np.where(inside & (side < 0.0), 0.5 * over, np.where(outside, found, over))
            near, far = np.where(inside, between, near), np.where(outside, between, far)
            side = np.where(outside, 1.0, np.where(inside, -1.0, side))
    result: FloatArray = np.where(step == 0.0, x, np.where(open_, np.copysign(np.inf, step), root))
    return np.where(np.isnan(step), np.nan, result)
