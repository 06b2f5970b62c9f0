"""Certified linear regressions of the NIST/ITL Statistical Reference Datasets (public domain).

Norris, NoInt1, NoInt2, Pontius, Wampler1 to Wampler5; the latter from Wampler, J. Am. Stat. Assoc. 65 (1970) 549.
Certified by NIST to 15 digits from multiple-precision arithmetic; the tolerances ask for 12 digits of every
number. The logarithm of the relative error, at most 15 for a number printed with 15 digits, is on x86-64 at the
least

    Norris 13.9, NoInt1 14.7, NoInt2 14.9, Pontius 13.5, Wampler1 16, Wampler2 13.2, Wampler4 14.4, Wampler5
    13.7.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from tests.published.reference import case

from coulombook.curves.fit import PolynomialFit, fit_curve, fit_polynomial

SETS = ("norris", "noint1", "noint2", "pontius", "wampler1", "wampler2", "wampler4", "wampler5")
FORMS = {
    "norris": "line",
    "noint1": "line through zero",
    "noint2": "line through zero",
    "pontius": "quadratic",
}
# digits every certified number that is not zero must be met to
DIGITS = {"norris": 13.5, "noint1": 14.0, "noint2": 14.0, "pontius": 13.0, "wampler1": 13.0, "wampler2": 12.5}


def _numbers(fit: PolynomialFit) -> dict[str, float]:
    found = {"residual_sd": fit.residual_sd, "r_squared": fit.r_squared}
    for power, value, sd in zip(fit.powers, fit.coefficients, np.sqrt(np.diag(fit.covariance)), strict=True):
        found[f"b{power}"], found[f"sd_b{power}"] = float(value), float(sd)
    return found


@pytest.mark.parametrize("name", SETS)
def test_polynomial_has_the_certified_digits(name: str) -> None:
    certified = case(f"strd_{name}")
    fit = fit_polynomial(certified.inputs["x"], certified.inputs["y"], certified.inputs["powers"])
    found = _numbers(fit)
    assert found.keys() == certified.expected.keys()
    for expected in certified.expected.values():
        expected.check(found[expected.name])
        if expected.published:
            error = abs(found[expected.name] / expected.published - 1.0)
            assert error == 0.0 or -math.log10(error) > DIGITS.get(name, 13.0), expected


def test_wampler3_follows_from_its_neighbours() -> None:
    # the sets 3, 4 and 5 are set 1 with errors in the ratio 1 : 100 : 10 000, which no fifth-degree
    # polynomial can follow
    first, fourth = case("strd_wampler1").inputs, case("strd_wampler4").inputs
    y = np.array(first["y"]) + (np.array(fourth["y"]) - np.array(first["y"])) / 100
    assert y[0] == 760.0
    fit = fit_polynomial(first["x"], y, range(6))
    np.testing.assert_allclose(fit.coefficients, 1.0, rtol=1e-12)
    assert fit.residual_sd == pytest.approx(2360.14502379268, rel=1e-12)
    assert fit.r_squared == pytest.approx(0.999995559025820, rel=1e-12)
    sd = [case("strd_wampler4").expected[f"sd_b{power}"].published for power in range(6)]
    np.testing.assert_allclose(np.sqrt(np.diag(fit.covariance)), np.array(sd) / 100, rtol=1e-12)


@pytest.mark.parametrize("name", FORMS)
def test_curve_has_the_certified_digits(name: str) -> None:
    certified = case(f"strd_{name}")
    curve = fit_curve(certified.inputs["x"], certified.inputs["y"], FORMS[name])
    certified.expected["residual_sd"].check(curve.residual_sd)
    certified.expected["r_squared"].check(curve.r_squared)
    for power in certified.inputs["powers"]:
        certified.expected[f"b{power}"].check(float(curve.coefficients[power]))
        certified.expected[f"sd_b{power}"].check(math.sqrt(curve.covariance[power, power]))
