"""Effective carbon numbers of Scanlon & Willis, J. Chromatogr. Sci. 23 (1985) 333, contributions from memory.

A second source, a later contribution scheme (Sensors 13 (2013) 7939, table 4S), has acetaldehyde at 1.06 and
propionaldehyde at 1.99.
"""

from __future__ import annotations

import pytest
from tests.published.reference import case

from coulombook.curves.carbon_number import effective_carbon_number, relative_uncertainty

# names of the case that are written otherwise in the table of species
OWN = {
    "n_propanol": "n-propanol",
    "acetic_acid": "acetate",
    "formic_acid": "formate",
    "allyl_alcohol": "allyl alcohol",
}


@pytest.mark.parametrize("name", sorted(case("ecn").expected))
def test_effective_carbon_number_is_the_published_one(name: str) -> None:
    expected = case("ecn").expected[name]
    found = effective_carbon_number(OWN.get(name, name))
    if expected.recomputed == 0.0:
        assert found == 0.0
    else:
        expected.check(found)


@pytest.mark.parametrize(("name", "number"), [("acetaldehyde", 1.06), ("propionaldehyde", 1.99)])
def test_another_scheme_agrees_within_the_stated_uncertainty(name: str, number: float) -> None:
    assert abs(effective_carbon_number(name) - number) < relative_uncertainty() * number
