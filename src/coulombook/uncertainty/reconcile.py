"""Reconciliation of measured values with linear constraints they must obey.

Kuehn & Davidson, Chem. Eng. Prog. 57(6) (1961) 44; measurement test: Mah & Tamhane, AIChE J. 28 (1982) 828.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from coulombook.uncertainty.linearised import FloatArray, Linearised, squared_norms

if TYPE_CHECKING:
    from scipy.sparse import csr_array

# rows of the values that are worked on at a time: bounds the memory of a day with thousands of runs
_CHUNK = 2048


@dataclass(frozen=True, slots=True, eq=False)
class Reconciled:
    """Adjusted values and the tests of the adjustment.

    ``value`` and ``u`` (n,) after adjustment; ``residual`` (m,) of the constraints before it; ``chi2`` with ``dof``
    degrees of freedom and probability ``p`` is the global test; ``z`` (n,) is the measurement test of each value,
    NaN where the constraints cannot move it; ``constraint_z`` (m,) is each residual over its own uncertainty.
    """

    value: FloatArray
    u: FloatArray
    residual: FloatArray
    constraint_z: FloatArray
    chi2: float
    dof: int
    p: float
    z: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class GlobalTest:
    """Whether values obey their constraints within their uncertainties.

    ``residual`` (m,) of the constraints, ``z`` (m,) each over its own uncertainty; ``chi2`` of all of them together,
    with ``dof`` degrees of freedom and probability ``p``.
    """

    residual: FloatArray
    z: FloatArray
    chi2: float
    dof: int
    p: float


def global_test(
    x: Linearised, constraints: csr_array, target: FloatArray, slack: FloatArray | float = 0.0
) -> GlobalTest:
    """Chi-square test of A y = b; parameters and errors as in `reconcile`."""
    return _solve(x, constraints, target, slack).test


@dataclass(frozen=True, slots=True, eq=False)
class _Solved:
    """``of_constraints`` derivatives of A y, ``inverse`` V^-1, ``solved`` V^-1 (A y - b)."""

    of_constraints: csr_array
    inverse: FloatArray
    solved: FloatArray
    test: GlobalTest


def _solve(x: Linearised, constraints: csr_array, target: FloatArray, slack: FloatArray | float) -> _Solved:
    from scipy.special import chdtrc

    m = constraints.shape[0]
    residual = constraints @ x.value - target
    of_constraints = constraints @ x.jacobian
    v = (of_constraints @ of_constraints.T).toarray() + np.diag(np.broadcast_to(np.square(slack), (m,)))
    scale = np.sqrt(np.diag(v))
    if m and not (scale > 0).all():
        raise ValueError(f"constraint {int(np.argmin(scale))} has no uncertainty to be adjusted with")
    rank = int(np.linalg.matrix_rank(v / np.outer(scale, scale), hermitian=True)) if m else 0
    if rank < m:
        raise ValueError(f"only {rank} of {m} constraints are independent of one another")
    inverse = np.linalg.inv(v)
    solved = inverse @ residual
    chi2 = float(residual @ solved)
    p = float(chdtrc(m, chi2)) if m else 1.0
    return _Solved(of_constraints, inverse, solved, GlobalTest(residual, residual / scale, chi2, m, p))


def reconcile(
    x: Linearised, constraints: csr_array, target: FloatArray, slack: FloatArray | float = 0.0
) -> Reconciled:
    """Least-squares adjustment of y so that A y = b, weighted by the full covariance S of y.

    y' = y - S A^T V^-1 (A y - b), cov(y') = S - S A^T V^-1 A S, with V = A S A^T + diag(slack^2).

    Parameters
    ----------
    x : (n,) Linearised
        Measured values y; their derivatives J by unit errors give S = J J^T.
    constraints : (m, n) sparse array
        A.
    target : (m,) float array
        b.
    slack : (m,) float array or float
        Standard deviation allowed to each constraint: it then holds only within this prior.

    Raises
    ------
    ValueError
        V is singular: a constraint has no uncertainty to be adjusted with, or repeats another one.
    """
    n = constraints.shape[1]
    found = _solve(x, constraints, target, slack)
    shift, taken = np.zeros(n), np.zeros(n)
    for first in range(0, n, _CHUNK):
        held = slice(first, first + _CHUNK)
        gain = (x.jacobian[held] @ found.of_constraints.T).toarray()
        shift[held] = gain @ found.solved
        taken[held] = np.einsum("nm,mk,nk->n", gain, found.inverse, gain, optimize=True)
    variance = squared_norms(x.jacobian)
    spread = np.sqrt(np.clip(taken, 0.0, None))
    moved = taken > 1e-24 * variance
    test = found.test
    return Reconciled(
        x.value - shift,
        np.sqrt(np.clip(variance - taken, 0.0, None)),
        test.residual,
        test.z,
        test.chi2,
        test.dof,
        test.p,
        np.divide(shift, spread, out=np.full(n, np.nan), where=moved & (spread > 0)),
    )
