"""Response of a curve and its inverse on the rising branch."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.curves.inverse import invert, invertible, response


@pytest.mark.parametrize(
    ("a0", "a1", "a2"),
    [
        (0.0, 2.0, 0.0),  # line through zero
        (1.0, 2.0, 0.0),  # line
        (1.0, 2.0, -0.05),  # bends down: rises up to x = 20
        (1.0, 2.0, 0.05),  # bends up
        (1.0, -0.05, 0.05),  # bends up with its vertex at 0.5: rises from there
        (1.0, 2.0, 1e-18),  # a quadratic as good as a line
        (1.0, 2.0, -1e-18),
    ],
)
def test_there_and_back_on_the_rising_branch(a0: float, a1: float, a2: float) -> None:
    x = np.array([0.7, 1.1, 5.0, 19.0])
    # no cancellation between the terms: each step rounds once, the slope is 0.02 at the flattest
    np.testing.assert_allclose(invert(a0, a1, a2, response(a0, a1, a2, x)), x, rtol=1e-12)


def test_inverse_worked_by_hand() -> None:
    # y = 3 + 4 x - x^2: y = 6 at x = 1 (rising) and x = 3 (falling)
    assert invert(3.0, 4.0, -1.0, 6.0) == 1.0
    # y = 3 - 4 x + x^2: y = 6 has roots 2 +- sqrt(7); it rises on the larger one
    assert invert(3.0, -4.0, 1.0, 6.0) == pytest.approx(2.0 + np.sqrt(7.0), rel=1e-15)


def test_nearly_straight_quadratic_keeps_its_digits() -> None:
    # (-a1 + sqrt(a1^2 + 4 a2 y))/(2 a2) would have no digit left at a2 = 1e-17
    a2 = 1e-17
    assert invert(0.0, 1.0, a2, 3.0) == pytest.approx(3.0 - a2 * 9.0, rel=1e-15)


def test_slope_of_the_inverse_is_one_over_the_slope_of_the_curve() -> None:
    a0, a1, a2, x, h = 1.0, 2.0, -0.05, 5.0, 1e-6
    y = response(a0, a1, a2, x)
    slope = (invert(a0, a1, a2, y + h) - invert(a0, a1, a2, y - h)) / (2 * h)
    assert slope == pytest.approx(1.0 / (a1 + 2 * a2 * x), rel=1e-8)


def test_invertible_refuses_what_the_curve_never_reaches() -> None:
    # y = 3 + 4 x - x^2 has its top, 7, at x = 2
    y = np.array([6.9, 7.0, 7.1, np.nan, -50.0])
    assert invertible(np.array(3.0), np.array(4.0), np.array(-1.0), y).tolist() == [
        True,
        False,
        False,
        False,
        True,
    ]
    # y = 3 - 4 x + x^2 has its bottom, -1, at x = 2
    assert invertible(np.array(3.0), np.array(-4.0), np.array(1.0), np.array([-1.1, -0.9])).tolist() == [
        False,
        True,
    ]


def test_reading_at_the_intercept_of_a_curve_that_falls_at_zero_has_no_inverse() -> None:
    # y = 3 - 4 x + x^2 is 3 at x = 0 and at x = 4: the expression is 0/0 there, and says so
    assert not invertible(np.array(3.0), np.array(-4.0), np.array(1.0), np.array(3.0))
    assert invert(3.0, -4.0, 1.0, 3.0 + 1e-6) == pytest.approx(4.0, abs=1e-6)


def test_invertible_refuses_a_line_that_does_not_rise() -> None:
    slope = np.array([1.0, 0.0, -1.0])
    assert invertible(np.zeros(3), slope, np.zeros(3), np.ones(3)).tolist() == [True, False, False]


def test_curves_of_different_forms_are_inverted_together_with_draws() -> None:
    a0, a1, a2 = np.array([0.0, 1.0, 1.0]), np.array([2.0, 2.0, 2.0]), np.array([0.0, 0.0, -0.05])
    x = np.linspace(0.1, 10.0, 12).reshape(4, 3)
    np.testing.assert_allclose(invert(a0, a1, a2, response(a0, a1, a2, x)), x, rtol=1e-13)
