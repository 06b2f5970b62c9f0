"""Reconciliation of measured values with linear constraints they must obey.

Kuehn & Davidson, Chem. Eng. Prog. 57(6) (1961) 44; measurement test: Mah & Tamhane, AIChE J. 28 (1982) 828.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from coulombook.uncertainty.linearised import FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class Reconciled:
    """Adjusted values and the tests of the adjustment.

    ``value`` (n,) and ``covariance`` (n, n) after adjustment; ``residual`` (m,) of the constraints before it;
    ``chi2`` with ``dof`` degrees of freedom is the global test; ``z`` (n,) is the measurement test of each value, NaN
    where the constraints cannot move it.
    """

    value: FloatArray
    covariance: FloatArray
    residual: FloatArray
    chi2: float
    dof: int
    p: float
    z: FloatArray


def reconcile(
    value: FloatArray,
    covariance: FloatArray,
    constraints: FloatArray,
    target: FloatArray,
    slack: FloatArray | float = 0.0,
) -> Reconciled:
    """Least-squares adjustment of y so that A y = b, weighted by the full covariance S of y.

    x = y - S A^T V^-1 (A y - b), cov(x) = S - S A^T V^-1 A S, with V = A S A^T + diag(slack^2).

    Parameters
    ----------
    value : (n,) float array
        Measured values y.
    covariance : (n, n) float array
        Their covariance S; may be singular as long as V is not.
    constraints : (m, n) float array
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
    from scipy.special import chdtrc

    residual = constraints @ value - target
    gain = covariance @ constraints.T
    v = constraints @ gain + np.diag(np.broadcast_to(np.square(slack), target.shape))
    rank = int(np.linalg.matrix_rank(v, hermitian=True)) if len(target) else 0
    if rank < len(target):
        raise ValueError(
            f"only {rank} of {len(target)} constraints can be adjusted to: one has no uncertainty, or repeats another"
        )
    solved = (
        np.linalg.solve(v, np.column_stack([residual, gain.T]))
        if len(target)
        else np.zeros((0, 1 + len(value)))
    )
    shift = gain @ solved[:, 0]
    taken = gain @ solved[:, 1:]
    spread = np.sqrt(np.clip(np.diag(taken), 0.0, None))
    moved = spread > 1e-12 * np.sqrt(np.clip(np.diag(covariance), 0.0, None))
    z = np.divide(shift, spread, out=np.full(shift.shape, np.nan), where=moved)
    chi2 = float(residual @ solved[:, 0])
    return Reconciled(
        value - shift,
        covariance - taken,
        residual,
        chi2,
        len(target),
        float(chdtrc(len(target), chi2)) if len(target) else 1.0,
        z,
    )
