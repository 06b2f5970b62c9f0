"""Constants and products, written down here a second time on purpose.

Electron numbers are those of the half reactions written out (x CO2 + n H+ + n e- -> product + water),
not computed from the formula, so that they check the package's own computation.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

# SI Brochure, 9th ed. (2019): e, N_A and k are exact
ELEMENTARY_CHARGE = 1.602176634e-19
AVOGADRO = 6.02214076e23
BOLTZMANN = 1.380649e-23
FARADAY = ELEMENTARY_CHARGE * AVOGADRO
GAS_CONSTANT = BOLTZMANN * AVOGADRO


@dataclass(frozen=True, slots=True)
class Product:
    """Electrons and CO2 molecules per molecule of a product."""

    electrons: int
    carbon: int
    phase: str
    alias: str  # another way a bench writes it


PRODUCTS = {
    "hydrogen": Product(2, 0, "gas", "H2"),
    "carbon monoxide": Product(2, 1, "gas", "CO"),
    "methane": Product(8, 1, "gas", "CH4"),
    "ethylene": Product(12, 2, "gas", "C2H4"),
    "ethane": Product(14, 2, "gas", "C2H6"),
    "propylene": Product(18, 3, "gas", "C3H6"),
    "formate": Product(2, 1, "liquid", "HCOO-"),
    "methanol": Product(6, 1, "liquid", "CH3OH"),
    "ethanol": Product(12, 2, "liquid", "EtOH"),
    "acetate": Product(8, 2, "liquid", "CH3COO-"),
    "acetaldehyde": Product(10, 2, "liquid", "CH3CHO"),
    "ethylene glycol": Product(10, 2, "liquid", "ethylene glycol"),
    "n-propanol": Product(18, 3, "liquid", "1-propanol"),
    "propionaldehyde": Product(16, 3, "liquid", "propanal"),
    "allyl alcohol": Product(16, 3, "liquid", "allyl alcohol"),
    "acetone": Product(16, 3, "liquid", "acetone"),
}


@cache
def water_vapour_pascal(temperature_kelvin: float) -> float:
    """Saturated vapour pressure of water by IAPWS-IF97, from the independent package iapws. [Pa]"""
    from iapws.iapws97 import _PSat_T

    return 1e6 * float(_PSat_T(temperature_kelvin))
