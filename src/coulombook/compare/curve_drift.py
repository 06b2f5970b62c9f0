"""Drift of a calibration curve: two dates against each other, and a rate over the months.

Curves are compared by their mean slope over a stretch of x, (f(high) - f(low))/(high - low) = a1 + a2 (low + high): the
slope of a line whatever the stretch, and of a quadratic at its middle. Drift is a ratio of slopes, so the sums are made
with logarithms, in which a relative error is an addend.

A slope is wrong by the scatter of its own readings and by its standards. Two calibrations from one parent cylinder are
wrong alike by that cylinder; it is left out of their ratio.

Sources: JCGM 100:2008, 5.2 and G.4 (correlated inputs; effective degrees of freedom of Welch and Satterthwaite);
Aitken, Proc. R. Soc. Edinb. 55 (1936) 42 (least squares with a covariance); Paule & Mandel, J. Res. Natl. Bur. Stand.
87 (1982) 377 (scatter that the stated uncertainties leave unexplained); Knapp & Hartung, Stat. Med. 22 (2003) 2693
(test of a regression between results of stated uncertainty, from memory).
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coulombook.curves.fit import Curve, fit_curve
from coulombook.curves.quantiles import chi2_tail, student_quantile, student_tail

FloatArray = NDArray[np.float64]
Parent = tuple[str, float]  # name of a cylinder and its stated relative standard uncertainty

LEVEL = 0.95
DAYS_PER_MONTH = 365.25 / 12.0  # the mean month of the Julian year

_STEP = 1e-4  # of the parent's value; the central difference leaves an error of its square
_ENDLESS = 1e9  # degrees of freedom that cannot be told from infinitely many
_CLOSE = 1e-12  # of the variance found


@dataclass(frozen=True, slots=True)
class MeanSlope:
    """Mean slope of a curve over a stretch of x, with its relative standard uncertainty in parts.

    ``u_scatter`` stems from the scatter of the responses and is known with ``freedom`` degrees of freedom (with
    none it is not known at all); ``u_standards`` from the standards. ``parents`` says by how much of itself the slope
    is wrong when a parent cylinder is wrong by its standard uncertainty, sign included.
    """

    slope: float
    u_scatter: float  # [1]
    freedom: float
    u_standards: float  # [1]
    parents: Mapping[Parent, float] = field(default_factory=dict)

    @property
    def u_relative(self) -> float:
        """Relative standard uncertainty of the slope. [1]"""
        return math.hypot(self.u_scatter, self.u_standards)


@dataclass(frozen=True, slots=True)
class Change:
    """A value with its standard uncertainty, tested against no change.

    ``p`` is the two-sided probability of a larger one by chance alone; NaN where the uncertainty is not known, or is
    zero.
    """

    value: float
    u: float
    freedom: float  # effective degrees of freedom of u
    p: float
    level: float

    @property
    def significant(self) -> bool | None:
        """Whether chance alone explains the value less than once in 1/(1 - level); None where it cannot be told."""
        return None if math.isnan(self.p) else self.p < 1.0 - self.level

    def interval(self) -> tuple[float, float]:
        """Two-sided interval of the value at ``level``."""
        half = float(student_quantile(0.5 + 0.5 * self.level, min(self.freedom, _ENDLESS))) * self.u
        return self.value - half, self.value + half


@dataclass(frozen=True, slots=True)
class SlopeRatio:
    """Slope of the second curve over that of the first; ``log`` is its logarithm, tested against 0."""

    log: Change

    @property
    def ratio(self) -> float:
        """Second over first. [1]"""
        return math.exp(self.log.value)

    @property
    def u_ratio(self) -> float:
        """Standard uncertainty of the ratio. [1]"""
        return self.ratio * self.log.u

    @property
    def significant(self) -> bool | None:
        """Whether the slopes differ by more than chance; None where it cannot be told."""
        return self.log.significant


@dataclass(frozen=True, slots=True, eq=False)
class Drift:
    """A steady drift: the logarithm of the slope as a line over the months.

    ``rate`` is d ln(slope)/dt; with three calibrations or more its uncertainty is what their scatter about the line
    says. ``u_stated`` is what their own uncertainties say. ``chi_square`` compares the two: ``unexplained`` is the
    relative standard deviation between calibrations, beyond their uncertainties, that would explain the scatter.
    """

    rate: Change  # [1/month]
    u_stated: float  # [1/month]
    start: float  # ln(slope) at month 0 by the line
    chi_square: float
    chi_freedom: int
    chi_p: float  # NaN for two calibrations
    unexplained: float  # [1]

    @property
    def steady(self) -> bool:
        """Whether the calibrations lie on one line within their uncertainties, as far as can be told."""
        return not self.chi_p < 1.0 - self.rate.level


def common_stretch(curves: Sequence[Curve]) -> tuple[float, float]:
    """The stretch of x that every curve covers. [unit of x]

    Raises
    ------
    ValueError
        There is none, and a quadratic among the curves has no slope that could stand for another stretch.
    """
    low, high = max(one.lowest for one in curves), min(one.highest for one in curves)
    if low < high:
        return low, high
    if any(one.coefficients[2] != 0.0 for one in curves):
        raise ValueError("the ranges of the curves have nothing in common, and a quadratic has no one slope")
    return min(one.lowest for one in curves), max(one.highest for one in curves)


def mean_slope(
    curve: Curve, low: float, high: float, parents: Mapping[Parent, float] | None = None
) -> MeanSlope:
    """Mean slope of a curve from ``low`` to ``high``, a1 + a2 (low + high). [response per unit of x]

    Parameters
    ----------
    curve : Curve
    low, high : float
        Ends of the stretch, such as those of `common_stretch`.
    parents : mapping, optional
        What `parent_effects` found; without it every error counts as this curve's own.

    Examples
    --------
    >>> line = fit_curve([1.0, 2.0, 3.0, 4.0], [2.0, 4.1, 5.9, 8.0])
    >>> found = mean_slope(line, 1.0, 4.0)
    >>> round(found.slope, 3), round(found.u_relative, 4), found.freedom
    (1.98, 0.0214, 2.0)
    """
    by_coefficient = np.array([0.0, 1.0, low + high])
    slope = float(by_coefficient @ curve.coefficients)
    whole = float(np.sum(np.square(by_coefficient @ curve.factor)))
    standards = min(max(float(by_coefficient @ curve.certificate @ by_coefficient), 0.0), whole)
    return MeanSlope(
        slope=slope,
        u_scatter=math.sqrt(whole - standards) / slope,
        # what the standards' errors are taken out of is known less well than it was
        freedom=min(float(curve.degrees_of_freedom), curve.scatter_freedom),
        u_standards=math.sqrt(standards) / slope,
        parents=dict(parents or {}),
    )


def parent_effects(
    x: ArrayLike,
    y: ArrayLike,
    form: str,
    weights: str,
    low: float,
    high: float,
    *,
    parent: Sequence[str],
    u_parent: ArrayLike,
    u_x: ArrayLike | None = None,
) -> dict[Parent, float]:
    """Relative change of the mean slope when a parent cylinder is off by its standard uncertainty. [1]

    d ln(slope)/d ln(parent) u, by central difference of the fit itself, the standards of one parent moved together.

    Parameters
    ----------
    x, y, form, weights, u_x, parent, u_parent
        What `coulombook.curves.fit.fit_curve` was given.
    low, high : float
        The stretch, as in `mean_slope`.

    Examples
    --------
    Standards all from one cylinder: if it holds 0.5 % more than stated, the slope was taken 0.5 % too high.

    >>> found = parent_effects([1.0, 2.0, 3.0], [2.0, 4.1, 5.9], "line", "equal", 1.0, 3.0,
    ...                        parent=["C1"] * 3, u_parent=[0.005] * 3)
    >>> round(found["C1", 0.005], 6)
    -0.005
    """
    x, y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
    u = np.asarray(u_parent, dtype=float)
    families: dict[Parent, list[int]] = {}
    for place, name in enumerate(parent):
        if name and u[place] > 0.0:
            families.setdefault((name, float(u[place])), []).append(place)
    effects = {}
    for family, places in families.items():
        logs = []
        for step in (_STEP, -_STEP):
            moved = x.copy()
            moved[places] *= 1.0 + step
            curve = fit_curve(moved, y, form, weights, u_x=u_x, parent=parent, u_parent=u)
            logs.append(math.log(mean_slope(curve, low, high).slope))
        effects[family] = (logs[0] - logs[1]) / (2.0 * _STEP) * family[1]
    return effects


def slope_ratio(first: MeanSlope, second: MeanSlope, level: float = LEVEL) -> SlopeRatio:
    """Slope of the second curve over that of the first, tested against 1. [1]

    u^2(ln ratio) = u1^2 + u2^2 - 2 cov, cov being what the two have from the same parents: cylinders of the same name
    and stated uncertainty. Student's t with the effective degrees of freedom of Welch and Satterthwaite, the standards'
    part counting as fully known.

    Raises
    ------
    ValueError
        A slope is not above zero.
    """
    values = np.log(_positive([first, second]))
    combination = np.array([-1.0, 1.0])
    return SlopeRatio(_changed(combination, values, [first, second], level))


def intercept_shift(first: Curve, second: Curve, level: float = LEVEL) -> Change | None:
    """Intercept of the second curve less that of the first, tested against 0; None where a form has none.

    [raw detector units]
    """
    if not (first.free[0] and second.free[0]):
        return None
    whole = [float(np.sum(np.square(one.factor[0]))) for one in (first, second)]
    scatter = [
        max(a - float(one.certificate[0, 0]), 0.0) for a, one in zip(whole, (first, second), strict=True)
    ]
    freedom = [min(float(one.degrees_of_freedom), one.scatter_freedom) for one in (first, second)]
    value = float(second.coefficients[0] - first.coefficients[0])
    return _test(value, sum(whole), scatter, freedom, level)


def drift_rate(months: ArrayLike, slopes: Sequence[MeanSlope], level: float = LEVEL) -> Drift:
    """Rate of drift over all calibrations of a curve, by weighted regression of ln(slope) on time. [1/month]

    Least squares with the covariance of the slopes, parents they share included, and a variance between calibrations
    found by Paule and Mandel's rule (none when chi-square does not exceed its degrees of freedom). The rate of two
    calibrations is tested as their ratio is. With more, by the scatter about the line, n - 2 degrees of freedom (Knapp
    and Hartung): this keeps its error rate whether the stated uncertainties are the whole truth or not.

    Parameters
    ----------
    months : (n_calibrations,) array_like
        When each was measured, from any origin, in mean months of `DAYS_PER_MONTH` days.
    slopes : sequence of n_calibrations `MeanSlope`
        All over the same stretch of x.

    Raises
    ------
    ValueError
        Fewer than two different times, or a slope that is not above zero.

    Examples
    --------
    >>> slopes = [MeanSlope(slope, 0.01, 12.0, 0.0) for slope in (1.0, 0.95, 0.89, 0.85)]
    >>> found = drift_rate([0, 3, 6, 9], slopes)
    >>> round(found.rate.value, 5), round(found.u_stated, 5), found.rate.significant
    (-0.01843, 0.00149, True)
    """
    t = np.asarray(months, dtype=float)
    if np.unique(t).size < 2:
        raise ValueError("a drift needs calibrations of at least two different dates")
    values = np.log(_positive(slopes))
    covariance = _covariance(slopes)
    freedom = t.size - 2
    if min(one.freedom for one in slopes) <= 0.0 or not (np.diag(covariance) > 0.0).all():
        # equal weights: nothing says which calibration to trust more
        rows, _ = _line(t, np.eye(t.size), values)
        rate = Change(float(rows[1] @ values), math.nan, 0.0, math.nan, level)
        return Drift(rate, math.nan, float(rows[0] @ values), math.nan, freedom, math.nan, 0.0)
    rows, chi_square = _line(t, covariance, values)
    u_stated = math.sqrt(float(rows[1] @ covariance @ rows[1]))
    if freedom == 0:
        rate = _changed(rows[1], values, slopes, level)
        return Drift(rate, u_stated, float(rows[0] @ values), 0.0, 0, math.nan, 0.0)
    between = _between(t, covariance, values, freedom)
    whole = covariance + between * np.eye(t.size)
    rows, square = _line(t, whole, values)
    value = float(rows[1] @ values)
    u = math.sqrt(float(rows[1] @ whole @ rows[1]) * square / freedom)
    p = float(student_tail(value / u, freedom)) if u > 0.0 else 0.0
    return Drift(
        rate=Change(value, u, float(freedom), p, level),
        u_stated=u_stated,
        start=float(rows[0] @ values),
        chi_square=chi_square,
        chi_freedom=freedom,
        chi_p=chi2_tail(chi_square, freedom),
        unexplained=math.sqrt(between),
    )


def _positive(slopes: Sequence[MeanSlope]) -> FloatArray:
    found = np.array([one.slope for one in slopes])
    wrong = found[~(found > 0.0)]
    if wrong.size:
        raise ValueError(f"a drift needs slopes above zero; one is {wrong[0]:g}")
    return found


def _covariance(slopes: Sequence[MeanSlope]) -> FloatArray:
    """Covariance (n, n) of the logarithms of the slopes."""
    result = np.diag([one.u_relative**2 for one in slopes])
    for row, one in enumerate(slopes):
        for column, other in enumerate(slopes[:row]):
            shared = one.parents.keys() & other.parents.keys()
            result[row, column] = result[column, row] = sum(one.parents[k] * other.parents[k] for k in shared)
    return result


def _changed(
    combination: FloatArray, values: FloatArray, slopes: Sequence[MeanSlope], level: float
) -> Change:
    """A linear combination of the logarithms of the slopes, tested against 0."""
    variance = max(float(combination @ _covariance(slopes) @ combination), 0.0)
    scatter = [float((share * one.u_scatter) ** 2) for share, one in zip(combination, slopes, strict=True)]
    return _test(float(combination @ values), variance, scatter, [one.freedom for one in slopes], level)


def _test(
    value: float, variance: float, scatter: Sequence[float], freedom: Sequence[float], level: float
) -> Change:
    u = math.sqrt(variance)
    if min(freedom) <= 0.0 or u == 0.0:
        return Change(value, u, 0.0, math.nan, level)
    parts = sum(one**2 / nu for one, nu in zip(scatter, freedom, strict=True))
    effective = min(variance**2 / parts, _ENDLESS) if parts > 0.0 else _ENDLESS
    return Change(value, u, effective, float(student_tail(value / u, effective)), level)


def _line(t: FloatArray, covariance: FloatArray, values: FloatArray) -> tuple[FloatArray, float]:
    """Rows that turn values into intercept and rate (2, n), and chi-square of the values about the line."""
    inverse = np.linalg.inv(np.linalg.cholesky(covariance))
    centre = float(t.mean())
    q, r = np.linalg.qr(inverse @ np.column_stack((np.ones_like(t), t - centre)))
    rows = np.linalg.solve(r, q.T) @ inverse
    rows[0] -= centre * rows[1]
    target = inverse @ values
    residual = target - q @ (q.T @ target)
    return rows, float(residual @ residual)


def _between(t: FloatArray, covariance: FloatArray, values: FloatArray, freedom: int) -> float:
    """Variance between calibrations that brings chi-square down to its degrees of freedom; 0 if it is not above."""

    # chi-square falls with the variance and is convex: Newton's steps climb to the root from below
    variance = 0.0
    while True:
        whole = covariance + variance * np.eye(t.size)
        rows, square = _line(t, whole, values)
        residual = values - np.column_stack((np.ones_like(t), t)) @ (rows @ values)
        fall = float(np.sum(np.square(np.linalg.solve(whole, residual))))
        step = (square - freedom) / fall
        if step <= _CLOSE * variance:
            return variance
        variance += step


__all__ = [
    "DAYS_PER_MONTH",
    "LEVEL",
    "Change",
    "Drift",
    "MeanSlope",
    "Parent",
    "SlopeRatio",
    "common_stretch",
    "drift_rate",
    "intercept_shift",
    "mean_slope",
    "parent_effects",
    "slope_ratio",
]
