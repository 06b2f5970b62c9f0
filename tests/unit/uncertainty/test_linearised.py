"""Linearised numbers: values as plain arithmetic gives them, derivatives as finite differences give them."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from coulombook.uncertainty.linearised import (
    Linearised,
    chain,
    covariance,
    gather,
    linear_map,
    nominal,
    select,
    sparse_map,
    standard_uncertainty,
)

X = np.array([1.5, 2.0, 0.7])
Y = np.array([0.4, 3.0, 1.1])
C = np.array([2.0, -1.0, 0.5])
# six errors of unit variance, one for each element of x and of y, so that the jacobian is the plain derivative
XS = Linearised(X, sparse_map(range(3), range(3), 1.0, (3, 6)))
YS = Linearised(Y, sparse_map(range(3), range(3, 6), 1.0, (3, 6)))


@pytest.mark.parametrize(
    "function",
    [
        lambda x, y: x + y,
        lambda x, y: x - y,
        lambda x, y: x * y,
        lambda x, y: x / y,
        lambda x, y: C + x,
        lambda x, y: C - x,
        lambda x, y: C * x,
        lambda x, y: C / x,
        lambda x, y: x + C,
        lambda x, y: x - C,
        lambda x, y: x * C,
        lambda x, y: x / C,
        lambda x, y: 2.0 - x,
        lambda x, y: 2.0 / y,
        lambda x, y: -x,
        lambda x, y: x**3,
        lambda x, y: np.sqrt(x),
        lambda x, y: np.exp(x),
        lambda x, y: np.log(x),
        lambda x, y: 2.0 * (y - C) / (x + np.sqrt(x**2 + 4.0 * 0.01 * (y - C))),
        lambda x, y: gather(x, np.array([2, 0, 0])) * y,
        lambda x, y: linear_map(sparse_map([0, 0, 1], [0, 2, 1], [1.0, 2.0, -3.0], (2, 3)), x * y),
        lambda x, y: select(np.array([True, False, True]), x * x, y),
        lambda x, y: select(np.array([True, False, True]), C, y),
        lambda x, y: chain(x * y, lambda z: (np.sin(z), np.cos(z))),
    ],
)
def test_derivatives_agree_with_central_differences(function: Callable[..., Linearised]) -> None:
    result = function(XS, YS)
    np.testing.assert_allclose(nominal(result), function(X, Y), rtol=1e-15)
    step = 1e-6
    for column in range(6):
        shift = np.zeros(6)
        shift[column] = step
        high = function(X + shift[:3], Y + shift[3:])
        low = function(X - shift[:3], Y - shift[3:])
        # a central difference with step 1e-6 is good to about 1e-10 here: truncation 1e-12, rounding 1e-16/1e-6
        np.testing.assert_allclose(
            result.jacobian.toarray()[:, column], (high - low) / (2 * step), rtol=1e-8, atol=1e-9
        )


def test_a_draw_axis_passes_through_every_function() -> None:
    draws = np.stack([X, X + 1.0])
    matrix = sparse_map([0, 0, 1], [0, 2, 1], [1.0, 2.0, -3.0], (2, 3))
    np.testing.assert_allclose(linear_map(matrix, draws)[1], linear_map(matrix, X + 1.0))
    np.testing.assert_allclose(gather(draws, np.array([2, 0]))[0], X[[2, 0]])
    assert select(np.array([True, False, True]), draws, Y).shape == (2, 3)


def test_a_number_not_selected_leaves_no_trace_even_where_it_is_unknown() -> None:
    unknown = Linearised(np.array([np.nan, 2.0, 0.7]), np.nan * XS.jacobian)
    kept = select(np.array([False, False, False]), unknown, YS)
    np.testing.assert_array_equal(nominal(kept), Y)
    np.testing.assert_array_equal(standard_uncertainty(kept), np.ones(3))


def test_uncertainty_of_a_sum_carries_the_covariance_of_its_terms() -> None:
    # x and -x share their error, so that x + (-x) has none, while x + y adds in quadrature
    assert standard_uncertainty(XS + (-XS)) == pytest.approx([0.0, 0.0, 0.0])
    assert standard_uncertainty(XS + YS) == pytest.approx([2**0.5] * 3)
    np.testing.assert_allclose(covariance(XS), np.eye(3))


def test_uncertainty_after_many_steps_is_the_root_of_the_diagonal_of_the_covariance() -> None:
    repeated = sparse_map([0, 0, 1, 1, 1], [0, 0, 2, 1, 2], [1.0, 2.0, -3.0, 0.5, 1.0], (2, 3))
    number = linear_map(repeated, XS * YS + gather(XS, np.array([2, 2, 0])) / YS - YS)
    number = number + gather(number, np.array([1, 1]))
    np.testing.assert_allclose(standard_uncertainty(number) ** 2, np.diag(covariance(number)), rtol=1e-12)


def test_plain_numbers_have_no_uncertainty() -> None:
    assert standard_uncertainty(X).tolist() == [0.0, 0.0, 0.0]


def test_a_measurement_function_cannot_branch_on_a_reading() -> None:
    with pytest.raises(TypeError, match="not supported"):
        _ = XS > 1.0  # type: ignore[operator]
