"""The day's balance as constraints: readings adjusted to a total of one, shown beside the measured ones."""

from __future__ import annotations

import numpy as np

from coulombook.balance.settle import Settled
from coulombook.uncertainty.linearised import IntArray, Linearised, gather, sparse_map
from coulombook.uncertainty.reconcile import Reconciled, reconcile


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
    plan = settled.plan
    rows = np.flatnonzero(settled.detection.detected)
    runs, constraint = np.unique(plan.products.run[rows], return_inverse=True)
    x = gather(settled.outcome.faradaic_efficiency, rows)
    if not isinstance(x, Linearised):
        raise ValueError("no uncertainty is known that the day could be adjusted with")
    sums = sparse_map(constraint, np.arange(len(rows)), 1.0, (len(runs), len(rows)))
    slack = plan.settings.unaccounted or 0.0
    return rows, runs, reconcile(x, sums, np.ones(len(runs)), slack)
