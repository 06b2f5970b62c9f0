"""Least-squares calibration curves."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.curves.fit import Curve, fit_curve, fit_polynomial
from coulombook.curves.inverse import response
from coulombook.curves.weights import point_weights

X = np.array([1.0, 2.0, 3.0, 4.0])


def test_line_worked_by_hand() -> None:
    # residuals (1, -1, -1, 1) are orthogonal to 1 and x: the fit is 5 + 3 x, s^2 = 4/2, Sxx = 5, mean x = 2.5
    curve = fit_curve(X, 5.0 + 3.0 * X + np.array([1.0, -1.0, -1.0, 1.0]))
    np.testing.assert_allclose(curve.coefficients, [5.0, 3.0, 0.0], rtol=1e-14)
    assert curve.degrees_of_freedom == 2
    assert curve.residual_sd == pytest.approx(np.sqrt(2.0), rel=1e-14)
    # var(a1) = s^2/Sxx, var(a0) = s^2 (1/n + mean^2/Sxx), cov = -mean var(a1)
    expected = [[2.0 * (0.25 + 6.25 / 5.0), -2.5 * 0.4, 0.0], [-2.5 * 0.4, 0.4, 0.0], [0.0, 0.0, 0.0]]
    np.testing.assert_allclose(curve.covariance, expected, atol=1e-13)
    # total sum of squares 9 x 5 + 4
    assert curve.r_squared == pytest.approx(1.0 - 4.0 / 49.0, rel=1e-14)
    assert (curve.form, curve.weights, curve.points) == ("line", "equal", 4)
    assert (curve.lowest, curve.highest) == (1.0, 4.0)
    assert curve.free == (True, True, False)


def test_line_through_zero_worked_by_hand() -> None:
    # slope = sum x y / sum x^2 = (1 x 2 + 2 x 3)/(1 + 4) = 1.6; residuals 0.4, -0.2; s^2 = 0.2/1; var = 0.2/5
    curve = fit_curve([1.0, 2.0], [2.0, 3.0], "line through zero")
    np.testing.assert_allclose(curve.coefficients, [0.0, 1.6, 0.0], rtol=1e-14)
    assert curve.residual_sd == pytest.approx(np.sqrt(0.2), rel=1e-14)
    assert curve.covariance[1, 1] == pytest.approx(0.04, rel=1e-13)
    # about zero, as the form has no intercept: 1 - 0.2/13
    assert curve.r_squared == pytest.approx(1.0 - 0.2 / 13.0, rel=1e-14)
    assert curve.free == (False, True, False)
    assert curve.factor.shape == (3, 1)


def test_quadratic_comes_back_from_exact_points() -> None:
    # mole fractions against areas of a million: scales a naive solver loses digits on
    x = np.array([1e-6, 5e-6, 2e-5, 1e-4, 4e-4])
    curve = fit_curve(x, 3.0 + 2e9 * x - 5e11 * x**2, "quadratic")
    np.testing.assert_allclose(curve.coefficients, [3.0, 2e9, -5e11], rtol=1e-8)
    assert curve.r_squared == pytest.approx(1.0, abs=1e-12)


def test_weighted_line_solves_the_weighted_equations() -> None:
    rng = np.random.default_rng(50)
    x = np.array([1.0, 2.0, 5.0, 10.0, 20.0, 50.0])
    y = 3.0 + 2.0 * x + rng.normal(0.0, 0.1, 6) * x
    for weights, w in (("1/x", 1.0 / x), ("1/x^2", 1.0 / x**2)):
        curve = fit_curve(x, y, "line", weights)
        w = w / w.mean()
        residual = y - response(*curve.coefficients, x)
        # normal equations as a check of the solution, not as the way to it; sums of six terms of size 10
        assert w @ residual == pytest.approx(0.0, abs=1e-11)
        assert (w * x) @ residual == pytest.approx(0.0, abs=1e-11)
        assert curve.residual_sd == pytest.approx(np.sqrt(w @ residual**2 / 4.0), rel=1e-12)
        design = np.column_stack((np.ones(6), x))
        expected = curve.residual_sd**2 * np.linalg.inv(design.T @ (w[:, None] * design))
        np.testing.assert_allclose(curve.covariance[:2, :2], expected, rtol=1e-11)


@pytest.mark.parametrize("form", ["line", "line through zero", "quadratic"])
def test_factor_is_a_root_of_the_covariance(form: str) -> None:
    rng = np.random.default_rng(51)
    x = np.geomspace(20e-6, 2e-2, 9)
    curve = fit_curve(x, 1.0 + 5e6 * x * (1.0 + 0.01 * rng.standard_normal(9)), form, "1/x")
    assert curve.factor.shape == (3, sum(curve.free))
    np.testing.assert_allclose(curve.factor @ curve.factor.T, curve.covariance, rtol=1e-13)


@pytest.mark.parametrize("form", ["line", "line through zero", "quadratic"])
def test_scatter_of_refitted_curves_is_the_covariance(form: str) -> None:
    rng = np.random.default_rng(52)
    x = np.array([1.0, 2.0, 4.0, 6.0, 8.0, 10.0])
    truth = (0.0 if form == "line through zero" else 2.0, 5.0, -0.1 if form == "quadratic" else 0.0)
    draws = [fit_curve(x, response(*truth, x) + rng.normal(0.0, 0.3, 6), form) for _ in range(600)]
    coefficients = np.array([one.coefficients for one in draws])
    stated = np.mean([one.covariance for one in draws], axis=0)
    found = np.cov(coefficients.T)
    free = np.array(draws[0].free)
    # a variance of 600 draws is known to sqrt(2/600) = 5.8 %; three of them
    np.testing.assert_allclose(found[free][:, free], stated[free][:, free], rtol=0.18)
    np.testing.assert_allclose(coefficients.mean(axis=0), truth, atol=4.0 * np.sqrt(stated.max() / 600))


def test_units_of_x_and_y_do_not_matter() -> None:
    rng = np.random.default_rng(53)
    x = np.linspace(1.0, 9.0, 12)
    y = 1.0 + 3.0 * x - 0.05 * x**2 + rng.normal(0.0, 0.05, 12)
    plain, scaled = (fit_curve(x, y, "quadratic"), fit_curve(1e-6 * x, 1e7 * y, "quadratic"))
    factors = 1e7 * np.array([1.0, 1e6, 1e12])
    np.testing.assert_allclose(scaled.coefficients, factors * plain.coefficients, rtol=1e-12)
    np.testing.assert_allclose(scaled.covariance, np.outer(factors, factors) * plain.covariance, rtol=1e-10)


def test_order_of_the_standards_does_not_matter() -> None:
    rng = np.random.default_rng(54)
    x = rng.uniform(1.0, 9.0, 12)
    y = 1.0 + 3.0 * x + rng.normal(0.0, 0.05, 12)
    order = rng.permutation(12)
    first, second = fit_curve(x, y, "line", "1/x"), fit_curve(x[order], y[order], "line", "1/x")
    np.testing.assert_allclose(first.coefficients, second.coefficients, rtol=1e-14)


def test_as_many_points_as_coefficients_leave_nothing_known_of_the_scatter() -> None:
    curve = fit_curve([1.0, 3.0], [2.0, 8.0])
    np.testing.assert_allclose(curve.coefficients, [-1.0, 3.0, 0.0], rtol=1e-14)
    assert (curve.degrees_of_freedom, curve.residual_sd) == (0, 0.0)
    assert not curve.covariance.any()


def test_arrays_of_a_curve_cannot_be_changed() -> None:
    curve = fit_curve(X, 2.0 * X)
    assert isinstance(curve, Curve)
    for array in (curve.coefficients, curve.covariance, curve.factor):
        with pytest.raises(ValueError, match="read-only"):
            array[...] = 0.0


@pytest.mark.parametrize(
    ("x", "y", "form", "weights", "message"),
    [
        ([1.0], [2.0], "line", "equal", r"1 point\(s\) cannot fix the 2 coefficient\(s\) of a line"),
        ([], [], "line through zero", "1/x", r"0 point\(s\) cannot fix"),
        ([1.0, 2.0], [2.0, 3.0], "quadratic", "equal", r"2 point\(s\) cannot fix the 3"),
        ([2.0, 2.0, 2.0], [1.0, 2.0, 3.0], "line", "equal", "as many different x; there are 1"),
        ([1.0, 2.0, 2.0], [1.0, 2.0, 3.0], "quadratic", "equal", "as many different x; there are 2"),
        ([0.0, 0.0], [1.0, 2.0], "line through zero", "equal", "as many different x; there are 0"),
        ([0.0, 1.0, 2.0], [0.0, 1.0, 2.0], "line", "1/x", "weights 1/x need every x above zero; one is 0"),
        ([0.0, 1.0, 2.0], [0.0, 1.0, 2.0], "line", "1/x^2", r"weights 1/x\^2 need every x above zero"),
        ([1.0, 2.0, 3.0], [1.0, 2.0, 3.0], "line", "replicates", "at least two points of the same x"),
        ([1.0, 1.0, 2.0, 2.0], [1.0, 1.0, 2.0, 2.0], "line", "replicates", "there is no variance"),
        ([1.0, 2.0, 3.0], [1.0, 2.0, 3.0], "line", "1/y", "choose from equal, 1/x, 1/x"),
        ([1.0, 2.0, 3.0], [1.0, 2.0, 3.0], "line", "both", "an uncertainty above zero for every standard"),
        (
            [1.0, 2.0, 3.0],
            [1.0, 2.0, 3.0],
            "cubic",
            "equal",
            "choose from line, line through zero, quadratic",
        ),
        ([1.0, 2.0, 3.0], [3.0, 2.0, 1.0], "line", "equal", "does not rise over its whole range"),
        (
            [1.0, 2.0, 3.0, 4.0],
            [1.0, 2.0, 2.0, 1.0],
            "quadratic",
            "equal",
            "does not rise over its whole range",
        ),
        ([1.0, 2.0, float("nan")], [1.0, 2.0, 3.0], "line", "equal", "not a finite number"),
        ([1.0, 2.0, 3.0], [1.0, 2.0, float("inf")], "line", "equal", "not a finite number"),
    ],
)
def test_curve_that_cannot_be_fitted_or_inverted_is_refused(
    x: list[float], y: list[float], form: str, weights: str, message: str
) -> None:
    with pytest.raises(ValueError, match=message):
        fit_curve(x, y, form, weights)


def test_weight_that_is_not_above_zero_is_refused() -> None:
    with pytest.raises(ValueError, match="every weight must be above zero"):
        fit_polynomial(X, X, (0, 1), [1.0, 0.0, 1.0, 1.0])


def test_only_ratios_of_weights_matter() -> None:
    rng = np.random.default_rng(55)
    y = 2.0 * X + rng.normal(0.0, 0.1, 4)
    weights = np.array([1.0, 2.0, 3.0, 4.0])
    first, second = (fit_polynomial(X, y, (0, 1), k * weights) for k in (1.0, 1e-9))
    np.testing.assert_allclose(first.covariance, second.covariance, rtol=1e-12)
    assert first.residual_sd == pytest.approx(second.residual_sd, rel=1e-12)
    # and fit_curve hands over weights of mean 1
    assert point_weights(X, y, "1/x^2").mean() == pytest.approx(1.0, rel=1e-15)
