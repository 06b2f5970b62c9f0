"""Lines with errors in both axes: York's numbers, shared errors, scatter and bends."""

from __future__ import annotations

import math

import numpy as np
import pytest
from tests.published.reference import case
from tests.unit.compare.series_sample import points

from coulombook.compare.trend import Lines, Points, fit_lines
from coulombook.uncertainty.linearised import FloatArray, IntArray, Linearised, sparse_map

NOTHING = np.zeros(0, dtype=bool)


def fit(found: Points, group: IntArray | None = None) -> Lines:
    """Lines through all points, one group unless said otherwise."""
    n = len(found.x)
    group = np.zeros(n, dtype=np.intp) if group is None else group
    square = (found.x - found.x.mean()) ** 2
    return fit_lines(found, np.arange(n), group, int(group.max()) + 1, shapes=square[None])


def plain(x: FloatArray, y: FloatArray) -> Lines:
    return fit(Points.of(x, y, NOTHING))


def test_a_line_without_uncertainties_is_that_of_least_squares() -> None:
    # Sxx = 5, Sxy = 9.7, slope 1.94; residuals -0.09, 0.17, -0.07, -0.01: SSE = 0.042, s^2 = 0.021
    x, y = np.arange(4.0), np.array([1.0, 3.2, 4.9, 6.9])
    line = plain(x, y)
    assert line.slope.value[0] == pytest.approx(1.94)
    assert line.slope.u[0] == pytest.approx(math.sqrt(0.021 / 5.0))
    assert line.slope.degrees_of_freedom[0] == pytest.approx(2.0)
    assert line.mean.value[0] == pytest.approx(4.0)
    assert line.mean.u[0] == pytest.approx(math.sqrt(0.021 / 4.0))


def test_a_bend_is_that_of_a_parabola_by_least_squares() -> None:
    x = np.array([0.0, 1.0, 2.0, 4.0, 7.0])
    y = np.array([0.1, 1.2, 1.9, 3.3, 4.9])
    coefficients, covariance = np.polyfit(x, y, 2, cov=True)
    bend = plain(x, y).beside[0]
    assert bend.value[0] == pytest.approx(coefficients[0])
    assert bend.u[0] == pytest.approx(math.sqrt(covariance[0, 0]))
    assert bend.degrees_of_freedom[0] == pytest.approx(2.0)


def test_slope_and_uncertainty_are_yorks_for_pearsons_points() -> None:
    # twice York's uncertainties leave his slope as it is, and nothing for unexplained scatter: chi^2 falls below 8
    data = case("york_pearson")
    x, y, wx, wy = (np.array(data.inputs[name], dtype=float) for name in ("x", "y", "wx", "wy"))
    n = len(x)
    own = np.ones(2 * n, dtype=bool)
    every = np.arange(n)
    line = fit(
        Points.of(
            Linearised(x, sparse_map(every, every, 2 * wx**-0.5, (n, 2 * n))),
            Linearised(y, sparse_map(every, n + every, 2 * wy**-0.5, (n, 2 * n))),
            own,
        )
    )
    assert line.scatter.unexplained[0] == 0.0
    data.expected["slope"].check(float(line.slope.value[0]))
    # York's printed u is at the adjusted points; to first order, at the points as measured, it is 1.5 % above
    assert line.slope.u[0] / 2 == pytest.approx(data.expected["u_slope"].recomputed, rel=0.016)


def test_errors_that_all_points_share_leave_a_slope_alone() -> None:
    group = np.zeros(5, dtype=np.intp)
    x, y = np.linspace(-1.1, -0.7, 5), np.array([3.1, 2.2, 1.1, 0.3, -0.8])
    alone = fit(points(x, y, group, (0.002, 0.03), (0.0, 0.0)))
    shared = fit(points(x, y, group, (0.002, 0.03), (0.05, 0.4)))
    for one, other in ((alone.slope, shared.slope), (alone.beside[0], shared.beside[0])):
        assert one.value[0] == pytest.approx(other.value[0], rel=1e-12)
        assert one.u[0] == pytest.approx(other.u[0], rel=1e-9)
    assert shared.mean.u[0] > 0.4 > alone.mean.u[0]


