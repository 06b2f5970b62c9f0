"""Composition, electrons, aliases and equilibrium potentials."""

from __future__ import annotations

from collections import Counter

import pytest

from coulombook.species import (
    Composition,
    Species,
    SpeciesTable,
    equilibrium_potential_rhe_volt,
    equilibrium_potential_she_volt,
    internal_standard_name,
    load_species,
    parse_formula,
)
from coulombook.species import _data as shipped_data
from coulombook.species import _key as key_of

CARRIERS = {"nitrogen", "argon", "helium", "oxygen", "carbon dioxide", "water"}


@pytest.mark.parametrize(
    ("formula", "composition"),
    [
        ("H2", Composition(0, 2, 0)),
        ("CO", Composition(1, 0, 1)),
        ("CH3CH2CH2OH", Composition(3, 8, 1)),
        ("HCOO-", Composition(1, 1, 2, -1)),
        ("HCOO\N{SUPERSCRIPT MINUS}", Composition(1, 1, 2, -1)),
        ("HCOO\N{MINUS SIGN}", Composition(1, 1, 2, -1)),
        ("CH3COO^-", Composition(2, 3, 2, -1)),
        ("C2O4^2-", Composition(2, 0, 4, -2)),
        # without a caret the digit belongs to the element
        ("C2O4-", Composition(2, 0, 4, -1)),
        ("H3O+", Composition(0, 3, 1, 1)),
        ("C\N{SUBSCRIPT TWO}H\N{SUBSCRIPT FOUR}", Composition(2, 4, 0)),
    ],
)
def test_formula_is_read_with_its_charge(formula: str, composition: Composition) -> None:
    assert parse_formula(formula) == composition


@pytest.mark.parametrize("formula", ["N2", "C2H4N", "c2h4", "C2 H4", "(CH3)2CO", "C2H4)", "K+", "2H2"])
def test_formula_of_other_elements_or_signs_is_refused(formula: str) -> None:
    with pytest.raises(ValueError, match="must be made of C, H and O"):
        parse_formula(formula)


@pytest.mark.parametrize("formula", ["", "  ", "-", "^2-"])
def test_empty_formula_is_refused(formula: str) -> None:
    with pytest.raises(ValueError, match="empty"):
        parse_formula(formula)


def test_electrons_follow_from_oxidation_states() -> None:
    # acetic acid: two carbons from +4 to an average of 0, 8; the anion holds one proton less and the same carbon
    assert parse_formula("CH3COOH").electrons == 8
    assert parse_formula("CH3COO-").electrons == 8
    # CO2 itself and water are where the count starts
    assert parse_formula("CO2").electrons == 0
    assert parse_formula("H2O").electrons == 0


def test_every_name_formula_and_alias_means_one_thing() -> None:
    # one namespace for species and internal standards: a vial's DMSO must not be taken for a product
    keys = Counter(
        key
        for row in shipped_data()["species"] + shipped_data()["internal_standard"]
        for key in {key_of(text) for text in (row["name"], row.get("formula", row["name"]), *row["aliases"])}
    )
    assert [key for key, count in keys.items() if count > 1] == []


def test_every_alias_is_found_whatever_case_and_blanks() -> None:
    table = load_species()
    for species in table:
        for text in (species.name, species.formula, *species.aliases):
            for spelling in (text, text.upper(), f"  {text.lower()} "):
                assert table.find(spelling) is species, spelling
    assert table.find("n-propanol") is table.find("1-PROPANOL")
    assert table.find("Ethylene  Glycol") is table["ethylene glycol"]
    assert table.find("kryptonite") is None


def test_aliases_that_are_formulas_have_the_electrons_of_their_species() -> None:
    # a formula with a wrong atom in the table would give a wrong Faradaic efficiency
    checked = 0
    for species in load_species():
        if species.carrier:
            continue
        for alias in species.aliases:
            try:
                composition = parse_formula(alias)
            except ValueError:
                continue
            # "HCOO" is written for the anion and "C2O42-" for C2O4^2-: shorthand, not formulas
            if alias in {"HCOO", "CH3COO", "C2O42-"}:
                continue
            assert composition.electrons == species.electrons, alias
            assert composition.carbon == species.carbon, alias
            checked += 1
    assert checked > 20


