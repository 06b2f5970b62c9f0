"""Quantitative NMR: saturation by fast repetition and the internal standard.

Ernst & Anderson, Rev. Sci. Instrum. 37 (1966) 93; Malz & Jancke, J. Pharm. Biomed. Anal. 38 (2005) 813. The rows of
the internal standard are this project's own numbers.
"""

from __future__ import annotations

import math

import pytest
from scipy.optimize import minimize_scalar
from tests.published.reference import case

from coulombook.amounts.liquid import (
    amount_in_compartment_mol,
    concentration_mol_per_m3,
    integral_per_proton,
    tube_amount_mol,
)
from coulombook.curves.nmr import saturation_factor


def test_saturation_at_ninety_degrees() -> None:
    data = case("nmr_saturation")
    for ratio in data.inputs["TR_over_T1"]:
        data.expected[f"sat90_TR_{ratio}T1"].check(float(saturation_factor(float(ratio), 1.0, math.pi / 2)))


def test_saturation_at_other_angles() -> None:
    data = case("nmr_saturation")
    for degrees, ratio in data.inputs["flip_TR"]:
        found = float(saturation_factor(ratio, 1.0, math.radians(degrees)))
        data.expected[f"sat_{degrees:.0f}deg_TR_{ratio:.0f}T1"].check(found)


def test_strongest_signal_is_at_the_ernst_angle() -> None:
    best = minimize_scalar(
        lambda angle: -float(saturation_factor(1.0, 1.0, angle)), bounds=(0.5, 1.5), options={"xatol": 1e-12}
    )
    # a maximum is flat: its place is known to the root of the rounding
    published = case("nmr_saturation").expected["ernst_deg_TR_1T1"]
    assert math.degrees(best.x) == pytest.approx(published.published, abs=published.abs_tol)
    assert math.degrees(best.x) == pytest.approx(published.recomputed, rel=1e-6)


def test_internal_standard_gives_the_amount_in_the_cell() -> None:
    data = case("qnmr_internal_standard")
    given = data.inputs
    tube_m3 = (given["V_sample_uL"] + given["V_std_uL"]) * 1e-9
    standard = integral_per_proton(given["I_std"], given["N_std"])
    for name, integral in given["I"].items():
        ratio = integral_per_proton(integral, given["N"][name]) / standard
        tube_mol = tube_amount_mol(ratio, given["c_std_mM"] * tube_m3)
        data.expected[f"c_tube_{name}"].check(tube_mol / tube_m3)
        electrolyte = concentration_mol_per_m3(tube_mol, given["V_sample_uL"] * 1e-9)
        cell_mol = amount_in_compartment_mol(electrolyte, given["V_cell_mL"] * 1e-6, 0.0)
        data.expected[f"umol_cell_{name}"].check(cell_mol * 1e6)
