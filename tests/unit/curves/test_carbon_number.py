"""Curves borrowed by effective carbon number."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.curves.carbon_number import (
    effective_carbon_number,
    known_analytes,
    relative_response,
    relative_uncertainty,
    scale_curve,
)
from coulombook.curves.fit import fit_curve
from coulombook.curves.inverse import invert
from coulombook.curves.limits import limits
from coulombook.curves.prediction import curve_response, reading_variance
from coulombook.species import load_species


def test_every_analyte_is_a_species_with_as_many_carbons_as_its_groups() -> None:
    species = load_species()
    for name in known_analytes():
        assert effective_carbon_number(name, methaniser=True) == species[name].carbon, name


def test_ratio_of_two_hydrocarbons() -> None:
    ratio, u = relative_response("ethane", "ethylene")
    assert ratio == pytest.approx(2.0 / 1.9, rel=1e-15)
    assert u == pytest.approx(relative_uncertainty() * ratio, rel=1e-15)


def test_a_methaniser_counts_carbons() -> None:
    assert relative_response("carbon monoxide", "ethylene", methaniser=True)[0] == pytest.approx(0.5)


@pytest.mark.parametrize("pair", [("carbon monoxide", "ethylene"), ("ethylene", "formate")])
def test_what_burns_without_signal_borrows_and_lends_no_curve(pair: tuple[str, str]) -> None:
    with pytest.raises(ValueError, match="gives no signal on a flame ionisation detector"):
        relative_response(*pair)


def test_unknown_groups_are_refused() -> None:
    with pytest.raises(ValueError, match="no effective carbon number is known for hydrogen"):
        effective_carbon_number("hydrogen")


@pytest.mark.parametrize("form", ["line", "line through zero", "quadratic"])
def test_scaled_curve_answers_as_its_own_at_the_scaled_x(form: str) -> None:
    rng = np.random.default_rng(110)
    x = np.repeat([1.0, 2.0, 4.0, 8.0], 3)
    curve = fit_curve(x, 1.0 + 10.0 * x - 0.1 * x**2 + 0.1 * rng.standard_normal(12), form, "1/x")
    scaled = scale_curve(curve, 1.25, 0.0)
    at = np.array([0.5, 1.0, 3.0, 6.0])
    np.testing.assert_allclose(curve_response(scaled, at), curve_response(curve, 1.25 * at), rtol=1e-14)
    np.testing.assert_allclose(reading_variance(scaled, at), reading_variance(curve, 1.25 * at), rtol=1e-14)
    assert (scaled.lowest, scaled.highest) == (0.8, 6.4)
    # every limit is an x, and all x are divided by the factor
    own, borrowed = limits(curve), limits(scaled)
    assert borrowed.decision == pytest.approx(own.decision / 1.25, rel=1e-12)
    assert borrowed.detection == pytest.approx(own.detection / 1.25, rel=1e-9)
    assert borrowed.quantification == pytest.approx(own.quantification / 1.25, rel=1e-9)


def test_error_of_the_factor_is_an_error_of_every_x() -> None:
    x = np.array([1.0, 2.0, 4.0, 8.0])
    curve = fit_curve(x, 10.0 * x - 0.1 * x**2, "quadratic")  # without scatter: the factor is the only error
    factor, u_factor = 1.25, 0.125
    scaled = scale_curve(curve, factor, u_factor)
    y = 30.0
    draws = np.random.default_rng(111).standard_normal(20000)
    moved = scaled.coefficients[:, None] + scaled.factor[:, -1:] * draws
    linear = float(np.asarray(invert(*scaled.coefficients, y)))
    # x is inversely proportional to the factor: u(x)/x = u(factor)/factor
    gradient = [(invert(*(scaled.coefficients + 1e-6 * one), y) - linear) / 1e-6 for one in np.eye(3)]
    u = np.sqrt(np.array(gradient) @ scaled.covariance @ np.array(gradient))
    assert u == pytest.approx(0.1 * linear, rel=1e-3)
    # the spread of draws agrees as far as a first order can: 10 % steps, some percent
    assert np.std(invert(*moved, y)) == pytest.approx(0.1 * linear, rel=0.05)
    np.testing.assert_allclose(scaled.certificate, scaled.covariance, atol=1e-12 * scaled.covariance.max())


def test_factor_that_is_none_is_refused() -> None:
    curve = fit_curve([1.0, 2.0], [1.0, 2.0])
    with pytest.raises(ValueError, match="must be above zero; it is 0"):
        scale_curve(curve, 0.0, 0.1)
    with pytest.raises(ValueError, match=r"at or above zero; it is -0\.1"):
        scale_curve(curve, 1.0, -0.1)
