"""Decision, detection and quantification limits."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.curves.fit import FORMS, Curve, fit_curve
from coulombook.curves.limits import SCHEMES, Limits, blank_decision_limit, limits
from coulombook.curves.prediction import curve_response

X = np.array([1.0, 2.0, 3.0, 4.0])
# residuals (1, -1, -1, 1) are orthogonal to 1 and x: slope 10, intercept 5, s^2 = 4/2, Sxx = 5, mean x = 2.5
LINE = fit_curve(X, 5.0 + 10.0 * X + np.array([1.0, -1.0, -1.0, 1.0]))
# Student's t with 2 degrees of freedom, in closed form
T95, T975 = 0.9 / math.sqrt(2.0 * 0.95 * 0.05), 0.95 / math.sqrt(2.0 * 0.975 * 0.025)


def test_decision_limit_worked_by_hand() -> None:
    expected = T95 * math.sqrt(2.0) / 10.0 * math.sqrt(1.0 + 1.0 / 4.0 + 2.5**2 / 5.0)
    for scheme in ("ISO 11843-2", "DIN 32645", "Hubaux-Vos"):
        assert limits(LINE, scheme).decision == pytest.approx(expected, rel=1e-12)


def test_repeats_lower_the_limits() -> None:
    expected = T95 * math.sqrt(2.0) / 10.0 * math.sqrt(1.0 / 4.0 + 1.0 / 4.0 + 2.5**2 / 5.0)
    assert limits(LINE, repeats=4).decision == pytest.approx(expected, rel=1e-12)
    assert limits(LINE, repeats=4).detection < limits(LINE).detection


def test_detection_by_din_is_twice_the_decision() -> None:
    found = limits(LINE, "DIN 32645")
    assert found.detection == pytest.approx(2.0 * found.decision, rel=1e-15)


def test_detection_by_hubaux_and_vos_is_where_the_lower_band_reaches_the_decision() -> None:
    found = limits(LINE, "Hubaux-Vos")
    x = found.detection
    lower = 10.0 * x - T95 * math.sqrt(2.0 * (1.0 + 1.0 / 4.0 + (x - 2.5) ** 2 / 5.0))
    assert lower == pytest.approx(10.0 * found.decision, rel=1e-10)


def test_quantification_is_where_the_half_width_is_a_third() -> None:
    x = limits(LINE).quantification
    half_width = T975 * math.sqrt(2.0) / 10.0 * math.sqrt(1.0 + 1.0 / 4.0 + (x - 2.5) ** 2 / 5.0)
    assert half_width == pytest.approx(x / 3.0, rel=1e-10)


def test_ich_limits_are_multiples_of_the_residual_sd_over_the_slope() -> None:
    found = limits(LINE, "ICH residual")
    unit = math.sqrt(2.0) / 10.0
    assert (found.decision, found.detection, found.quantification) == pytest.approx(
        (1.65 * unit, 3.3 * unit, 10.0 * unit), rel=1e-12
    )


def test_ich_limits_from_blanks() -> None:
    # blanks 1, 2, 3: s = 1
    found = limits(LINE, "ICH blank", blank_responses=[1.0, 2.0, 3.0])
    assert (found.detection, found.quantification) == pytest.approx((0.33, 1.0), rel=1e-12)


def test_decision_from_blanks_worked_by_hand() -> None:
    # s = 1, n = 3, t(0.95; 2)
    expected = T95 * math.sqrt(1.0 + 1.0 / 3.0) / 10.0
    assert blank_decision_limit([1.0, 2.0, 3.0], 10.0, 0.05) == pytest.approx(expected, rel=1e-12)
    found = limits(LINE, "DIN 32645 blank", blank_responses=[1.0, 2.0, 3.0])
    assert (found.decision, found.detection) == pytest.approx((expected, 2.0 * expected), rel=1e-12)


def _curves() -> list[Curve]:
    rng = np.random.default_rng(80)
    x = np.repeat([0.5, 1.0, 2.0, 5.0, 10.0], 3)
    truth = {"line": (1.0, 10.0, 0.0), "line through zero": (0.0, 10.0, 0.0), "quadratic": (1.0, 10.0, -0.2)}
    scatter = {
        "equal": np.full(15, 0.5),
        "1/x": 0.5 * np.sqrt(x),
        "1/x^2": 0.5 * x,
        "replicates": 0.2 + 0.05 * x,
    }
    return [
        fit_curve(x, a0 + a1 * x + a2 * x**2 + sd * rng.standard_normal(15), form, weights)
        for form, (a0, a1, a2) in truth.items()
        for weights, sd in scatter.items()
    ]


@pytest.mark.parametrize("scheme", SCHEMES)
def test_limits_stand_in_their_order_for_every_form_and_weighting(scheme: str) -> None:
    for curve in _curves():
        found = limits(curve, scheme, blank_responses=[0.9, 1.0, 1.2, 0.7])
        assert 0.0 < found.decision < found.detection, (curve.form, curve.weights)
        assert found.quantification > found.decision, (curve.form, curve.weights)


def test_detection_by_iso_lies_a_little_below_twice_the_decision() -> None:
    # the noncentral t is the exact answer to which 2 t is the approximation (ISO 11843-2: "for more than four degrees
    # of freedom a good one"; from memory)
    for curve in _curves():
        if curve.weights == "equal":
            found = limits(curve)
            assert 0.97 < found.detection / (2.0 * found.decision) < 1.01, (curve.form, curve.weights)


def test_curve_through_zero_has_no_uncertainty_of_its_own_at_zero() -> None:
    curve = fit_curve(X, 10.0 * X + np.array([1.0, -1.0, -1.0, 1.0]), "line through zero")
    t = 2.3533634348018264  # t(0.95; 3)
    sd = curve.residual_sd
    assert limits(curve).decision == pytest.approx(t * sd / curve.coefficients[1], rel=1e-12)


def test_scatter_that_grows_with_x_is_held_below_the_lowest_standard() -> None:
    y = 10.0 * X + np.array([1.0, -1.0, -1.0, 1.0])
    curve = fit_curve(X, y, "line through zero", "1/x^2")
    s2 = curve.residual_sd**2 * np.mean(1.0 / X**2) * X[0] ** 2
    t = 2.3533634348018264
    assert limits(curve).decision == pytest.approx(t * math.sqrt(s2) / curve.coefficients[1], rel=1e-12)


@pytest.mark.parametrize("scheme", SCHEMES)
@pytest.mark.parametrize("form", FORMS)
def test_without_scatter_every_limit_is_zero(scheme: str, form: str) -> None:
    x = np.array([0.0, 1.0, 2.0, 3.0, 4.0])
    found = limits(fit_curve(x, 2.0 * x, form), scheme, blank_responses=[0.0, 0.0, 0.0])
    # 2 x fits to the rounding of the solver; a limit of 1e-14 on a range of 4 is none
    assert np.allclose((found.decision, found.detection, found.quantification), 0.0, atol=1e-13)


def test_unknown_scatter_gives_no_limits() -> None:
    found = limits(fit_curve([1.0, 2.0], [1.0, 2.0]))
    assert isinstance(found, Limits)
    assert all(math.isnan(one) for one in (found.decision, found.detection, found.quantification))


def test_curve_that_falls_at_zero_gives_no_limits() -> None:
    # rises over its range from 2 to 6 but has its lowest point at 1
    x = np.array([2.0, 3.0, 4.0, 5.0, 6.0])
    y = (x - 1.0) ** 2 + 0.1 * np.array([1.0, -1.0, 0.0, 1.0, -1.0])
    assert math.isnan(limits(fit_curve(x, y, "quadratic")).decision)


def test_limit_beyond_the_turning_point_is_infinite() -> None:
    # turns at x = 5; residuals orthogonal to 1, x and x^2, so large that the band does not clear the decision before
    x = np.array([0.0, 1.0, 2.0, 3.0, 4.0])
    curve = fit_curve(x, 10.0 * x - x**2 + 2.0 * np.array([-1.0, 2.0, 0.0, -2.0, 1.0]), "quadratic")
    found = limits(curve, "Hubaux-Vos")
    assert math.isinf(found.detection)
    assert math.isinf(found.quantification)


def test_threshold_is_passed_by_few_blanks_and_missed_by_few_at_detection() -> None:
    # simulated with the curve refitted each time; 4000 days know 5 % to 0.34 %: three of them
    rng = np.random.default_rng(81)
    x = np.repeat([1.0, 2.0, 4.0, 6.0, 8.0, 10.0], 2)
    truth = fit_curve(x, 3.0 + 5.0 * x + 0.4 * rng.standard_normal(12))
    slope, intercept, sd = 5.0, 3.0, 0.4
    design = np.column_stack((np.ones(12), x))
    hat = np.linalg.pinv(design)
    y = intercept + slope * x + sd * rng.standard_normal((4000, 12))
    b = y @ hat.T
    s = np.sqrt(np.sum((y - b @ design.T) ** 2, axis=1) / 10.0)
    # limits scale with s and 1/slope: those of one curve serve all
    one = limits(truth)
    reading = one.decision * truth.coefficients[1] / truth.residual_sd
    threshold = b[:, 0] + reading * s
    false = np.mean(intercept + sd * rng.standard_normal(4000) > threshold)
    assert 0.04 < false < 0.06
    # the amount detection promises, at the true scatter
    x_detection = one.detection * truth.coefficients[1] / truth.residual_sd * sd / slope
    missed = np.mean(intercept + slope * x_detection + sd * rng.standard_normal(4000) <= threshold)
    assert 0.04 < missed < 0.06


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"scheme": "ISO"}, "limits 'ISO' are not available; choose from ISO 11843-2, DIN 32645"),
        ({"alpha": 0.6}, "must lie between 0 and 0.5"),
        ({"beta": 0.0}, "must lie between 0 and 0.5"),
        ({"repeats": 0}, "one reading at least"),
        ({"scheme": "ICH blank"}, r"at least 3 standards of x = 0 \(blanks\); there are 0"),
        ({"scheme": "ICH blank", "blank_responses": [1.0, 2.0]}, "there are 2"),
    ],
)
def test_limits_that_cannot_be_had_are_refused(arguments: dict[str, object], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        limits(LINE, **arguments)  # type: ignore[arg-type]


def test_response_at_the_decision_limit_of_a_quadratic_is_the_threshold() -> None:
    x = np.array([0.0, 1.0, 2.0, 4.0, 6.0, 8.0])
    y = 1.0 + 5.0 * x - 0.1 * x**2 + 0.2 * np.array([1.0, -1.0, 1.0, -1.0, 1.0, -1.0])
    curve = fit_curve(x, y, "quadratic")
    found = limits(curve)
    t = 2.3533634348018264  # t(0.95; 3)
    threshold = curve.coefficients[0] + t * math.sqrt(curve.residual_sd**2 + curve.covariance[0, 0])
    assert float(curve_response(curve, found.decision)) == pytest.approx(threshold, rel=1e-12)