def test_carriers_are_the_gases_of_the_contract_and_water() -> None:
    assert {one.name for one in load_species() if one.carrier} == CARRIERS


def test_products_need_electrons_and_are_measured_as_gas_or_liquid() -> None:
    for species in load_species():
        assert species.phase in {"gas", "liquid"}
        if not species.carrier:
            assert species.electrons > 0
            assert species.name == species.name.lower()


def test_carrier_without_composition_has_no_electrons() -> None:
    nitrogen = load_species()["nitrogen"]
    assert (nitrogen.carbon, nitrogen.group) == (0, "")
    with pytest.raises(ValueError, match="nitrogen is no product"):
        _ = nitrogen.electrons


def test_group_counts_the_carbon_atoms() -> None:
    table = load_species()
    assert [table[name].group for name in ("hydrogen", "formate", "ethanol", "acetone")] == [
        "H2",
        "C1",
        "C2",
        "C3",
    ]


def test_species_of_the_day_wins_over_the_shipped_one() -> None:
    mine = Species("furfural", "C5H4O2", "liquid", ("EtOH",), composition=parse_formula("C5H4O2"))
    table = load_species().extended([mine])
    assert table.find("etoh") is mine
    assert table.find("ethanol") is load_species()["ethanol"]
    again = Species("ethanol", "C2H5OH", "liquid", (), composition=parse_formula("C2H5OH"))
    assert load_species().extended([again])["ethanol"] is again


def test_an_alias_does_not_hide_a_species_of_that_name() -> None:
    first = Species("first", "CO", "gas", ("second",), composition=parse_formula("CO"))
    second = Species("second", "CH4", "gas", (), composition=parse_formula("CH4"))
    assert SpeciesTable([first, second]).find("second") is second


def test_internal_standard_has_one_name_and_strangers_keep_theirs() -> None:
    assert internal_standard_name("Dimethyl  Sulfoxide") == internal_standard_name("dmso") == "DMSO"
    assert internal_standard_name(" sodium  benzoate ") == "sodium benzoate"


def test_formate_moves_with_ph_on_the_rhe_scale_and_ethylene_does_not() -> None:
    table = load_species()
    # one proton fewer than electrons, n = 2: ln(10) RT/F / 2 = 29.58 mV a unit of pH; acetate n = 8: 7.39 mV
    formate = [equilibrium_potential_rhe_volt(table["formate"], ph) for ph in (6.0, 7.0)]
    acetate = [equilibrium_potential_rhe_volt(table["acetate"], ph) for ph in (6.0, 7.0)]
    assert formate[1] - formate[0] == pytest.approx(0.0591593 / 2, abs=5e-8)
    assert acetate[1] - acetate[0] == pytest.approx(0.0591593 / 8, abs=5e-8)
    ethylene = [equilibrium_potential_rhe_volt(table["ethylene"], ph) for ph in (0.0, 14.0)]
    # the pH terms of the two scales cancel to the rounding of volts
    assert ethylene[0] == pytest.approx(ethylene[1], abs=1e-14)


def test_hydrogen_is_zero_against_rhe_at_every_ph() -> None:
    hydrogen = load_species()["hydrogen"]
    assert equilibrium_potential_rhe_volt(hydrogen, 9.3) == pytest.approx(0.0, abs=1e-15)
    assert equilibrium_potential_she_volt(hydrogen, 7.0) == pytest.approx(-7 * 0.0591593, abs=5e-7)


def test_potential_without_gibbs_energy_names_what_is_known() -> None:
    table = load_species()
    with pytest.raises(ValueError, match="no Gibbs energy of glycolaldehyde in state any; known: none"):
        equilibrium_potential_rhe_volt(table["glycolaldehyde"])
    with pytest.raises(ValueError, match="ethanol in state g; known: aq, l"):
        equilibrium_potential_rhe_volt(table["ethanol"], state="g")
    with pytest.raises(ValueError, match="carbon dioxide"):
        equilibrium_potential_rhe_volt(table["carbon dioxide"])
