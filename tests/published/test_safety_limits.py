"""Flammability and exposure limits.

NFPA 497:2008 and IEC 60079-20-1:2010; OSHA 29 CFR 1910.1000 table Z-1 and the NIOSH Pocket Guide (secondary
text and memory, as the shipped table says).
"""

from __future__ import annotations

import tomllib
from importlib.resources import files

from tests.published.reference import case

from coulombook.species import load_species

SHIPPED = tomllib.loads(files("coulombook").joinpath("data", "safety.toml").read_text(encoding="utf-8"))
COLUMNS = {
    "osha_twa_ppm": "osha_pel_twa",
    "niosh_twa_ppm": "niosh_rel_twa",
    "idlh_ppm": "idlh",
}


def _name(text: str) -> str:
    species = load_species().find(text.replace("_", " "))
    assert species is not None
    return species.name


def test_flammability_limits_are_those_of_the_standards() -> None:
    inputs = case("flammability").inputs
    shipped = {row["species"]: row for row in SHIPPED["flammability"]}
    # the other rows stand with a source of their own, from memory
    of_standards = {name for name, row in shipped.items() if "further_percent" not in row}
    assert {_name(gas) for gas in inputs["gas"]} == of_standards
    for index, gas in enumerate(inputs["gas"]):
        for standard in ("nfpa", "iec"):
            expected = [inputs[f"{standard}_{end}"][index] for end in ("lfl", "ufl")]
            assert shipped[_name(gas)][f"{standard}_percent"] == expected, gas


def test_exposure_limits_are_those_of_the_lists() -> None:
    inputs = case("exposure_limits").inputs
    shipped = {row["species"]: row for row in SHIPPED["exposure"]}
    for index, substance in enumerate(inputs["substance"]):
        # -1 stands for a substance the lists give no limit for; ethylene has none at all
        numbers = {column: inputs[column_of][index] for column, column_of in COLUMNS.items()}
        row = shipped.get(_name(substance), {})
        assert {column: row.get(column, -1) for column in COLUMNS} == numbers, substance
        short_term = row.get("niosh_ceiling_ppm", row.get("niosh_stel_ppm", -1))
        assert short_term == inputs["niosh_ceiling_or_stel"][index], substance


def test_every_gas_and_volatile_product_of_the_shipped_table_has_a_flammable_limit() -> None:
    # butane's is the lowest; anions, and what hardly evaporates, have none
    shipped = {row["species"] for row in SHIPPED["flammability"]}
    gases = {one.name for one in load_species() if one.phase == "gas" and not one.carrier}
    assert gases <= shipped
    assert {"methanol", "ethanol", "n-propanol", "acetaldehyde", "acetone"} <= shipped


def test_every_limit_has_a_source_with_its_year() -> None:
    for source in SHIPPED["source"].values():
        assert source["text"]
        assert source["year"] > 2000
        assert source["mark"]
