"""Least-squares calibration curves.

The fit is made in polynomials that are orthonormal over the points (`coulombook.curves.basis`) and refined with
residuals summed exactly, so that badly scaled standards (mole fractions of 1e-6 against peak areas of 1e6) keep
their digits. Normal equations are never formed.

Errors of the standards themselves enter the covariance of every curve for which they are stated; with weights
"both" they enter the fit as well (`coulombook.curves.both`).

Sources: Golub & Van Loan, Matrix Computations, 4th ed. (2013), sect. 5.3; Bjorck, BIT 7 (1967) 257 (iterative
refinement of least squares); Dekker, Numer. Math. 18 (1971) 224 (exact products).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coulombook.curves.basis import has_all_powers, orthonormal, quality, to_plain
from coulombook.curves.both import DistanceFit, fit_distance
from coulombook.curves.certificates import standard_errors
from coulombook.curves.unexplained import components, unexplained_variance
from coulombook.curves.weights import (
    WEIGHTS,
    VarianceFunction,
    point_weights,
    replicate_scatter,
    smooth_variance,
)

FloatArray = NDArray[np.float64]

# form -> powers of x that are free; the forms a curve may have
FORMS: dict[str, tuple[int, ...]] = {"line": (0, 1), "line through zero": (1,), "quadratic": (0, 1, 2)}

_REFINEMENTS = 4
_HALF_THE_DIGITS = 1e-8
_SPLITTER = 2.0**27 + 1.0


@dataclass(frozen=True, slots=True, eq=False)
class PolynomialFit:
    """A weighted least-squares polynomial: the sum over k of coefficients[k] x^powers[k]."""

    powers: tuple[int, ...]
    coefficients: FloatArray  # (n_coefficients,)
    factor: FloatArray  # (n_coefficients, n_coefficients) L with covariance = L L^T
    degrees_of_freedom: int
    residual_sd: float  # of a point of mean weight; 0 when no degree of freedom is left
    r_squared: float  # about the weighted mean, or about zero for a form without intercept

    @property
    def covariance(self) -> FloatArray:
        """Covariance (n_coefficients, n_coefficients) of the coefficients."""
        result: FloatArray = self.factor @ self.factor.T
        return result


@dataclass(frozen=True, slots=True, eq=False)
class Curve:
    """One fitted calibration curve, response = a0 + a1 x + a2 x^2.

    ``coefficients`` (3,) holds a0, a1, a2, zero where the form has none; ``factor`` (3, n_errors) is L with
    covariance = L L^T, well conditioned in the scaled basis of the fit, so that draws and propagation need
    no further factorisation. ``certificate`` is the part of the covariance that stems from the standards' own
    errors. ``scatter`` holds v0, v1, v2, c: a single reading at x has the variance
    v0 + v1 x + v2 x^2 + c y^2, see `coulombook.curves.prediction.reading_variance`; how well it is known there
    says `coulombook.curves.prediction.reading_freedom`. With no degree of freedom left
    nothing is known of the scatter: ``residual_sd`` and the rest of the covariance are then zero, and
    the caller should say so.
    """

    form: str
    weights: str
    points: int
    lowest: float
    highest: float
    free: tuple[bool, bool, bool]
    coefficients: FloatArray  # (3,)
    covariance: FloatArray  # (3, 3)
    factor: FloatArray  # (3, n_errors)
    degrees_of_freedom: int  # of the scatter of the responses
    residual_sd: float  # of a point of mean weight, in the unit of the response
    r_squared: float
    certificate: FloatArray  # (3, 3)
    response_variance: float  # of a point of mean weight, without what the standards' own errors add
    scatter: FloatArray  # (4,)
    scatter_freedom: float  # degrees of freedom of ``response_variance``
    scatter_function: VarianceFunction | None = None  # where replicates gave v0 and c, up to a factor
    distance: DistanceFit | None = None  # of a fit with errors in both variables

    @property
    def powers(self) -> tuple[int, ...]:
        """Powers of x that are free."""
        return FORMS[self.form]

    def _repr_html_(self) -> str:
        from coulombook.prose.display import html_table
        from coulombook.prose.numbers import plain, with_uncertainty

        rows = [
            (f"a{power}", with_uncertainty(self.coefficients[power], self.covariance[power, power] ** 0.5))
            for power in self.powers
        ]
        caption = (
            f"{self.form}, weights {self.weights}, {self.points} points from {plain(self.lowest)} to "
            f"{plain(self.highest)}, R^2 = {plain(self.r_squared, 6)}"
        )
        return html_table(caption, ("coefficient", "value(u)"), rows, ("coefficient",))


def _split(a: FloatArray) -> tuple[FloatArray, FloatArray]:
    """High and low half of the digits of each number, whose products with other halves are exact (Dekker)."""
    shifted = _SPLITTER * a
    high = shifted - (shifted - a)
    return high, a - high


class _ExactRows:
    """A matrix whose products with vectors are rounded once."""

    __slots__ = ("_high", "_low", "_matrix")

    def __init__(self, matrix: FloatArray) -> None:
        self._matrix = matrix
        self._high, self._low = _split(matrix)

    def dot(self, vector: FloatArray, *more: FloatArray) -> FloatArray:
        """Rows times ``vector``, plus the vectors of ``more``."""
        high, low = _split(vector)
        product = self._matrix * vector
        error = ((self._high * high - product) + self._high * low + self._low * high) + self._low * low
        terms = np.concatenate((product, error, *(one[:, None] for one in more)), axis=1)
        return np.array([math.fsum(row) for row in terms.tolist()])


def scaled_design(x: FloatArray, powers: tuple[int, ...]) -> tuple[float, float, FloatArray]:
    """Centre and scale that put x within -1 to 1, and the matrix from coefficients there to those of x^k."""
    centre = 0.5 * (x.min() + x.max()) if has_all_powers(powers) else np.zeros(())
    scale = np.abs(x - centre).max()
    return float(centre), float(scale), to_plain(powers, centre, scale)


def fit_polynomial(
    x: ArrayLike, y: ArrayLike, powers: Sequence[int], weights: ArrayLike | None = None
) -> PolynomialFit:
    """Weighted least-squares polynomial with chosen powers.

    Parameters
    ----------
    x, y : (n_points,) array_like
        Points.
    powers : sequence of int
        Ascending powers of x; (0, 1) is a line, (1,) a line through zero.
    weights : (n_points,) array_like, optional
        Weights, proportional to 1/variance of each y; equal by default. They are scaled to a mean of 1.

    Raises
    ------
    ValueError
        Fewer points than coefficients, fewer different x than coefficients, a value that is not finite, or
        a weight that is not above zero.

    Examples
    --------
    >>> fit_polynomial([0.0, 1.0, 2.0, 3.0], [1.0, 3.0, 5.0, 7.0], (0, 1)).coefficients.round(12)
    array([1., 2.])
    """
    x, y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
    weight = np.ones_like(x) if weights is None else np.asarray(weights, dtype=float)
    powers = tuple(powers)
    points, size = x.size, len(powers)
    if not (np.isfinite(x).all() and np.isfinite(y).all()):
        raise ValueError("a point of the curve is not a finite number")
    if not (weight > 0.0).all():
        raise ValueError("every weight must be above zero")
    if points < size:
        raise ValueError(f"{points} point(s) cannot fix {size} coefficients")
    different = np.unique(x[x != 0.0] if powers[0] > 0 else x).size
    if different < size:
        raise ValueError(f"{size} coefficient(s) need as many different x; there are {different}")

    weight = weight / weight.mean()
    root = np.sqrt(weight)
    q, back = orthonormal(x, root, powers)

    design = root[:, None] * x[:, None] ** np.array(powers)
    target = root * y
    rows, columns = _ExactRows(design), _ExactRows(np.ascontiguousarray(design.T))
    along = q.T @ target
    coefficients, residual = back @ along, target - q @ along
    # the augmented system  residual + design b = target,  design^T residual = 0
    for _ in range(_REFINEMENTS):
        miss = rows.dot(-coefficients, target, -residual)
        slant = columns.dot(-residual)
        along = q.T @ miss - back.T @ slant
        step = back @ along
        coefficients = coefficients + step
        residual = residual + miss - q @ along
        # a step multiplies the error by the same small factor each time, so what is left is this one squared
        if (np.abs(step) <= _HALF_THE_DIGITS * np.abs(coefficients)).all():
            break

    sd, r_squared = quality(residual, y, weight, powers)
    return PolynomialFit(
        powers=powers,
        coefficients=coefficients,
        factor=sd * back,
        degrees_of_freedom=points - size,
        residual_sd=float(sd),
        r_squared=float(r_squared),
    )


def fit_curve(
    x: ArrayLike,
    y: ArrayLike,
    form: str = "line",
    weights: str = "equal",
    *,
    u_x: ArrayLike | None = None,
    parent: Sequence[str] | None = None,
    u_parent: ArrayLike | None = None,
    u_y: ArrayLike | None = None,
) -> Curve:
    """Calibration curve through standards.

    Parameters
    ----------
    x : (n_points,) array_like
        Standards: mole fractions, or amount ratios. [1]
    y : (n_points,) array_like
        Responses: peak areas, or integral ratios. [raw detector units]
    form : str
        "line", "line through zero" or "quadratic" (with intercept).
    weights : str
        "equal", "1/x", "1/x^2" or "replicates" (see `coulombook.curves.weights.point_weights`), or "both": errors in
        the standards and in the responses (see `coulombook.curves.both`).
    u_x, parent, u_parent : (n_points,) array_like, optional
        Errors of the standards, see `coulombook.curves.certificates.standard_errors`. They always enter the
        covariance; with "both" they weigh the points as well.
    u_y : (n_points,) or (n_points, n_points) array_like, optional
        Standard uncertainty of each response or their covariance, for "both" only. By default that of the
        replicates (`replicate_variance`); without replicates, or when none differ, one sought in the residuals.

    Raises
    ------
    ValueError
        An unknown form or weighting, too few points or different x for the form, standards the weighting
        cannot be used on, or a curve that does not rise over its whole range, which no reading could be
        inverted on.

    Notes
    -----
    With any weights but "both" the errors of the standards are carried through the coefficients to first order,
    G U G^T with G the derivatives of the coefficients with respect to x (JCGM 102:2011, 6.2). As far as they make
    the points scatter about the curve they are in the residual variance s^2 already. That part e, the trace of their
    residuals' covariance over the degrees of freedom, is taken out, so that nothing counts twice: s^2 - e, but no less
    than the variance between replicates, or zero without any. For the scatter of a reading, which zero would make too
    good to be true, it is without replicates the estimate of `coulombook.curves.unexplained`, which never comes to
    zero. ``residual_sd`` stays what the residuals say.

    Examples
    --------
    >>> curve = fit_curve([1e-4, 1e-3], [10.0, 100.0], "line through zero")
    >>> curve.coefficients.round(6).tolist(), curve.degrees_of_freedom
    ([0.0, 100000.0, 0.0], 1)
    """
    if form not in FORMS:
        raise ValueError(f"form '{form}' is not available; choose from {', '.join(FORMS)}")
    if weights not in WEIGHTS:
        raise ValueError(f"weights '{weights}' are not available; choose from {', '.join(WEIGHTS)}")
    x, y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
    powers = FORMS[form]
    # before the weights are worked out, so that a curve without points is told so
    if x.size < len(powers):
        raise ValueError(f"{x.size} point(s) cannot fix the {len(powers)} coefficient(s) of a {form}")
    errors = standard_errors(x, u_x, parent, u_parent)
    if weights == "both":
        found = _fit_both(x, y, powers, errors, None if u_y is None else np.asarray(u_y, dtype=float))
    elif u_y is not None:
        raise ValueError("uncertainties of the responses can be given with weights both only")
    else:
        found = _fit_weighted(x, y, powers, weights, errors)
    rows = list(powers)
    coefficients, factor, certificate = np.zeros(3), np.zeros((3, len(powers))), np.zeros((3, 3))
    coefficients[rows], factor[rows] = found.coefficients, found.factor
    certificate[np.ix_(rows, rows)] = found.certificate
    ends = np.array([x.min(), x.max()])
    slopes = coefficients[1] + 2.0 * coefficients[2] * ends
    if not (slopes > 0.0).all():
        raise ValueError(
            f"the {form} does not rise over its whole range: its slope is {slopes[0]:g} at {ends[0]:g} and "
            f"{slopes[1]:g} at {ends[1]:g}"
        )
    covariance = factor @ factor.T
    for array in (coefficients, factor, covariance, certificate, found.scatter):
        array.setflags(write=False)
    return Curve(
        form=form,
        weights=weights,
        points=x.size,
        lowest=float(ends[0]),
        highest=float(ends[1]),
        free=(0 in powers, 1 in powers, 2 in powers),
        coefficients=coefficients,
        covariance=covariance,
        factor=factor,
        degrees_of_freedom=found.degrees_of_freedom,
        residual_sd=found.residual_sd,
        r_squared=found.r_squared,
        certificate=certificate,
        response_variance=found.response_variance,
        scatter=found.scatter,
        scatter_freedom=found.scatter_freedom,
        scatter_function=found.scatter_function,
        distance=found.distance,
    )


@dataclass(frozen=True, slots=True, eq=False)
class _Found:
    """What a fit, of either kind, hands over; coefficients in the order of the powers."""

    coefficients: FloatArray
    factor: FloatArray
    certificate: FloatArray
    degrees_of_freedom: int
    residual_sd: float
    r_squared: float
    response_variance: float
    scatter: FloatArray
    scatter_freedom: float
    scatter_function: VarianceFunction | None
    distance: DistanceFit | None


def _fit_weighted(
    x: FloatArray, y: FloatArray, powers: tuple[int, ...], weights: str, errors: FloatArray
) -> _Found:
    replicates = replicate_scatter(x, y) if weights == "replicates" else None
    weight = point_weights(x, y, weights) if replicates is None else _mean_one(1.0 / replicates.variance)
    fit = fit_polynomial(x, y, powers, weight)
    factor, certificate = fit.factor, np.zeros((len(powers), len(powers)))
    variance, freedom = fit.residual_sd**2, float(fit.degrees_of_freedom)
    if errors.shape[1]:
        factor, certificate, variance, freedom = _with_certificates(x, y, fit, weight, errors)
    scatter = np.zeros(4)
    if replicates is None:
        power = ("equal", "1/x", "1/x^2").index(weights)
        scatter[power] = variance * float(np.mean(x ** -float(power)))
    else:
        scatter = variance * float(np.mean(1.0 / replicates.variance)) * _of_function(replicates.function)
    return _Found(
        coefficients=fit.coefficients,
        factor=factor,
        certificate=certificate,
        degrees_of_freedom=fit.degrees_of_freedom,
        residual_sd=fit.residual_sd,
        r_squared=fit.r_squared,
        response_variance=variance,
        scatter=scatter,
        scatter_freedom=freedom,
        scatter_function=replicates.function if replicates else None,
        distance=None,
    )


def _mean_one(raw: FloatArray) -> FloatArray:
    scaled: FloatArray = raw / raw.mean()
    return scaled


def _of_function(function: VarianceFunction) -> FloatArray:
    """v0, v1, v2, c of a variance function."""
    return np.array([function.c0, 0.0, 0.0, function.c1])


def _with_certificates(
    x: FloatArray, y: FloatArray, fit: PolynomialFit, weight: FloatArray, errors: FloatArray
) -> tuple[FloatArray, FloatArray, float, float]:
    """Factor of the covariance, its part from the standards' errors, and the variance of the responses alone.

    The last with its degrees of freedom: a difference is known as well as what it is taken from, in absolute terms.
    """
    powers = np.array(fit.powers)
    centre, scale, plain = scaled_design(x, fit.powers)
    root = np.sqrt(weight)[:, None]
    q, r = np.linalg.qr(root * ((x - centre) / scale)[:, None] ** powers)
    back = np.linalg.inv(r)
    slope = (powers * x[:, None] ** np.maximum(powers - 1, 0)) @ fit.coefficients
    moved = root * slope[:, None] * errors
    along = q.T @ moved
    variance, freedom = fit.residual_sd**2, float(fit.degrees_of_freedom)
    in_curve = variance
    if variance > 0.0:
        pure, inner = _pure_variance(x, y, weight)
        seen = float(np.sum(np.square(moved)) - np.sum(np.square(along)))
        in_curve = max(variance - seen / freedom, pure)
        if pure > 0.0:
            freedom = max(freedom * (in_curve / variance) ** 2, float(inner))
            variance = in_curve
        else:
            residual = root[:, 0] * (y - (x[:, None] ** powers) @ fit.coefficients)
            variance, freedom = unexplained_variance(*components(residual, q, moved))
    both = np.hstack((math.sqrt(in_curve) * back, back @ along))
    triangle = np.linalg.qr(both.T)[1]
    own = plain @ (back @ along)
    return plain @ triangle.T, own @ own.T, variance, freedom


def _pure_variance(x: FloatArray, y: FloatArray, weight: FloatArray) -> tuple[float, int]:
    """Variance of a response of weight 1 between replicates, and its degrees of freedom; 0 without replicates."""
    _, member = np.unique(x, return_inverse=True)
    member = member.reshape(-1)
    freedom = x.size - int(member.max()) - 1
    if freedom == 0:
        return 0.0, 0
    mean = np.bincount(member, weights=y) / np.bincount(member)
    return float(weight @ np.square(y - mean[member])) / freedom, freedom


def _fit_both(
    x: FloatArray, y: FloatArray, powers: tuple[int, ...], errors: FloatArray, u_y: FloatArray | None
) -> _Found:
    certain = np.flatnonzero(~errors.any(axis=1))
    if certain.size:
        raise ValueError(
            f"weights both need an uncertainty above zero for every standard; that of x = {x[certain[0]]:g} is 0"
            " (a zero gas has that of its impurities)"
        )
    freedom = x.size - len(powers)
    scatter = function = None
    if u_y is None and _pure_variance(x, y, np.ones_like(x))[0] > 0.0:
        replicates = replicate_scatter(x, y)
        u_y = np.sqrt(replicates.variance)
        function = replicates.function
        scatter = _of_function(function)
        freedom = x.size - np.unique(x).size
    fit = fit_distance(x, y, powers, errors, u_y)
    variance = np.square(fit.u_y)
    if scatter is None:
        c0, c1 = smooth_variance(y, variance)
        scatter = np.array([c0, 0.0, 0.0, c1])
    residual = y - (x[:, None] ** np.array(powers)) @ fit.coefficients
    weight = 1.0 / variance
    middle = float(weight @ y / weight.sum()) if powers[0] == 0 else 0.0
    total = float(weight @ np.square(y - middle))
    return _Found(
        coefficients=fit.coefficients,
        factor=fit.factor,
        certificate=fit.certificate @ fit.certificate.T,
        degrees_of_freedom=freedom,
        residual_sd=float(1.0 / math.sqrt(np.mean(weight))) if freedom else 0.0,
        r_squared=1.0 - float(weight @ np.square(residual)) / total if total > 0.0 else math.nan,
        response_variance=float(1.0 / np.mean(weight)),
        scatter=scatter,
        scatter_freedom=float(freedom) if function else fit.scatter_freedom,
        scatter_function=function,
        distance=fit,
    )
