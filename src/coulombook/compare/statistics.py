"""Tests between groups of replicates: Welch, one-way analysis of variance.

Sources: Welch, Biometrika 34 (1947) 28; Satterthwaite, Biometrics Bull. 2 (1946) 110; Hedges, J. Educ. Stat. 6 (1981)
107. Student's t and F come from `scipy.special`, which loads in a third of the time of `scipy.stats`.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Sample:
    """Replicates of one group: their number, mean and sample standard deviation."""

    count: int
    mean: float
    deviation: float

    @classmethod
    def of(cls, values: FloatArray) -> Sample:
        """Two passes, so that many leading digits in common cost none."""
        mean = float(np.mean(values))
        # the mean of what is left takes out the rounding of the first mean
        mean += float(np.mean(values - mean))
        spread = float(np.std(values - mean, ddof=1)) if len(values) > 1 else math.nan
        return cls(len(values), mean, spread)


@dataclass(frozen=True, slots=True)
class Difference:
    """Difference of two means with its interval and test.

    ``effect`` is Hedges' g, the difference in pooled standard deviations, corrected for small samples.
    """

    value: float
    u: float
    t: float
    degrees_of_freedom: float
    p: float
    low: float
    high: float
    effect: float


def student_p(t: float, degrees_of_freedom: float) -> float:
    """Two-sided tail probability of Student's t."""
    from scipy.special import stdtr

    return float(2.0 * stdtr(degrees_of_freedom, -abs(t)))


def student_quantile(degrees_of_freedom: float, level: float) -> float:
    """Two-sided quantile of Student's t at a level of confidence."""
    from scipy.special import stdtrit

    return float(stdtrit(degrees_of_freedom, 0.5 + level / 2.0))


def welch(one: Sample, other: Sample, level: float = 0.95) -> Difference:
    """Difference of two means without assuming equal variances (Welch).

    Raises ValueError for a group of fewer than two replicates.
    """
    if min(one.count, other.count) < 2:
        raise ValueError("Welch's test needs two replicates on either side")
    a, b = one.deviation**2 / one.count, other.deviation**2 / other.count
    u = math.sqrt(a + b)
    difference = one.mean - other.mean
    if u == 0:
        same = difference == 0
        t = 0.0 if same else math.copysign(math.inf, difference)
        return Difference(
            difference, 0.0, t, math.inf, 1.0 if same else 0.0, difference, difference, math.nan
        )
    freedom = (a + b) ** 2 / (a**2 / (one.count - 1) + b**2 / (other.count - 1))
    return _difference(difference, u, freedom, level, _hedges(one, other, difference))


def pooled(one: Sample, other: Sample, level: float = 0.95) -> Difference:
    """Difference of two means with one pooled variance (Student)."""
    freedom = one.count + other.count - 2
    spread = pooled_deviation([one, other])
    u = spread * math.sqrt(1.0 / one.count + 1.0 / other.count)
    difference = one.mean - other.mean
    return _difference(difference, u, freedom, level, _hedges(one, other, difference))


def _difference(value: float, u: float, freedom: float, level: float, effect: float) -> Difference:
    t = value / u
    half = student_quantile(freedom, level) * u
    return Difference(value, u, t, freedom, student_p(t, freedom), value - half, value + half, effect)


def pooled_deviation(samples: Sequence[Sample]) -> float:
    """Standard deviation within groups, sqrt(sum (n - 1) s^2 / sum (n - 1)); NaN without a repeat."""
    freedom = sum(sample.count - 1 for sample in samples)
    if freedom == 0:
        return math.nan
    square = sum((sample.count - 1) * sample.deviation**2 for sample in samples if sample.count > 1)
    return math.sqrt(square / freedom)


def _hedges(one: Sample, other: Sample, difference: float) -> float:
    spread = pooled_deviation([one, other])
    freedom = one.count + other.count - 2
    if not spread > 0:
        return math.nan
    return difference / spread * (1.0 - 3.0 / (4.0 * freedom - 1.0))


@dataclass(frozen=True, slots=True)
class Variance:
    """One-way analysis of variance."""

    between: float  # sum of squares between groups
    within: float
    between_freedom: int
    within_freedom: int
    f: float
    p: float

    @property
    def r_squared(self) -> float:
        """Share of the sum of squares that the groups explain."""
        whole = self.between + self.within
        return self.between / whole if whole > 0 else math.nan

    @property
    def residual_deviation(self) -> float:
        """Standard deviation within groups."""
        return math.sqrt(self.within / self.within_freedom)


def one_way(groups: Sequence[FloatArray]) -> Variance:
    """One-way analysis of variance.

    A constant near the mean is taken off before squares are formed: sums of squares of numbers with many leading
    digits in common would lose all of theirs.

    Raises ValueError for fewer than two groups or no repeat in any.
    """
    from scipy.special import fdtrc

    total = sum(len(group) for group in groups)
    if len(groups) < 2 or total <= len(groups):
        raise ValueError("an analysis of variance needs two groups and a repeat")
    origin = float(groups[0][0])
    shifted = [np.asarray(group, dtype=float) - origin for group in groups]
    means = [float(np.mean(group)) for group in shifted]
    grand = float(np.mean(np.concatenate(shifted)))
    between = sum(len(group) * (mean - grand) ** 2 for group, mean in zip(shifted, means, strict=True))
    within = sum(float(np.sum((group - mean) ** 2)) for group, mean in zip(shifted, means, strict=True))
    a, b = len(groups) - 1, total - len(groups)
    # values that are all the same, such as of a product that nobody makes, do not differ
    without_scatter = math.inf if between > 0 else 0.0
    f = without_scatter if within == 0 else (between / a) / (within / b)
    return Variance(between, within, a, b, f, float(fdtrc(a, b, f)))
