"""Rows of the tables of carbon and energy."""

from __future__ import annotations

import numpy as np

from coulombook.balance.efficiencies import CarbonAccount, ProductEfficiencies
from coulombook.balance.settle import Settled
from coulombook.book.entries import PERCENT, Row
from coulombook.uncertainty.linearised import Number, nominal, standard_uncertainty


def _with_u(name: str, x: Number) -> tuple[tuple[str, list[float]], tuple[str, list[float]]]:
    """A column in percent and that of its standard uncertainty."""
    value = nominal(x) * PERCENT
    u = np.where(np.isfinite(value), standard_uncertainty(x) * PERCENT, np.nan)
    return (f"{name} / %", value.tolist()), (f"u({name}) / %", u.tolist())


def carbon_rows(settled: Settled, account: CarbonAccount) -> list[Row]:
    """One row per run."""
    columns = (
        *_with_u("CO2 conversion", account.conversion),
        ("carbonate bound / %", (nominal(account.carbonate_bound) * PERCENT).tolist()),
        ("total FE at inlet flow / %", (account.total_at_inlet * PERCENT).tolist()),
        ("total FE at outlet flow / %", (account.total_at_outlet * PERCENT).tolist()),
    )
    return [
        {
            "run": run.name,
            **{head: column[number] for head, column in columns},
            "outlet flow by": account.outlet_by[number] or None,
        }
        for number, run in enumerate(settled.plan.runs)
    ]


def efficiency_rows(settled: Settled, found: ProductEfficiencies) -> list[Row]:
    """One row per run and detected product."""
    products = settled.plan.products
    equilibrium = nominal(found.equilibrium_volt).tolist()
    columns = (
        *_with_u("carbon efficiency", found.of_fed),
        *_with_u("share of converted CO2", found.of_converted),
        *_with_u("cathodic energy efficiency", found.cathodic),
        *_with_u("full-cell energy efficiency", found.full_cell),
    )
    return [
        {
            "run": settled.plan.runs[products.run[row]].name,
            "product": products.species[row],
            "E equilibrium vs RHE / V": equilibrium[number],
            **{head: column[number] for head, column in columns},
        }
        for number, row in enumerate(found.rows.tolist())
    ]
