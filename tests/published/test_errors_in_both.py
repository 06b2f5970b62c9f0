"""Lines with errors in both variables: Pearson's points with York's weights, and Pearson's own line.

York, Can. J. Phys. 44 (1966) 1079; York, Evensen, Martinez & De Basabe Delgado, Am. J. Phys. 72 (2004) 367;
Pearson, Phil. Mag. (6) 2 (1901) 559. The numbers of the last are from memory and agree with what the points give.
"""

from __future__ import annotations

import math

import numpy as np
from tests.published.reference import case

from coulombook.curves.both import fit_distance
from coulombook.curves.certificates import standard_errors


def test_line_through_pearsons_points_with_yorks_weights() -> None:
    data = case("york_pearson")
    x, y, wx, wy = (np.array(data.inputs[name], dtype=float) for name in ("x", "y", "wx", "wy"))
    fit = fit_distance(x, y, (0, 1), standard_errors(x, wx**-0.5), wy**-0.5)
    u_intercept, u_slope = np.linalg.norm(fit.factor, axis=1)
    found = {
        "intercept": fit.coefficients[0],
        "slope": fit.coefficients[1],
        "u_intercept": u_intercept,
        "u_slope": u_slope,
        "chi2": fit.chi_square,
        "mswd": fit.mswd,
        "u_intercept_scaled": u_intercept * math.sqrt(fit.mswd),
        "u_slope_scaled": u_slope * math.sqrt(fit.mswd),
    }
    assert set(found) == set(data.expected)
    for name, value in found.items():
        data.expected[name].check(float(value))


def test_line_with_equal_errors_of_both_is_pearsons_orthogonal_line() -> None:
    data = case("orthogonal_pearson")
    x, y = (np.array(data.inputs[name], dtype=float) for name in ("x", "y"))
    one = np.ones_like(x)
    fit = fit_distance(x, y, (0, 1), standard_errors(x, one), one)
    data.expected["slope"].check(float(fit.coefficients[1]))
    data.expected["intercept"].check(float(fit.coefficients[0]))
