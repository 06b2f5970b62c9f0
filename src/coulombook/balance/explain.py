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

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.causes import Cause, candidate_causes, names
from coulombook.balance.settle import Settled
from coulombook.uncertainty.linearised import FloatArray, Linearised, covariance, nominal

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


class _Whitened:
    """The residuals' covariance, diagonal in its own axes, for every scatter that is tried."""

    def __init__(self, v: FloatArray) -> None:
        values, self.axes = np.linalg.eigh(v)
        # rounding may leave a shared error with a tiny negative variance; zero variance needs a floor to be inverted
        floor = max(float(values.max(initial=0.0)), 1.0) * 1e-12
        self.weights = 1.0 / (np.clip(values, floor, None)[None, :] + _SCATTERS[:, None] ** 2)  # (S, R)
        self.logdet = -np.log(self.weights).sum(axis=1)

    def deviance(self, r: FloatArray) -> FloatArray:
        """-2 ln of the likelihood of residuals (m, R) without any cause, at each scatter (m, S)."""
        result: FloatArray = (r @ self.axes) ** 2 @ self.weights.T + self.logdet
        return result

    def gain(self, r: FloatArray, causes: Sequence[Cause]) -> FloatArray:
        """2 ln Bayes factor of each cause against none, (m, n_causes), each side at its own best scatter."""
        base = self.deviance(r)
        best = np.full((len(r), len(causes)), np.inf)
        single = [number for number, cause in enumerate(causes) if cause.pattern.shape[1] == 1]
        several = [number for number, cause in enumerate(causes) if cause.pattern.shape[1] > 1]
        z = r @ self.axes
        turned = [self.axes.T @ causes[number].pattern for number in several]
        d = self.axes.T @ np.column_stack([causes[number].pattern for number in single]) if single else None
        for scatter, weights in enumerate(self.weights):
            if d is not None:
                right = (z * weights) @ d
                information = weights @ d**2
                gained = right**2 / (information + PRIOR_SD**-2) - np.log1p(PRIOR_SD**2 * information)
                forbidden = np.array([causes[number].only_positive for number in single]) & (right < 0)
                found = base[:, [scatter]] - np.where(forbidden, -np.log1p(PRIOR_SD**2 * information), gained)
                best[:, single] = np.minimum(best[:, single], found)
            for number, pattern in zip(several, turned, strict=True):
                gained = _gain_of_several(z, weights, pattern, causes[number].only_positive)
                best[:, number] = np.minimum(best[:, number], base[:, scatter] - gained)
        result: FloatArray = base.min(axis=1)[:, None] - best
        return result

    def estimates(self, r: FloatArray, causes: Sequence[Cause]) -> list[tuple[float, float]]:
        """Generalised-least-squares estimate of each first parameter, with its u, at its best scatter for r (R,)."""
        if not causes:
            return []
        z = r @ self.axes
        # all patterns turned at once: the axes of a long day are large
        turned = self.axes.T @ np.concatenate([cause.pattern for cause in causes], axis=1)
        ends = np.cumsum([cause.pattern.shape[1] for cause in causes])
        return [self._estimate(z, d) for d in np.split(turned, ends[:-1], axis=1)]

    def _estimate(self, z: FloatArray, d: FloatArray) -> tuple[float, float]:
        inverse = np.linalg.pinv(d.T @ (self.weights[:, :, None] * d), hermitian=True)  # (S, k, k)
        theta = (inverse @ ((self.weights * z) @ d)[:, :, None])[:, :, 0]  # (S, k)
        deviance = (self.weights * (z - theta @ d.T) ** 2).sum(axis=1) + self.logdet
        best = int(deviance.argmin())
        return float(theta[best, 0]), float(np.sqrt(inverse[best, 0, 0]))


def _gain_of_several(z: FloatArray, weights: FloatArray, d: FloatArray, only_positive: bool) -> FloatArray:
    right = (z * weights) @ d
    information = (d.T * weights) @ d
    k = d.shape[1]
    inside = np.linalg.solve(information + np.eye(k) * PRIOR_SD**-2, right.T).T
    occam = np.linalg.slogdet(np.eye(k) + PRIOR_SD**2 * information)[1]
    gained = (inside * right).sum(axis=1)
    result: FloatArray = np.where(only_positive & (inside[:, 0] < 0), 0.0, gained) - occam
    return result


