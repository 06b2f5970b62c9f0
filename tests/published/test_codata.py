"""Constants: CODATA 2018 and 2022, exact since the SI of 2019; molar volumes from ISO and IUPAC normal conditions."""

from __future__ import annotations

import pytest
import scipy.constants
from tests.published.reference import case

from coulombook import constants
from coulombook.amounts import gas
from coulombook.cell import potential

VALUES = case("constants").expected


def test_faraday_and_gas_constant_are_the_exact_ones() -> None:
    VALUES["F"].check(constants.FARADAY_CONSTANT)
    VALUES["R"].check(constants.GAS_CONSTANT)
    # a second fact: the charge of a mole of elementary charges
    n_a, e = VALUES["N_A"].recomputed, VALUES["e"].recomputed
    assert n_a is not None
    assert e is not None
    assert n_a * e == pytest.approx(constants.FARADAY_CONSTANT, rel=1e-10)


def test_the_constants_are_those_of_the_codata_tables_of_scipy() -> None:
    # exact by definition, so equal to the last bit of the doubles; products are rounded once
    assert scipy.constants.e == constants.ELEMENTARY_CHARGE
    assert constants.AVOGADRO_CONSTANT == scipy.constants.N_A
    assert scipy.constants.k == constants.BOLTZMANN_CONSTANT
    assert pytest.approx(scipy.constants.R, rel=1e-15) == constants.GAS_CONSTANT
    # older editions of the table print the exact value cut off after ten digits
    faraday, unit, _ = scipy.constants.physical_constants["Faraday constant"]
    assert pytest.approx(faraday, rel=1e-9) == constants.FARADAY_CONSTANT
    assert unit == "C mol^-1"


def test_slope_of_the_rhe_scale() -> None:
    VALUES["nernst_25C"].check(potential.nernst_slope_volt(298.15))
    VALUES["nernst_20C"].check(potential.nernst_slope_volt(293.15))


@pytest.mark.parametrize(
    ("name", "kelvin", "pascal"),
    [
        ("Vm_0C_1atm_L", 273.15, 101325.0),
        ("Vm_25C_1atm_L", 298.15, 101325.0),
        ("Vm_20C_1atm_L", 293.15, 101325.0),
        ("Vm_0C_1bar_L", 273.15, 1e5),
    ],
)
def test_molar_volume_of_an_ideal_gas(name: str, kelvin: float, pascal: float) -> None:
    VALUES[name].check(1000.0 / gas.molar_density(pascal, kelvin))
