"""The day's balance as constraints: readings adjusted to a total of one, shown beside the measured ones."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from coulombook.balance.settle import Settled
from coulombook.uncertainty.linearised import IntArray, Linearised, gather, sparse_map
from coulombook.uncertainty.reconcile import GlobalTest, Reconciled, global_test, reconcile

if TYPE_CHECKING:
    from scipy.sparse import csr_array


def reconcile_day(settled: Settled) -> tuple[IntArray, IntArray, Reconciled]:
    """Adjust every counted Faradaic efficiency of the day so that each run adds up to one.

    All covariances count: an outlet flow that is off is pulled back once, for all runs. A share that the day allows to
    be unaccounted for ([balance] unaccounted) is the slack of each constraint.

    Returns
    -------
    rows : (n,) int array
        Rows of the ledger that were adjusted, those that are counted.
    runs : (m,) int array
        Run of each constraint.
    reconciled : Reconciled

    Raises
    ------
    ValueError
        A run has no uncertainty to be adjusted with.
    """
    one = _constrain(settled)
    return one.rows, one.runs, reconcile(one.x, one.sums, np.ones(len(one.runs)), one.slack)


def close_day(settled: Settled) -> tuple[IntArray, GlobalTest]:
    """Whether the totals of all runs together are one: the runs, and the chi-square test with all covariances.

    Raises ValueError as `reconcile_day`.
    """
    one = _constrain(settled)
    return one.runs, global_test(one.x, one.sums, np.ones(len(one.runs)), one.slack)


@dataclass(frozen=True, slots=True, eq=False)
class _Constrained:
    """``sums`` of counted efficiencies ``x`` (rows of the ledger), one constraint for each of ``runs``."""

    rows: IntArray
    runs: IntArray
    x: Linearised
    sums: csr_array
    slack: float


def _constrain(settled: Settled) -> _Constrained:
    plan = settled.plan
    rows = np.flatnonzero(settled.detection.detected)
    runs, constraint = np.unique(plan.products.run[rows], return_inverse=True)
    x = gather(settled.outcome.faradaic_efficiency, rows)
    if not isinstance(x, Linearised):
        raise ValueError("no uncertainty is known that the day could be adjusted with")
    sums = sparse_map(constraint, np.arange(len(rows)), 1.0, (len(runs), len(rows)))
    return _Constrained(rows, runs, x, sums, plan.settings.unaccounted or 0.0)
