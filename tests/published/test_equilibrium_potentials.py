"""Equilibrium potentials of CO2 reduction against RHE at 25 degC.

Gibbs energies of formation: CRC Handbook of Chemistry and Physics (Standard Thermodynamic Properties;
Aqueous Ions), and the NBS tables, J. Phys. Chem. Ref. Data 11 (1982) Suppl. 2 (from memory) for aqueous
molecules. Printed potentials: Nitopi et al., Chem. Rev. 119 (2019) 7610, table 1 (from memory).
"""

from __future__ import annotations

import pytest
from tests.published.reference import case

from coulombook.constants import FARADAY_CONSTANT
from coulombook.species import (
    electrons_of,
    equilibrium_potential_rhe_volt,
    equilibrium_potential_she_volt,
    load_species,
    oxygen_potential_rhe_volt,
)

DATA = case("equilibrium_potentials_crc")
# state of the source -> species and state of the shipped table
STATES = {
    "CO_g": ("carbon monoxide", "g"),
    "HCOOH_l": ("formate", "acid, l"),
    "HCOOH_aq": ("formate", "acid, aq"),
    "CH3OH_l": ("methanol", "l"),
    "CH3OH_aq": ("methanol", "aq"),
    "CH4_g": ("methane", "g"),
    "C2H4_g": ("ethylene", "g"),
    "C2H6_g": ("ethane", "g"),
    "C2H5OH_l": ("ethanol", "l"),
    "C2H5OH_aq": ("ethanol", "aq"),
    "CH3CHO_g": ("acetaldehyde", "g"),
    "CH3CHO_l": ("acetaldehyde", "l"),
    "CH3COOH_l": ("acetate", "acid, l"),
    "CH3COOH_aq": ("acetate", "acid, aq"),
    "n_C3H7OH_l": ("n-propanol", "l"),
    "acetone_g": ("acetone", "g"),
    "propionaldehyde_g": ("propionaldehyde", "g"),
    "ethylene_glycol_l": ("ethylene glycol", "l"),
    "glyoxal_g": ("glyoxal", "g"),
}


def test_every_state_of_the_source_is_shipped() -> None:
    assert set(DATA.inputs["name"]) == set(STATES)


@pytest.mark.parametrize("name", STATES)
def test_potential_is_the_published_one(name: str) -> None:
    product, state = STATES[name]
    DATA.expected[name].check(equilibrium_potential_rhe_volt(load_species()[product], 6.8, state))


def test_formate_and_acetate_stand_where_their_ph_puts_them() -> None:
    table = load_species()
    for product in ("formate", "acetate"):
        DATA.expected[f"{product}_SHE"].check(equilibrium_potential_she_volt(table[product], 0.0, "aq"))
        DATA.expected[f"{product}_RHE_pH6p8"].check(equilibrium_potential_rhe_volt(table[product], 6.8, "aq"))


@pytest.mark.parametrize("name", STATES)
def test_shipped_gibbs_energy_is_the_one_of_the_source(name: str) -> None:
    product, state = STATES[name]
    quoted = dict(zip(DATA.inputs["name"], DATA.inputs["G"], strict=True))
    found = {one.state: one.joule_per_mol for one in load_species()[product].gibbs}
    assert found[state] == pytest.approx(1000.0 * quoted[name], rel=1e-12)


@pytest.mark.parametrize("name", case("gibbs_from_H_S").expected)
def test_shipped_gibbs_energy_follows_from_enthalpy_and_entropy(name: str) -> None:
    states = {**STATES, "CO2_g": ("carbon dioxide", "g"), "acetone_l": ("acetone", "l")}
    product, state = states[name]
    found = next(one.joule_per_mol for one in load_species()[product].gibbs if one.state == state) / 1000.0
    rebuilt = case("gibbs_from_H_S").expected[name].recomputed
    # printed to 0.1 kJ/mol; tables of H, S and G need not come from one measurement: 0.6 kJ/mol, as the
    # source allows
    assert found == pytest.approx(rebuilt, abs=0.6)


def test_oxygen_and_water_stand_at_the_reversible_voltage() -> None:
    # 237.1 kJ/mol (CRC) over 2 F, full precision; the textbook's figure is 1.229 V
    assert oxygen_potential_rhe_volt() == pytest.approx(1.2286841677498808, rel=1e-12)
    assert oxygen_potential_rhe_volt() == pytest.approx(1.229, abs=5e-4)


HEATING = case("heating_values")
BURNT = {
    "H2": "hydrogen",
    "CO": "carbon monoxide",
    "HCOOH_l": "HCOOH",
    "CH3OH_l": "methanol",
    "CH4": "methane",
    "C2H4": "ethylene",
    "C2H6": "ethane",
    "C2H5OH_l": "ethanol",
    "CH3CHO_l": "acetaldehyde",
    "CH3COOH_l": "CH3COOH",
    "n_C3H7OH_l": "n-propanol",
    "acetone_l": "acetone",
    "ethylene_glycol_l": "ethylene glycol",
}


@pytest.mark.parametrize("name", BURNT)
def test_heat_of_combustion_over_thermoneutral_voltage_gives_the_electrons(name: str) -> None:
    # burning a product takes up the electrons that made it: HHV = n F E_tn (enthalpies of formation: CRC)
    heat = HEATING.expected[f"HHV_{name}"].recomputed
    voltage = HEATING.expected[f"Etn_{name}"].recomputed
    assert heat is not None
    assert voltage is not None
    assert 1000.0 * heat / (FARADAY_CONSTANT * voltage) == pytest.approx(electrons_of(BURNT[name]), rel=1e-9)