def test_an_error_that_moves_x_and_y_of_a_point_together_counts_with_its_sign() -> None:
    # y = 2 x, and an error that moves y by twice what it moves x: each point slides along the line
    x, n = np.arange(5.0), 5
    every = np.arange(n)
    along = Points.of(
        Linearised(x, sparse_map(every, every, 0.1, (n, n))),
        Linearised(2.0 * x, sparse_map(every, every, 0.2, (n, n))),
        np.ones(n, dtype=bool),
    )
    across = Points.of(
        Linearised(x, sparse_map(every, every, 0.1, (n, n))),
        Linearised(2.0 * x, sparse_map(every, every, -0.2, (n, n))),
        np.ones(n, dtype=bool),
    )
    assert fit(along).slope.u[0] == pytest.approx(0.0, abs=1e-9)
    # 0.4 in y for each point, Sxx = 10
    assert fit(across).slope.u[0] == pytest.approx(0.4 / math.sqrt(10.0), rel=1e-9)


def test_a_relative_error_that_all_share_cancels_in_a_relative_slope() -> None:
    x, y, n = np.arange(5.0), np.array([10.0, 9.1, 8.2, 6.9, 6.1]), 5
    rows = [*range(n), *range(n)]
    columns = [*range(n), *[n] * n]

    def relative(shared: float) -> tuple[float, float]:
        sizes = [*[0.2] * n, *(shared * y)]
        own = np.array([True] * n + [False])
        line = fit(Points.of(x, Linearised(y, sparse_map(rows, columns, sizes, (n, n + 1))), own))
        found = line.relative_slope(np.zeros(1))
        return float(found.value[0]), float(found.u[0])

    value, u = relative(0.0)
    # slope -1, value at the start 8.06 + 2 = 10.06
    assert value == pytest.approx(-1.0 / 10.06, rel=1e-3)
    assert relative(0.3) == pytest.approx((value, u), rel=1e-9)


def test_groups_are_fitted_each_on_its_own_whatever_the_order_of_points() -> None:
    generator = np.random.default_rng(3)
    group = np.repeat([0, 1, 2], [4, 6, 9])
    x = generator.uniform(0.0, 1.0, 19)
    y = 2.0 * x + generator.normal(0.0, 0.1, 19)
    every = points(x, y, group, (0.01, 0.05), (0.1, 0.1))
    together = fit(every, group)
    # the same points in another order within their groups
    order = np.concatenate([generator.permutation(np.flatnonzero(group == number)) for number in range(3)])
    shuffled = fit_lines(every, order, group, 3)
    for number in range(3):
        alone = fit_lines(
            every, np.flatnonzero(group == number), np.zeros((group == number).sum(), dtype=np.intp), 1
        )
        for name in ("value", "u", "degrees_of_freedom"):
            found = getattr(together.slope, name)[number]
            assert found == pytest.approx(getattr(alone.slope, name)[0], rel=1e-9)
            assert found == pytest.approx(getattr(shuffled.slope, name)[number], rel=1e-9)


def test_points_on_a_line_leave_no_scatter_and_no_bend() -> None:
    x = np.linspace(-1.3, -0.6, 6)
    line = plain(x, -20.0 * x - 3.0)
    assert line.slope.value[0] == pytest.approx(-20.0, rel=1e-12)
    assert line.slope.u[0] == 0.0
    assert line.beside[0].p[0] == 1.0


def test_without_a_point_to_spare_and_without_uncertainties_no_bend_is_told() -> None:
    assert math.isnan(plain(np.arange(3.0), np.array([0.0, 1.0, 3.0])).beside[0].p[0])


def test_points_at_one_x_have_no_slope() -> None:
    assert math.isnan(plain(np.ones(4), np.arange(4.0)).slope.value[0])
