"""Readings on a calibration line, with their standard deviation and confidence limits.

Fluorescein and silver by standard addition of Miller & Miller, Statistics and Chemometrics for Analytical Chemistry,
chapter 5 (printed results from memory; they follow from the data), Fieller's limits (J. R. Stat. Soc. B 16 (1954)
175) of the same data, this project's own evaluation.
"""

from __future__ import annotations

import math

import pytest
from tests.published.reference import case

from coulombook.curves.fit import fit_curve
from coulombook.curves.interval import inverse_with_uncertainty
from coulombook.curves.quantiles import student_quantile


def test_fluorescein_readings() -> None:
    data = case("mm_fluorescein")
    curve = fit_curve(data.inputs["x"], data.inputs["y"])
    t = float(student_quantile(0.975, curve.degrees_of_freedom))
    data.expected["t95"].check(t)
    data.expected["ci95_slope"].check(t * math.sqrt(curve.covariance[1, 1]))
    data.expected["ci95_intercept"].check(t * math.sqrt(curve.covariance[0, 0]))
    data.expected["fieller_g"].check(t**2 * curve.covariance[1, 1] / curve.coefficients[1] ** 2)
    for y0, name in zip(data.inputs["y0"], "abc", strict=True):
        one, four = (inverse_with_uncertainty(curve, y0, repeats) for repeats in (1, 4))
        data.expected[f"x0_{name}"].check(float(one.x))
        data.expected[f"s_x0_{name}"].check(float(one.u))
        data.expected[f"s_x0_m4_{name}"].check(float(four.u))
        data.expected[f"ci95_x0_{name}"].check(t * float(one.u))
        data.expected[f"fieller_lo_{name}"].check(float(one.low))
        data.expected[f"fieller_hi_{name}"].check(float(one.high))


def test_standard_addition_is_the_reading_of_zero() -> None:
    data = case("mm_standard_addition")
    curve = fit_curve(data.inputs["x"], data.inputs["y"])
    # zero is no measured response: it has no scatter of its own
    found = inverse_with_uncertainty(curve, 0.0, u_y=0.0)
    data.expected["slope"].check(float(curve.coefficients[1]))
    data.expected["intercept"].check(float(curve.coefficients[0]))
    data.expected["s_yx"].check(curve.residual_sd)
    data.expected["x_e"].check(-float(found.x))
    data.expected["s_xe"].check(float(found.u))
    data.expected["ci95"].check(float(student_quantile(0.975, curve.degrees_of_freedom)) * float(found.u))


def test_weighted_line_reads_low_signals_closer_than_an_unweighted_one() -> None:
    # the printed limits of the weighted line rest on weights of the unknowns guessed by hand and cannot be had again;
    # what they show is that the low reading is known far better than from the unweighted line, the high one less well
    data = case("mm_weighted")
    x, y, s = (data.inputs[name] for name in ("x", "y", "s"))
    plain = fit_curve(x, y)
    weighted = fit_curve(x, y, "line", "both", u_x=[1e-9] * 6, u_y=s)
    data.expected["slope_w"].check(float(weighted.coefficients[1]))
    data.expected["intercept_w"].check(float(weighted.coefficients[0]))
    for y0, name in zip(data.inputs["y0"], "ab", strict=True):
        data.expected[f"x0_w_{name}"].check(float(inverse_with_uncertainty(weighted, y0).x))
        data.expected[f"x0_u_{name}"].check(float(inverse_with_uncertainty(plain, y0).x))
    low, high = (
        [float(inverse_with_uncertainty(curve, y0).u) for curve in (weighted, plain)]
        for y0 in data.inputs["y0"]
    )
    assert low[0] < 0.5 * low[1]
    assert high[0] > high[1]
    assert weighted.residual_sd == pytest.approx(sum(one**-2.0 / 6.0 for one in s) ** -0.5, rel=1e-12)
