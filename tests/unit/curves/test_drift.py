"""Interpolation between check-gas injections."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.curves.drift import interpolation_weights


def _dense(check_times: list[float], at_times: list[float]) -> np.ndarray:
    rows, columns, values = interpolation_weights(check_times, at_times)
    matrix = np.zeros((len(at_times), len(check_times)))
    matrix[rows, columns] = values
    assert np.count_nonzero(matrix) == len(values), "each place occurs once"
    return matrix


def test_factor_is_linear_between_checks_and_constant_outside() -> None:
    matrix = _dense([0.0, 100.0, 300.0], [-50.0, 0.0, 25.0, 100.0, 250.0, 300.0, 900.0])
    expected = [[1, 0, 0], [1, 0, 0], [0.75, 0.25, 0], [0, 1, 0], [0, 0.25, 0.75], [0, 0, 1], [0, 0, 1]]
    np.testing.assert_allclose(matrix, expected, rtol=1e-15)


def test_order_of_the_checks_does_not_matter() -> None:
    factors = {0.0: 1.0, 100.0: 0.9, 300.0: 1.1}
    for order in ([0.0, 100.0, 300.0], [300.0, 0.0, 100.0]):
        found = _dense(order, [50.0, 200.0]) @ [factors[one] for one in order]
        np.testing.assert_allclose(found, [0.95, 1.0], rtol=1e-15)


def test_checks_at_the_same_time_count_as_their_mean() -> None:
    matrix = _dense([0.0, 100.0, 100.0], [50.0, 100.0, 500.0])
    np.testing.assert_allclose(matrix, [[0.5, 0.25, 0.25], [0, 0.5, 0.5], [0, 0.5, 0.5]], rtol=1e-15)


def test_single_check_holds_for_the_whole_day() -> None:
    np.testing.assert_array_equal(_dense([40.0], [0.0, 40.0, 1e5]), [[1.0], [1.0], [1.0]])


def test_weights_of_each_reading_add_to_one() -> None:
    rng = np.random.default_rng(70)
    matrix = _dense(rng.integers(0, 20, 30).astype(float).tolist(), rng.uniform(-5.0, 25.0, 200).tolist())
    np.testing.assert_allclose(matrix.sum(axis=1), 1.0, rtol=1e-14)
    assert (matrix >= 0.0).all()


def test_no_readings_give_no_weights() -> None:
    assert [len(one) for one in interpolation_weights([0.0], [])] == [0, 0, 0]


def test_nothing_to_interpolate_between_is_refused() -> None:
    with pytest.raises(ValueError, match="no checks"):
        interpolation_weights([], [1.0])
    with pytest.raises(ValueError, match="not a finite number"):
        interpolation_weights([0.0, float("nan")], [1.0])
