"""The day in miniature judged: what is assumed about it, its carbon and energy, its closure; worked by hand."""

from __future__ import annotations

import math
from collections.abc import Callable
from pathlib import Path

import pytest
from tests.system.test_miniature_day import FILES

import coulombook
from coulombook.book import Cell

Tally = Callable[..., coulombook.Book]
EXACT = "".join(
    f'[[uncertainty]]\nquantity = "{quantity}"\nstandard = "0 %"\nshared = "day"\n'
    for quantity in ("peak area", "integral", "I")
)


@pytest.fixture
def tally(tmp_path: Path) -> Tally:
    """Tally the day with more in day.toml, or with other files."""

    def write_and_tally(settings: str = "", **files: str) -> coulombook.Book:
        for name, text in {**FILES, **files}.items():
            path = tmp_path / name
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_text(text + (settings if name == "day.toml" else ""), encoding="utf-8")
        return coulombook.tally(tmp_path)

    return write_and_tally


def row(book: coulombook.Book, table: str, **keys: str) -> dict[str, Cell]:
    return next(
        one for one in book.tables[table].records() if all(one[key] == value for key, value in keys.items())
    )


def number(cell: Cell) -> float:
    assert isinstance(cell, int | float)
    return float(cell)


def test_undeclared_uncertainties_are_assumed_and_told(tally: Tally) -> None:
    book = tally()
    told = {
        one.where.removeprefix("day.toml, ") for one in book.findings if one.kind == "assumed-uncertainty"
    }
    assert told == {
        "inlet flow", "peak area", "integral", "standard amount", "compartment volume", "aliquot", "I",
    }  # fmt: skip
    gas = row(book, "ledger", product="carbon monoxide")
    # 1 % of flow, 1 % of the area, 0.2 % of current; the curve runs through its standards
    relative = math.sqrt(0.01**2 + 0.01**2 + 0.002**2)
    assert number(gas["u(FE) / %"]) == pytest.approx(relative * number(gas["FE / %"]), rel=1e-6)
    liquid = row(book, "ledger", product="formate")
    # 2 % of either integral, 1 % standard, 1 % volume, 0.5 % aliquot, 0.2 % charge
    relative = math.sqrt(2 * 0.02**2 + 0.01**2 + 0.01**2 + 0.005**2 + 0.002**2)
    assert number(liquid["u(FE) / %"]) == pytest.approx(relative * number(liquid["FE / %"]), rel=1e-6)


def test_a_stated_zero_stays_zero(tally: Tally) -> None:
    book = tally(EXACT)
    kinds = {one.kind for one in book.findings}
    assert not kinds & {"assumed-uncertainty", "uncertainty-not-used"}
    assert all(
        number(one["u(FE) / %"]) == pytest.approx(0.0, abs=1e-9) for one in book.tables["ledger"].records()
    )
    assert row(book, "summary", run="a1")["closure"] == "short"


def test_what_one_group_declares_leaves_the_others_assumed(tally: Tally) -> None:
    book = tally('[[uncertainty]]\nquantity = "peak area"\nstandard = "3 %"\nshared = "reading"\n')
    told = {
        one.where.removeprefix("day.toml, ") for one in book.findings if one.kind == "assumed-uncertainty"
    }
    assert "I" in told
    assert not told & {"inlet flow", "peak area"}
    gas = row(book, "ledger", product="carbon monoxide")
    relative = math.sqrt(0.03**2 + 0.002**2)
    assert number(gas["u(FE) / %"]) == pytest.approx(relative * number(gas["FE / %"]), rel=1e-6)


def test_carbon_of_the_miniature_day(tally: Tally) -> None:
    book = tally()
    carbon = row(book, "carbon", run="a1")
    # 500 ppm of CO, twice 100 ppm of ethylene, and 30 umol of formate in 3600 s, of 14.871678 umol/s fed
    formate = 30.0 / 3600.0 / 14.871678
    assert number(carbon["CO2 conversion / %"]) == pytest.approx(0.05 + 0.02 + 100 * formate, rel=1e-6)
    # 0.01 A / (2 x 96485.332 C/mol) over the feed
    assert number(carbon["carbonate bound / %"]) == pytest.approx(
        100 * 0.01 / (2 * 96485.33212) / 14.871678e-6, rel=1e-6
    )
    # by the balance the outlet is (feed - formate) / (1 + 100 ppm): ethylene makes one molecule of two
    outlet = (1.0 - formate) / (1.0 + 100e-6)
    total = (14.3490 + 17.2188) * outlet + 16.0809
    assert carbon["outlet flow by"] == "balance"
    assert number(carbon["total FE at outlet flow / %"]) == pytest.approx(total, abs=1.5e-4)  # printed digits
    assert number(carbon["total FE at inlet flow / %"]) == pytest.approx(47.6487, abs=5e-5)
    assert "flow-matters" not in {one.kind for one in book.findings}
    shares = {one["product"]: one for one in book.tables["efficiencies"].records()}
    assert number(shares["carbon monoxide"]["carbon efficiency / %"]) == pytest.approx(0.05, rel=1e-6)
    assert number(shares["ethylene"]["carbon efficiency / %"]) == pytest.approx(0.02, rel=1e-6)
    assert sum(number(one["share of converted CO2 / %"]) for one in shares.values()) == pytest.approx(100.0)


