"""What a calibration curve has against it: residuals, outlying standards, form, scatter, monotony."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coulombook.curves import adequacy
from coulombook.curves.adequacy import FTest, Homogeneity
from coulombook.curves.certificates import standard_errors
from coulombook.curves.fit import Curve
from coulombook.curves.prediction import curve_response, slope
from coulombook.curves.quantiles import chi2_tail, student_quantile, student_tail
from coulombook.curves.weights import point_weights

FloatArray = NDArray[np.float64]

LEVEL = 0.99  # of every test, as ISO 8466-1 has it for linearity and homogeneity
ADEQUATE_GOODNESS = 2.0  # ISO 6143
# models that far behind the best have considerably less support (Burnham & Anderson, Model Selection and
# Multimodel Inference, 2nd ed. (2002), p. 70; page from memory)
AIC_MARGIN = 4.0


@dataclass(frozen=True, slots=True, eq=False)
class Judgement:
    """Verdicts on one curve. A test is None when the points allow none.

    ``standardised`` residuals are in units of the standard deviation the weights give the response (with errors of the
    standards: the effective one); ``studentised`` ones take the point's own pull on the curve into account
    (internally studentised), ``deleted`` ones compare it with the curve through the others (externally studentised,
    Student's t with n - p - 1 degrees of freedom). NaN where the points do not tell.
    """

    level: float
    residual: FloatArray  # (n_points,) response minus curve
    standardised: FloatArray  # (n_points,)
    studentised: FloatArray  # (n_points,)
    deleted: FloatArray  # (n_points,)
    leverage: FloatArray  # (n_points,) share of itself in its fitted value
    most_outlying: int | None  # the point with the largest deleted residual
    outlier_p: float  # of that one, times the number of points (Bonferroni); NaN when None
    lack_of_fit: FTest | None
    mandel: FTest | None  # for a quadratic: is its square term needed
    homogeneity: Homogeneity | None
    weights_aic: Mapping[str, float]
    suggested_weights: str | None  # other weights the points speak for; a suggestion only
    goodness: float | None  # ISO 6143, of a fit with errors in both variables
    chi_square_p: float | None  # of the same
    least_slope: float
    u_least_slope: float
    rises: bool  # the slope is above zero all over the range, at the level of the tests

    @property
    def outlier(self) -> int | None:
        """The point that does not belong to the others, if there is one."""
        return self.most_outlying if self.outlier_p < 1.0 - self.level else None

    @property
    def tested(self) -> bool:
        """Whether the points allow any test of form, scatter or outlying points."""
        tests = (self.lack_of_fit, self.mandel, self.homogeneity, self.goodness, self.chi_square_p)
        return self.most_outlying is not None or any(test is not None for test in tests)

    @property
    def fits(self) -> bool:
        """Whether neither the replicates, nor ISO 6143's measure, nor chi-square speak against the curve."""
        alpha = 1.0 - self.level
        return not (
            (self.lack_of_fit is not None and self.lack_of_fit.p < alpha)
            or (self.goodness is not None and self.goodness > ADEQUATE_GOODNESS)
            or (self.chi_square_p is not None and self.chi_square_p < alpha)
        )

    @property
    def bends(self) -> bool:
        """Whether a square term is called for (in a line), or needed (in a quadratic)."""
        return self.mandel is not None and self.mandel.p < 1.0 - self.level

    @property
    def even_scatter(self) -> bool:
        """Whether the scatter follows the weights, as far as the points tell."""
        return self.homogeneity is None or self.homogeneity.p >= 1.0 - self.level


def judge(
    curve: Curve,
    x: ArrayLike,
    y: ArrayLike,
    *,
    u_x: ArrayLike | None = None,
    parent: Sequence[str] | None = None,
    u_parent: ArrayLike | None = None,
    level: float = LEVEL,
) -> Judgement:
    """Judge a curve by the points it was fitted to.

    Parameters
    ----------
    curve : Curve
    x, y, u_x, parent, u_parent
        What `coulombook.curves.fit.fit_curve` was given.
    level : float
        Level of confidence of every test.

    Notes
    -----
    Outlying point: a mean shift of this one response, tested by Student's t with Bonferroni's correction
    (Cook & Weisberg, Residuals and Influence in Regression, 1982, 2.2.2). With fewer than two degrees of freedom left
    nothing can be said. Lack of fit, Mandel and homogeneity: `coulombook.curves.adequacy`.

    Examples
    --------
    >>> from coulombook.curves.fit import fit_curve
    >>> x, y = [1.0, 2.0, 3.0, 4.0, 5.0, 6.0], [2.0, 4.1, 5.9, 8.0, 14.0, 12.1]
    >>> judge(fit_curve(x, y), x, y).outlier
    4
    """
    x, y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
    errors = standard_errors(x, u_x, parent, u_parent)
    variance = _point_variance(curve, x, y)
    moved = slope(curve, x)[:, None] * errors
    covariance = np.diag(variance) + moved @ moved.T
    residual = y - curve_response(curve, x)
    studentised, deleted, leverage = _studentise(curve, x, y, covariance)
    most = int(np.nanargmax(np.abs(deleted))) if np.isfinite(deleted).any() else None
    outlier_p = math.nan
    if most is not None:
        freedom = x.size - len(curve.powers) - 1
        outlier_p = min(1.0, x.size * float(student_tail(deleted[most], freedom)))
    even = adequacy.homogeneity(x, y, variance, studentised)
    aic = adequacy.weights_aic(x, y, curve.powers) if x.size > len(curve.powers) else {}
    ends = np.array([curve.lowest, curve.highest])
    slopes = slope(curve, ends)
    by_coefficient = np.column_stack((np.zeros(2), np.ones(2), 2.0 * ends))
    u_slopes = np.linalg.norm(by_coefficient @ curve.factor, axis=1)
    t = float(student_quantile(level, max(curve.degrees_of_freedom, 1)))
    least = int(np.argmin(slopes - t * u_slopes))
    both = curve.distance
    return Judgement(
        level=level,
        residual=residual,
        standardised=residual / np.sqrt(np.diag(covariance)) if curve.scatter.any() else np.zeros_like(y),
        studentised=studentised,
        deleted=deleted,
        leverage=leverage,
        most_outlying=most,
        outlier_p=outlier_p,
        lack_of_fit=adequacy.lack_of_fit(x, y, curve.powers, variance, moved),
        mandel=adequacy.mandel(x, y, curve.powers, covariance),
        homogeneity=even,
        weights_aic=MappingProxyType(aic),
        suggested_weights=_suggest(curve, x, aic, even, level),
        goodness=both.goodness if both else None,
        chi_square_p=(
            chi2_tail(both.chi_square, both.degrees_of_freedom) if both and both.degrees_of_freedom else None
        ),
        least_slope=float(slopes[least]),
        u_least_slope=float(u_slopes[least]),
        rises=bool(slopes[least] - t * u_slopes[least] > 0.0),
    )


def _point_variance(curve: Curve, x: FloatArray, y: FloatArray) -> FloatArray:
    """Variance of each response as the fit weighted it; relative ones when there is no scatter."""
    if curve.distance is not None:
        return np.square(curve.distance.u_y)
    weight = point_weights(x, y, curve.weights)
    unit = curve.response_variance if curve.response_variance > 0.0 else 1.0
    result: FloatArray = unit / weight
    return result


def _studentise(
    curve: Curve, x: FloatArray, y: FloatArray, covariance: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Internally and externally studentised residuals, and leverages."""
    fit = adequacy.whiten(x, y, curve.powers, covariance)
    n, size = fit.q.shape
    freedom = n - size
    inverse = np.linalg.inv(fit.root)
    leverage = np.sum(np.square(fit.root @ fit.q), axis=1) / np.diag(covariance)
    nothing = np.full(n, np.nan)
    if freedom < 1:
        return nothing, nothing, leverage
    if fit.square <= fit.rounding:
        return np.zeros(n), nothing, leverage
    shift = inverse.T @ fit.residual
    # a unit shift of one response, as far as the curve does not follow it
    seen = inverse - fit.q @ (fit.q.T @ inverse)
    size_of_shift = np.linalg.norm(seen, axis=0)
    followed = size_of_shift <= 1e-7 * np.linalg.norm(inverse, axis=0)
    with np.errstate(divide="ignore", invalid="ignore"):
        internal = np.where(followed, np.nan, shift / size_of_shift / math.sqrt(fit.square / freedom))
        if freedom < 2:
            return internal, nothing, leverage
        left = np.maximum(freedom - np.square(internal), 0.0)
        external = internal * np.sqrt((freedom - 1.0) / left)
    return internal, external, leverage


def _suggest(
    curve: Curve, x: FloatArray, aic: Mapping[str, float], even: Homogeneity | None, level: float
) -> str | None:
    """Other weights the points speak for.

    Those of the lowest Akaike criterion, when it is lower by 4 than that of the weights in use or the scatter
    does not follow these; "replicates" where standards at zero leave no others to compare.
    """
    uneven = even is not None and even.p < 1.0 - level
    if curve.weights not in aic:
        return None
    if len(aic) == 1:
        return "replicates" if uneven and even is not None and even.method == "Bartlett" else None
    best = min(aic, key=lambda one: aic[one])
    if best == curve.weights:
        return None
    return best if uneven or aic[curve.weights] - aic[best] > AIC_MARGIN else None
