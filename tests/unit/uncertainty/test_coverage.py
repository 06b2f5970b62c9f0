"""Coverage intervals of draws, and when the law of propagation may stand for them."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.uncertainty.coverage import (
    numerical_tolerance,
    propagation_validated,
    shortest_interval,
    symmetric_interval,
)

RNG_SEED = 7


def test_shortest_interval_leaves_out_the_long_tail() -> None:
    # nine tenths of eleven draws are ten: all but the one far above
    draws = np.array([[9.0, 3, 1, 4, 100, 5, 2, 6, 0, 7, 8]])
    low, high = shortest_interval(draws, 0.82)
    assert (low[0], high[0]) == (0.0, 9.0)


def test_shortest_interval_of_an_exponential_begins_at_zero() -> None:
    draws = np.random.default_rng(RNG_SEED).exponential(size=(1, 200_000))
    low, high = shortest_interval(draws, 0.95)
    # the density falls from zero on: the interval is [0, -ln 0.05] = [0, 2.9957]; a quantile of 2e5 draws there has a
    # sampling error of sqrt(0.05 x 0.95 / 2e5) / 0.05 = 0.01, three of which are allowed
    assert low[0] == pytest.approx(0.0, abs=0.01)
    assert high[0] == pytest.approx(-math.log(0.05), abs=0.03)


def test_symmetric_interval_leaves_the_same_share_on_either_side() -> None:
    ordered = np.arange(1000.0)[None, :]
    assert symmetric_interval(ordered, 0.9) == ([50.0], [949.0])


def test_an_unknown_draw_makes_the_interval_unknown() -> None:
    draws = np.array([[1.0, np.nan, 2.0], [1.0, 3.0, 2.0]])
    low, high = shortest_interval(draws, 0.5)
    assert np.isnan(low).tolist() == [True, False]
    assert np.isnan(high).tolist() == [True, False]


@pytest.mark.parametrize(
    ("u", "digits", "tolerance"),
    # the examples of JCGM 101:2008, 7.9.2: m_S with u = 0.000 35 g and two digits; 2 K and one digit
    [(0.00035, 2, 0.000005), (2.0, 1, 0.5), (0.0996, 2, 0.005), (12.3, 2, 0.5)],
)
def test_numerical_tolerance_is_half_a_unit_of_the_last_digit(
    u: float, digits: int, tolerance: float
) -> None:
    assert numerical_tolerance(u, digits) == pytest.approx(tolerance)


def test_no_uncertainty_has_no_tolerance() -> None:
    assert math.isnan(numerical_tolerance(0.0))
    assert math.isnan(numerical_tolerance(math.inf))


def test_propagation_is_validated_for_a_linear_model_and_not_for_a_square() -> None:
    z = np.random.default_rng(RNG_SEED).standard_normal((1, 200_000))
    for drawn, value, u, agrees in (
        (3.0 + 0.2 * z, 3.0, 0.2, True),
        ((0.1 + 0.2 * z) ** 2, 0.01, 0.04, False),
    ):
        ordered = np.sort(drawn, axis=-1)
        low, high = symmetric_interval(ordered, 0.95)
        found = propagation_validated(np.array([value]), np.array([u]), 0.95, low, high, 200_000)
        assert found.tolist() == [agrees]
