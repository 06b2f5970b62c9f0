"""Verdicts on calibration curves."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.curves.adequacy import FTest, homogeneity, lack_of_fit, mandel, weights_aic
from coulombook.curves.fit import FORMS, fit_curve
from coulombook.curves.judgement import Judgement, judge

X = np.array([1.0, 2.0, 3.0, 4.0])
# residuals (1, -1, -1, 1) are orthogonal to 1 and x; s^2 = 4/2
Y = 5.0 + 10.0 * X + np.array([1.0, -1.0, -1.0, 1.0])
NONE = np.zeros((4, 0))


def verdict(
    x: np.ndarray, y: np.ndarray, form: str = "line", weights: str = "equal", **more: object
) -> Judgement:
    return judge(fit_curve(x, y, form, weights, **more), x, y, **more)  # type: ignore[arg-type]


def test_residuals_and_leverages_worked_by_hand() -> None:
    found = verdict(X, Y)
    np.testing.assert_allclose(found.residual, [1.0, -1.0, -1.0, 1.0], atol=1e-12)
    np.testing.assert_allclose(
        found.standardised, np.array([1.0, -1.0, -1.0, 1.0]) / math.sqrt(2.0), rtol=1e-12
    )
    # 1/n + (x - mean)^2/Sxx with Sxx = 5
    leverage = 0.25 + np.array([2.25, 0.25, 0.25, 2.25]) / 5.0
    np.testing.assert_allclose(found.leverage, leverage, rtol=1e-12)
    internal = found.residual / np.sqrt(2.0 * (1.0 - leverage))
    np.testing.assert_allclose(found.studentised, internal, rtol=1e-12)
    np.testing.assert_allclose(found.deleted, internal / np.sqrt(2.0 - internal**2), rtol=1e-6)


@pytest.mark.parametrize("weights", ["equal", "1/x"])
def test_deleted_residual_is_the_distance_to_the_curve_through_the_others(weights: str) -> None:
    rng = np.random.default_rng(90)
    x = np.array([1.0, 2.0, 4.0, 5.0, 8.0, 9.0, 12.0])
    y = 2.0 + 3.0 * x + rng.standard_normal(7)
    found = verdict(x, y, "line", weights)
    w = np.ones(7) if weights == "equal" else 1.0 / x
    for out in range(7):
        kept = np.arange(7) != out
        root = np.sqrt(w[kept])[:, None]
        design = np.column_stack((np.ones(6), x[kept]))
        b, square, _, _ = np.linalg.lstsq(root * design, root[:, 0] * y[kept], rcond=None)
        s2 = float(square[0]) / 4.0
        row = np.array([1.0, x[out]])
        spread = row @ np.linalg.inv((root * design).T @ (root * design)) @ row
        expected = (y[out] - row @ b) / math.sqrt(s2 * (1.0 / w[out] + spread))
        assert found.deleted[out] == pytest.approx(expected, rel=1e-9)


def test_outlying_standard_is_named() -> None:
    x = np.linspace(1.0, 10.0, 10)
    rng = np.random.default_rng(91)
    y = 2.0 + 3.0 * x + 0.1 * rng.standard_normal(10)
    assert verdict(x, y).outlier is None
    y[6] += 2.0
    found = verdict(x, y)
    assert found.outlier == found.most_outlying == 6
    assert found.outlier_p < 1e-4


def test_outlying_standard_is_named_no_more_often_than_the_level_allows() -> None:
    rng = np.random.default_rng(92)
    x = np.linspace(1.0, 10.0, 8)
    p = [verdict(x, 3.0 * x + rng.standard_normal(8)).outlier_p for _ in range(600)]
    # Bonferroni's bound is close to exact for the largest of eight; 600 draws know 5 % to 0.9 %
    assert 0.025 < np.mean(np.array(p) < 0.05) < 0.075


def test_lack_of_fit_worked_by_hand() -> None:
    # levels 1, 2, 3 with means 1, 3, 2 and replicates +-0.5: line through the means 1 + 0.5 x, deviations of the means
    # -0.5, 1, -0.5; SS(lack) = 2 (0.25 + 1 + 0.25) = 3 with 1 degree of freedom; SS(pure) = 6 x 0.25 = 1.5 with 3
    x = np.repeat([1.0, 2.0, 3.0], 2)
    y = np.repeat([1.0, 3.0, 2.0], 2) + np.tile([0.5, -0.5], 3)
    found = lack_of_fit(x, y, (0, 1), np.ones(6), np.zeros((6, 0)))
    assert isinstance(found, FTest)
    assert (found.value, found.upper, found.lower) == (pytest.approx(6.0, rel=1e-12), 1, 3)
    # F(1, 3) is the square of t with 3 degrees of freedom: p = 1 - (2/pi) (atan(u) + u/(1 + u^2)), u = sqrt(6/3)
    u = math.sqrt(2.0)
    assert found.p == pytest.approx(1.0 - 2.0 / math.pi * (math.atan(u) + u / (1.0 + u * u)), rel=1e-12)


def test_weighted_lack_of_fit_splits_the_weighted_sum_of_squares() -> None:
    rng = np.random.default_rng(93)
    x = np.repeat([1.0, 2.0, 5.0, 9.0], [2, 3, 1, 4])
    y = 2.0 + 3.0 * x + x * rng.standard_normal(10)
    w = x**-2.0
    curve = fit_curve(x, y, "line", "1/x^2")
    total = curve.residual_sd**2 / np.mean(w) ** -1 * 8.0
    mean = np.array([y[x == one].mean() for one in x])
    pure = float(w @ np.square(y - mean))
    expected = ((total - pure) / 2.0) / (pure / 6.0)
    found = judge(curve, x, y).lack_of_fit
    assert found is not None
    assert (found.value, found.upper, found.lower) == (pytest.approx(expected, rel=1e-9), 2, 6)


def test_error_of_a_standard_is_no_lack_of_fit() -> None:
    # one standard is 3 % off, its injections agree to 0.1 %
    rng = np.random.default_rng(94)
    x = np.repeat([1.0, 2.0, 4.0, 6.0, 8.0], 3)
    y = 10.0 * x * (1.0 + 0.001 * rng.standard_normal(15))
    y[6:9] *= 1.03
    silent = verdict(x, y, "line", "1/x^2")
    assert silent.lack_of_fit is not None
    assert silent.lack_of_fit.p < 1e-6
    assert not silent.fits
    for weights in ("1/x^2", "both"):
        stated = verdict(x, y, "line", weights, u_x=0.02 * x)
        assert stated.lack_of_fit is not None
        assert stated.lack_of_fit.p > 0.05
        assert stated.fits


def test_mandel_worked_by_hand() -> None:
    # the square contrast of four points is (1, -1, -1, 1): all residual is curvature; the cubic one adds 0.1^2 x 20
    y = Y + 0.1 * np.array([-1.0, 3.0, -3.0, 1.0])
    found = mandel(X, y, (0, 1), np.eye(4))
    assert found is not None
    # line: SS1 = 4 + 0.2 less the cubic's share in the slope, none as contrasts are orthogonal; SS2 = 0.2 with 1
    assert (found.value, found.upper, found.lower) == (pytest.approx(4.0 / 0.2, rel=1e-9), 1, 1)


def test_mandel_of_a_quadratic_asks_whether_its_square_term_is_needed() -> None:
    rng = np.random.default_rng(95)
    x = np.linspace(1.0, 10.0, 12)
    y = 2.0 + 3.0 * x + 0.05 * rng.standard_normal(12)
    assert not verdict(x, y, "quadratic").bends
    of_line, of_quadratic = (verdict(x, y, form).mandel for form in ("line", "quadratic"))
    assert of_line is not None
    assert of_quadratic is not None
    # the two scale the scatter differently, which the ratio does not see but for rounding
    assert of_line.value == pytest.approx(of_quadratic.value, rel=1e-11)
    bent = y + 0.05 * x**2
    assert verdict(x, bent, "quadratic").bends
    assert verdict(x, bent, "line").bends


def test_mandel_of_a_line_through_zero_stays_at_zero() -> None:
    # y = 10 x + a blank of 5: a square term through zero helps, as an intercept would, but is not needed for 10 x
    x = np.linspace(1.0, 10.0, 12)
    noise = 0.05 * np.random.default_rng(96).standard_normal(12)
    assert not verdict(x, 10.0 * x + noise, "line through zero").bends
    found = verdict(x, 10.0 * x + 0.2 * x**2 + noise, "line through zero")
    assert found.bends
    assert found.mandel is not None
    assert (found.mandel.upper, found.mandel.lower) == (1, 10)


def test_bartlett_worked_by_hand() -> None:
    # variances 1 and 4 with 2 degrees of freedom each: pooled 2.5
    # [4 ln 2.5 - 2 ln 1 - 2 ln 4] / [1 + (1/2 + 1/2 - 1/4)/3]
    x = np.repeat([1.0, 2.0], 3)
    y = np.array([1.0, 2.0, 3.0, 8.0, 10.0, 12.0])
    found = homogeneity(x, y, np.ones(6), np.zeros(6))
    assert found is not None
    assert found.method == "Bartlett"
    assert found.value == pytest.approx((4.0 * math.log(2.5) - 2.0 * math.log(4.0)) / 1.25, rel=1e-12)
    # with one degree of freedom p = erfc(sqrt(value/2))
    assert found.p == pytest.approx(math.erfc(math.sqrt(found.value / 2.0)), rel=1e-10)


def test_scatter_without_replicates_is_judged_by_ranks() -> None:
    x = np.array([1.0, 2.0, 3.0, 4.0, 5.0, 6.0])
    # ranks of |residual| run against x but for one swap: rho = 1 - 6 x 2/(6 x 35)
    found = homogeneity(x, x, np.ones(6), np.array([0.1, -0.3, 0.2, -0.4, 0.5, 0.6]))
    assert found is not None
    assert found.method == "rank correlation"
    assert found.value == pytest.approx(1.0 - 12.0 / 210.0, rel=1e-12)
    even = homogeneity(x, x, np.ones(6), np.array([0.4, -0.3, 0.6, -0.1, 0.5, 0.2]))
    assert even is not None
    assert even.p > 0.3


def test_level_of_equal_replicates_leaves_bartlett_to_the_ranks() -> None:
    x = np.repeat([1.0, 2.0, 3.0], 2)
    found = homogeneity(
        x, np.array([1.0, 1.0, 2.0, 2.1, 3.0, 3.2]), np.ones(6), np.array([1.0, 2, 3, 4, 5, 6])
    )
    assert found is not None
    assert found.method == "rank correlation"


@pytest.mark.parametrize(("power", "expected"), [(0.0, "equal"), (0.5, "1/x"), (1.0, "1/x^2")])
def test_weights_are_suggested_that_the_scatter_was_drawn_with(power: float, expected: str) -> None:
    rng = np.random.default_rng(97)
    x = np.repeat(np.geomspace(1.0, 100.0, 8), 5)
    y = 5.0 * x + x**power * rng.standard_normal(40)
    aic = weights_aic(x, y, (0, 1))
    assert min(aic, key=lambda one: aic[one]) == expected
    for weights in ("equal", "1/x", "1/x^2"):
        found = verdict(x, y, "line", weights)
        assert found.suggested_weights == (None if weights == expected else expected)
        assert found.even_scatter == (weights == expected)


def test_scatter_that_grows_from_a_blank_suggests_replicates() -> None:
    rng = np.random.default_rng(98)
    x = np.repeat([0.0, 1.0, 10.0, 100.0], 5)
    y = 5.0 * x + (0.1 + 0.05 * 5.0 * x) * rng.standard_normal(20)
    assert verdict(x, y).suggested_weights == "replicates"
    assert verdict(x, y, "line", "replicates").suggested_weights is None


def test_goodness_and_chi_square_belong_to_errors_in_both() -> None:
    rng = np.random.default_rng(99)
    x = np.repeat([1.0, 2.0, 4.0, 6.0, 8.0], 3)
    y = 10.0 * x * (1.0 + 0.01 * rng.standard_normal(15))
    found = verdict(x, y, "line", "both", u_x=0.01 * x)
    assert found.goodness is not None
    assert found.goodness < 2.0
    assert found.chi_square_p is not None
    assert found.chi_square_p > 0.01
    assert found.fits
    y[6:9] *= 1.1
    found = verdict(x, y, "line", "both", u_x=0.01 * x)
    assert found.goodness is not None
    assert found.goodness > 2.0
    assert not found.fits
    plain = verdict(x, y)
    assert plain.goodness is None
    assert plain.chi_square_p is None


def test_slope_that_may_vanish_does_not_rise_for_certain() -> None:
    x = np.array([1.0, 2.0, 3.0, 4.0, 5.0, 6.0])
    noise = 0.2 * np.array([1.0, -1.0, 1.0, -1.0, 1.0, -1.0])
    assert verdict(x, 5.0 * x + noise).rises
    assert not verdict(x, 0.1 * x + noise).rises
    flat = verdict(x, 12.3 * x - x**2 + noise, "quadratic")
    assert flat.least_slope == pytest.approx(0.3, abs=0.3)
    assert not flat.rises


@pytest.mark.parametrize("form", FORMS)
def test_points_on_the_curve_have_nothing_to_test(form: str) -> None:
    x = np.array([1.0, 1.0, 2.0, 3.0, 4.0])
    found = verdict(x, 2.0 * x, form)
    assert found.lack_of_fit is None
    assert found.mandel is None
    assert found.outlier is None
    assert found.homogeneity is None
    assert found.suggested_weights is None
    assert not found.studentised.any()
    assert found.fits
    assert found.rises


@pytest.mark.parametrize(("form", "points"), [("line", 2), ("line through zero", 1), ("quadratic", 3)])
def test_as_many_points_as_coefficients_tell_nothing(form: str, points: int) -> None:
    found = verdict(X[:points], 2.0 * X[:points], form)
    assert found.outlier is None
    assert found.most_outlying is None
    assert np.isnan(found.deleted).all()
    np.testing.assert_allclose(found.leverage, 1.0, rtol=1e-12)
    assert (found.lack_of_fit, found.mandel, found.homogeneity) == (None, None, None)


def test_single_point_that_holds_the_curve_alone_is_not_judged() -> None:
    # without the last standard the slope is unknown
    x = np.array([1.0, 1.0, 1.0, 1.0, 9.0])
    found = verdict(x, np.array([1.0, 1.2, 0.9, 1.1, 9.0]))
    assert np.isnan(found.deleted[-1])
    assert np.isfinite(found.deleted[:-1]).all()
    assert found.leverage[-1] == pytest.approx(1.0, rel=1e-12)
