"""The potential scale."""

from __future__ import annotations

import tomllib
from importlib.resources import files

import numpy as np
import pytest

from coulombook.cell.potential import (
    find_reference,
    nernst_slope_volt,
    potential_rhe_volt,
    reference_names,
    reference_potential_volt,
)

TABLE = tomllib.loads(
    files("coulombook").joinpath("data", "reference_electrodes.toml").read_text(encoding="utf-8")
)


@pytest.mark.parametrize(
    "name",
    [
        "Ag/AgCl, 3 mol/L KCl",
        "Ag/AgCl (3 M KCl)",
        "ag/agcl  3M kcl",
        "Ag/AgCl, 3.0 M KCl",
        "Ag/AgCl, 3 mol L^-1 KCl",
        "Ag/AgCl [3 mol dm-3 KCl]",
    ],
)
def test_spellings_of_one_electrode_are_found(name: str) -> None:
    found = find_reference(name)
    assert found is not None
    assert found.name == "Ag/AgCl, 3 mol/L KCl"
    assert found.potential_volt == 0.210


@pytest.mark.parametrize("name", ["Ag/AgCl", "RHE", "", "Ag/AgCl, 33 M KCl", "calomel"])
def test_ambiguous_or_unknown_electrode_is_not_guessed(name: str) -> None:
    assert find_reference(name) is None


def test_every_name_and_alias_leads_to_its_own_row() -> None:
    for row in TABLE["electrode"]:
        for name in (row["name"], *row["aliases"]):
            found = find_reference(name)
            assert found is not None
            assert found.name == row["name"], name
            assert found.source
            assert found.coefficient_source
    assert reference_names() == tuple(row["name"] for row in TABLE["electrode"])


def test_coefficients_called_derived_follow_from_the_standard_potentials() -> None:
    # constant activity a: E = E0 - (R T / n F) ln a, so dE/dT = dE0/dT + (E - E0)/T at T = 298.15 K
    derived = [row for row in TABLE["electrode"] if row["coefficient_source"] == "derived"]
    assert len(derived) >= 8
    for row in derived:
        standard = TABLE["standard_potentials"][row["standard"]]
        expected = (
            standard["coefficient_volt_per_kelvin"]
            + (row["potential_volt"] - standard["potential_volt"]) / 298.15
        )
        # given in steps of 0.01 mV/K
        assert row["coefficient_volt_per_kelvin"] == pytest.approx(expected, abs=0.5e-5), row["name"]


def test_potential_worked_by_hand() -> None:
    # -1.5 + 0.210 + 0.0591594 x 6.8 + 0.010 x 10 = -0.78772 V
    assert potential_rhe_volt(-1.5, 0.210, 6.8, 298.15, -0.010, 10.0, 0.0) == pytest.approx(
        -0.78772, abs=5e-6
    )


def test_compensated_part_of_the_drop_is_not_taken_off_twice() -> None:
    args = (-1.5, 0.210, 6.8, 298.15, -0.010, 10.0)
    whole, rest, none = (potential_rhe_volt(*args, f) for f in (0.0, 0.85, 1.0))
    # 10 mA x 10 ohm = 100 mV, of which 15 % are left
    assert whole - none == pytest.approx(0.100, abs=1e-15)
    assert rest - none == pytest.approx(0.015, abs=1e-15)


def test_anodic_current_moves_the_potential_the_other_way() -> None:
    assert potential_rhe_volt(1.0, 0.0, 0.0, 298.15, 0.010, 10.0, 0.0) == pytest.approx(0.9, abs=1e-15)


def test_reference_moves_with_temperature() -> None:
    # 10 K above 25 degC at -0.73 mV/K: 7.3 mV less
    assert reference_potential_volt(0.210, -0.73e-3, 308.15) == pytest.approx(0.2027, abs=1e-12)


def test_nernst_slope_grows_with_absolute_temperature() -> None:
    assert nernst_slope_volt(293.15) == pytest.approx(0.0581672, abs=5e-8)


def test_batches_of_draws_pass_through() -> None:
    draws = np.linspace(6.7, 6.9, 6).reshape(3, 2)
    result = potential_rhe_volt(
        np.array([-1.5, -1.6]), 0.21, draws, 298.15, np.array([-0.01, -0.02]), 10.0, np.zeros(2)
    )
    assert result.shape == (3, 2)
    assert result[0, 0] == pytest.approx(-1.5 + 0.21 + 0.05915935 * 6.7 + 0.1, abs=1e-7)
