"""Days whose readings are made from published rows give the published figures back.

The tables and what speaks for their digits stand in hori_1994/SOURCE.md and hori_1989/SOURCE.md.
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from tests.forward.chemistry import PRODUCTS
from tests.forward.files import write_day
from tests.forward.truth import Compartment, Curve, DayTruth, Hold, Resonance

import coulombook

HERE = Path(__file__).resolve().parent
# Readings are written in full, so that what is printed comes back to the rounding of the arithmetic
ROUNDING_PERCENT = 1e-6

GAS = {name: Curve(0.9 + 0.1 * PRODUCTS[name].carbon) for name in PRODUCTS if PRODUCTS[name].phase == "gas"}
LIQUID = tuple(Resonance(name, "CH", 2) for name in PRODUCTS if PRODUCTS[name].phase == "liquid")


def _printed(folder: str) -> list[dict[str, str]]:
    with (HERE / folder / "printed.csv").open(encoding="utf-8") as handle:
        return list(csv.DictReader(handle))


def _efficiency(row: dict[str, str]) -> dict[str, float]:
    return {name: float(row[name]) / 100 for name in row if name in PRODUCTS and float(row[name])}


def _hold(name: str, row: dict[str, str], density: float, ph: float, celsius: float) -> Hold:
    time = np.array([0.0, 700.0, 1500.0, 2400.0])
    # E(RHE) = E(SHE) + (R T ln 10 / F) pH, the reading being against SHE itself
    rhe = float(row["E vs SHE / V"]) + 8.314462618 * (celsius + 273.15) * np.log(10) / 96485.33212 * ph
    return Hold(
        name=name,
        time_second=time,
        current_ampere=np.full(4, -10 * density * 1e-4),  # mA/cm^2 to A/m^2, times 1 cm^2
        potential_rhe_volt=np.full(4, rhe),
        efficiency=_efficiency(row),
        catalyst=name,
        electrode=name,
        level="printed",
        pH=ph,
        temperature_kelvin=celsius + 273.15,
        resistance_ohm=0.0,
        injections_second=(900.0, 1500.0, 2100.0),
        compartments=(Compartment("catholyte", 1.0, (60e-6,), (0.5e-6,), (None,)),),
    )


def _tally(holds: list[Hold], folder: Path) -> coulombook.Book:
    day = DayTruth(
        holds=tuple(holds),
        gas_curves={("FID", name): curve for name, curve in GAS.items()},
        resonances=LIQUID,
        reference_volt=0.0,
        title="Readings made from a published table",
    )
    return coulombook.tally(write_day(folder, day))


@pytest.fixture(scope="module")
def metals(tmp_path_factory: pytest.TempPathFactory) -> coulombook.Book:
    rows = _printed("hori_1994")
    holds = [_hold(row["metal"], row, float(row["j / mA cm^-2"]), 6.8, 18.5) for row in rows]
    return _tally(holds, tmp_path_factory.mktemp("hori_1994"))


@pytest.fixture(scope="module")
def electrolytes(tmp_path_factory: pytest.TempPathFactory) -> coulombook.Book:
    rows = _printed("hori_1989")
    holds = [_hold(row["electrolyte"], row, 5.0, float(row["pH"]), 19.0) for row in rows]
    return _tally(holds, tmp_path_factory.mktemp("hori_1989"))


def _assert_row(book: coulombook.Book, name: str, row: dict[str, str], density: float) -> None:
    ledger = book.ledger[book.ledger["run"] == name].set_index("product")
    printed = _efficiency(row)
    assert sorted(ledger.index) == sorted(printed)
    for product, share in printed.items():
        assert ledger.loc[product, "FE / %"] == pytest.approx(100 * share, abs=ROUNDING_PERCENT)
        assert ledger.loc[product, "j / mA cm^-2"] == pytest.approx(share * density, abs=ROUNDING_PERCENT)


@pytest.mark.parametrize("row", _printed("hori_1994"), ids=lambda row: row["metal"])
def test_faradaic_efficiencies_on_metals_come_back_as_printed(
    metals: coulombook.Book, row: dict[str, str]
) -> None:
    _assert_row(metals, row["metal"], row, float(row["j / mA cm^-2"]))


@pytest.mark.parametrize("row", _printed("hori_1994"), ids=lambda row: row["metal"])
def test_total_on_metals_is_the_printed_one(metals: coulombook.Book, row: dict[str, str]) -> None:
    total = metals.summary.set_index("run").loc[row["metal"], "total FE / %"]
    # the rows of Ag and Ga do not add up to their printed totals (by 0.1 and 0.2); all others do
    misprint = {"Ag": 0.1, "Ga": 0.2}.get(row["metal"], 0.0)
    assert total == pytest.approx(float(row["total"]), abs=misprint + 1e-5)


@pytest.mark.parametrize("row", _printed("hori_1994"), ids=lambda row: row["metal"])
def test_potential_on_metals_moves_to_the_hydrogen_scale(
    metals: coulombook.Book, row: dict[str, str]
) -> None:
    found = metals.summary.set_index("run").loc[row["metal"], "E vs RHE / V"]
    # R T ln 10 / F at 18.5 degC is 0.0578697 V, times pH 6.8
    assert found == pytest.approx(float(row["E vs SHE / V"]) + 0.0578697 * 6.8, abs=1e-6)


def test_copper_carbon_sums_and_ratio_are_those_of_the_row(metals: coulombook.Book) -> None:
    copper = metals.summary.set_index("run").loc["Cu"]
    assert copper["C1 FE / %"] == pytest.approx(33.3 + 1.3 + 9.4, abs=ROUNDING_PERCENT)
    assert copper["C2+ FE / %"] == pytest.approx(25.5 + 5.7 + 3.0 + 1.4 + 1.1 + 2.3, abs=ROUNDING_PERCENT)
    # 39.0/44.0 by charge; by amount each share over its electrons:
    # (25.5/12 + 5.7/12 + 3.0/18 + 1.4/16 + 1.1/10 + 2.3/16) / (33.3/8 + 1.3/2 + 9.4/2)
    assert copper["C2+/C1"] == pytest.approx(0.88636, abs=5e-6)
    assert copper["C2+/C1 molar"] == pytest.approx(0.32672, abs=5e-6)


@pytest.mark.parametrize(
    ("product", "density", "rate"),
    [
        # j_i = FE_i x 5 mA/cm^2, rate = j_i/(n F) in nmol/(s cm^2), worked to six digits
        ("methane", 1.665, 2.15706),
        ("ethylene", 1.275, 1.10120),
        ("ethanol", 0.285, 0.246151),
        ("n-propanol", 0.150, 0.0863689),
        ("carbon monoxide", 0.065, 0.336839),
        ("formate", 0.470, 2.43560),
        ("hydrogen", 1.025, 5.31169),
        ("allyl alcohol", 0.070, 0.0453437),
        ("acetaldehyde", 0.055, 0.0570035),
        ("propionaldehyde", 0.115, 0.0744932),
    ],
)
def test_copper_partial_currents_and_rates(
    metals: coulombook.Book, product: str, density: float, rate: float
) -> None:
    row = metals.ledger[metals.ledger["run"] == "Cu"].set_index("product").loc[product]
    assert row["j / mA cm^-2"] == pytest.approx(density, rel=1e-8)
    # amount over 2400 s on 1 cm^2; half of the sixth digit
    assert row["amount / umol"] / 2400 * 1e3 == pytest.approx(rate, rel=5e-6)


@pytest.mark.parametrize("metal", ["Hg", "Ti", "Fe"])
def test_metal_without_one_of_the_carbon_groups_has_no_false_ratio(
    metals: coulombook.Book, metal: str
) -> None:
    row = metals.summary.set_index("run").loc[metal]
    if metal == "Hg":  # formate alone: nothing of C2 and higher
        assert row["C2+/C1"] == pytest.approx(0.0, abs=1e-12)
    else:  # hydrogen alone: nothing to divide by
        assert np.isnan(row["C2+/C1"])


@pytest.mark.parametrize("row", _printed("hori_1989"), ids=lambda row: row["electrolyte"])
def test_faradaic_efficiencies_in_electrolytes_come_back_as_printed(
    electrolytes: coulombook.Book, row: dict[str, str]
) -> None:
    name = row["electrolyte"]
    _assert_row(electrolytes, name, row, 5.0)
    total = electrolytes.summary.set_index("run").loc[name, "total FE / %"]
    assert total == pytest.approx(float(row["total"]), abs=1e-5)


@pytest.mark.parametrize(
    ("electrolyte", "ratio"),
    [
        # (ethylene + ethanol + n-propanol) / (methane + carbon monoxide + formate), five digits
        ("0.1 M KHCO3", 40.0 / 41.1),
        ("0.1 M KCl", 73.3 / 20.6),
        ("0.5 M K2HPO4", 1.6 / 11.8),
    ],
)
def test_ratio_follows_the_electrolyte(electrolytes: coulombook.Book, electrolyte: str, ratio: float) -> None:
    found = electrolytes.summary.set_index("run").loc[electrolyte, "C2+/C1"]
    assert found == pytest.approx(ratio, rel=1e-8)
