"""Generalised distance regression: errors in the standards and in the responses.

The true standards are written x + L e, with U = L L^T the covariance of the certificates (`standard_errors`)
and e independent errors of unit variance. Coefficients b and errors e are found together as the minimum of

    chi^2 = (y - f(x + L e; b))^T V^-1 (y - f(x + L e; b)) + e^T e,

V being the covariance of the responses. With independent errors of every standard this is the sum ISO
6143:2001 minimises, and York's for the line; with a full U it is the generalised distance regression of ISO/TS
28037:2010, clause 10. Written with e instead of U^-1 it needs no inverse of U, which is singular when standards share
an error.

It is solved by Gauss-Newton steps, each a Householder QR of the whitened derivatives, with Levenberg's damping should
a step not lower chi^2. It has converged when the next step would move the solution by less than 1e-10 of its standard
uncertainty, or by less than the rounding of the residuals.

Sources: ISO 6143:2001; ISO/TS 28037:2010; York, Evensen, Martinez & De Basabe Delgado, Am. J. Phys. 72 (2004) 367;
Boggs, Byrd & Schnabel, SIAM J. Sci. Stat. Comput. 8 (1987) 1052. Clause numbers from memory.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

_STEPS = 200
_SMALL_STEP = 1e-10  # of the standard uncertainties
_NEAR = 1e-5  # of the standard uncertainties
_NEGLIGIBLE = 1e-3  # a scatter of this share of the certificates' effect adds 1e-6 to a variance
_EPS = float(np.finfo(float).eps)


@dataclass(frozen=True, slots=True, eq=False)
class DistanceFit:
    """What a fit with errors in both variables finds.

    ``factor`` (n_coefficients, n_coefficients) is L with covariance = L L^T, not scaled by chi^2;
    ``certificate`` (n_coefficients, n_errors) is the part of the coefficients' errors that each error of the standards
    makes. ``goodness`` is ISO 6143's Gamma: the largest deviation of a standard or of a level's mean response
    from the curve, in its standard uncertainty; the fit is adequate up to 2. ``scatter_known`` is False when the
    scatter of the responses was sought in the residuals and the certificates left nothing of it.
    """

    coefficients: FloatArray  # (n_coefficients,) of x^powers
    factor: FloatArray
    certificate: FloatArray
    true_x: FloatArray  # (n_points,)
    u_y: FloatArray  # (n_points,)
    chi_square: float
    degrees_of_freedom: int
    goodness: float
    scatter_known: bool

    @property
    def mswd(self) -> float:
        """Mean square weighted deviation, chi^2 over degrees of freedom; NaN without any."""
        return self.chi_square / self.degrees_of_freedom if self.degrees_of_freedom else math.nan


@dataclass(frozen=True, slots=True, eq=False)
class _Problem:
    """The points in the scaled basis of the fit."""

    t: FloatArray  # (n,) scaled standards
    y: FloatArray  # (n,)
    powers: FloatArray  # (p,)
    errors: FloatArray  # (n, k) of t


@dataclass(frozen=True, slots=True, eq=False)
class _Solution:
    b: FloatArray  # (p,)
    e: FloatArray  # (k,)
    chi_square: float
    residual: FloatArray  # (n,) y - f at the true standards
    back: FloatArray  # (p, p) inverse of the triangle that belongs to b
    top: FloatArray  # (k, p) how b answers to the errors of the standards, before `back`


Whitening = Callable[[FloatArray], FloatArray]


def fit_distance(
    x: FloatArray,
    y: FloatArray,
    powers: Sequence[int],
    errors: FloatArray,
    u_y: FloatArray | None = None,
) -> DistanceFit:
    """Polynomial through points with errors in both variables.

    Parameters
    ----------
    x, y : (n_points,) float arrays
        Standards and responses.
    powers : sequence of int
        Ascending powers of x that are free.
    errors : (n_points, n_errors) float array
        Factor of the covariance of x, see `coulombook.curves.certificates.standard_errors`.
    u_y : (n_points,) or (n_points, n_points) float array, optional
        Standard uncertainty of each response, or their covariance. When it is not given, one variance common to all
        responses is sought such that chi^2 equals its degrees of freedom (Paule & Mandel, J. Res. Natl. Bur. Stand. 87
        (1982) 377): the scatter about the curve that the certificates do not explain.

    Raises
    ------
    ValueError
        Too few points, an uncertainty of a response that is not above zero, or no convergence.
    """
    from coulombook.curves.fit import fit_polynomial, scaled_design

    powers = tuple(powers)
    start = fit_polynomial(x, y, powers, None if u_y is None else 1.0 / _variance(u_y))
    centre, scale, plain = scaled_design(x, powers)
    b = np.asarray(np.linalg.solve(plain, start.coefficients), dtype=np.float64)
    problem = _Problem((x - centre) / scale, y, np.array(powers, dtype=float), errors / scale)
    e = np.zeros(errors.shape[1])
    known = True
    if u_y is None:
        variance, known = _paule_mandel(problem, b, start.residual_sd**2, x.size - len(powers))
        u_y = np.full_like(y, math.sqrt(variance))
    solution = _solve(problem, _whitening(u_y), b, e)
    single = np.sqrt(_variance(u_y))
    shift = errors @ solution.e
    return DistanceFit(
        coefficients=plain @ solution.b,
        factor=plain @ solution.back,
        certificate=plain @ solution.back @ solution.top.T,
        true_x=x + shift,
        u_y=single,
        chi_square=solution.chi_square,
        degrees_of_freedom=x.size - len(powers),
        goodness=_goodness(x, shift, errors, solution.residual, single),
        scatter_known=known,
    )


def _variance(u_y: FloatArray) -> FloatArray:
    variance: FloatArray = np.square(u_y) if u_y.ndim == 1 else np.diag(u_y)
    if not (variance > 0.0).all():
        raise ValueError("every response needs an uncertainty above zero")
    return variance


def _whitening(u_y: FloatArray) -> Whitening:
    """Turns responses into ones with independent errors of unit variance."""
    if u_y.ndim == 1:
        return lambda a: (a.T / u_y).T
    root = np.linalg.cholesky(u_y)
    return lambda a: np.linalg.solve(root, a)


def _solve(problem: _Problem, whiten: Whitening, b: FloatArray, e: FloatArray) -> _Solution:
    k, size = e.size, b.size
    rounding = 64.0 * _EPS * float(np.linalg.norm(whiten(problem.y)))
    small = max(_SMALL_STEP, rounding)
    damping = 0.0
    identity = np.eye(k)
    below = np.zeros((k, size))
    state = _state(problem, whiten, b, e)
    for _ in range(_STEPS):
        t, basis, residual, chi_square = state
        slope = _derivative(problem.powers, t) @ b
        derivatives = np.block([[whiten(slope[:, None] * problem.errors), whiten(basis)], [identity, below]])
        miss = np.concatenate((whiten(residual), -e))
        q, r = np.linalg.qr(derivatives)
        along = q.T @ miss
        length = float(np.linalg.norm(along))
        if length <= small:
            back = np.linalg.inv(r[k:, k:])
            return _Solution(b, e, chi_square, residual, back, q[problem.y.size :, k:])
        while True:
            step = _damped(r, along, damping)
            following = _state(problem, whiten, b + step[k:], e + step[:k])
            # what a step so short lowers, its square, drowns in the rounding of chi^2
            if length < _NEAR or following[3] <= chi_square:
                damping = 0.1 * damping if damping > 1e-6 else 0.0
                break
            damping = max(10.0 * damping, 1e-3)
            if damping > 1e12:
                raise ValueError("the fit with errors in both variables does not converge")
        b, e, state = b + step[k:], e + step[:k], following
    raise ValueError("the fit with errors in both variables does not converge")


def _state(
    problem: _Problem, whiten: Whitening, b: FloatArray, e: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray, float]:
    """Scaled true standards, their powers, the residuals and chi^2."""
    t = problem.t + problem.errors @ e
    basis = t[:, None] ** problem.powers
    residual = problem.y - basis @ b
    return t, basis, residual, float(np.sum(np.square(whiten(residual))) + e @ e)


def _derivative(powers: FloatArray, t: FloatArray) -> FloatArray:
    result: FloatArray = powers * t[:, None] ** np.maximum(powers - 1.0, 0.0)
    return result


def _damped(r: FloatArray, along: FloatArray, damping: float) -> FloatArray:
    if damping == 0.0:
        return np.asarray(np.linalg.solve(r, along), dtype=np.float64)
    size = np.linalg.norm(r, axis=0)
    rows = np.vstack((r, math.sqrt(damping) * np.diag(size)))
    target = np.concatenate((along, np.zeros(size.size)))
    return np.asarray(np.linalg.lstsq(rows, target, rcond=None)[0], dtype=np.float64)


def _paule_mandel(problem: _Problem, b: FloatArray, largest: float, freedom: int) -> tuple[float, bool]:
    """Variance of the responses at which chi^2 equals its degrees of freedom, and whether there is one.

    chi^2 falls as the variance v grows, with d chi^2/dv = -sum residual^2/v^2 at its minimum, and it is at most
    its degrees of freedom where v is the residual variance of the fit without errors in x: Newton's
    steps in ln v between these bounds.
    """
    slope = _derivative(problem.powers, problem.t) @ b
    effect = np.square(slope) * np.sum(np.square(problem.errors), axis=1)
    rounding = (1e-12 * float(np.abs(problem.y).max())) ** 2
    smallest = max(_NEGLIGIBLE**2 * float(np.median(effect)), rounding)
    if freedom == 0 or largest <= smallest:
        return smallest, False
    e = np.zeros(problem.errors.shape[1])

    def excess(v: float) -> tuple[float, float]:
        nonlocal b, e
        found = _solve(problem, _whitening(np.full_like(problem.y, math.sqrt(v))), b, e)
        b, e = found.b, found.e
        return found.chi_square - freedom, -float(found.residual @ found.residual) / v

    low, high = math.log(smallest), math.log(largest)
    at = high
    for _ in range(_STEPS):
        over, slope_of_log = excess(math.exp(at))
        if over > 0.0:
            low = at
        else:
            high = at
        if high - low < 1e-12 or abs(over) <= 1e-9 * freedom:
            break
        following = at - over / slope_of_log if slope_of_log < 0.0 else low
        if not low < following < high:
            if low == math.log(smallest) and following <= low and excess(smallest)[0] <= 0.0:
                return smallest, False
            following = 0.5 * (low + high)
        at = following
    return math.exp(at), True


def _goodness(
    x: FloatArray, shift: FloatArray, errors: FloatArray, residual: FloatArray, u_y: FloatArray
) -> float:
    u_x = np.sqrt(np.sum(np.square(errors), axis=1))
    _, member = np.unique(x, return_inverse=True)
    member = member.reshape(-1)
    of_mean = np.abs(np.bincount(member, weights=residual)) / np.sqrt(np.bincount(member, weights=u_y**2))
    of_x = np.abs(shift[u_x > 0.0]) / u_x[u_x > 0.0]
    return float(max(of_mean.max(), of_x.max(initial=0.0)))
