"""Readings turned into x, with uncertainty and interval."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.curves.fit import FORMS, Curve, fit_curve
from coulombook.curves.interval import inverse_with_uncertainty
from coulombook.curves.inverse import invert
from coulombook.curves.prediction import (
    curve_response,
    curve_variance,
    range_distance,
    reading_freedom,
    reading_variance,
    slope,
)
from coulombook.curves.quantiles import student_quantile
from coulombook.uncertainty.linearised import Linearised, covariance, sparse_map

X = np.array([1.0, 2.0, 3.0, 4.0])
# residuals (1, -1, -1, 1) are orthogonal to 1 and x: slope 10, intercept 5, s^2 = 4/2, Sxx = 5, mean x = 2.5
LINE = fit_curve(X, 5.0 + 10.0 * X + np.array([1.0, -1.0, -1.0, 1.0]))
T975 = 0.95 / math.sqrt(2.0 * 0.975 * 0.025)  # Student's t with 2 degrees of freedom, in closed form
POINTS = np.repeat([1.0, 2.0, 5.0, 8.0, 10.0], 3)


def drawn(form: str, weights: str, seed: int = 100, **more: object) -> Curve:
    rng = np.random.default_rng(seed)
    a0, a2 = (0.0 if form == "line through zero" else 1.0), (-0.2 if form == "quadratic" else 0.0)
    sd = {"1/x": 0.2 * np.sqrt(POINTS), "1/x^2": 0.1 * POINTS}.get(weights, np.full(15, 0.3))
    y = a0 + 10.0 * POINTS + a2 * POINTS**2 + sd * rng.standard_normal(15)
    return fit_curve(POINTS, y, form, weights, **more)  # type: ignore[arg-type]


def test_uncertainty_worked_by_hand() -> None:
    # s/b sqrt(1/m + 1/n + (y - ybar)^2/(b^2 Sxx)), ybar = 30
    for repeats in (1, 4):
        found = inverse_with_uncertainty(LINE, 50.0, repeats)
        expected = math.sqrt(2.0) / 10.0 * math.sqrt(1.0 / repeats + 0.25 + 20.0**2 / (100.0 * 5.0))
        assert float(found.x) == pytest.approx(4.5, rel=1e-14)
        assert float(found.u) == pytest.approx(expected, rel=1e-13)
        assert float(found.degrees_of_freedom) == pytest.approx(2.0, rel=1e-12)


def test_interval_of_a_line_is_fiellers() -> None:
    # x = xbar + [d +- (t s/b) sqrt((1 - g)(1/m + 1/n) + d^2/Sxx)]/(1 - g), d = (y - ybar)/b, g = t^2 s^2/(b^2 Sxx)
    y = np.array([5.0, 8.0, 30.0, 60.0, 200.0])
    found = inverse_with_uncertainty(LINE, y)
    g = T975**2 * 2.0 / (100.0 * 5.0)
    d = (y - 30.0) / 10.0
    arm = T975 * math.sqrt(2.0) / 10.0 * np.sqrt((1.0 - g) * 1.25 + d**2 / 5.0)
    np.testing.assert_allclose(found.low, 2.5 + (d - arm) / (1.0 - g), rtol=1e-12)
    np.testing.assert_allclose(found.high, 2.5 + (d + arm) / (1.0 - g), rtol=1e-12)
    np.testing.assert_allclose(found.asymmetry, (found.high - found.x) / (found.x - found.low), rtol=1e-12)
    # at the centre of the line the interval is symmetric
    assert found.asymmetry[2] == pytest.approx(1.0, rel=1e-10)
    assert found.asymmetry[0] < 1.0 < found.asymmetry[-1]


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("weights", ["equal", "1/x", "1/x^2", "replicates"])
def test_ends_are_where_the_reading_is_just_contradicted(form: str, weights: str) -> None:
    curve = drawn(form, weights)
    y = np.array([1.5, 12.0, 50.0, 80.0])
    for repeats in (1, 3):
        found = inverse_with_uncertainty(curve, y, repeats, level=0.9)
        t = student_quantile(0.95, found.degrees_of_freedom)
        if weights != "replicates":
            # t(0.95) with 12, 13 and 14 degrees of freedom, from a table
            table = {12: 1.7822875556, 13: 1.7709333960, 14: 1.7613101358}
            np.testing.assert_allclose(t, table[curve.degrees_of_freedom], rtol=1e-9)
        for end in (found.low, found.high):
            v = reading_variance(curve, end) / repeats + curve_variance(curve, end)
            np.testing.assert_allclose(np.abs(y - curve_response(curve, end)), t * np.sqrt(v), rtol=1e-9)
        assert (found.low < found.x).all()
        assert (found.x < found.high).all()


def test_variance_from_replicates_is_known_less_well_at_the_ends() -> None:
    # three replicates at two levels: the variance there is that of the level, with two degrees of freedom; the curve
    # adds what the same two levels tell
    x = np.repeat([1.0, 10.0], 3)
    y = 10.0 * x + np.array([0.1, -0.1, 0.0, 1.0, -1.0, 0.0])
    curve = fit_curve(x, y, "line", "replicates")
    np.testing.assert_allclose(reading_freedom(curve, [1.0, 10.0]), 2.0, rtol=1e-9)
    # in between both tell
    assert 2.0 < float(reading_freedom(curve, 3.0)) < 4.0
    found = inverse_with_uncertainty(curve, [10.0, 30.0, 100.0])
    np.testing.assert_allclose(found.degrees_of_freedom, reading_freedom(curve, found.x), rtol=1e-12)


def test_a_narrow_interval_is_the_symmetric_one() -> None:
    # g near zero: x +- t u (Draper & Smith, Applied Regression Analysis, ch. 3)
    curve = fit_curve(X, 5.0 + 10.0 * X + 1e-4 * np.array([1.0, -1.0, -1.0, 1.0]), "line")
    found = inverse_with_uncertainty(curve, 30.0)
    assert float(found.high - found.x) == pytest.approx(T975 * float(found.u), rel=1e-6)
    assert float(found.x - found.low) == pytest.approx(T975 * float(found.u), rel=1e-6)


@pytest.mark.parametrize("form", FORMS)
def test_uncertainty_is_that_of_the_law_of_propagation(form: str) -> None:
    curve = drawn(form, "1/x")
    y = 42.0
    found = inverse_with_uncertainty(curve, y, u_y=0.7)
    # the same through the package's own forward differentiation: coefficients, and the reading apart from them
    root = np.zeros((4, curve.factor.shape[1] + 1))
    root[:3, :-1] = curve.factor
    root[3, -1] = 0.7
    values = [*curve.coefficients, y]
    parts = []
    for row, value in zip(root, values, strict=True):
        columns = np.arange(row.size)
        parts.append(
            Linearised(np.array([value]), sparse_map(np.zeros(row.size, int), columns, row, (1, row.size)))
        )
    x = invert(*parts)
    assert isinstance(x, Linearised)
    assert float(found.x) == pytest.approx(float(x.value[0]), rel=1e-14)
    assert float(found.u) ** 2 == pytest.approx(float(covariance(x)[0, 0]), rel=1e-10)


def test_interval_without_end_says_so() -> None:
    # a slope of 1 with u = 0.5 and two degrees of freedom is not told from zero
    curve = fit_curve(X, X + 0.8 * np.array([1.0, -1.0, -1.0, 1.0]))
    found = inverse_with_uncertainty(curve, 2.5)
    assert math.isinf(float(found.low))
    assert math.isinf(float(found.high))
    assert math.isfinite(float(found.u))


def test_interval_of_a_quadratic_has_no_end_beyond_its_turning_point() -> None:
    x = np.array([0.0, 1.0, 2.0, 3.0, 4.0])
    curve = fit_curve(x, 10.0 * x - x**2 + 0.1 * np.array([-1.0, 2.0, 0.0, -2.0, 1.0]), "quadratic")
    found = inverse_with_uncertainty(curve, np.array([10.0, 24.9, 30.0]))
    assert np.isfinite([found.low[0], found.high[0], found.low[1]]).all()
    assert math.isinf(found.high[1])
    # no x gives 30
    assert np.isnan([found.x[2], found.u[2], found.low[2], found.high[2]]).all()


def test_a_given_uncertainty_of_the_reading_takes_the_place_of_the_scatter() -> None:
    found = inverse_with_uncertainty(LINE, 30.0, u_y=0.0)
    assert float(found.u) == pytest.approx(math.sqrt(2.0 * 0.25) / 10.0, rel=1e-12)
    assert float(found.degrees_of_freedom) == pytest.approx(2.0, rel=1e-12)
    # and is taken as known
    large = inverse_with_uncertainty(LINE, 30.0, u_y=100.0)
    assert float(large.degrees_of_freedom) > 1e6


def test_certificates_add_degrees_of_freedom() -> None:
    silent = inverse_with_uncertainty(drawn("line", "equal"), 50.0)
    stated = inverse_with_uncertainty(
        drawn("line", "equal", parent=["A"] * 15, u_parent=[0.05] * 15),
        50.0,
    )
    assert float(stated.degrees_of_freedom) > 20.0 * float(silent.degrees_of_freedom)
    assert float(stated.u) == pytest.approx(math.hypot(float(silent.u), 0.05 * float(stated.x)), rel=0.03)


def test_unknown_scatter_gives_no_interval() -> None:
    found = inverse_with_uncertainty(fit_curve([1.0, 2.0], [1.0, 2.0]), 1.5)
    assert float(found.x) == pytest.approx(1.5)
    assert math.isnan(float(found.low))
    assert math.isnan(float(found.high))


def test_points_on_the_curve_give_an_interval_of_no_width() -> None:
    found = inverse_with_uncertainty(fit_curve([1.0, 2.0, 4.0], [2.0, 4.0, 8.0], "line through zero"), 6.0)
    assert (float(found.low), float(found.x), float(found.high)) == pytest.approx((3.0, 3.0, 3.0), rel=1e-12)


def test_readings_that_cannot_be_are_refused() -> None:
    with pytest.raises(ValueError, match="one measurement at least"):
        inverse_with_uncertainty(LINE, 30.0, 0)
    with pytest.raises(ValueError, match="between 0 and 1; it is 95"):
        inverse_with_uncertainty(LINE, 30.0, level=95.0)
    with pytest.raises(ValueError, match="at or above zero"):
        inverse_with_uncertainty(LINE, 30.0, u_y=-1.0)


@pytest.mark.parametrize(("weights", "power"), [("equal", 0.0), ("1/x", 1.0), ("1/x^2", 2.0)])
def test_scatter_of_a_reading_is_that_of_a_standard_of_its_x(weights: str, power: float) -> None:
    rng = np.random.default_rng(101)
    y = 10.0 * POINTS + rng.standard_normal(15)
    curve = fit_curve(POINTS, y, "line", weights)
    raw = POINTS**-power
    np.testing.assert_allclose(
        reading_variance(curve, POINTS), curve.residual_sd**2 / (raw / raw.mean()), rtol=1e-12
    )
    # never less than at the lowest standard
    assert reading_variance(curve, -3.0) == pytest.approx(float(reading_variance(curve, 1.0)), rel=1e-12)


def test_slope_is_the_derivative_of_the_response() -> None:
    curve = drawn("quadratic", "equal")
    x, step = np.array([1.0, 5.0, 9.0]), 1e-4
    difference = (curve_response(curve, x + step) - curve_response(curve, x - step)) / (2.0 * step)
    np.testing.assert_allclose(slope(curve, x), difference, rtol=1e-9)


def test_distance_from_the_range_counts_its_widths() -> None:
    # range 1 to 4
    np.testing.assert_allclose(
        range_distance(LINE, [-2.0, 0.7, 1.0, 2.0, 4.0, 5.5]), [-1.0, -0.1, 0.0, 0.0, 0.0, 0.5], atol=1e-14
    )
