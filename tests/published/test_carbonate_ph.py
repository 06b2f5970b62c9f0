"""pH of KHCO3 saturated with CO2 at 25 degC and 101.325 kPa, wet.

Equilibrium constants of Plummer & Busenberg, Geochim. Cosmochim. Acta 46 (1982) 1011 (from memory),
activity coefficients by Davies; 6.8 (0.1 mol/L) and 7.2 (0.5 mol/L) are common practice.
"""

from __future__ import annotations

import pytest
from tests.published.reference import case

from coulombook.cell import electrolyte
from coulombook.cell.electrolyte import bicarbonate_ph

DATA = case("khco3_ph")
NAMES = {0.05: "0p05M", 0.1: "0p1M", 0.2: "0p2M", 0.5: "0p5M", 1.0: "1p0M"}


def test_shipped_constants_are_those_of_the_source() -> None:
    inputs = DATA.inputs
    shipped = (
        electrolyte.HENRY_MOL_PER_LITRE_BAR,
        electrolyte.PK1,
        electrolyte.PK2,
        electrolyte.PKW,
        electrolyte.DAVIES_A,
    )
    assert shipped == (inputs["K_H"], inputs["pK1"], inputs["pK2"], inputs["pKw"], inputs["A_davies"])


@pytest.mark.parametrize("concentration", DATA.inputs["c_KHCO3"])
def test_ph_with_and_without_activity(concentration: float) -> None:
    pressure = DATA.inputs["p_bar"] - DATA.inputs["pw_bar"]
    suffix = NAMES[concentration]
    DATA.expected[f"pH_davies_{suffix}"].check(bicarbonate_ph(concentration, pressure))
    DATA.expected[f"pH_ideal_{suffix}"].check(bicarbonate_ph(concentration, pressure, activity=False))


def test_default_pressure_is_wet_co2_at_one_atmosphere() -> None:
    pressure = DATA.inputs["p_bar"] - DATA.inputs["pw_bar"]
    assert bicarbonate_ph(0.1) == bicarbonate_ph(0.1, pressure)
    DATA.expected["CO2_aq_mol_L"].check(electrolyte.HENRY_MOL_PER_LITRE_BAR * pressure)
