"""Quantiles and tails against scipy.stats, and the small parts of the verdicts that lean on them."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats
from scipy.optimize import brentq

from coulombook.curves.adequacy import COMPARED_WEIGHTS, FTest, homogeneity, weights_aic, whiten
from coulombook.curves.fit import fit_curve, fit_polynomial, scaled_design
from coulombook.curves.interval import inverse_with_uncertainty
from coulombook.curves.judgement import judge
from coulombook.curves.quantiles import (
    chi2_tail,
    f_quantile,
    f_tail,
    power_of_t,
    student_quantile,
    student_tail,
)


@pytest.mark.parametrize("probability", [0.005, 0.3, 0.5, 0.95, 0.99])
def test_quantiles_are_those_of_scipy(probability: float) -> None:
    freedom = np.array([1.0, 2.0, 3.7, 25.0, np.inf, 0.0, np.nan])
    found = student_quantile(probability, freedom)
    np.testing.assert_allclose(found[:4], stats.t.ppf(probability, freedom[:4]), rtol=1e-10, atol=1e-12)
    assert found[4] == pytest.approx(stats.norm.ppf(probability), rel=1e-12, abs=1e-12)
    assert np.isnan(found[5:]).all()
    assert float(student_quantile(probability, 4)) == pytest.approx(stats.t.ppf(probability, 4), abs=1e-12)
    assert f_quantile(probability, 3, 7) == pytest.approx(stats.f.ppf(probability, 3, 7), rel=1e-10)
    assert FTest(1.0, 3, 7, 0.5).critical(probability) == f_quantile(probability, 3, 7)


def test_critical_value_is_that_of_one_per_cent_unless_another_is_asked_for() -> None:
    # F(0.99; 1, 6) = 13.75 of every printed table
    assert FTest(1.0, 1, 6, 0.5).critical() == pytest.approx(13.745, abs=1e-3)


@pytest.mark.parametrize("value", [0.0, 0.4, 1.0, 6.3])
def test_tails_are_those_of_scipy(value: float) -> None:
    for sign in (1.0, -1.0):
        assert float(student_tail(sign * value, 5)) == pytest.approx(2.0 * stats.t.sf(value, 5), rel=1e-10)
    assert f_tail(value, 2, 9) == pytest.approx(stats.f.sf(value, 2, 9), rel=1e-10)
    assert chi2_tail(value, 4) == pytest.approx(stats.chi2.sf(value, 4), rel=1e-10)


def test_an_infinite_ratio_is_never_chance() -> None:
    assert f_tail(math.inf, 1, 3) == 0.0


@pytest.mark.parametrize("shift", [0.0, 1.3, 4.0])
def test_power_is_that_of_the_noncentral_t(shift: float) -> None:
    assert power_of_t(shift, 2.1, 6.0) == pytest.approx(stats.nct.sf(2.1, 6.0, shift), rel=1e-8)
    # with a known standard deviation the t is a normal variable about its shift
    assert power_of_t(shift, 2.1, math.inf) == pytest.approx(stats.norm.sf(2.1 - shift), rel=1e-12)


@pytest.mark.parametrize("powers", [(0, 1), (0, 1, 2)])
def test_standards_are_put_within_one_of_zero(powers: tuple[int, ...]) -> None:
    x = np.array([2.5, 3.0, 11.0, 4.5])
    centre, scale, plain = scaled_design(x, powers)
    assert (centre, scale) == (6.75, 4.25)
    coefficients = np.arange(1.0, 1.0 + len(powers))
    scaled = sum(c * ((x - centre) / scale) ** k for c, k in zip(coefficients, powers, strict=True))
    again = sum(c * x**k for c, k in zip(plain @ coefficients, range(len(plain)), strict=True))
    np.testing.assert_allclose(again, scaled, rtol=1e-12)


def test_a_curve_through_zero_keeps_its_zero() -> None:
    assert scaled_design(np.array([2.5, 11.0]), (1,))[:2] == (0.0, 11.0)
    assert scaled_design(np.array([-3.0, 2.0]), (1, 2))[:2] == (0.0, 3.0)


def test_scatter_is_ranked_with_ties_as_scipy_ranks_it() -> None:
    x = np.array([1.0, 1.0, 2.0, 3.0, 3.0, 5.0, 8.0, 9.0])
    size = np.array([0.3, -0.3, 1.0, 0.2, np.nan, -2.0, 1.0, 4.0])
    found = homogeneity(x, np.ones(8), np.ones(8), size)
    assert found is not None
    assert found.method == "rank correlation"
    known = np.isfinite(size)
    rho, p = stats.spearmanr(np.abs(size[known]), x[known])
    assert found.value == pytest.approx(rho, rel=1e-12)
    assert found.p == pytest.approx(p, rel=1e-9)


def test_five_points_on_three_levels_are_the_fewest_that_are_ranked() -> None:
    size = np.array([0.1, 0.5, 0.2, 0.9, 0.7])
    x = np.array([1.0, 2.0, 3.0, 4.0, 5.0])
    ones = np.ones(5)
    assert homogeneity(x, ones, ones, size) is not None
    assert homogeneity(x[:4], ones[:4], ones[:4], size[:4]) is None
    assert homogeneity(x, ones, ones, np.where(x == 3.0, np.nan, size)) is None
    assert homogeneity(np.array([1.0, 1.0, 1.0, 2.0, 2.0]), ones, ones, size) is None
    assert homogeneity(x, ones, ones, np.full(5, 0.4)) is None
    assert homogeneity(np.array([1.0, 2.0, 3.0, 3.0, 3.0]), ones, ones, size) is not None
    # in perfect order there is no chance left
    found = homogeneity(x, ones, ones, -size[np.argsort(size)])
    assert found is not None
    assert (found.value, found.p) == (pytest.approx(1.0), pytest.approx(0.0, abs=1e-12))


def test_akaikes_criterion_is_that_of_normal_responses() -> None:
    rng = np.random.default_rng(4)
    x = np.array([1.0, 2.0, 4.0, 8.0, 16.0, 32.0])
    y = 1.0 + 2.0 * x + 0.1 * x * rng.standard_normal(6)
    found = weights_aic(x, y, (0, 1))
    assert set(found) == set(COMPARED_WEIGHTS)
    for weights, power in (("equal", 0), ("1/x", 1), ("1/x^2", 2)):
        variance = x**power
        fit = fit_polynomial(x, y, (0, 1), 1.0 / variance)
        residual = y - np.polynomial.polynomial.polyval(x, fit.coefficients)
        s2 = float(np.mean(residual**2 / variance))
        likelihood = stats.norm.logpdf(residual, scale=np.sqrt(s2 * variance)).sum()
        # two coefficients and the variance
        assert found[weights] == pytest.approx(-2.0 * likelihood + 2.0 * 3, rel=1e-10)


def test_standards_at_zero_leave_equal_weights_alone() -> None:
    x = np.array([0.0, 1.0, 2.0, 3.0])
    assert list(weights_aic(x, x + np.array([0.1, -0.1, 0.1, 0.0]), (0, 1))) == ["equal"]
    assert weights_aic(x, 2.0 * x, (0, 1)) == {}


def test_other_weights_are_suggested_from_a_difference_of_four_on() -> None:
    # Burnham & Anderson (as cited at AIC_MARGIN): 4 to 7 behind the best means considerably less support
    x = np.geomspace(1.0, 60.0, 7)
    pattern = np.array([1.0, -2.5, -0.6, 2.2, 0.7, -2.0, 1.4])

    def responses(growth: float) -> np.ndarray:
        y: np.ndarray = 2.0 + 5.0 * x + 0.1 * pattern * x**growth
        return y

    def lead(growth: float) -> float:
        found = weights_aic(x, responses(growth), (0, 1))
        return found["equal"] - min(found.values())

    for behind, expected in ((3.9, False), (4.1, True)):
        growth = brentq(lambda g, behind=behind: lead(g) - behind, 0.3, 1.2)
        y = responses(growth)
        found = judge(fit_curve(x, y), x, y)
        assert found.even_scatter, "else they are suggested at any difference"
        assert (found.suggested_weights is not None) == expected


def test_whitened_residuals_are_those_of_generalised_least_squares() -> None:
    rng = np.random.default_rng(8)
    x = np.array([1.0, 2.0, 3.0, 5.0, 8.0])
    root = np.tril(rng.normal(size=(5, 5))) + 3.0 * np.eye(5)
    covariance = root @ root.T
    y = 1.0 + 2.0 * x + rng.standard_normal(5)
    found = whiten(x, y, (0, 1), covariance)
    design = np.column_stack((np.ones(5), x))
    inverse = np.linalg.inv(covariance)
    b = np.linalg.solve(design.T @ inverse @ design, design.T @ inverse @ y)
    off = y - design @ b
    assert found.square == pytest.approx(off @ inverse @ off, rel=1e-10)
    np.testing.assert_allclose(found.root @ found.residual, off, rtol=1e-9, atol=1e-12)
    assert 0.0 < found.rounding < 1e-20 * float(y @ inverse @ y)


@pytest.mark.parametrize("level", [0.0, 1.0, 1.5, -0.1, math.nan])
def test_a_level_of_confidence_lies_between_nothing_and_certainty(level: float) -> None:
    curve = fit_curve([0.0, 1.0, 2.0, 3.0], [0.1, 1.0, 2.1, 2.9])
    with pytest.raises(ValueError, match="must lie between 0 and 1"):
        inverse_with_uncertainty(curve, 1.5, level=level)
    assert float(inverse_with_uncertainty(curve, 1.5, level=0.999).high) > 1.5
