"""What is said of draws at once, held against plain numpy; and where the law of propagation may stand, to the edge."""

from __future__ import annotations

import math
from statistics import NormalDist

import numpy as np
import pytest

from coulombook.uncertainty.coverage import (
    coverage,
    numerical_tolerance,
    propagation_validated,
    shortest_interval,
    symmetric_interval,
)


def test_all_figures_of_draws_are_those_of_numpy() -> None:
    rng = np.random.default_rng(5)
    draws = np.vstack(
        [rng.normal(3.0, 0.2, 500), rng.exponential(2.0, 500), 1e6 + rng.normal(0.0, 1e-3, 500)]
    )
    plain = draws.copy()
    found = coverage(draws, 0.9)
    np.testing.assert_allclose(found.deviation, plain.std(axis=1, ddof=1), rtol=1e-10)
    ordered = np.sort(plain, axis=1)
    for row in range(3):
        # 450 steps of 500: the narrowest of the 50 intervals that many draws apart
        width = ordered[row, 450:] - ordered[row, :50]
        start = int(width.argmin())
        assert (found.low[row], found.high[row]) == (ordered[row, start], ordered[row, start + 450])
    np.testing.assert_array_equal(found.low_quantile, ordered[:, 25])
    np.testing.assert_array_equal(found.high_quantile, ordered[:, 474])
    np.testing.assert_array_equal(draws, ordered)  # in place


def test_an_unknown_draw_makes_all_figures_unknown_and_no_other_output() -> None:
    draws = np.arange(20.0).reshape(2, 10)
    draws[0, 3] = np.nan
    found = coverage(draws, 0.5)
    for one in (found.deviation, found.low, found.high, found.low_quantile, found.high_quantile):
        assert np.isnan(one).tolist() == [True, False]


def test_draws_that_are_all_the_same_have_no_width() -> None:
    found = coverage(np.full((1, 7), 0.1), 0.95)
    assert (found.deviation[0], found.low[0], found.high[0]) == (0.0, 0.1, 0.1)


def test_few_draws_have_the_widest_or_the_narrowest_interval_there_is() -> None:
    draws = np.array([[1.0, 2.0, 4.0, 8.0]])
    assert shortest_interval(draws.copy(), 0.999) == ([1.0], [8.0])
    assert shortest_interval(draws.copy(), 0.001) == ([1.0], [2.0])
    assert symmetric_interval(draws, 0.999) == ([1.0], [8.0])
    assert symmetric_interval(draws, 0.5) == ([2.0], [4.0])
    # of equally narrow ones the lowest
    assert shortest_interval(np.array([[5.0, 1.0, 3.0, 7.0]]), 0.25) == ([1.0], [3.0])
    # the level is a share of the draws, rounded: 0.62 of 4 are two steps, 0.63 of 4 are three
    assert shortest_interval(draws.copy(), 0.62) == ([1.0], [4.0])
    assert shortest_interval(draws.copy(), 0.63) == ([1.0], [8.0])


def test_an_unknown_draw_hides_in_no_symmetric_interval() -> None:
    low, high = symmetric_interval(np.array([[0.0, 1.0, 2.0, np.nan], [0.0, 1.0, 2.0, 3.0]]), 0.5)
    assert np.isnan(low).tolist() == np.isnan(high).tolist() == [True, False]


@pytest.mark.parametrize(
    ("u", "tolerance"),
    [(1.0, 0.05), (9.94, 0.05), (9.96, 0.5), (10.0, 0.5), (99.4, 0.5), (99.6, 5.0), (0.00031, 0.000005)],
)
def test_tolerance_is_that_of_two_digits_unless_others_are_asked_for(u: float, tolerance: float) -> None:
    assert numerical_tolerance(u) == pytest.approx(tolerance)


def test_what_is_no_uncertainty_has_no_tolerance() -> None:
    for u in (-1.0, -math.inf, math.nan, math.inf, 0.0):
        assert math.isnan(numerical_tolerance(u))


@pytest.mark.parametrize("level", [0.95, 0.5])
@pytest.mark.parametrize("side", ["low", "high"])
def test_ends_may_differ_by_the_digits_shown_and_twice_what_sampling_leaves(level: float, side: str) -> None:
    value, u, n = np.array([10.0]), np.array([0.42]), 10_000
    tail = (1.0 - level) / 2.0
    factor = NormalDist().inv_cdf(1.0 - tail)
    # standard deviation of a quantile of n draws: sqrt(p (1 - p)/n)/f (David & Nagaraja, Order Statistics, sect. 2.5)
    sampling = u[0] * math.sqrt(tail * (1.0 - tail) / n) / NormalDist().pdf(factor)
    allowed = 0.005 + 2.0 * sampling
    ends = {"low": value - factor * u, "high": value + factor * u}
    for share, agrees in ((0.0, True), (0.99, True), (-0.99, True), (1.01, False), (-1.01, False)):
        moved = {**ends, side: ends[side] + share * allowed}
        assert propagation_validated(value, u, level, moved["low"], moved["high"], n).tolist() == [agrees]


def test_unknown_ends_and_no_uncertainty_validate_nothing() -> None:
    value, u = np.array([1.0, 1.0, 1.0]), np.array([0.1, 0.1, 0.0])
    low, high = np.array([np.nan, 0.8, 1.0]), np.array([1.2, np.nan, 1.0])
    assert propagation_validated(value, u, 0.95, low, high, 1000).tolist() == [False, False, False]
