"""Uncertainty budgets: which source contributes what to the variance of an output (JCGM 100:2008, 5.1.3 and 7.2.7)."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from coulombook.uncertainty.errors import Source
from coulombook.uncertainty.linearised import FloatArray, Linearised, Number, sparse_map


@dataclass(frozen=True, slots=True, eq=False)
class Budget:
    """Contributions u_s (n_outputs, n_sources) of each source to the standard uncertainty of each output.

    The sources are independent of one another, so that the squares of a row add up to the output's variance.
    """

    sources: tuple[Source, ...]
    u: FloatArray

    @property
    def share(self) -> FloatArray:
        """Share of each source in the variance of each output, (n_outputs, n_sources).

        Zero where there is no finite variance.
        """
        square = self.u**2
        total = square.sum(axis=1, keepdims=True)
        known = np.isfinite(total) & (total > 0)
        result: FloatArray = np.divide(square, total, out=np.zeros_like(square), where=known)
        return result


def budget(x: Number, sources: Sequence[Source]) -> Budget:
    """Sum up the error columns of each source.

    Parameters
    ----------
    x : (n_outputs,) numbers
    sources : (n_errors,) sequence
        Source of each error column, as `Inputs.sources` holds them.
    """
    names = tuple(dict.fromkeys(sources))
    if not isinstance(x, Linearised):
        return Budget(names, np.zeros((len(x), len(names))))
    place = {source: number for number, source in enumerate(names)}
    owner = [place[source] for source in sources]
    merged = x.jacobian.copy()
    merged.sum_duplicates()
    sums = sparse_map(np.arange(len(sources)), owner, 1.0, (len(sources), len(names)))
    return Budget(names, np.sqrt((merged.multiply(merged) @ sums).toarray()))