def test_a_measured_outlet_flow_is_held_against_the_inlet_flow_taken_for_it(tally: Tally) -> None:
    runs = (
        "run,catalyst,electrode,electrode area / cm^2,pH,resistance / ohm,inlet flow / sccm,outlet flow / sccm\n"
        "a1,mesh,m1,1.0,6.8,10,20,15\n"
    )
    book = tally(**{"runs.csv": runs})
    carbon = row(book, "carbon", run="a1")
    assert carbon["outlet flow by"] == "measured"
    # three quarters of the gas products
    total = 0.75 * (14.3490 + 17.2188) + 16.0809
    assert number(carbon["total FE at outlet flow / %"]) == pytest.approx(total, abs=1.5e-4)
    # -7.9 %, and the total's u is near 0.7 %
    told = next(one for one in book.findings if one.kind == "flow-matters")
    assert "would move by -7.9 %" in told.text


def test_energy_of_the_miniature_day(tally: Tally) -> None:
    # the log counts the voltage from the other electrode
    trace = "t / s,E / V,I / mA,U / V\n0,-1.5,-10,-2.9\n1800,-1.5,-10,-3.0\n3600,-1.5,-10,-3.1\n"
    book = tally(
        '[[uncertainty]]\nquantity = "U"\nstandard = "10 mV"\nshared = "day"\n', **{"traces/a1.csv": trace}
    )
    one = row(book, "efficiencies", product="carbon monoxide")
    # CO: G = -137.2, CO2: -394.4, water: -237.1 kJ/mol (CRC), and nothing of it moves with pH
    equilibrium = -(-137.2 - 237.1 + 394.4) * 1e3 / (2 * 96485.33212)
    assert number(one["E equilibrium vs RHE / V"]) == pytest.approx(equilibrium, abs=1e-9)
    stored = 0.143490 * (1.2286841677 - equilibrium)
    assert number(one["cathodic energy efficiency / %"]) == pytest.approx(
        100 * stored / (1.2286841677 + 0.78772), abs=5e-4
    )
    assert number(one["full-cell energy efficiency / %"]) == pytest.approx(100 * stored / 3.0, abs=5e-4)
    # 10 mV of 3 V beside the 1.43 % of FE
    relative = math.sqrt(0.01**2 + 0.01**2 + 0.002**2 + (0.01 / 3.0) ** 2)
    assert number(one["u(full-cell energy efficiency) / %"]) == pytest.approx(
        relative * number(one["full-cell energy efficiency / %"]), rel=1e-6
    )
    assert "uncertainty-not-used" not in {found.kind for found in book.findings}


def test_energy_of_a_day_without_cell_voltage_is_that_of_the_cathode(tally: Tally) -> None:
    one = row(tally(), "efficiencies", product="formate")
    assert one["full-cell energy efficiency / %"] is None
    assert number(one["cathodic energy efficiency / %"]) > 0
    # formate moves with pH against RHE: -0.024 V at pH 6.8 (from memory of the tables of the trade)
    assert number(one["E equilibrium vs RHE / V"]) == pytest.approx(-0.024, abs=5e-4)


def test_closure_of_the_only_run_is_that_of_the_day(tally: Tally) -> None:
    run, day = tally().tables["closure"].records()
    deviation = number(run["deviation / u"])
    assert deviation == pytest.approx((47.6487 - 100) / number(run["u(total FE) / %"]), rel=1e-5)
    assert (run["closure"], day["closure"], day["run"]) == ("short", "open", None)
    # one constraint: chi-square is the square of it
    assert number(day["chi-square"]) == pytest.approx(deviation**2, rel=1e-9)
    assert day["degrees of freedom"] == 1
