"""Replicates pooled into points of a series."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.compare.series import pool_points, series_points
from coulombook.uncertainty.linearised import Linearised, sparse_map


def test_points_keep_the_order_of_the_ledger_and_pool_their_rows() -> None:
    points = series_points(["a", "b", "a"], ["-1 V"] * 3, ["hydrogen"] * 3)
    assert [(point.catalyst, point.rows.tolist()) for point in points] == [("a", [0, 2]), ("b", [1])]


def test_a_shared_error_does_not_average_out_over_replicates() -> None:
    points = series_points(["a", "a"], ["-1 V"] * 2, ["hydrogen"] * 2)
    shared = Linearised(np.array([0.5, 0.5]), sparse_map([0, 1], [0, 0], 0.01, (2, 1)))
    alone = Linearised(np.array([0.5, 0.5]), sparse_map([0, 1], [0, 1], 0.01, (2, 2)))
    assert pool_points(shared, points).u[0] == pytest.approx(0.01)
    assert pool_points(alone, points).u[0] == pytest.approx(0.01 / 2**0.5)


def test_scatter_between_replicates_enters_what_their_uncertainty_does_not_explain() -> None:
    points = series_points(["a", "a"], ["-1 V"] * 2, ["hydrogen"] * 2)
    x = Linearised(np.array([0.40, 0.44]), sparse_map([0, 1], [0, 1], 0.01, (2, 2)))
    pooled = pool_points(x, points)
    # s^2 = 0.0008, explained 0.0001 each; u^2 of the mean = 0.0001/2 + (0.0008 - 0.0001)/2 = 0.0004
    assert pooled.deviation[0] == pytest.approx(0.0008**0.5)
    assert pooled.u[0] == pytest.approx(0.02)
