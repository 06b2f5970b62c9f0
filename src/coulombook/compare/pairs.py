"""Catalysts against one another at one point: differences and ratios with intervals in which shared errors cancel.

What two catalysts share (one flow meter, one curve) moves both and leaves their difference or ratio nearly alone; what
is each run's own, and the scatter between runs that nobody declared, does not.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from coulombook.compare.adjustment import holm
from coulombook.compare.replicates import Scatter
from coulombook.compare.statistics import student_p, student_quantile
from coulombook.uncertainty.linearised import FloatArray, Linearised, standard_uncertainty

CLEAR_OF_ZERO = 3.0  # standard uncertainties: less and the interval of a logarithm is no interval of a ratio
_ENDLESS = 1e9  # degrees of freedom: Student's t is the normal distribution to nine digits


@dataclass(frozen=True, slots=True)
class Pair:
    """One catalyst against another, ``one`` having the larger mean.

    ``ratio`` is NaN where one of the means is not clear of zero. ``p`` is that of equal catalysts, from the ratio
    where there is one and from the difference elsewhere; ``p_holm`` is it after Holm over the family.
    """

    one: str
    other: str
    difference: float
    u: float
    low: float
    high: float
    ratio: float
    ratio_low: float
    ratio_high: float
    degrees_of_freedom: float
    p: float
    p_holm: float

    def told_apart(self, level: float) -> bool:
        """Whether the family as a whole tells the two apart at a level of confidence."""
        return self.p_holm < 1.0 - level


@dataclass(frozen=True, slots=True, eq=False)
class Contest:
    """Catalysts at one point, largest mean first, with all their pairs."""

    catalysts: tuple[str, ...]
    mean: FloatArray
    u: FloatArray
    pairs: tuple[Pair, ...]


def contest(x: Linearised, catalysts: Sequence[str], scatter: Scatter, level: float = 0.95) -> Contest:
    """Compare catalysts by their means at one point.

    Differences on the quantity, ratios on its logarithm, where a relative error that both share cancels exactly. The
    degrees of freedom are those of Welch and Satterthwaite: the stated uncertainties count as known, the scatter
    between runs as well as it was estimated, and of two catalysts neither need scatter as the other does.

    Parameters
    ----------
    x : (n_catalysts,) Linearised
        Means, the errors of `Scatter` among their errors.
    catalysts : (n_catalysts,) sequence of str
    scatter : Scatter
    level : float
        Level of confidence of the intervals.
    """
    rows = x.jacobian.toarray()
    u = standard_uncertainty(x)
    order = sorted(range(len(catalysts)), key=lambda number: -x.value[number])
    pairs = [
        _pair(x.value, rows, u, catalysts, (a, b), scatter, level)
        for place, a in enumerate(order)
        for b in order[place + 1 :]
    ]
    return Contest(
        tuple(catalysts[number] for number in order),
        x.value[order],
        u[order],
        family([pairs])[0],
    )


def family(points: Sequence[Sequence[Pair]]) -> list[tuple[Pair, ...]]:
    """Pairs of several points judged together: at most one family in 1/(1 - level) holds a false verdict."""
    adjusted = iter(holm([pair.p for pairs in points for pair in pairs]))
    return [tuple(replace(pair, p_holm=next(adjusted)) for pair in pairs) for pairs in points]


def _pair(
    mean: FloatArray,
    rows: FloatArray,
    u: FloatArray,
    names: Sequence[str],
    pair: tuple[int, int],
    scatter: Scatter,
    level: float,
) -> Pair:
    a, b = pair
    difference = float(mean[a] - mean[b])
    of_difference, freedom = _uncertainty(rows[a] - rows[b], scatter)
    half = _quantile(freedom, level) * of_difference
    p = _tail(difference, of_difference, freedom)
    ratio = ratio_low = ratio_high = math.nan
    if min(mean[a] - CLEAR_OF_ZERO * u[a], mean[b] - CLEAR_OF_ZERO * u[b]) > 0:
        logarithm = math.log(mean[a] / mean[b])
        of_logarithm, freedom = _uncertainty(rows[a] / mean[a] - rows[b] / mean[b], scatter)
        reach = _quantile(freedom, level) * of_logarithm
        ratio, ratio_low, ratio_high = (math.exp(logarithm + shift) for shift in (0.0, -reach, reach))
        p = _tail(logarithm, of_logarithm, freedom)
    return Pair(
        names[a], names[b], difference, of_difference, difference - half, difference + half, ratio, ratio_low,
        ratio_high, freedom, p, p,
    )  # fmt: skip


def _uncertainty(row: FloatArray, scatter: Scatter) -> tuple[float, float]:
    """Standard uncertainty of a contrast with these errors, and its degrees of freedom."""
    whole = float(row @ row)
    own = row[scatter.first : scatter.first + len(scatter.group)]
    parts = np.bincount(scatter.group, own**2, len(scatter.freedom))
    doubt = float((parts**2 / scatter.freedom).sum())
    return math.sqrt(whole), whole**2 / doubt if doubt > 0 else math.inf


def _quantile(freedom: float, level: float) -> float:
    return student_quantile(min(freedom, _ENDLESS), level)


def _tail(value: float, u: float, freedom: float) -> float:
    """Two-sided probability; NaN where nothing is uncertain."""
    return math.nan if not u > 0 else student_p(value / u, min(freedom, _ENDLESS))
