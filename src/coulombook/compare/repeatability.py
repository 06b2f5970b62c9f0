"""How far runs of one catalyst at one level scatter beyond what their uncertainties explain.

Two or three replicates know their own scatter badly, while a comparison has many pairs of them. Repeated electrolyses
scatter by a like share of what they give (common practice, no source), so that one relative standard deviation is
estimated for one quantity over all catalysts and levels, beside what the stated uncertainties explain. A catalyst whose
runs scatter more than those of the others stands by itself, and so does a single group of replicates, by Cochran's test
at 5 % (the level of a straggler in ISO 5725-2): setting apart too much costs resolution, too little costs the truth.

Of two catalysts that are left with replicates no others tell which of them scatters as usual, and a test between the
two overlooks much: each is judged by its own scatter, as in Welch's test, and catalysts without replicates by the
larger of the two.

Sources: Welch, Biometrika 34 (1947) 28; Ruxton, Behav. Ecol. 17 (2006) 688 (Welch's test without a test before it);
Patterson & Thompson, Biometrika 58 (1971) 545 (restricted likelihood, here solved by scoring); ISO 5725-2:1994, 7.3.3
(Cochran's test); 't Lam, Anal. Chim. Acta 659 (2010) 68 (its F form, for groups of unequal size). All from memory.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]
Mask = NDArray[np.bool_]

STRAGGLING = 0.05  # level of Cochran's test for a straggler, ISO 5725-2
_ROUNDS = 200
_CLOSE = 1e-10
_NOTHING = 1e-24  # of the square of a mean: a variance that is rounding


@dataclass(frozen=True, slots=True, eq=False)
class Groups:
    """Replicates by group, (n,) each."""

    owner: IntArray  # number of the catalyst
    mean: FloatArray
    variance: FloatArray  # sample variance of a run; NaN for a single one
    explained: FloatArray  # variance of a run that its uncertainty explains, shared errors left out
    freedom: FloatArray  # runs less one
    counts: FloatArray  # share of it that counts (groups with the same electrodes are one)


@dataclass(frozen=True, slots=True, eq=False)
class Repeatability:
    """Unexplained scatter of a single run.

    Each group belongs to an estimate, ``estimate`` (n,): 0 is the one common to all that do not stand apart. Of each
    estimate ``relative`` is the standard deviation over the mean, and ``freedom`` the effective degrees of freedom with
    which its square is known. ``deviation`` (n,) is that of each group's runs in the unit of the quantity. ``apart``
    (n,) are those that scatter more than the others beyond chance.
    """

    estimate: IntArray
    apart: Mask
    relative: FloatArray
    freedom: FloatArray
    deviation: FloatArray


def repeatability(groups: Groups) -> Repeatability:
    """Estimate the unexplained scatter of runs.

    Examples
    --------
    Nothing is declared, and groups of three runs scatter by 2, 4 and 2 % of their means:

    >>> mean = np.array([1.0, 2.0, 1.0])
    >>> variance = (np.array([0.02, 0.04, 0.02]) * mean) ** 2
    >>> found = repeatability(Groups(np.arange(3), mean, variance, np.zeros(3), np.full(3, 2.0), np.ones(3)))
    >>> found.relative.round(5), found.freedom.round(6)  # sqrt((0.02^2 + 0.04^2 + 0.02^2)/3), 3 x 2
    (array([0.02828]), array([6.]))
    """
    # a mean of nothing has no scatter that is a share of it, and tells nothing of that of others
    usable = (groups.freedom > 0) & np.isfinite(groups.variance) & (groups.mean != 0)
    estimate = np.zeros(len(groups.mean), dtype=np.intp)
    apart = np.zeros(len(groups.mean), dtype=bool)
    last = 0
    by_owner = [np.flatnonzero(groups.owner == one) for one in np.unique(groups.owner)]
    while (found := _straggler(groups, usable & (estimate == 0), by_owner, whole=True)) is not None:
        last += 1
        estimate[found], apart[found] = last, True
    by_itself = [np.array([place]) for place in range(len(groups.mean))]
    for pool in range(last + 1):
        while (found := _straggler(groups, usable & (estimate == pool), by_itself, whole=False)) is not None:
            last += 1
            estimate[found], apart[found] = last, True
    quieter = _quieter_of_two(groups, usable & (estimate == 0), by_owner)
    if quieter is not None:
        last += 1
        estimate[quieter[estimate[quieter] == 0]] = last
    relative, freedom = np.zeros(last + 1), np.full(last + 1, math.inf)
    for pool in range(last + 1):
        held = usable & (estimate == pool)
        alone = held.sum() == 1
        square, information = _common(groups, held, groups.freedom * (1.0 if alone else groups.counts))
        relative[pool] = math.sqrt(square)
        if square > 0:
            freedom[pool] = square**2 * information
    return Repeatability(estimate, apart, relative, freedom, relative[estimate] * np.abs(groups.mean))


def _quieter_of_two(groups: Groups, usable: Mask, by_owner: list[IntArray]) -> IntArray | None:
    """The groups of the catalyst that scatters less, if two have replicates left and no more."""
    replicated = [one for one in by_owner if usable[one].any()]
    if len(replicated) != 2:
        return None
    squares = []
    for one in replicated:
        held = np.zeros(len(usable), dtype=bool)
        held[one] = usable[one]
        squares.append(_common(groups, held, groups.freedom * groups.counts)[0])
    return replicated[int(np.argmin(squares))]


def _common(groups: Groups, held: Mask, freedom: FloatArray) -> tuple[float, float]:
    """Square of the relative scatter that groups have in common, and the information about it, 2/variance."""
    m2 = groups.mean[held] ** 2
    s2, e, freedom = groups.variance[held], groups.explained[held], freedom[held]
    if not m2.size:
        return 0.0, 0.0
    square = max(0.0, float((freedom * (s2 - e) / m2).sum() / freedom.sum()))
    weight = freedom
    for _ in range(_ROUNDS):
        weight = freedom * (m2 / np.maximum(e + square * m2, _NOTHING * m2)) ** 2
        better = max(0.0, float((weight * (s2 - e) / m2).sum() / weight.sum()))
        done = abs(better - square) <= _CLOSE * (better + square)
        square = better
        if done:
            break
    return square, float(weight.sum())


def _straggler(groups: Groups, held: Mask, sets: list[IntArray], *, whole: bool) -> IntArray | None:
    """The set of groups that scatters most, if it does so beyond chance against all others.

    ``whole``: the sets are those of an owner, whose groups need not be independent.
    """
    freedom = groups.freedom * groups.counts if whole else groups.freedom
    candidates = [one[held[one]] for one in sets if held[one].any()]
    if len(candidates) < 3:
        return None

    def scatter(places: IntArray, expected: FloatArray) -> float:
        ratio = groups.variance[places] / expected[places]
        return float((freedom[places] * ratio).sum() / freedom[places].sum())

    expected = _expected(groups, held)
    worst = max(candidates, key=lambda places: scatter(places, expected))
    rest = held.copy()
    rest[worst] = False
    # what a set is held against must not hold the set itself
    expected = _expected(groups, rest)
    others = np.flatnonzero(rest)
    # a common scatter of nothing leaves the uncertainties as they were stated: no better than that
    f = scatter(worst, expected) / max(1.0, scatter(others, expected))
    from scipy.special import fdtrc

    p = float(fdtrc(freedom[worst].sum(), freedom[others].sum(), f))
    return worst if p * len(candidates) < STRAGGLING else None


def _expected(groups: Groups, held: Mask) -> FloatArray:
    """Variance of a run of each group by what is stated and the scatter common to some groups."""
    square, _ = _common(groups, held, groups.freedom * groups.counts)
    floor = np.maximum(_NOTHING * groups.mean**2, np.finfo(float).tiny)
    result: FloatArray = np.maximum(groups.explained + square * groups.mean**2, floor)
    return result
