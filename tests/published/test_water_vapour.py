"""Saturated vapour pressure of water.

IAPWS R7-97(2012) (IAPWS-IF97), table 35: check values of the saturation-pressure equation, from memory; the
`iapws` package computes the same equation apart from this one, and IAPWS-95 as a second formulation.
"""

from __future__ import annotations

import iapws
import numpy as np
import pytest
from tests.published.reference import case

from coulombook.amounts.water import saturated_water_vapour_pascal

DATA = case("water_vapour_pressure")


@pytest.mark.parametrize(
    ("kelvin", "megapascal", "unit"),
    [(300.0, 0.353658941e-2, 1e-11), (500.0, 0.263889776e1, 1e-8), (600.0, 0.123443146e2, 1e-7)],
)
def test_check_values_of_the_standard(kelvin: float, megapascal: float, unit: float) -> None:
    # half of the last printed digit, in Pa
    assert saturated_water_vapour_pascal(kelvin) == pytest.approx(1e6 * megapascal, abs=0.5e6 * unit)


def test_pressures_of_the_lab() -> None:
    for celsius in DATA.inputs["t_C"]:
        found = saturated_water_vapour_pascal(celsius + 273.15) / 1000.0
        DATA.expected[f"p_kPa_{celsius}C"].check(found)


def test_equation_agrees_with_another_program_over_its_range() -> None:
    kelvin = np.linspace(273.15, 640.0, 60)
    other = [1e6 * iapws.iapws97._PSat_T(one) for one in kelvin]
    # the same polynomial in another order: rounding
    np.testing.assert_allclose(saturated_water_vapour_pascal(kelvin), other, rtol=1e-11)


def test_equation_agrees_with_the_scientific_formulation() -> None:
    # the two formulations differ by 0.006 % at 25 degC
    other = DATA.expected["p_kPa_25C_iapws95"].recomputed
    assert saturated_water_vapour_pascal(298.15) / 1000.0 == pytest.approx(other, rel=1e-4)
