"""Electrons per molecule from CO2.

Kuhl, Cave, Abram & Jaramillo, Energy Environ. Sci. 5 (2012) 7050, table 1; Nitopi et al., Chem. Rev. 119
(2019) 7610, table 1 (from memory; each equals 4 C + H - 2 O of its formula).
"""

from __future__ import annotations

import pytest
from tests.published.reference import case

from coulombook.species import Composition, load_species

DATA = case("electron_counts")
# name of the source -> what a bench table may call it
SPELLED = {
    "ethylene_glycol": "ethylene glycol",
    "n_C3H7OH": "n-C3H7OH",
    "allyl_alcohol": "allyl alcohol",
    "oxalic_acid": "oxalic acid",
}


@pytest.mark.parametrize("name", DATA.inputs["name"])
def test_electrons_of_a_product_are_the_published_ones(name: str) -> None:
    species = load_species().find(SPELLED.get(name, name))
    assert species is not None
    DATA.expected[name].check(species.electrons)


def test_electrons_of_a_composition_are_the_published_ones() -> None:
    inputs = DATA.inputs
    for name, c, h, o in zip(inputs["name"], inputs["C"], inputs["H"], inputs["O"], strict=True):
        DATA.expected[name].check(Composition(c, h, o).electrons)
