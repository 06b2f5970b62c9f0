"""Rows of the table of closure: each run's balance, and that of the day as a whole."""

from __future__ import annotations

import numpy as np

from coulombook.balance.closing import close_day
from coulombook.balance.settle import Settled
from coulombook.balance.verdicts import CLOSED, closures
from coulombook.book.entries import PERCENT, Row
from coulombook.uncertainty.linearised import nominal

OPEN = "open"  # the whole day, which may be short in one run and over in another


def closure_rows(settled: Settled) -> list[Row]:
    """One row per run with products, and a last one, without a run, for the day.

    The day's is left out where no uncertainty is known by which all runs could be judged together.
    """
    plan = settled.plan
    verdicts, u = closures(settled)
    total = nominal(settled.outcome.total)
    rows: list[Row] = [
        {
            "run": plan.runs[run].name,
            "total FE / %": float(total[run] * PERCENT),
            "u(total FE) / %": float(u[run] * PERCENT),
            "deviation / u": float((total[run] - 1.0) / u[run]) if u[run] > 0 else None,
            "closure": verdicts[run],
        }
        for run in np.unique(plan.products.run).tolist()
    ]
    try:
        runs, test = close_day(settled)
    except ValueError:
        return rows
    if len(runs):
        closes = test.p >= 1.0 - plan.settings.level_of_confidence
        rows.append(
            {
                "closure": CLOSED if closes else OPEN,
                "chi-square": test.chi2,
                "degrees of freedom": test.dof,
                "p": test.p,
            }
        )
    return rows
