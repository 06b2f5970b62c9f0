"""Reference electrodes against SHE at 25 degC, and their temperature coefficients.

Bard & Faulkner, Electrochemical Methods (2001); Sawyer, Sobkowiak & Roberts, Electrochemistry for Chemists
(1995), sect. 5.2 (15 to 35 degC from memory); Meites, Handbook of Analytical Chemistry (1963); Szabo &
Bakos, Int. J. Corros. 2010, 756950, table 2; Bates & Bower, J. Res. Natl. Bur. Stand. 53 (1954) 283
(polynomial from memory).
"""

from __future__ import annotations

import tomllib
from importlib.resources import files

import numpy as np
import pytest
from tests.published.reference import case

from coulombook.cell.potential import find_reference, nernst_slope_volt, potential_rhe_volt

# name -> values printed in tables at 25 degC; several where tables differ by the liquid junction or otherwise
PRINTED = {
    "SHE": (0.0,),
    "Ag/AgCl, sat. KCl": (0.197, 0.199),
    "Ag/AgCl, 3.5 mol/L KCl": (0.205,),
    "Ag/AgCl, 3 mol/L KCl": (0.207, 0.210, 0.213),
    "Ag/AgCl, 1 mol/L KCl": (0.2360,),
    "Ag/AgCl, 0.1 mol/L KCl": (0.2881, 0.2895),
    "SCE": (0.2412, 0.244),
    "calomel, 3.5 mol/L KCl": (0.250,),
    "calomel, 1 mol/L KCl": (0.2801, 0.283),
    "calomel, 0.1 mol/L KCl": (0.3337, 0.336),
    "Hg/HgO, 0.1 mol/L NaOH": (0.165,),
    "Hg/HgO, 1 mol/L NaOH": (0.098,),
    "Hg/Hg2SO4, sat. K2SO4": (0.64, 0.65),
    "Hg/Hg2SO4, 1 mol/L H2SO4": (0.6739,),
}
CELSIUS = np.array([15.0, 20.0, 25.0, 30.0, 35.0])
COLUMNS = {
    "Ag/AgCl, 3.5 mol/L KCl": (0.212, 0.208, 0.205, 0.201, 0.197),
    "Ag/AgCl, sat. KCl": (0.209, 0.204, 0.199, 0.194, 0.189),
    "SCE": (0.251, 0.248, 0.244, 0.241, 0.238),
    "calomel, 3.5 mol/L KCl": (0.254, 0.252, 0.250, 0.248, 0.246),
}
STANDARD = tomllib.loads(
    files("coulombook").joinpath("data", "reference_electrodes.toml").read_text(encoding="utf-8")
)["standard_potentials"]


@pytest.mark.parametrize("name", PRINTED)
def test_shipped_potential_is_a_printed_one(name: str) -> None:
    found = find_reference(name)
    assert found is not None
    assert found.potential_volt in PRINTED[name]


@pytest.mark.parametrize("name", COLUMNS)
def test_coefficient_is_the_slope_of_the_printed_column(name: str) -> None:
    found = find_reference(name)
    assert found is not None
    slope = np.polyfit(CELSIUS, COLUMNS[name], 1)[0]
    # five values of three digits, each off by up to 0.5 mV: the slope by up to 0.5 mV x sum |t - 25| / sum
    # (t - 25)^2 = 0.5 x 30 / 250 = 0.06 mV/K
    assert found.coefficient_volt_per_kelvin == pytest.approx(slope, abs=0.06e-3)


def test_silver_chloride_standard_potential_follows_bates_and_bower() -> None:
    data = case("agcl_bates_bower")
    for celsius in data.inputs["t_C"]:
        data.expected[f"E0_{celsius}C"].check(float(np.polynomial.Polynomial(data.inputs["coef"])(celsius)))
    polynomial = np.polynomial.Polynomial(data.inputs["coef"])
    assert STANDARD["Ag/AgCl"]["potential_volt"] == pytest.approx(polynomial(25.0), abs=0.5e-4)
    assert STANDARD["Ag/AgCl"]["coefficient_volt_per_kelvin"] == pytest.approx(
        polynomial.deriv()(25.0), abs=0.5e-6
    )


def test_mercury_oxide_stands_at_0_926_v_against_rhe() -> None:
    # HgO + H2 -> Hg + H2O (Gibbs energies of the CRC Handbook); unit activity of hydroxide is pH 13.995
    electrode = find_reference("Hg/HgO, 1 M KOH")
    assert electrode is not None
    published = case("hgo_rhe").expected["E_vs_RHE"]
    found = potential_rhe_volt(0.0, electrode.potential_volt, 13.995, 298.15, 0.0, 0.0, 0.0)
    assert found == pytest.approx(published.published, abs=published.abs_tol)
    assert found - electrode.potential_volt == pytest.approx(13.995 * nernst_slope_volt(298.15), rel=1e-12)
