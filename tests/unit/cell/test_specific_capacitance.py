"""The shipped table of specific capacitances."""

from __future__ import annotations

import math
import tomllib
from importlib.resources import files

import pytest

from coulombook.cell.specific_capacitance import (
    find_electrolyte,
    find_material,
    known_electrolytes,
    known_materials,
    specific_capacitance,
)

SHIPPED = tomllib.loads(
    files("coulombook").joinpath("data", "specific_capacitance.toml").read_text(encoding="utf-8")
)


def test_every_row_has_a_source_and_an_uncertainty_that_covers_its_span() -> None:
    for row in SHIPPED["row"]:
        assert SHIPPED["source"][row["source"]]["mark"]
        assert row["low"] < row["value"] < row["high"]
        # rectangular in the logarithm; printed to two digits
        expected = 0.5 * math.log(row["high"] / row["low"]) / math.sqrt(3.0)
        assert row["relative_uncertainty"] == pytest.approx(expected, abs=0.005)


@pytest.mark.parametrize(
    ("text", "kind"),
    [
        ("KOH", "alkali"),
        ("1 M NaOH", "alkali"),
        ("0.5 mol/L H2SO4", "acid"),
        ("0.1 M KHCO3, saturated with CO2", "bicarbonate"),
        ("Bicarbonate", "bicarbonate"),
        ("KOH and H2SO4", None),
        ("acetonitrile", None),
    ],
)
def test_electrolyte_is_known_by_name_or_recipe(text: str, kind: str | None) -> None:
    assert find_electrolyte(text) == kind


def test_material_is_known_by_name_or_symbol() -> None:
    assert find_material(" cu ") == find_material("Copper") == "copper"
    assert find_material("brass") is None
    assert known_materials() == ("general", "copper")
    assert known_electrolytes("Cu") == ("bicarbonate", "acid")


def test_value_comes_with_unit_uncertainty_and_source() -> None:
    found = specific_capacitance("Cu", "0.1 M KHCO3")
    assert found is not None
    # 29 uF/cm^2
    assert found.farad_per_m2 == pytest.approx(0.29, rel=1e-12)
    assert found.relative_uncertainty == 0.40
    assert "7231" in found.source
    assert specific_capacitance("copper", "KOH") is None
