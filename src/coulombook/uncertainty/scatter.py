"""Scatter of repeats that the stated uncertainties do not explain."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from coulombook.uncertainty.linearised import (
    FloatArray,
    IntArray,
    Linearised,
    Number,
    linear_map,
    nominal,
    sparse_map,
    standard_uncertainty,
)


@dataclass(frozen=True, slots=True, eq=False)
class Pooled:
    """Repeats pooled by group.

    ``count`` (n_groups,) repeats; ``mean`` (n_groups,) with the law-of-propagation part of its uncertainty;
    ``deviation`` (n_groups,) sample standard deviation s, NaN for a single repeat; ``explained`` (n_groups,) variance
    of a single repeat that its own uncertainty explains, without what all repeats share, 0 for a single one;
    ``unexplained`` (n_groups,) variance beyond it; ``residual`` (n,) repeat minus its group's mean.
    """

    count: FloatArray
    mean: Number
    deviation: FloatArray
    explained: FloatArray
    unexplained: FloatArray
    residual: FloatArray


def pool(x: Number, group: IntArray, groups: int) -> Pooled:
    """Mean of each group of repeats, and the variance between repeats that their uncertainties leave unexplained.

    With repeats x_i of covariance C, errors that all repeats share do not make them scatter: the expected sample
    variance is e = mean(C_ii) - mean(C_ij, i != j). What s^2 exceeds this, max(0, s^2 - e), is unexplained and enters
    the uncertainty of the mean as sqrt(unexplained / m) beside the propagated part (the between-group variance of a
    one-way analysis of variance; JCGM 100:2008, H.5).

    Parameters
    ----------
    x : (n,) numbers
    group : (n,) int array
        Group of each repeat, 0 <= group < groups.
    groups : int
        Number of groups, each with at least one repeat.
    """
    n = len(group)
    count = np.bincount(group, minlength=groups).astype(float)
    averaging = sparse_map(group, np.arange(n), 1.0 / count[group], (groups, n))
    mean = linear_map(averaging, x)
    residual = nominal(x) - nominal(mean)[group]
    several = count > 1
    with np.errstate(invalid="ignore", divide="ignore"):
        variance = np.where(
            several, np.bincount(group, weights=residual**2, minlength=groups) / (count - 1), np.nan
        )
    if isinstance(x, Linearised):
        mean_variance = averaging @ (standard_uncertainty(x) ** 2)
        with np.errstate(invalid="ignore", divide="ignore"):
            # var(mean) = (mean C_ii + (m - 1) mean C_ij) / m, solved for mean C_ii - mean C_ij
            explained = (mean_variance - standard_uncertainty(mean) ** 2) * count / (count - 1)
        explained = np.where(several, explained, 0.0)
    else:
        explained = np.zeros(groups)
    unexplained = np.where(several, np.clip(variance - explained, 0.0, None), 0.0)
    return Pooled(count, mean, np.sqrt(variance), explained, unexplained, residual)
