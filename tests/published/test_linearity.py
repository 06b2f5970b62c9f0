"""Mandel's test of a calibration line against a quadratic.

ISO 8466-1:1990 and 2021, DIN 38402-51; Mandel, The Statistical Analysis of Experimental Data (1964). Data: fluorescein
of Miller & Miller, Statistics and Chemometrics for Analytical Chemistry, chapter 5; the numbers are this project's own.
"""

from __future__ import annotations

import math

import pytest
from tests.published.reference import case

from coulombook.curves.fit import fit_curve
from coulombook.curves.judgement import judge


@pytest.mark.parametrize(("name", "bends"), [("mandel_fluorescein11", True), ("mandel_fluorescein7", False)])
def test_line_is_rejected_for_the_long_range_and_kept_for_the_short(name: str, bends: bool) -> None:
    data = case(name)
    x, y = data.inputs["x"], data.inputs["y"]
    line, quadratic = (fit_curve(x, y, form) for form in ("line", "quadratic"))
    verdict = judge(line, x, y)
    assert verdict.mandel is not None
    data.expected["test_value"].check(verdict.mandel.value)
    data.expected["f99"].check(verdict.mandel.critical(0.99))
    n = len(x)
    ds2 = (n - 2) * line.residual_sd**2 - (n - 3) * quadratic.residual_sd**2
    # a difference of sums of squares loses a digit or two
    assert math.isclose(ds2, data.expected["ds2"].recomputed or 0.0, rel_tol=1e-8)
    assert verdict.bends == bends
    data.expected["r_linear"].check(math.sqrt(line.r_squared))
