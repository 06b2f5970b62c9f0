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

from coulombook.curves.unexplained import components, unexplained_variance

FloatArray = NDArray[np.float64]

_STEPS = 200
_SMALL_STEP = 1e-10  # of the standard uncertainties
_NEAR = 1e-5  # of the standard uncertainties
_NEGLIGIBLE = 1e-3  # a scatter of this share of the certificates' effect adds 1e-6 to a variance
_SETTLED = 1e-10  # relative change of a scatter sought in the residuals
_EPS = float(np.finfo(float).eps)


@dataclass(frozen=True, slots=True, eq=False)
class DistanceFit:
    """What a fit with errors in both variables finds.

    ``factor`` (n_coefficients, n_coefficients) is L with covariance = L L^T, not scaled by chi^2;
    ``certificate`` (n_coefficients, n_errors) is the part of the coefficients' errors that each error of the standards
    makes. ``goodness`` is ISO 6143's Gamma: the largest deviation of a standard or of a level's mean response
    from the curve, in its standard uncertainty; the fit is adequate up to 2. ``scatter_freedom`` are the degrees of
    freedom of u_y where it was sought in the residuals.
    """

    coefficients: FloatArray  # (n_coefficients,) of x^powers
    factor: FloatArray
    certificate: FloatArray
    true_x: FloatArray  # (n_points,)
    u_y: FloatArray  # (n_points,)
    chi_square: float
    degrees_of_freedom: int
    goodness: float
    scatter_freedom: float

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
        responses is sought in the residuals: fit and `coulombook.curves.unexplained.unexplained_variance` of the fit's
        residuals take turns until the variance changes by less than 1e-10 of itself.

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
    freedom = float(x.size - len(powers))
    if u_y is None:
        u_y, freedom = _scatter_of_residuals(problem, b, start.residual_sd)
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
        scatter_freedom=freedom,
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


def _scatter_of_residuals(problem: _Problem, b: FloatArray, plain_sd: float) -> tuple[FloatArray, float]:
    """Standard uncertainty common to all responses, and its degrees of freedom."""
    slope = _derivative(problem.powers, problem.t) @ b
    effect = np.sum(np.square(slope[:, None] * problem.errors), axis=1)
    # as good as none, for points that lie on the curve or leave no degree of freedom: the fit needs one to weigh with
    least = max(_NEGLIGIBLE * math.sqrt(float(np.median(effect))), 1e-12 * float(np.abs(problem.y).max()))
    u, freedom = max(plain_sd, least), float(problem.y.size - b.size)
    if freedom == 0.0 or u == least:
        return np.full_like(problem.y, least), freedom
    e = np.zeros(problem.errors.shape[1])
    for _ in range(_STEPS):
        found = _solve(problem, _whitening(np.full_like(problem.y, u)), b, e)
        b, e = found.b, found.e
        t = problem.t + problem.errors @ e
        moved = (_derivative(problem.powers, t) @ b)[:, None] * problem.errors
        # responses less the curve at the standards as stated, to first order
        residual = found.residual + moved @ e
        variance, freedom = unexplained_variance(*components(residual, t[:, None] ** problem.powers, moved))
        before, u = u, max(math.sqrt(variance), least)
        if abs(u - before) <= _SETTLED * u:
            break
    return np.full_like(problem.y, u), freedom


def _goodness(
    x: FloatArray, shift: FloatArray, errors: FloatArray, residual: FloatArray, u_y: FloatArray
) -> float:
    u_x = np.sqrt(np.sum(np.square(errors), axis=1))
    _, member = np.unique(x, return_inverse=True)
    member = member.reshape(-1)
    of_mean = np.abs(np.bincount(member, weights=residual)) / np.sqrt(np.bincount(member, weights=u_y**2))
    of_x = np.abs(shift[u_x > 0.0]) / u_x[u_x > 0.0]
    return float(max(of_mean.max(), of_x.max(initial=0.0)))