def explain(settled: Settled) -> Explained:
    """Rank the causes of a day's residuals; see the module's text."""
    outcome, plan = settled.outcome, settled.plan
    held = np.flatnonzero(np.bincount(plan.products.run, minlength=len(plan.runs)) > 0)
    total = outcome.total
    v = (
        covariance(total)[np.ix_(held, held)]
        if isinstance(total, Linearised)
        else np.zeros((len(held), len(held)))
    )
    v = v + np.eye(len(held)) * (plan.settings.unaccounted or 0.0) ** 2
    causes = [
        Cause(one.kind, one.where, one.pattern[held], one.only_positive, one.bench_test)
        for one in candidate_causes(settled)
    ]
    causes = [one for one in causes if np.abs(one.pattern[:, 0]).max(initial=0.0) > 0]
    found = rank(nominal(total)[held] - 1.0, v, causes)
    return replace(found, ranked=tuple(map(_of_the_quantity, found.ranked)))


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


def rank(residual: FloatArray, v: FloatArray, causes: Sequence[Cause]) -> Explained:
    """Fit and rank causes of residuals (R,) with covariance v (R, R)."""
    return CauseModel(v, causes).rank(residual)


class CauseModel:
    """The causes of a day with the covariance of its residuals: made once, it ranks any residuals (R,) of that day."""

    def __init__(self, v: FloatArray, causes: Sequence[Cause]) -> None:
        self._causes = causes
        self._whitened = _Whitened(v)
        self._chance: dict[int, float] = {}

    def rank(self, residual: FloatArray) -> Explained:
        """Fit and rank the causes; see the module's text."""
        if len(residual) == 0:
            return Explained((), True, 0.0)
        causes, whitened = self._causes, self._whitened
        gains = whitened.gain(residual[None, :], causes)[0].tolist()
        scatter = int(whitened.deviance(residual[None, :])[0].argmin())
        best = max(gains, default=0.0)
        closes = best <= 0 or (best < _BEYOND_CHANCE and best <= self._chance_gain(scatter))
        fits = whitened.estimates(residual, causes)
        labels = names(causes)
        alike = _of_one_pattern(causes)
        # a share that would have to be gained, not lost, explains nothing
        possible = [
            number
            for number, cause in enumerate(causes)
            if not (cause.only_positive and fits[number][0] <= 0)
        ]
        order = sorted(possible, key=lambda number: -gains[number])
        ranked = []
        for number in order:
            near = tuple(
                labels[other]
                for other in order
                if other != number
                and gains[number] > 0
                and (
                    abs(gains[other] - gains[number]) < TOLD_APART
                    or (alike[number, other] and gains[other] > 0)
                )
            )
            ranked.append(
                Explanation(
                    causes[number].kind,
                    causes[number].where,
                    *fits[number],
                    gains[number],
                    near,
                    causes[number].bench_test,
                )
            )
        nothing = Explanation("none", "", 0.0, 0.0, 0.0, (), "")
        place_of_none = 0 if closes else sum(gains[number] > 0 for number in order)
        ranked.insert(place_of_none, nothing)
        return Explained(tuple(ranked), closes, float(_SCATTERS[scatter]))

    def _chance_gain(self, scatter: int) -> float:
        """The evidence that the best of all causes exceeds by chance in 5 % of days without any cause."""
        if scatter not in self._chance:
            whitened = self._whitened
            spread = 1.0 / np.sqrt(whitened.weights[scatter])
            normals = np.random.default_rng(_SEED).standard_normal((_CHANCE_DAYS, len(spread)))
            turns = np.array_split((normals * spread) @ whitened.axes.T, _CHANCE_TURNS)
            best = np.concatenate([whitened.gain(days, self._causes).max(axis=1) for days in turns])
            self._chance[scatter] = float(np.quantile(best, 1.0 - _ACCUSED_BY_CHANCE))
        return self._chance[scatter]


# patterns whose directions agree to this cosine differ by less than the readings could ever show
_SAME_DIRECTION = 1.0 - 1e-9


def _of_one_pattern(causes: Sequence[Cause]) -> NDArray[np.bool_]:
    """Which causes move all totals in the same proportion, (n_causes, n_causes): only their likely sizes differ."""
    if not causes:
        return np.zeros((0, 0), dtype=bool)
    first = np.column_stack([cause.pattern[:, 0] for cause in causes])
    length = np.linalg.norm(first, axis=0)
    direction = np.divide(first, length, out=np.zeros_like(first), where=length > 0)
    single = np.array([cause.pattern.shape[1] == 1 for cause in causes])
    same: NDArray[np.bool_] = np.abs(direction.T @ direction) >= _SAME_DIRECTION
    same &= single & single[:, None]
    return same
