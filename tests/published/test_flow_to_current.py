"""Flow of gas to current: arithmetic on exact constants, with the standard conditions named.

20 mL/min with 1 % CO or ethylene, referred to 0 degC or 25 degC, 101.325 kPa or 100 kPa; hydrogen evolved
per ampere.
"""

from __future__ import annotations

from tests.published.reference import case

from coulombook.amounts.gas import charge_rate_ampere, molar_density
from coulombook.constants import FARADAY_CONSTANT
from coulombook.species import load_species

DATA = case("flow_to_current")
VOLUME_FLOW = DATA.inputs["flow_mL_min"] * 1e-6 / 60.0  # m^3/s
CONDITIONS = {"0C_1atm": (101325.0, 273.15), "25C_1atm": (101325.0, 298.15), "0C_1bar": (1e5, 273.15)}


def test_standard_flow_is_an_amount_at_its_own_conditions() -> None:
    for name, (pascal, kelvin) in CONDITIONS.items():
        DATA.expected[f"n_dot_{name}"].check(VOLUME_FLOW * molar_density(pascal, kelvin))


def test_one_percent_of_the_flow_as_a_current() -> None:
    table = load_species()
    rate = DATA.inputs["x"] * VOLUME_FLOW * molar_density(*CONDITIONS["0C_1atm"])
    for product, name in (("carbon monoxide", "CO"), ("ethylene", "C2H4")):
        milliampere = 1000.0 * charge_rate_ampere(table[product].electrons, rate)
        DATA.expected[f"i_{name}_mA"].check(milliampere)
        if name == "CO":
            DATA.expected["FE_CO_at_100mA"].check(milliampere / 100.0)


def test_hydrogen_evolved_per_ampere() -> None:
    rate = 1.0 / (load_species()["hydrogen"].electrons * FARADAY_CONSTANT)
    for name, condition in (("0C", "0C_1atm"), ("25C", "25C_1atm")):
        millilitre_per_minute = rate / molar_density(*CONDITIONS[condition]) * 60e6
        DATA.expected[f"H2_mL_min_per_A_{name}"].check(millilitre_per_minute)
