"""Control chart of check injections."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.curves.control import ACTION, IN_CONTROL, WARNING, control_chart
from coulombook.curves.fit import Curve, fit_curve

X = np.array([1.0, 2.0, 3.0, 4.0])
# residuals (1, -1, -1, 1) are orthogonal to 1 and x: slope 10, intercept 5, s^2 = 4/2, Sxx = 5, mean x = 2.5
LINE = fit_curve(X, 5.0 + 10.0 * X + np.array([1.0, -1.0, -1.0, 1.0]))
SD = math.sqrt(2.0 * (1.0 + 0.25))  # of a check at x = 2.5, where f = 30


def rules(scores: list[float]) -> list[tuple[int, str]]:
    chart = control_chart(LINE, [2.5] * len(scores), [30.0 + SD * one for one in scores])
    return [(one.check, one.rule) for one in chart.runs]


def test_limits_are_those_of_a_prediction() -> None:
    chart = control_chart(LINE, [2.5, 4.0], [30.0, 45.0])
    np.testing.assert_allclose(chart.expected, [30.0, 45.0], rtol=1e-13)
    np.testing.assert_allclose(
        chart.standard_deviation, [SD, math.sqrt(2.0 * (1.0 + 0.25 + 1.5**2 / 5.0))], rtol=1e-12
    )
    low, high = chart.limits(3.0)
    assert (low[0], high[0]) == pytest.approx((30.0 - 3.0 * SD, 30.0 + 3.0 * SD), rel=1e-12)


def test_zones_begin_beyond_two_and_three_standard_deviations() -> None:
    chart = control_chart(LINE, [2.5] * 5, [30.0 + SD * one for one in (0.0, 1.9, -2.1, 2.9, -3.1)])
    assert chart.zones == (IN_CONTROL, IN_CONTROL, WARNING, WARNING, ACTION)
    np.testing.assert_allclose(chart.score, [0.0, 1.9, -2.1, 2.9, -3.1], atol=1e-12)


def test_mean_of_repeats_has_narrower_limits_and_an_uncertain_gas_wider_ones() -> None:
    assert control_chart(LINE, [2.5], [30.0], repeats=4).standard_deviation[0] == pytest.approx(
        math.sqrt(2.0 * (0.25 + 0.25)), rel=1e-12
    )
    assert control_chart(LINE, [2.5], [30.0], u_x=[0.3]).standard_deviation[0] == pytest.approx(
        math.hypot(SD, 3.0), rel=1e-12
    )


def test_eight_on_one_side_are_a_run() -> None:
    side = [0.5, 0.3, 0.6, 0.2, 0.4, 0.3, 0.5, 0.1]
    assert rules(side[:-1]) == []
    assert rules([-0.2, *side]) == [(8, "8 checks in a row on one side of the curve")]
    assert rules([*side[:4], -0.1, *side[4:]]) == []


def test_six_rising_or_falling_are_a_run() -> None:
    rising = [-0.9, -0.5, -0.1, 0.2, 0.6, 0.9]
    assert rules(rising[:-1]) == []
    assert rules(rising) == [(5, "6 checks in a row, each above the last")]
    assert rules(rising[::-1]) == [(5, "6 checks in a row, each below the last")]


def test_two_of_three_beyond_one_warning_limit_are_a_run() -> None:
    expected = [(3, "two of three checks beyond the same warning limit")]
    assert rules([0.0, 2.1, 0.3, 2.2]) == expected
    assert rules([0.0, 2.1, 0.3, -2.2]) == []
    assert rules([2.1, 0.0, 0.3, 2.2]) == []


def test_checks_in_control_break_no_rule() -> None:
    assert rules([0.5, -0.3, 0.8, -1.2, 0.1, -0.6, 1.4, -0.2, 0.3]) == []


def test_curve_without_scatter_calls_for_action_at_any_deviation() -> None:
    exact = fit_curve(X, 10.0 * X, "line through zero")
    chart = control_chart(exact, [2.5, 2.5], [25.0, 25.1])
    assert chart.zones == (IN_CONTROL, ACTION)


def test_unknown_scatter_places_no_check() -> None:
    unknown: Curve = fit_curve([1.0, 2.0], [10.0, 20.0])
    chart = control_chart(unknown, [1.5], [99.0])
    assert np.isnan(chart.score).all()
    assert chart.runs == ()


def test_checks_in_control_rarely_leave_the_limits() -> None:
    # a curve with many points, so that its own error does not count: 0.27 % beyond action, 4.6 % beyond warning
    rng = np.random.default_rng(113)
    x = np.linspace(1.0, 10.0, 400)
    curve = fit_curve(x, 5.0 + 10.0 * x + rng.standard_normal(400))
    chart = control_chart(curve, np.full(4000, 5.0), 55.0 + rng.standard_normal(4000))
    score = np.abs(chart.score)
    # 4000 checks know 4.6 % to 0.33 %, the standard deviation of 400 points 4 %, which moves 4.6 % by 0.8 %
    assert 0.03 < np.mean(score > 2.0) < 0.065
    assert np.mean(score > 3.0) < 0.008
