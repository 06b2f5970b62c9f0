"""Worked calibration lines of Miller & Miller, Statistics and Chemometrics for Analytical Chemistry, chapter 5.

Fluorescein (pg/mL against fluorescence intensity) and the weighted line of absorbances with its weights
1/s^2; the printed results are from memory and agree with what follows from the data. Mandel's fluorescein
with 11 points is this project's own evaluation of the same data.
"""

from __future__ import annotations

import math

import numpy as np
from tests.published.reference import case

from coulombook.curves.fit import fit_curve, fit_polynomial
from coulombook.curves.inverse import invert


def test_fluorescein_line_and_its_standard_deviations() -> None:
    data = case("mm_fluorescein")
    curve = fit_curve(data.inputs["x"], data.inputs["y"])
    data.expected["slope"].check(float(curve.coefficients[1]))
    data.expected["intercept"].check(float(curve.coefficients[0]))
    data.expected["r"].check(math.sqrt(curve.r_squared))
    data.expected["s_yx"].check(curve.residual_sd)
    data.expected["s_slope"].check(math.sqrt(curve.covariance[1, 1]))
    data.expected["s_intercept"].check(math.sqrt(curve.covariance[0, 0]))


def test_fluorescein_readings_are_inverted_with_their_standard_deviation() -> None:
    data = case("mm_fluorescein")
    curve = fit_curve(data.inputs["x"], data.inputs["y"])
    a0, a1, a2 = curve.coefficients
    for y0, name in zip(data.inputs["y0"], "abc", strict=True):
        x0 = float(invert(a0, a1, a2, y0))
        data.expected[f"x0_{name}"].check(x0)
        # law of propagation with the curve's own covariance: dx/da0 = -1/b, dx/da1 = -x/b, and s/b for the
        # reading
        slope = np.array([-1.0, -x0, 0.0]) / a1
        for replicates, suffix in ((1, ""), (4, "_m4")):
            variance = slope @ curve.covariance @ slope + curve.residual_sd**2 / replicates / a1**2
            data.expected[f"s_x0{suffix}_{name}"].check(math.sqrt(variance))


def test_weighted_line_has_the_printed_coefficients() -> None:
    data = case("mm_weighted")
    x, y, s = (np.array(data.inputs[name]) for name in ("x", "y", "s"))
    weights = s**-2 / np.mean(s**-2)
    for index, weight in enumerate(weights):
        data.expected[f"w{index}"].check(float(weight))
    fit = fit_polynomial(x, y, (0, 1), s**-2.0)
    data.expected["slope_w"].check(float(fit.coefficients[1]))
    data.expected["intercept_w"].check(float(fit.coefficients[0]))
    data.expected["s_yx_w"].check(fit.residual_sd)
    plain = fit_curve(x, y)
    data.expected["slope_u"].check(float(plain.coefficients[1]))
    data.expected["intercept_u"].check(float(plain.coefficients[0]))
    for y0, name in zip(data.inputs["y0"], "ab", strict=True):
        data.expected[f"x0_w_{name}"].check(float(invert(*fit.coefficients, 0.0, y0)))
        data.expected[f"x0_u_{name}"].check(float(invert(*plain.coefficients, y0)))


def test_bent_fluorescein_is_a_quadratic() -> None:
    data = case("mandel_fluorescein11")
    fit = fit_curve(data.inputs["x"], data.inputs["y"], "quadratic")
    for power in range(3):
        data.expected[f"c{power}"].check(float(fit.coefficients[power]))
    data.expected["s_yx_quadratic"].check(fit.residual_sd)
    data.expected["r2_quadratic"].check(fit.r_squared)
    data.expected["s_yx_linear"].check(fit_curve(data.inputs["x"], data.inputs["y"]).residual_sd)
