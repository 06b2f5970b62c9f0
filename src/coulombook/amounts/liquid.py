"""Liquid: integrals to amounts. Formulas only; every argument may be an array or `Linearised`.

Source of the internal-standard equation: Malz & Jancke, J. Pharm. Biomed. Anal. 38 (2005) 813.
"""

from __future__ import annotations

from coulombook.uncertainty.linearised import Number


def integral_per_proton(integral: Number, protons: Number) -> Number:
    """Integral of a signal over the protons that give it. [detector units]"""
    return integral / protons


def tube_amount_mol(amount_ratio: Number, standard_amount_mol: Number) -> Number:
    """Amount of analyte in the tube, from its ratio to the internal standard. [mol]"""
    return amount_ratio * standard_amount_mol


def concentration_mol_per_m3(tube_amount_mol: Number, aliquot_m3: Number) -> Number:
    """Concentration in the electrolyte that went into the tube. [mol/m^3]"""
    return tube_amount_mol / aliquot_m3


def amount_in_compartment_mol(
    concentration_mol_per_m3: Number, volume_m3: Number, withdrawn_mol: Number
) -> Number:
    """Amount made up to a sampling: what is in the compartment now plus what earlier samplings took away. [mol]"""
    return concentration_mol_per_m3 * volume_m3 + withdrawn_mol
