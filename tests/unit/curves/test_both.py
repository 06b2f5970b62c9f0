"""Fits with errors in both variables, and errors of the standards in every other fit."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.curves.both import fit_distance
from coulombook.curves.certificates import standard_errors
from coulombook.curves.fit import FORMS, Curve, fit_curve
from coulombook.curves.inverse import response

X = np.array([1.0, 2.0, 4.0, 6.0, 8.0, 10.0])
TRUTH = {"line": (2.0, 5.0, 0.0), "line through zero": (0.0, 5.0, 0.0), "quadratic": (2.0, 5.0, -0.1)}


def york(
    x: np.ndarray, y: np.ndarray, u_x: np.ndarray, u_y: np.ndarray
) -> tuple[np.ndarray, np.ndarray, float]:
    """Intercept and slope, their standard uncertainties and chi^2.

    York, Evensen, Martinez & De Basabe Delgado, Am. J. Phys. 72 (2004) 367, eq. 13, errors uncorrelated.
    """
    b = np.polyfit(x, y, 1)[0]
    for _ in range(1000):
        w = 1.0 / (u_y**2 + b**2 * u_x**2)
        x_bar, y_bar = w @ x / w.sum(), w @ y / w.sum()
        u, v = x - x_bar, y - y_bar
        beta = w * (u * u_y**2 + b * v * u_x**2)
        previous, b = b, (w * beta) @ v / ((w * beta) @ u)
        if abs(b - previous) <= 1e-15 * abs(b):
            break
    a = y_bar - b * x_bar
    adjusted = x_bar + beta
    adjusted_bar = w @ adjusted / w.sum()
    var_b = 1.0 / (w @ np.square(adjusted - adjusted_bar))
    var_a = 1.0 / w.sum() + adjusted_bar**2 * var_b
    return np.array([a, b]), np.sqrt([var_a, var_b]), float(w @ np.square(y - a - b * x))


def draw(rng: np.random.Generator, form: str, u_x: np.ndarray, u_y: float) -> np.ndarray:
    """Responses of standards whose certificates are off by u_x."""
    y: np.ndarray = response(*TRUTH[form], X + u_x * rng.standard_normal(X.size))
    return y + u_y * rng.standard_normal(X.size)


def test_line_with_independent_errors_is_yorks() -> None:
    rng = np.random.default_rng(70)
    for _ in range(20):
        u_x, u_y = 0.3 * rng.uniform(0.2, 1.0, 6), rng.uniform(0.2, 2.0, 6)
        y = 2.0 + 5.0 * X + u_y * rng.standard_normal(6)
        coefficients, u, chi_square = york(X, y, u_x, u_y)
        fit = fit_distance(X, y, (0, 1), standard_errors(X, u_x), u_y)
        # both iterate; they stop within 1e-10 of an uncertainty
        np.testing.assert_allclose(fit.coefficients, coefficients, atol=1e-9 * u.max())
        np.testing.assert_allclose(np.linalg.norm(fit.factor, axis=1), u, rtol=1e-8)
        assert fit.chi_square == pytest.approx(chi_square, rel=1e-10)
        assert fit.mswd == pytest.approx(chi_square / 4.0, rel=1e-10)


@pytest.mark.parametrize("form", FORMS)
def test_another_solver_finds_the_same(form: str) -> None:
    odrpack = pytest.importorskip("odrpack")
    rng = np.random.default_rng(71)
    u_x, u_y = 0.02 * X + 0.01, np.linspace(0.2, 1.0, 6)
    y = response(*TRUTH[form], X) + u_y * rng.standard_normal(6)
    powers = np.array(FORMS[form])
    fit = fit_distance(X, y, FORMS[form], standard_errors(X, u_x), u_y)
    other = odrpack.odr_fit(
        lambda x, b: (x[:, None] ** powers) @ b,
        X,
        y,
        np.array(TRUTH[form])[powers],
        weight_x=u_x**-2.0,
        weight_y=u_y**-2.0,
        sstol=1e-15,
        partol=1e-14,
        maxit=500,
    )
    assert fit.chi_square == pytest.approx(other.sum_square, rel=1e-9)
    # the minimum of a sum of squares is flat: coefficients agree to the root of what the sums agree to
    np.testing.assert_allclose(fit.coefficients, other.beta, rtol=1e-6)
    # its derivatives are finite differences
    np.testing.assert_allclose(fit.factor @ fit.factor.T, other.cov_beta, rtol=1e-4)
    np.testing.assert_allclose(fit.true_x, X + other.delta, rtol=1e-6)


@pytest.mark.parametrize("form", FORMS)
def test_with_exact_standards_it_is_the_weighted_fit(form: str) -> None:
    rng = np.random.default_rng(72)
    u_y = np.sqrt(X)
    y = response(*TRUTH[form], X) + u_y * rng.standard_normal(6)
    fit = fit_distance(X, y, FORMS[form], np.zeros((6, 0)), u_y)
    plain = fit_curve(X, y, form, "1/x")
    rows = list(FORMS[form])
    np.testing.assert_allclose(fit.coefficients, plain.coefficients[rows], rtol=1e-11)
    # the weighted fit scales by its residuals, this one knows its uncertainties
    scale = fit.mswd
    np.testing.assert_allclose(
        scale * (fit.factor @ fit.factor.T), plain.covariance[np.ix_(rows, rows)], rtol=1e-9
    )


def test_a_parents_error_is_an_error_of_the_slope() -> None:
    # a common relative error of all standards cannot be seen in the points: it moves the slope of a line through zero
    # by itself, and nothing else (points on the line, where the problem is linear)
    y, u_y = 5.0 * X, np.full(6, 0.5)
    own = standard_errors(X, 0.01 * X)
    alone = fit_distance(X, y, (1,), own, u_y)
    shared = fit_distance(X, y, (1,), standard_errors(X, 0.01 * X, ["A"] * 6, [0.02] * 6), u_y)
    assert shared.coefficients[0] == pytest.approx(alone.coefficients[0], rel=1e-9)
    assert max(shared.chi_square, alone.chi_square) < 1e-18
    slope, u_alone = alone.coefficients[0], alone.factor[0, 0]
    assert shared.factor[0, 0] ** 2 == pytest.approx(u_alone**2 + (0.02 * slope) ** 2, rel=1e-9)
    # seen from the certificates alone
    assert np.sum(shared.certificate**2) < shared.factor[0, 0] ** 2
    assert np.sum(shared.certificate**2) > (0.02 * slope) ** 2


def test_a_full_covariance_of_the_responses_is_generalised_least_squares() -> None:
    rng = np.random.default_rng(73)
    root = 0.3 * rng.standard_normal((6, 6)) + np.eye(6)
    covariance = root @ root.T
    y = 2.0 + 5.0 * X + root @ rng.standard_normal(6)
    fit = fit_distance(X, y, (0, 1), np.zeros((6, 0)), covariance)
    design, inverse = np.column_stack((np.ones(6), X)), np.linalg.inv(covariance)
    expected = np.linalg.inv(design.T @ inverse @ design)
    np.testing.assert_allclose(fit.coefficients, expected @ design.T @ inverse @ y, rtol=1e-9)
    np.testing.assert_allclose(fit.factor @ fit.factor.T, expected, rtol=1e-9)


def test_scatter_is_sought_in_the_residuals_where_there_are_no_replicates() -> None:
    rng = np.random.default_rng(74)
    y = draw(rng, "line", 0.0 * X, 1.0)
    curve = fit_curve(X, y, "line", "both", u_x=1e-6 * X)
    assert curve.distance is not None
    # certificates that add 1e-10 of the variance leave the residual variance of the ordinary line
    assert curve.residual_sd == pytest.approx(fit_curve(X, y).residual_sd, rel=1e-7)
    assert curve.distance.chi_square == pytest.approx(4.0, rel=1e-8)
    assert (curve.degrees_of_freedom, curve.scatter_freedom) == (4, pytest.approx(4.0, rel=1e-8))
    # those that add something take it out, and some of what is known of the rest
    stated = fit_curve(X, y, "line", "both", u_x=0.005 * X)
    assert stated.residual_sd < curve.residual_sd
    assert 1.0 <= stated.scatter_freedom < 4.0


def test_scatter_sought_in_the_residuals_is_right_on_average() -> None:
    rng = np.random.default_rng(75)
    u_x = np.full(6, 0.05)  # 0.25 in the response, half of the scatter
    found = [
        fit_curve(X, draw(rng, "line", u_x, 0.5), "line", "both", u_x=u_x).scatter[0] for _ in range(200)
    ]
    # a variance with four degrees of freedom: sqrt(2/4)/sqrt(200) = 5 %; that it is never zero adds some percent
    assert 0.85 * 0.25 < np.mean(found) < 1.3 * 0.25


def test_certificates_that_explain_all_scatter_leave_a_little_to_the_responses() -> None:
    y = 2.0 + 5.0 * X + 1e-3 * np.array([1.0, -1.0, 1.0, -1.0, 1.0, -1.0])
    curve = fit_curve(X, y, "line", "both", u_x=np.full(6, 0.1))
    assert curve.distance is not None
    assert curve.distance.chi_square < 1e-3
    # four components without scatter, each of variance v + e: v = 2 e/4, e = (5 x 0.1)^2
    assert curve.scatter[0] == pytest.approx(0.5 * 0.25, rel=1e-3)


def test_replicates_give_the_scatter_of_the_responses() -> None:
    rng = np.random.default_rng(76)
    x = np.repeat(X, 4)
    y = 2.0 + 5.0 * x + 0.5 * rng.standard_normal(24)
    curve = fit_curve(x, y, "line", "both", u_x=0.01 * x)
    assert curve.degrees_of_freedom == 18
    assert curve.distance is not None
    np.testing.assert_allclose(
        curve.distance.u_y**2,
        curve.scatter[0] + curve.scatter[3] * np.repeat(y.reshape(6, 4).mean(axis=1) ** 2, 4),
    )
    # 18 degrees of freedom: 0.5 to 17 %
    assert curve.residual_sd == pytest.approx(0.5, rel=0.5)


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("weights", ["equal", "1/x", "1/x^2", "replicates", "both"])
def test_covariance_with_certificates_is_the_scatter_of_refitted_curves(form: str, weights: str) -> None:
    # three injections of each standard; certificates as bad as the injections; a parent over the first three
    rng = np.random.default_rng(77)
    x = np.repeat(X, 3)
    u_x, family, u_parent = 0.02 * x, ["A"] * 9 + [""] * 9, np.array([0.02] * 9 + [0.0] * 9)
    errors = standard_errors(x, u_x, family, u_parent)
    scatter = {"1/x": 0.2 * np.sqrt(x), "1/x^2": 0.05 * x}.get(weights, np.full(18, 0.3))
    curves: list[Curve] = []
    for _ in range(200):
        y = response(*TRUTH[form], x + errors @ rng.standard_normal(errors.shape[1]))
        y = y + scatter * rng.standard_normal(18)
        curves.append(fit_curve(x, y, form, weights, u_x=u_x, parent=family, u_parent=u_parent))
    free = np.array(curves[0].free)
    coefficients = np.array([one.coefficients for one in curves])[:, free]
    stated = np.mean([one.covariance for one in curves], axis=0)[np.ix_(free, free)]
    found = np.atleast_2d(np.cov(coefficients.T))
    # a variance of 200 draws is known to 10 %: three of them, and a little for what clipping at the replicates'
    # variance, and weights found from three replicates, add
    ratio = np.diag(found) / np.diag(stated)
    assert (ratio > 0.65).all(), ratio
    assert (ratio < 1.35).all(), ratio


def test_certificates_do_not_count_twice() -> None:
    # without replicates the residuals show the standards' own errors: stating them must not add them again
    rng = np.random.default_rng(78)
    u_x = np.full(6, 0.2)
    stated, silent = [], []
    for _ in range(400):
        y = draw(rng, "line", u_x, 0.2)
        stated.append(fit_curve(X, y, u_x=u_x).covariance[1, 1])
        silent.append(fit_curve(X, y).covariance[1, 1])
    # 4 degrees of freedom, 400 draws: 3.5 %; cutting the scatter off at zero adds some of the rest
    assert 1.0 < np.mean(stated) / np.mean(silent) < 1.5


def test_a_parent_alone_leaves_the_scatter_of_a_line_through_zero_as_it_is() -> None:
    y = 5.0 * X + np.array([1.0, -1.0, 1.0, -1.0, 1.0, -1.0])
    plain = fit_curve(X, y, "line through zero")
    shared = fit_curve(X, y, "line through zero", parent=["A"] * 6, u_parent=[0.02] * 6)
    slope = plain.coefficients[1]
    np.testing.assert_allclose(shared.coefficients, plain.coefficients, rtol=1e-15)
    assert shared.certificate[1, 1] == pytest.approx((0.02 * slope) ** 2, rel=1e-12)
    assert shared.covariance[1, 1] == pytest.approx(plain.covariance[1, 1] + (0.02 * slope) ** 2, rel=1e-12)
    assert shared.scatter[0] == pytest.approx(plain.scatter[0], rel=1e-12)
    assert shared.residual_sd == plain.residual_sd


def test_goodness_of_fit_is_the_largest_weighted_deviation() -> None:
    # exact standards but for the last, which is 1 off with u = 0.1: nearly all of it is taken as its own error
    x = np.array([1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0])
    y = 2.0 * x
    y[-1] += 2.0
    u_x = np.full(8, 0.001)
    u_x[-1] = 0.1
    fit = fit_distance(x, y, (0, 1), standard_errors(x, u_x), np.full(8, 0.01))
    assert fit.goodness == pytest.approx(10.0, rel=0.05)
    assert fit_distance(x, 2.0 * x, (0, 1), standard_errors(x, u_x), np.full(8, 0.01)).goodness < 1e-6


def test_mole_fractions_against_large_areas_converge() -> None:
    rng = np.random.default_rng(79)
    x = np.repeat([20e-6, 100e-6, 500e-6, 2e-3, 1e-2], 3)
    y = (3.0 + 2e9 * x) * (1.0 + 0.01 * rng.standard_normal(15))
    for form in FORMS:
        for u_x in (0.01 * x, 0.1 * x, np.full(15, 1e-6)):
            for points in (slice(None), slice(None, None, 3)):
                curve = fit_curve(x[points], y[points], form, "both", u_x=u_x[points])
                assert math.isfinite(curve.covariance.sum())


def test_standard_without_uncertainty_is_refused() -> None:
    with pytest.raises(ValueError, match=r"every standard; that of x = 0 is 0 \(a zero gas has that"):
        fit_curve([0.0, 1.0, 2.0], [0.1, 1.0, 2.0], "line", "both", u_x=[0.0, 0.1, 0.1])
    with pytest.raises(ValueError, match="that of x = 2 is 0"):
        fit_curve([1.0, 2.0, 3.0], [1.0, 2.0, 3.0], "line", "both", u_x=[0.1, 0.0, 0.1])
    # a parent alone will do
    fit_curve([1.0, 2.0, 3.0], [1.0, 2.1, 3.0], "line", "both", parent=["A"] * 3, u_parent=[0.01] * 3)


def test_response_without_uncertainty_is_refused() -> None:
    with pytest.raises(ValueError, match="every response needs an uncertainty above zero"):
        fit_curve(X, X, "line", "both", u_x=0.1 * X, u_y=np.array([0.0, 1.0, 1.0, 1.0, 1.0, 1.0]))
    with pytest.raises(ValueError, match="with weights both only"):
        fit_curve(X, X, "line", "equal", u_y=np.ones(6))


def test_falling_curve_is_refused_under_both() -> None:
    with pytest.raises(ValueError, match="does not rise over its whole range"):
        fit_curve(X, 10.0 - X, "line", "both", u_x=0.01 * X)


@pytest.mark.parametrize(
    ("x", "y", "form", "message"),
    [
        ([1.0], [1.0], "line", r"1 point\(s\) cannot fix the 2"),
        ([2.0, 2.0, 2.0], [1.0, 2.0, 3.0], "line", "as many different x; there are 1"),
        ([1.0, 2.0, 2.0], [1.0, 2.0, 3.0], "quadratic", "as many different x; there are 2"),
        ([1.0, 2.0, float("nan")], [1.0, 2.0, 3.0], "line", "not a finite number"),
    ],
)
def test_points_that_make_no_curve_are_refused_under_both(
    x: list[float], y: list[float], form: str, message: str
) -> None:
    with pytest.raises(ValueError, match=message):
        fit_curve(x, y, form, "both", u_x=[0.1] * len(x))


def test_as_many_points_as_coefficients_leave_the_certificates_alone() -> None:
    curve = fit_curve([1.0, 3.0], [2.0, 8.0], "line", "both", u_x=[0.01, 0.01])
    np.testing.assert_allclose(curve.coefficients, [-1.0, 3.0, 0.0], rtol=1e-9)
    assert (curve.degrees_of_freedom, curve.residual_sd) == (0, 0.0)
    # slope 3: both responses 0.03 off, the slope by 0.03 sqrt(2)/2
    assert curve.covariance[1, 1] == pytest.approx(2.0 * 0.03**2 / 4.0, rel=1e-4)
