"""Rank correlation against a reference library, published values, and its own coverage."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from coulombook.compare.rank_correlation import (
    EXACT,
    STUDENT,
    interval,
    midranks,
    spearman,
    spearman_of_kinds,
)


@pytest.mark.parametrize("count", [4, 5, 7, 8, 9, 15, 40])
@pytest.mark.parametrize("ties", [False, True])
def test_coefficient_and_probability_are_those_of_the_reference_library(count: int, ties: bool) -> None:
    generator = np.random.default_rng(count)
    x, y = generator.standard_normal((2, count))
    y = y + 0.8 * x
    if ties:
        x, y = x.round(), y.round()
    found = spearman(x, y)
    reference = stats.spearmanr(x, y)
    assert found.rho == pytest.approx(reference.statistic, rel=1e-12)
    if found.method == STUDENT:
        assert found.p == pytest.approx(reference.pvalue, rel=1e-9)
    else:
        assert found.method == EXACT

        def statistic(a: np.ndarray) -> float:
            return float(stats.spearmanr(a, y).statistic)

        if count <= 5:  # the reference counts orders one by one, in Python
            exact = stats.permutation_test((x,), statistic, permutation_type="pairings", n_resamples=np.inf)
            # the reference doubles the smaller tail; this counts both, which is the same without ties
            if not ties:
                assert found.p == pytest.approx(exact.pvalue, rel=1e-12)


@pytest.mark.parametrize(
    ("count", "critical", "level"),
    # smallest coefficient whose two-sided probability does not exceed the level; Zar, Biostatistical Analysis, Table
    # B.20 (from memory)
    [
        (5, 1.0, 0.05),
        (6, 0.886, 0.05),
        (7, 0.786, 0.05),
        (8, 0.738, 0.05),
        (7, 0.929, 0.01),
        (8, 0.881, 0.01),
    ],
)
def test_critical_values_are_those_of_the_table(count: int, critical: float, level: float) -> None:
    generator = np.random.default_rng(1)
    x = np.arange(count, dtype=float)
    below, reached = 0.0, 2.0
    for _ in range(3000):
        found = spearman(x, generator.permutation(count).astype(float))
        if found.p <= level:
            reached = min(reached, abs(found.rho))
        else:
            below = max(below, abs(found.rho))
    # a level of 0.05 by 3,000 random orders leaves out none of the few orders beyond it, but where they are below one
    # in a thousand; then the perfect order decides
    reached = min(reached, 1.0 if spearman(x, x).p <= level else 2.0)
    assert reached == pytest.approx(critical, abs=0.0005)
    assert below < reached


def test_a_perfect_order_of_five_is_the_least_that_can_convince() -> None:
    # 2 of 24 and 2 of 120 orders are perfect one way or the other
    assert spearman(np.arange(4.0), np.arange(4.0)).p == pytest.approx(2 / 24)
    assert spearman(np.arange(5.0), np.arange(5.0)).p == pytest.approx(2 / 120)


def test_nothing_is_said_where_nothing_varies() -> None:
    found = spearman(np.arange(6.0), np.ones(6))
    assert np.isnan(found.rho)
    assert np.isnan(found.p)


def test_the_interval_is_fishers_with_the_variance_of_bonett_and_wright() -> None:
    # rho 0.5, n 28: z = atanh 0.5 = 0.549306, u = sqrt(1.125/25) = 0.212132, z -+ 1.959964 u = 0.133535 and 0.965077,
    # and of these the hyperbolic tangent
    assert interval(0.5, 28, 0.95) == pytest.approx((0.132747, 0.746533), abs=1e-6)
    assert all(np.isnan(interval(0.5, 4, 0.95)))


def test_a_perfect_order_has_an_interval_that_ends_at_one() -> None:
    low, high = interval(1.0, 6, 0.95)
    assert high == 1.0
    assert 0.5 < low < 1.0
    assert interval(-1.0, 6, 0.95) == pytest.approx((-1.0, -low))


@pytest.mark.parametrize(("count", "r"), [(8, 0.5), (12, 0.0), (12, 0.8), (25, 0.5)])
def test_intervals_hold_the_true_coefficient(count: int, r: float) -> None:
    generator = np.random.default_rng(4)
    true = 6 / np.pi * np.arcsin(r / 2)  # of ranks, for a normal pair with correlation r
    covered = 0
    for _ in range(1000):
        x = generator.standard_normal(count)
        y = r * x + np.sqrt(1 - r * r) * generator.standard_normal(count)
        rho = float(np.corrcoef(midranks(x), midranks(y))[0, 1])
        low, high = interval(rho, count, 0.95)
        covered += low <= true <= high
    # 0.7 % is the standard deviation of the share; with few pairs the interval is a little wide
    assert 0.93 <= covered / 1000 <= 0.98


def test_electrodes_of_one_catalyst_are_no_independent_pairs() -> None:
    """Catalysts with a roughness and a selectivity that have nothing to do with each other, two electrodes each."""
    generator = np.random.default_rng(1)
    kind = np.repeat(np.arange(6), 2)
    days, alone, together = 1000, 0, 0
    for _ in range(days):
        x, y = generator.standard_normal((2, 6))[:, kind] + 0.05 * generator.standard_normal((2, 12))
        alone += spearman(x, y).p < 0.05
        together += spearman_of_kinds(x, y, kind).p < 0.05
    assert alone / days > 0.15  # what taking them for independent does
    # 5 % and twice the standard deviation of a count of 1000 at 5 %
    assert together / days <= 0.05 + 2 * 0.007


def test_a_correlation_over_kinds_is_that_of_all_pairs_with_the_chance_of_the_kinds() -> None:
    x, y = np.array([1.0, 1.1, 2.0, 2.2, 3.0, 3.1]), np.array([1.0, 1.2, 3.1, 3.0, 2.0, 2.1])
    found = spearman_of_kinds(x, y, np.array([0, 0, 1, 1, 2, 2]))
    assert (found.count, found.independent) == (6, 3)
    assert found.rho == pytest.approx(spearman(x, y).rho)
    # means in the order 1, 3, 2: rho 0.5, which every order of three reaches on one side or the other
    assert found.p == pytest.approx(1.0)
    assert np.isnan(found.low)


@pytest.mark.parametrize("kind", [[0] * 6, list(range(6))])
def test_electrodes_of_one_catalyst_alone_or_of_as_many_are_independent(kind: list[int]) -> None:
    x, y = np.arange(6.0), np.array([0.0, 2.0, 1.0, 3.0, 4.0, 5.0])
    assert spearman_of_kinds(x, y, np.array(kind)) == spearman(x, y)
