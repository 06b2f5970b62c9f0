"""Drift of curves, against numbers worked by hand and against its own claims by simulation."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.compare.curve_drift import (
    DAYS_PER_MONTH,
    MeanSlope,
    common_stretch,
    drift_rate,
    intercept_shift,
    mean_slope,
    parent_effects,
    slope_ratio,
)
from coulombook.curves.fit import fit_curve

EXACT = 1e-12  # relative; a dozen operations in double precision
WELL_KNOWN = 1e9  # degrees of freedom


def known(slope: float, u: float = 0.0, standards: float = 0.0, freedom: float = WELL_KNOWN) -> MeanSlope:
    return MeanSlope(slope, u, freedom, standards)


# --- slopes


def test_the_mean_slope_of_a_line_is_its_slope_whatever_the_stretch() -> None:
    # x = 1, 2, 3, y = 2, 4, 6.3: slope = ((-1) 2 + 1 * 6.3)/2 = 2.15
    # intercept 4.1 - 4.3 = -0.2; residuals 0.05, -0.1, 0.05; s^2 = 0.015 with 1 degree of freedom
    # u(slope) = sqrt(0.015/2) = 0.0866025
    line = fit_curve([1.0, 2.0, 3.0], [2.0, 4.0, 6.3])
    found = mean_slope(line, 0.0, 50.0)
    assert found.slope == pytest.approx(2.15, rel=EXACT)
    assert found.u_relative == pytest.approx(math.sqrt(0.0075) / 2.15, rel=EXACT)
    assert (found.freedom, found.u_standards) == (1.0, 0.0)


def test_the_mean_slope_of_a_quadratic_is_the_rise_over_the_stretch() -> None:
    x = np.array([0.0, 1.0, 2.0, 3.0])
    curve = fit_curve(x, 1.0 + 5.0 * x - 0.5 * x**2, "quadratic")
    # f(2) = 9, f(1) = 5.5
    assert mean_slope(curve, 1.0, 2.0).slope == pytest.approx(3.5, rel=1e-10)


def test_the_errors_of_the_standards_are_told_from_the_scatter() -> None:
    # one parent of 1 %, a line through zero: the slope is 1 % uncertain by it, the rest is scatter
    x, y = np.array([1.0, 2.0, 3.0]), np.array([2.0, 4.1, 5.9])
    curve = fit_curve(x, y, "line through zero", parent=["P"] * 3, u_parent=[0.01] * 3)
    bare = fit_curve(x, y, "line through zero")
    found = mean_slope(curve, 1.0, 3.0)
    assert found.u_standards == pytest.approx(0.01, rel=1e-9)
    assert found.u_scatter == pytest.approx(mean_slope(bare, 1.0, 3.0).u_scatter, rel=1e-6)


def test_curves_are_compared_where_both_were_calibrated() -> None:
    low, high = fit_curve([1.0, 2.0, 3.0], [1.0, 2.1, 3.0]), fit_curve([2.0, 4.0, 6.0], [1.0, 2.1, 3.0])
    assert common_stretch([low, high]) == (2.0, 3.0)


def test_lines_without_a_common_range_are_compared_all_the_same_but_quadratics_are_not() -> None:
    low, high = fit_curve([1.0, 2.0, 3.0], [1.0, 2.1, 3.0]), fit_curve([4.0, 5.0, 6.0], [1.0, 2.1, 3.0])
    assert common_stretch([low, high]) == (1.0, 6.0)
    bent = fit_curve([4.0, 5.0, 6.0, 7.0], [1.0, 2.1, 3.0, 3.8], "quadratic")
    with pytest.raises(ValueError, match="nothing in common"):
        common_stretch([low, bent])


# --- two dates


def test_a_ratio_of_slopes_by_hand() -> None:
    # 2.0 with 3 % and 1.9 with 4 %: ratio 0.95, u = 0.95 * 5 %; t = ln(0.95)/0.05 = -1.025866
    # two-sided p of the normal distribution 0.30496 (tables: Phi(1.025866) = 0.84752)
    found = slope_ratio(known(2.0, 0.03), known(1.9, 0.04))
    assert found.ratio == pytest.approx(0.95, rel=EXACT)
    assert found.u_ratio == pytest.approx(0.0475, rel=EXACT)
    assert found.log.p == pytest.approx(0.30496, abs=2e-5)
    assert found.significant is False


def test_the_effective_degrees_of_freedom_are_those_of_welch_and_satterthwaite() -> None:
    # scatter 3 % (4 degrees of freedom) and 4 % (9), standards 2 % of the second:
    # u^2 = 9 + 16 + 4 = 29e-4; nu = 29^2/(81/4 + 256/9) = 841/48.6944 = 17.2710
    found = slope_ratio(known(2.0, 0.03, freedom=4), known(1.9, 0.04, 0.02, freedom=9))
    assert found.log.u == pytest.approx(math.sqrt(29e-4), rel=EXACT)
    assert found.log.freedom == pytest.approx(841 / (81 / 4 + 256 / 9), rel=EXACT)


def test_a_parent_cylinder_both_share_is_left_out_of_the_ratio() -> None:
    shared = {("C-7", 0.01): -0.01}
    first, second = MeanSlope(2.0, 0.002, 10, 0.01, shared), MeanSlope(1.96, 0.002, 10, 0.01, shared)
    # (1e-4 + 4e-6) * 2 - 2e-4 = 8e-6
    assert slope_ratio(first, second).log.u == pytest.approx(math.sqrt(8e-6), rel=1e-9)
    assert slope_ratio(first, second).significant
    other = MeanSlope(1.96, 0.002, 10, 0.01, {("C-8", 0.01): -0.01})
    assert slope_ratio(first, other).log.u == pytest.approx(math.sqrt(2.08e-4), rel=1e-9)
    assert slope_ratio(first, other).significant is False


@pytest.mark.parametrize("weights", ["equal", "1/x^2", "both"])
def test_the_effect_of_a_parent_agrees_with_the_covariance_of_the_fit(weights: str) -> None:
    x = np.repeat([1.0, 2.0, 4.0, 8.0], 2)
    y = np.array([2.0, 2.1, 4.1, 4.0, 7.9, 8.1, 16.2, 15.9])
    errors = {"parent": ["A", "A", "A", "A", "B", "B", "B", "B"], "u_parent": np.repeat([0.01, 0.02], 4)}
    curve = fit_curve(x, y, "line", weights, **errors)  # type: ignore[arg-type]
    found = parent_effects(x, y, "line", weights, 1.0, 8.0, **errors)  # type: ignore[arg-type]
    assert set(found) == {("A", 0.01), ("B", 0.02)}
    # the parents are independent, and nothing else is wrong with the standards. The fit drops terms with residuals,
    # of a few per cent here
    u = mean_slope(curve, 1.0, 8.0).u_standards
    assert math.hypot(*found.values()) == pytest.approx(u, rel=0.05)


def test_standards_without_parent_have_no_shared_effect() -> None:
    x, y = [1.0, 2.0, 3.0], [1.0, 2.1, 3.0]
    assert parent_effects(x, y, "line", "equal", 1, 3, parent=["", "", ""], u_parent=[0.0] * 3) == {}


def test_curves_without_scatter_to_judge_by_leave_the_question_open() -> None:
    bare = fit_curve([1.0, 2.0], [1.0, 2.0])
    found = slope_ratio(mean_slope(bare, 1.0, 2.0), known(1.1, 0.01))
    assert found.ratio == pytest.approx(1.1, rel=EXACT)
    assert found.significant is None
    assert slope_ratio(known(1.0), known(1.1)).significant is None


def test_a_slope_that_does_not_rise_is_refused() -> None:
    with pytest.raises(ValueError, match="above zero; one is -1"):
        slope_ratio(known(1.0, 0.1), known(-1.0, 0.1))


def test_intercepts_are_compared_by_their_difference() -> None:
    # y = x, 2x, ... with residuals -1, 2, -1 in 0.1: s^2 = 0.06/1; u^2(a0) = s^2 (1/3 + 4/2) = 0.14
    first = fit_curve([1.0, 2.0, 3.0], [1.0 - 0.1, 2.0 + 0.2, 3.0 - 0.1])
    second = fit_curve([1.0, 2.0, 3.0], [1.4 - 0.1, 2.4 + 0.2, 3.4 - 0.1])
    found = intercept_shift(first, second)
    assert found is not None
    assert found.value == pytest.approx(0.4, rel=1e-9)
    assert found.u == pytest.approx(math.sqrt(0.28), rel=1e-9)
    # equal variances of 1 degree of freedom each: (2 a)^2/(2 a^2) = 2
    assert found.freedom == pytest.approx(2.0, rel=1e-9)
    assert intercept_shift(first, fit_curve([1.0, 2.0], [1.0, 2.0], "line through zero")) is None


# --- over the months


def test_a_drift_over_four_calibrations_by_hand() -> None:
    # ln(slope) = 0, -0.02, -0.05, -0.05 at months 0, 1, 2, 3, each known to 1 %:
    # sum (t - 1.5) ln = -1.5*0 - 0.5*(-0.02) + 0.5*(-0.05) + 1.5*(-0.05) = -0.09; Sxx = 5
    # rate -0.018, u = 0.01/sqrt(5); mean -0.03, start -0.03 + 1.5*0.018 = -0.003
    # residuals 0.003, 0.001, -0.011, 0.007: chi^2 = (9 + 1 + 121 + 49)e-6/1e-4 = 1.8
    slopes = [known(math.exp(one), 0.01) for one in (0.0, -0.02, -0.05, -0.05)]
    found = drift_rate([0, 1, 2, 3], slopes)
    assert found.rate.value == pytest.approx(-0.018, rel=1e-9)
    assert found.u_stated == pytest.approx(0.01 / math.sqrt(5.0), rel=1e-9)
    # by the scatter about the line: sqrt(180e-6/2/5), two degrees of freedom; t = -0.018/0.0042426 = -4.2426
    # p = 1 - |t|/sqrt(2 + t^2) = 0.05132
    assert found.rate.u == pytest.approx(math.sqrt(18e-6), rel=1e-9)
    assert found.rate.p == pytest.approx(1.0 - math.sqrt(18.0 / 20.0), rel=1e-9)
    assert found.start == pytest.approx(-0.003, rel=1e-9)
    assert found.chi_square == pytest.approx(1.8, rel=1e-9)
    assert found.chi_p == pytest.approx(math.exp(-0.9), rel=1e-9)  # two degrees of freedom
    assert found.steady
    assert found.unexplained == 0.0
    assert found.rate.significant is False


def test_better_known_calibrations_weigh_more() -> None:
    # u = 1, 1, 2 %: weights 1, 1, 1/4; t = 0, 1, 2, y = 0, 0, 0.015: mean t = 1.5/2.25 = 2/3
    # Sxx = 4/9 + 1/9 + (16/9)/4 = 1; Sxy = (1/4)(4/3)(0.015) = 0.005; u^2 = 1e-4/1
    # residuals 1, -2, 4 in 1/600: chi^2 = (5 + 16/4)/36 = 1/4, less than its one degree of freedom
    slopes = [known(1.0, 0.01), known(1.0, 0.01), known(math.exp(0.015), 0.02)]
    found = drift_rate([0, 1, 2], slopes)
    assert found.rate.value == pytest.approx(0.005, rel=1e-9)
    assert found.u_stated == pytest.approx(0.01, rel=1e-9)
    assert found.chi_square == pytest.approx(0.25, rel=1e-9)
    assert found.rate.u == pytest.approx(0.01 * 0.5, rel=1e-9)
    assert found.unexplained == 0.0


def test_a_parent_of_all_calibrations_adds_nothing_to_the_rate() -> None:
    shared = {("C-7", 0.05): -0.05}
    slopes = [MeanSlope(math.exp(one), 0.01, WELL_KNOWN, 0.05, shared) for one in (0.0, -0.02, -0.05, -0.05)]
    found = drift_rate([0, 1, 2, 3], slopes)
    assert found.rate.value == pytest.approx(-0.018, rel=1e-6)
    assert found.u_stated == pytest.approx(0.01 / math.sqrt(5.0), rel=1e-6)


def test_two_calibrations_give_the_rate_of_their_ratio() -> None:
    first, second = known(2.0, 0.03, freedom=4), known(1.9, 0.04, 0.02, freedom=9)
    ratio, found = slope_ratio(first, second), drift_rate([1.0, 5.0], [first, second])
    assert found.rate.value == pytest.approx(ratio.log.value / 4.0, rel=1e-9)
    assert found.rate.u == pytest.approx(ratio.log.u / 4.0, rel=1e-9)
    assert found.rate.p == pytest.approx(ratio.log.p, rel=1e-6)
    assert math.isnan(found.chi_p)


def test_the_origin_of_time_and_the_order_do_not_matter() -> None:
    slopes = [known(1.0, 0.01), known(0.97, 0.02), known(0.96, 0.01)]
    one, other = drift_rate([0, 3, 4], slopes), drift_rate([1004, 1000, 1003], [slopes[k] for k in (2, 0, 1)])
    assert other.rate.value == pytest.approx(one.rate.value, rel=1e-9)
    assert other.rate.u == pytest.approx(one.rate.u, rel=1e-9)
    assert other.chi_square == pytest.approx(one.chi_square, rel=1e-6)


def test_calibrations_that_jump_about_are_no_steady_drift() -> None:
    # residuals of +-10 % where 1 % is claimed; then chi^2 = n - 2 fixes the variance between: equal weights, so
    # sum r^2/(u^2 + v) = 2
    values = np.array([0.1, -0.1, -0.1, 0.1])  # orthogonal to the line: residuals themselves
    found = drift_rate([0, 1, 2, 3], [known(math.exp(one), 0.01) for one in values])
    assert not found.steady
    assert found.unexplained**2 == pytest.approx(0.04 / 2.0 - 1e-4, rel=1e-9)
    assert found.rate.u == pytest.approx(math.sqrt(0.02 / 5.0), rel=1e-9)
    assert found.rate.freedom == 2.0
    assert found.rate.significant is False


def test_one_date_gives_no_drift() -> None:
    with pytest.raises(ValueError, match="two different dates"):
        drift_rate([3, 3], [known(1.0, 0.1), known(1.1, 0.1)])


def test_curves_of_unknown_scatter_give_a_rate_without_a_verdict() -> None:
    found = drift_rate([0, 1, 2], [known(1.0, freedom=0), known(1.1, 0.01), known(1.2, 0.01)])
    assert found.rate.value == pytest.approx(0.5 * math.log(1.2), rel=1e-9)
    assert found.rate.significant is None


def test_a_month_is_the_mean_month() -> None:
    assert pytest.approx(365.25) == 12 * DAYS_PER_MONTH


# --- significance means what it says

FITS, DRAWS = 400, 1500


def about_nominal(draws: int) -> float:
    """Four standard deviations of a share of 5 % among so many draws."""
    return 4.0 * math.sqrt(0.05 * 0.95 / draws)


def calibrated(generator: np.random.Generator, form: str, weights: str) -> MeanSlope:
    """The slope of an instrument that does not drift, by a calibration of 2 % scatter, each standard good to 1 %."""
    x = np.repeat([1.0, 3.0, 10.0, 30.0, 100.0], 3)
    certificate = np.repeat(1.0 + 0.01 * generator.standard_normal(5), 3)
    scatter = 1.0 + 0.02 * generator.standard_normal(x.size)
    response = (2.0 * x * certificate + (0.5 if form == "line" else 0.0)) * scatter
    return mean_slope(fit_curve(x, response, form, weights, u_x=0.01 * x), 1.0, 100.0)


def drawn(generator: np.random.Generator, between: float) -> MeanSlope:
    """A slope as twelve degrees of freedom would have it: 1 % scatter, 0.5 % of the standards, ``between`` besides."""
    wrong = generator.standard_normal(3) @ [0.01, 0.005, between]
    u = 0.01 * math.sqrt(generator.chisquare(12) / 12)
    return MeanSlope(2.0 * math.exp(wrong), u, 12.0, 0.005)


@pytest.mark.parametrize(
    ("form", "weights"), [("line", "1/x^2"), ("line through zero", "1/x^2"), ("line through zero", "both")]
)
def test_an_instrument_that_does_not_drift_is_called_drifting_one_time_in_twenty(
    form: str, weights: str
) -> None:
    generator = np.random.default_rng(20430511)
    called = [
        slope_ratio(calibrated(generator, form, weights), calibrated(generator, form, weights)).significant
        for _ in range(FITS)
    ]
    assert np.mean([bool(one) for one in called]) == pytest.approx(0.05, abs=about_nominal(FITS))


@pytest.mark.parametrize("between", [0.0, 0.1])
def test_a_rate_over_five_calibrations_is_significant_by_chance_one_time_in_twenty(between: float) -> None:
    generator = np.random.default_rng(20430512)
    called = [
        drift_rate([0.0, 1.0, 2.5, 6.0, 7.0], [drawn(generator, between) for _ in range(5)]).rate.significant
        for _ in range(DRAWS)
    ]
    assert np.mean([bool(one) for one in called]) == pytest.approx(0.05, abs=about_nominal(DRAWS))


def test_the_stated_uncertainty_of_a_rate_is_the_scatter_of_rates() -> None:
    generator = np.random.default_rng(20430513)
    found = [
        drift_rate([0.0, 1.0, 2.5, 6.0], [drawn(generator, 0.0) for _ in range(4)]) for _ in range(DRAWS)
    ]
    z = np.array([one.rate.value / one.u_stated for one in found])
    # u is itself estimated: Student's t of about forty effective degrees of freedom has the root mean square 1.025;
    # weights of estimated u cost as much again, and the draws tell it to 1.8 %
    assert 0.95 < math.sqrt(float(np.mean(np.square(z)))) < 1.12
