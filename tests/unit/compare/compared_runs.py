"""Runs drawn from a truth, with errors of their own and one that all share, for the tests of comparisons."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from coulombook.uncertainty.linearised import Linearised, sparse_map


def numbers(
    values: Sequence[float], own: float | Sequence[float], shared: float = 0.0, *, relative: bool = True
) -> Linearised:
    """Numbers with standard uncertainties of their own and one error that moves all of them."""
    value = np.array(values, dtype=float)
    n = len(value)
    size = value if relative else np.ones(n)
    rows = [*range(n), *range(n)]
    sizes = np.concatenate([np.broadcast_to(np.asarray(own, dtype=float), n) * size, shared * size])
    return Linearised(value, sparse_map(rows, [*range(n), *[n] * n], sizes, (n, n + 1)))


def stacked(*parts: Linearised) -> list[Linearised]:
    """Quantities of the same runs whose errors have nothing in common."""
    count = sum(part.jacobian.shape[1] for part in parts)
    first, result = 0, []
    for part in parts:
        entries = part.jacobian.tocoo()
        shape = (len(part), count)
        result.append(
            Linearised(part.value, sparse_map(entries.row, first + entries.col, entries.data, shape))
        )
        first += part.jacobian.shape[1]
    return result
