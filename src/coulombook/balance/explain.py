"""Why does the balance not close? Candidate causes compared on one footing.

The residuals r = total FE - 1 of the runs of a day are modelled as r = D theta + e. D is the pattern of one cause;
e is normal with the full covariance V of the totals (shared errors included) plus an independent scatter between runs,
fitted along. Before the day is seen, an error theta of a few to ten per cent is thought likely: its prior is normal
with standard deviation 10 %. The evidence of a cause is 2 ln of its Bayes factor against "no cause" (Kass & Raftery,
J. Am. Stat. Assoc. 90 (1995) 773), exact for this linear model; the estimate shown is the generalised-least-squares
one, which the prior does not pull. Whether there is anything to explain at all is decided first, by the evidence that
chance alone gives the best of the same candidates: a day without a cause is accused in no more than 5 % of cases.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.causes import Cause, candidate_causes, names
from coulombook.balance.settle import Settled
from coulombook.uncertainty.linearised import FloatArray, IntArray, Linearised, nominal, squared_norms
from coulombook.uncertainty.shared import SharedCovariance

# causes whose evidence lies this near to the best cannot be told from it: a Bayes factor of 10 (Kass & Raftery: strong)
TOLD_APART = 2.0 * np.log(10.0)
PRIOR_SD = 0.10  # of a relative error or a lost share
_ACCUSED_BY_CHANCE = 0.05
_CHANCE_DAYS = 1000
_CHANCE_TURNS = 4  # days of many causes would fill the memory all at once
# chance gives the best of a hundred candidates 2 ln of a Bayes factor of this size in less than one day in a thousand
_BEYOND_CHANCE = 25.0
_SEED = 20430518
# scatter between runs that the stated uncertainties do not hold, tried as a fraction FE
_SCATTERS = np.concatenate(([0.0], np.geomspace(0.002, 0.3, 15)))


@dataclass(frozen=True, slots=True, eq=False)
class Explanation:
    """One candidate, fitted over the day.

    ``estimate`` and ``u`` are fractions; ``evidence`` is 2 ln of the Bayes factor.
    """

    cause: str
    where: str
    estimate: float
    u: float
    evidence: float
    apart: tuple[str, ...]  # causes it cannot be told from; empty: told apart
    bench_test: str


@dataclass(frozen=True, slots=True, eq=False)
class Explained:
    """All candidates, best first; ``closes`` tells whether the day needs no explanation."""

    ranked: tuple[Explanation, ...]
    closes: bool
    scatter: float  # independent scatter between runs under the best model, a fraction


@dataclass(frozen=True, slots=True, eq=False)
class _OfOneRun:
    """Causes (n,) that touch a single run each: there are as many as runs, so that no pattern is written out."""

    number: IntArray  # place among the causes
    run: IntArray
    size: FloatArray

    @classmethod
    def among(cls, causes: Sequence[Cause]) -> _OfOneRun:
        found = []
        for number, cause in enumerate(causes):
            runs = np.flatnonzero(cause.pattern.any(axis=1))
            if cause.pattern.shape[1] == 1 and len(runs) == 1:
                found.append((number, int(runs[0]), float(cause.pattern[runs[0], 0])))
        places, runs_, sizes = zip(*found, strict=True) if found else ((), (), ())
        return cls(np.array(places, np.intp), np.array(runs_, np.intp), np.array(sizes, float))


@dataclass(frozen=True, slots=True, eq=False)
class _Fit:
    """What residuals (m, R) say of each cause at one scatter.

    ``right`` (m, n) and ``information`` (n,) of causes with one parameter, D^T W r and D^T W D; ``several`` the same of
    those with more, (m, k) and (k, k); ``base`` (m,) -2 ln of the likelihood without any cause.
    """

    base: FloatArray
    right: FloatArray
    information: FloatArray
    several: list[tuple[FloatArray, FloatArray]]


class _Weighed:
    """The causes of a day, weighed by the covariance of its residuals for every scatter that is tried."""

    def __init__(self, v: SharedCovariance, causes: Sequence[Cause]) -> None:
        self.inverse = v.inverse(np.square(_SCATTERS))
        self._alone = _OfOneRun.among(causes)
        widths = np.array([cause.pattern.shape[1] for cause in causes], dtype=np.intp)
        shared = np.ones(len(causes), dtype=bool)
        shared[self._alone.number] = False
        # causes of one parameter: those of one run first
        together = np.flatnonzero(shared & (widths == 1))
        self.single = np.concatenate((self._alone.number, together))
        self.several = np.flatnonzero(widths > 1).tolist()
        patterns = [causes[number].pattern for number in (*together.tolist(), *self.several)]
        self._d = np.concatenate(patterns, axis=1) if patterns else np.zeros((len(v), 0))
        ends = len(together) + np.cumsum(widths[self.several])
        self._columns = [
            slice(int(end - widths[n]), int(end)) for n, end in zip(self.several, ends, strict=True)
        ]
        self._n_together = len(together)
        only = np.array([cause.only_positive for cause in causes], dtype=bool)
        self._only_positive = only[self.single]
        self._only_positive_of_several = [bool(only[number]) for number in self.several]
        self._information = [
            self._d.T @ self.inverse.solve(place, self._d) for place in range(len(_SCATTERS))
        ]  # (K, K) each

    def at(self, place: int, r: FloatArray) -> _Fit:
        """Residuals (m, R) at one of the scatters."""
        weighed = self.inverse.solve(place, r.T)
        alone, information = self._alone, self._information[place]
        right = self._d.T @ weighed
        return _Fit(
            np.einsum("rm,rm->m", r.T, weighed) + self.inverse.logdet[place],
            np.concatenate((weighed[alone.run] * alone.size[:, None], right[: self._n_together])).T,
            np.concatenate(
                (
                    np.square(alone.size) * self.inverse.diagonal[place, alone.run],
                    np.diag(information)[: self._n_together],
                )
            ),
            [(right[held].T, information[held, held]) for held in self._columns],
        )

    def gain(self, r: FloatArray) -> tuple[FloatArray, IntArray]:
        """2 ln Bayes factor of each cause against none, (m, n_causes), each side at its own best scatter.

        With the place (m,) of the best scatter without any cause.
        """
        count = len(self.single) + len(self.several)
        best = np.full((len(r), count), np.inf)
        base = np.empty((len(r), len(_SCATTERS)))
        for place in range(len(_SCATTERS)):
            fit = self.at(place, r)
            base[:, place] = fit.base
            occam = np.log1p(PRIOR_SD**2 * fit.information)
            gained = fit.right**2 / (fit.information + PRIOR_SD**-2)
            gained[self._only_positive & (fit.right < 0)] = 0.0
            best[:, self.single] = np.minimum(best[:, self.single], fit.base[:, None] - gained + occam)
            for number, only, (right, information) in zip(
                self.several, self._only_positive_of_several, fit.several, strict=True
            ):
                gained = _gain_of_several(right, information, only)
                best[:, number] = np.minimum(best[:, number], fit.base - gained)
        result: FloatArray = base.min(axis=1)[:, None] - best
        return result, base.argmin(axis=1)

    def estimates(self, r: FloatArray) -> list[tuple[float, float]]:
        """Generalised-least-squares estimate of each first parameter, with its u, at its best scatter for r (R,)."""
        count = len(self.single) + len(self.several)
        least, theta, u = np.full(count, np.inf), np.zeros(count), np.zeros(count)
        for place in range(len(_SCATTERS)):
            fit = self.at(place, r[None, :])
            inverse = np.divide(
                1.0, fit.information, out=np.zeros(len(self.single)), where=fit.information > 0
            )
            found = [(self.single, fit.right[0] * inverse, inverse, fit.right[0] ** 2 * inverse)]
            for number, (right, information) in zip(self.several, fit.several, strict=True):
                back = np.linalg.pinv(information, hermitian=True)
                estimate = back @ right[0]
                found.append((np.array([number]), estimate[:1], back[0, :1], right[0] @ estimate))
            for numbers, estimate, variance, gained in found:
                deviance = fit.base[0] - gained
                held = deviance < least[numbers]
                least[numbers] = np.where(held, deviance, least[numbers])
                theta[numbers] = np.where(held, estimate, theta[numbers])
                u[numbers] = np.where(held, np.sqrt(variance), u[numbers])
        return list(zip(theta.tolist(), u.tolist(), strict=True))


def _gain_of_several(right: FloatArray, information: FloatArray, only_positive: bool) -> FloatArray:
    """2 ln Bayes factor (m,) of a cause of k parameters, from D^T W r (m, k) and D^T W D (k, k)."""
    k = len(information)
    inside = np.linalg.solve(information + np.eye(k) * PRIOR_SD**-2, right.T).T
    occam = np.linalg.slogdet(np.eye(k) + PRIOR_SD**2 * information)[1]
    gained = (inside * right).sum(axis=1)
    result: FloatArray = np.where(only_positive & (inside[:, 0] < 0), 0.0, gained) - occam
    return result


def explain(settled: Settled) -> Explained:
    """Rank the causes of a day's residuals; see the module's text."""
    plan = settled.plan
    held = np.flatnonzero(np.bincount(plan.products.run, minlength=len(plan.runs)) > 0)
    causes = candidate_causes(settled)
    if len(held) < len(plan.runs):
        causes = [replace(one, pattern=one.pattern[held]) for one in causes]
    causes = [one for one in causes if np.abs(one.pattern[:, 0]).max(initial=0.0) > 0]
    found = rank(nominal(settled.outcome.total)[held] - 1.0, covariance_of_totals(settled, held), causes)
    return replace(found, ranked=tuple(map(_of_the_quantity, found.ranked)))


# of a run's own variance: a total that shares all its errors with others could not be weighed
_LEAST_VARIANCE = 1e-12


def covariance_of_totals(settled: Settled, runs: IntArray) -> SharedCovariance:
    """Covariance of the totals of some runs, with the share that the day allows to be unaccounted for."""
    total = settled.outcome.total
    allowed = np.full(len(runs), (settled.plan.settings.unaccounted or 0.0) ** 2)
    if not isinstance(total, Linearised):
        return SharedCovariance.of_matrix(np.diag(np.maximum(allowed, _LEAST_VARIANCE)))
    jacobian = total.jacobian[runs]
    columns = jacobian.tocsc()
    columns.eliminate_zeros()
    alone = columns[:, np.diff(columns.indptr) == 1]
    own = allowed + squared_norms(alone.tocsr())
    # nor could one whose shared errors are larger than any number of digits holds
    least = _LEAST_VARIANCE * np.maximum(1.0, squared_norms(jacobian.tocsr()))
    return SharedCovariance.of_errors(jacobian, np.where(own < least, allowed + least, allowed))


# causes that take a share of what was measured away
_LOST = ("gas-lost", "crossover")


def _of_the_quantity(one: Explanation) -> Explanation:
    """The estimate as an error of the quantity entered, or as the share that was lost.

    A pattern scales what was measured, so that a factor 1 + e too high leaves theta = e / (1 + e) of it to be taken
    away, and a lost share f leaves theta = f / (1 - f) of it to be added. NaN where no such error can explain it.
    """
    if one.cause in ("none", "unmeasured-product") or (one.cause == "crossover" and one.where):
        return one  # nothing, or a share of the charge itself
    rest = 1.0 + one.estimate if one.cause in _LOST else 1.0 - one.estimate
    if not rest > 0:
        return replace(one, estimate=float("nan"), u=float("nan"))
    return replace(one, estimate=one.estimate / rest, u=one.u / rest**2)


def rank(residual: FloatArray, v: FloatArray | SharedCovariance, causes: Sequence[Cause]) -> Explained:
    """Fit and rank causes of residuals (R,) with covariance v (R, R)."""
    return CauseModel(v, causes).rank(residual)


class CauseModel:
    """The causes of a day with the covariance of its residuals: made once, it ranks any residuals (R,) of that day."""

    def __init__(self, v: FloatArray | SharedCovariance, causes: Sequence[Cause]) -> None:
        self._causes = causes
        self._empty = len(v) == 0
        if not self._empty:
            self._weighed = _Weighed(
                v if isinstance(v, SharedCovariance) else SharedCovariance.of_matrix(v), causes
            )
        self._chance: dict[int, float] = {}

    def rank(self, residual: FloatArray) -> Explained:
        """Fit and rank the causes; see the module's text."""
        if self._empty:
            return Explained((), True, 0.0)
        causes = self._causes
        found, scatters = self._weighed.gain(residual[None, :])
        gains, scatter = found[0], int(scatters[0])
        best = float(gains.max(initial=0.0))
        closes = best <= 0 or (best < _BEYOND_CHANCE and best <= self.by_chance(scatter))
        fits = self._weighed.estimates(residual)
        # a share that would have to be gained, not lost, explains nothing
        possible = np.array(
            [not (one.only_positive and fit[0] <= 0) for one, fit in zip(causes, fits, strict=True)]
        )
        order = np.flatnonzero(possible)
        order = order[np.argsort(-gains[order], kind="stable")]
        near = _near(order, gains, causes)
        ranked = [
            Explanation(
                causes[number].kind,
                causes[number].where,
                *fits[number],
                float(gains[number]),
                near[number],
                causes[number].bench_test,
            )
            for number in order.tolist()
        ]
        nothing = Explanation("none", "", 0.0, 0.0, 0.0, (), "")
        place_of_none = 0 if closes else int(np.count_nonzero(gains[order] > 0))
        ranked.insert(place_of_none, nothing)
        return Explained(tuple(ranked), closes, float(_SCATTERS[scatter]))

    def by_chance(self, scatter: int) -> float:
        """The evidence that the best of all causes exceeds by chance in 5 % of days without any cause."""
        if scatter not in self._chance:
            generator = np.random.default_rng(_SEED)
            best = []
            for _ in range(_CHANCE_TURNS):
                days = self._weighed.inverse.sample(scatter, generator, _CHANCE_DAYS // _CHANCE_TURNS)
                best.append(self._weighed.gain(days.T)[0].max(axis=1))
            self._chance[scatter] = float(np.quantile(np.concatenate(best), 1.0 - _ACCUSED_BY_CHANCE))
        return self._chance[scatter]


def _near(order: IntArray, gains: FloatArray, causes: Sequence[Cause]) -> dict[int, tuple[str, ...]]:
    """Of each ranked cause, those it cannot be told from, best first; a cause without evidence is held against none."""
    labels = np.array(names(causes), dtype=object)
    alike = _of_one_pattern(causes)
    near: dict[int, tuple[str, ...]] = dict.fromkeys(order.tolist(), ())
    for number in order[gains[order] > 0].tolist():
        held = np.abs(gains[order] - gains[number]) < TOLD_APART
        held |= alike(number)[order] & (gains[order] > 0)
        held &= order != number
        near[number] = tuple(labels[order[held]].tolist())
    return near


# patterns whose directions agree to this cosine differ by less than the readings could ever show
_SAME_DIRECTION = 1.0 - 1e-9


def _of_one_pattern(causes: Sequence[Cause]) -> Callable[[int], NDArray[np.bool_]]:
    """Which causes (n_causes,) move all totals in one proportion with a given one: only their likely sizes differ."""
    alone = _OfOneRun.among(causes)
    run = np.full(len(causes), -1, dtype=np.intp)
    run[alone.number] = alone.run
    together = np.array(
        [number for number, cause in enumerate(causes) if run[number] < 0 and cause.pattern.shape[1] == 1],
        np.intp,
    )
    first = np.array([causes[number].pattern[:, 0] for number in together])
    length = np.linalg.norm(first, axis=1, keepdims=True) if len(together) else first
    direction = np.divide(first, length, out=np.zeros_like(first), where=length > 0)
    same = np.abs(direction @ direction.T) >= _SAME_DIRECTION

    def alike(number: int) -> NDArray[np.bool_]:
        if run[number] >= 0:
            return np.asarray(run == run[number])
        held = np.zeros(len(causes), dtype=bool)
        held[together] = same[together == number].any(axis=0)
        return held

    return alike
