"""Every declared uncertainty does to each result what moving its cells does: the day is written and tallied again.

Nothing of the package is used but its results. An error shared by the day moves all cells of a quantity together, one
shared by a run those of the run, and one of a reading each cell alone; independent errors add in squares.
"""

from __future__ import annotations

import copy
import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from tests.forward.days import EFFICIENCIES, GAS_CURVES, MORNING, hold, small_day, uneven_log
from tests.forward.files import Style, write_sheets
from tests.forward.tables import Sheets, sheets
from tests.forward.truth import Compartment, Curve, DayTruth, Drift, Error, Resonance, Surface

import coulombook

STEP = 1e-4  # of the standard uncertainty's size, either way: a central difference is then good to 1e-7
NEAR = 2e-5

# an uncertainty of nothing for one quantity of each group keeps the others from being assumed
SILENT = (
    Error("peak area", 0.0, shared="reading"),
    Error("integral", 0.0, shared="reading"),
    Error("I", 0.0, shared="day"),
)

AT = (MORNING.replace(hour=9, minute=0), MORNING.replace(hour=11, minute=30))
RATES = (0.02, 0.05, 0.1)
PLACES = (
    Compartment("catholyte", 0.9, (31e-6, 30e-6), (0.8e-6, 0.5e-6), (800.0, None)),
    Compartment("anolyte", 0.1, (25e-6,), (0.5e-6,), (None,)),
)
BENT = {
    ("TCD", "hydrogen"): Curve(0.41, 0.9, -2.2e-6, "quadratic"),
    ("FID", "carbon monoxide"): Curve(0.93, 0.7, 0.0, "line"),
    ("FID", "methane"): Curve(0.95),
    ("FID", "ethylene"): Curve(1.86, 0.4, 0.0, "line"),
    ("FID", "ethane"): Curve(1.89),
}


def _day(outlet_flow: str, **changes: Any) -> DayTruth:
    """Two runs of one catalyst at one level, which made the same, so that the series pools them without any scatter."""
    drift = {
        ("FID", "ethylene"): Drift(5e-4, AT, (1.02, 0.95)),
        ("TCD", "hydrogen"): Drift(2e-3, AT[:1], (0.97,)),
    }
    runs = [
        hold(
            number,
            **uneven_log(number + 3, rows=9, milliampere=(60.0, 45.0)[number]),
            catalyst="mesh",
            level="low",
            efficiency={name: share for name, share in EFFICIENCIES[0].items() if name != "n-propanol"},
            electrode=("m1", "s1")[number],
            compartments=PLACES,
            compensated=(0.3, 0.85)[number],
            temperature_kelvin=(298.15, 303.4)[number],
            pressure_pascal=(101325.0, 99.1e3)[number],
            headspace_m3=(None, 4e-5)[number],
            injections_second=(700.0, 1300.0),
            outlet_mol_per_s=13.9e-6 if outlet_flow in ("measured", "tracer") else None,
            tracer_mol_per_s=0.3e-6 if outlet_flow == "tracer" else None,
            carbonate_mol_per_s=0.4e-6 if outlet_flow == "balance" else 0.0,
        )
        for number in range(2)
    ]
    plain = small_day(
        outlet_flow=outlet_flow,
        drift=drift,
        blanks={"catholyte": {"formate": 0.05, "ethanol": 0.02}},
        gas_curves=BENT,
        resonances=(
            Resonance("formate", "CH", 1),
            Resonance("ethanol", "CH3", 3),
            Resonance("ethanol", "CH2", 2),
            Resonance("acetate", "CH3", 3),
        ),
        surfaces={
            "m1": Surface(1.7e-3, leakage_siemens=2e-5, samples=21, rates_volt_per_second=RATES),
            "s1": Surface(0.4e-3, 0.72e-4, offset_ampere=1e-6, samples=21, rates_volt_per_second=RATES),
        },
        specific_capacitance=0.28,
        feed_co2=0.9,
        dead_time_second=20.0,
        reference_volt_per_kelvin=-7e-4,
    )
    return replace(plain, holds=tuple(runs), **changes)


DAYS = {
    "inlet": (_day("inlet"), Style(units={"inlet flow": "sccm"})),
    "inlet by volume": (_day("inlet"), Style(units={"inlet flow": "mL/min"})),
    "wet": (_day("measured", meter_wet=True), Style(units={"outlet flow": "mL/min"})),
    "tracer": (
        _day("tracer", tracer="nitrogen", gas_curves={**BENT, ("TCD", "nitrogen"): Curve(0.37)}),
        Style(units={"tracer flow": "umol/s"}),
    ),
    "balance": (_day("balance"), Style(units={"inlet flow": "slpm"})),
    "electrode for smooth": (_day("inlet", specific_capacitance=None, smooth_reference="s1"), Style()),
}

# what is moved: tables that hold the quantity, and the size of its standard uncertainty
CELLS: dict[str, tuple[tuple[str, ...], Error]] = {
    "inlet flow": (("runs",), Error("inlet flow", 0.02)),
    "outlet flow": (("runs",), Error("outlet flow", 0.02)),
    "tracer flow": (("runs",), Error("tracer flow", 0.02)),
    "headspace": (("runs",), Error("headspace", 0.05)),
    "carbonate uptake": (("runs",), Error("carbonate uptake", 0.1)),
    "pH": (("runs",), Error("pH", absolute=0.1)),
    "temperature": (("runs",), Error("temperature", absolute=0.5, unit="K")),
    "pressure": (("runs",), Error("pressure", absolute=500.0, unit="Pa")),
    "resistance": (("runs",), Error("resistance", 0.05)),
    "compensated": (("runs",), Error("compensated", absolute=0.02)),
    "electrode area": (("runs", "scans"), Error("electrode area", 0.03)),
    "compartment volume": (("vials",), Error("compartment volume", absolute=0.3e-6, unit="mL")),
    "aliquot": (("vials",), Error("aliquot", 0.01)),
    "standard amount": (("vials",), Error("standard amount", 0.01)),
    "integral": (("liquid",), Error("integral", 0.02)),
    "peak area": (("gas", "checks"), Error("peak area", 0.01)),
    "mole fraction": (("checks",), Error("mole fraction", 0.01)),
    "scan rate": (("scans",), Error("scan rate", 0.01)),
    "time": (("gas",), Error("time", absolute=5.0, unit="s")),
}
ALWAYS = ["pH", "temperature", "resistance", "compensated", "electrode area"]
LIQUID = ["compartment volume", "aliquot", "standard amount", "integral"]
GAS = ["peak area", "mole fraction", "headspace", "time"]
CASES = [
    *(("inlet", quantity, "day") for quantity in [*ALWAYS, *LIQUID, *GAS, "inlet flow", "scan rate"]),
    *(
        ("inlet", quantity, "run")
        for quantity in ["inlet flow", "electrode area", *LIQUID, "peak area", "scan rate"]
    ),
    *(
        ("inlet", quantity, "reading")
        for quantity in ["inlet flow", "integral", "aliquot", "peak area", "scan rate"]
    ),
    ("inlet by volume", "temperature", "day"),
    ("inlet by volume", "pressure", "run"),
    *(("wet", quantity, "day") for quantity in ["outlet flow", "temperature", "pressure", "headspace"]),
    *(("tracer", quantity, "day") for quantity in ["tracer flow", "peak area", "headspace"]),
    ("tracer", "peak area", "reading"),
    *(
        ("balance", quantity, "day")
        for quantity in ["inlet flow", "carbonate uptake", "peak area", "integral"]
    ),
    ("balance", "carbonate uptake", "run"),
    ("electrode for smooth", "electrode area", "run"),
    ("electrode for smooth", "scan rate", "run"),
]

Key = tuple[str, ...]


@dataclass(frozen=True)
class Figures:
    """Values and their stated standard uncertainties, by table, row and head."""

    value: dict[Key, float]
    u: dict[Key, float]


WATCHED = (
    ("ledger", ("run", "product"), "FE / %"),
    ("ledger", ("run", "product"), "j / mA cm^-2"),
    ("ledger", ("run", "product"), "j real / mA cm^-2"),
    ("summary", ("run",), "E vs RHE / V"),
    ("summary", ("run",), "total FE / %"),
    ("summary", ("run",), "C2+ FE / %"),
    ("summary", ("run",), "C2+/C1"),
    ("summary", ("run",), "roughness factor"),
    ("injections", ("run", "injection", "product"), "FE / %"),
    ("series", ("catalyst", "level", "product"), "FE / %"),
    ("surface", ("electrode",), "capacitance / mF"),
    ("surface", ("electrode",), "roughness factor"),
    ("carbon", ("run",), "CO2 conversion / %"),
    ("efficiencies", ("run", "product"), "carbon efficiency / %"),
    ("efficiencies", ("run", "product"), "share of converted CO2 / %"),
    ("efficiencies", ("run", "product"), "cathodic energy efficiency / %"),
    ("efficiencies", ("run", "product"), "full-cell energy efficiency / %"),
)


def figures(book: coulombook.Book) -> Figures:
    value: dict[Key, float] = {}
    u: dict[Key, float] = {}
    for table, keys, head in WATCHED:
        frame = book.tables[table].frame()
        name, _, unit = head.partition(" / ")
        # C2+/C1 has no unit
        of_head = f"u({name})" + (f" / {unit}" if unit else "")
        for row in frame.to_dict("records"):
            key = (table, *(str(row[one]) for one in keys), head)
            if not pd.isna(row[head]):
                value[key] = float(row[head])
                u[key] = float(row[of_head])
    return Figures(value, u)


def tallied(
    folder: Path, day: DayTruth, cells: Sheets, style: Style, edit: tuple[str, str] | None = None
) -> Figures:
    write_sheets(folder, day, cells, style)
    if edit is not None:
        path = folder / "day.toml"
        text, count = re.subn(edit[0], edit[1], path.read_text(encoding="utf-8"))
        assert count == 1
        path.write_text(text, encoding="utf-8")
    return figures(coulombook.tally(folder))


def with_cell_voltage(cells: Sheets) -> Sheets:
    for columns in cells.traces.values():
        columns["U"] = 2.9 + 0.1 * np.sin(columns["t"] / 100.0)
    return cells


def declared(day: DayTruth, *errors: Error) -> DayTruth:
    quiet = tuple(one for one in SILENT if one.quantity not in {error.quantity for error in errors})
    return replace(day, errors=(*quiet, *errors))


def errors_of(cells: Sheets, tables: Sequence[str], quantity: str, shared: str) -> list[list[dict[str, Any]]]:
    """The rows that one error moves together, for each error."""
    rows = [row for table in tables for row in cells.tables.get(table, []) if row.get(quantity) is not None]
    if shared == "day":
        return [rows]
    if shared == "reading":
        return [[row] for row in rows]
    run_of = {row["vial"]: row["run"] for row in cells.tables.get("vials", [])}
    groups: dict[Any, list[dict[str, Any]]] = {}
    for number, row in enumerate(rows):
        run = row["run"] if "run" in row else run_of.get(row.get("vial"))
        # scans are the electrode's own; checks and blanks belong to no run
        owner = (
            ("run", run)
            if run is not None
            else ("electrode", row["electrode"])
            if "electrode" in row
            else ("", number)
        )
        if run is None and "vial" in row:
            owner = ("vial", row["vial"])
        groups.setdefault(owner, []).append(row)
    return list(groups.values())


def same_uncertainties(found: Figures, still: Figures, slopes: Iterable[dict[Key, float]]) -> None:
    """``slopes``: what each independent error of one standard uncertainty does to the values.

    ``still``: the same day without the declaration; what is uncertain there, as a capacitance by its methods, stays so.
    """
    square = dict.fromkeys(found.value, 0.0)
    for one in slopes:
        for key, moved in one.items():
            square[key] += moved**2
    assert max(square.values()) > 0.0, "nothing moves at all"
    for key, expected in square.items():
        whole = np.hypot(expected**0.5, still.u[key])
        assert found.u[key] == pytest.approx(whole, rel=NEAR, abs=1e-9 * abs(found.value[key])), key


def slope(up: Figures, down: Figures) -> dict[Key, float]:
    return {key: (up.value[key] - down.value[key]) / (2.0 * STEP) for key in up.value}


@pytest.mark.parametrize(("name", "quantity", "shared"), CASES)
def test_an_uncertainty_does_what_moving_its_cells_does(
    name: str, quantity: str, shared: str, tmp_path: Path
) -> None:
    truth, style = DAYS[name]
    if shared == "reading" and quantity != "scan rate":
        truth = replace(truth, holds=truth.holds[1:])  # cells are many
    tables, size = CELLS[quantity]
    day = declared(truth, replace(size, shared=shared))
    cells = with_cell_voltage(sheets(day))
    found = tallied(tmp_path / "plain", day, cells, style)
    still = tallied(tmp_path / "still", declared(truth), cells, style)
    slopes = []
    for number in range(len(errors_of(cells, tables, quantity, shared))):
        ends = []
        for sign in (1.0, -1.0):
            moved = copy.deepcopy(cells)
            for row in errors_of(moved, tables, quantity, shared)[number]:
                step = size.absolute if size.relative is None else size.relative * row[quantity]
                assert step is not None
                row[quantity] += sign * STEP * step
            ends.append(tallied(tmp_path / f"{number}{sign}", day, moved, style))
        slopes.append(slope(*ends))
    if quantity == "time":
        # between checks the drift moves with the clock, which the propagation leaves out: it is some per cent of this
        drifting = {key[1] for key in truth.drift}
        held = {
            key: value
            for key, value in found.value.items()
            if not drifting & set(key) and "FE / %" in key[-1]
        }
        held = {key: value for key, value in held.items() if key[0] in ("ledger", "injections")}
        found = Figures(held, found.u)
        slopes = [{key: moved for key, moved in one.items() if key in held} for one in slopes]
    same_uncertainties(found, still, slopes)


SETTINGS = {
    "potential": ("potential", 5e-3, "5 mV", r'potential = ".*"', 'potential = "{:.15g} V"', 0.210),
    "temperature coefficient": (
        "temperature coefficient", 1e-4, "0.1 mV/K", r'"temperature coefficient" = ".*"',
        '"temperature coefficient" = "{:.15g} V/K"', -7e-4,
    ),
    "standard temperature": (
        "standard temperature", 1.0, "1 K", r'standard_temperature = ".*"', 'standard_temperature = "{:.15g} K"',
        273.15,
    ),
    "standard pressure": (
        "standard pressure", 1e3, "1 kPa", r'standard_pressure = ".*"', 'standard_pressure = "{:.15g} Pa"', 101325.0,
    ),
    "dead time": ("dead time", 5.0, "5 s", r'dead_time = ".*"', 'dead_time = "{:.15g} s"', 20.0),
    "feed CO2": ("feed CO2", 0.01, "0.01", r"feed_CO2 = .*", "feed_CO2 = {:.15g}", 0.9),
    "specific capacitance": (
        "specific capacitance", 0.02, "2 uF/cm^2", r'specific_capacitance = ".*"',
        'specific_capacitance = "{:.15g} F/m^2"', 0.28,
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", SETTINGS)
def test_an_uncertain_setting_does_what_moving_it_does(name: str, tmp_path: Path) -> None:
    quantity, size, standard, pattern, text, value = SETTINGS[name]
    truth, style = DAYS["inlet"]
    day = declared(truth)
    bare = style
    entry = f'[[uncertainty]]\nquantity = "{quantity}"\nstandard = "{standard}"\nshared = "day"'
    style = replace(style, settings=entry)
    cells = with_cell_voltage(sheets(day))
    found = tallied(tmp_path / "plain", day, cells, style)
    still = tallied(tmp_path / "still", day, cells, bare)
    ends = [
        tallied(tmp_path / f"{sign}", day, cells, style, (pattern, text.format(value + sign * STEP * size)))
        for sign in (1.0, -1.0)
    ]
    same_uncertainties(found, still, [slope(*ends)])


@pytest.mark.parametrize(
    ("column", "error"),
    [
        ("I", Error("I", 0.01)),
        ("I", Error("I", absolute=2e-4, unit="mA")),
        ("E", Error("E", absolute=5e-3, unit="mV")),
        ("U", Error("U", absolute=2e-2, unit="mV")),
        ("U", Error("U", 0.01)),
    ],
)
@pytest.mark.parametrize("shared", ["day", "run"])
def test_an_error_of_the_log_does_what_moving_its_column_does(
    column: str, error: Error, shared: str, tmp_path: Path
) -> None:
    truth, style = DAYS["inlet"]
    day = declared(truth, replace(error, shared=shared))
    cells = with_cell_voltage(sheets(day))
    found = tallied(tmp_path / "plain", day, cells, style)
    still = tallied(tmp_path / "still", declared(truth), cells, style)
    electrodes = cells.tables["scans"]
    groups: list[tuple[set[str], set[str]]] = [({run}, set()) for run in cells.traces]
    groups += [
        (set(), {row["file"] for row in electrodes if row["electrode"] == name}) for name in truth.surfaces
    ]
    if shared == "day":
        groups = [(set(cells.traces), set(cells.scans))]
    slopes = []
    for number, (runs, scans) in enumerate(groups):
        ends = []
        for sign in (1.0, -1.0):
            moved = copy.deepcopy(cells)
            columns = [moved.traces[run] for run in runs]
            if column == "I" and error.relative is not None:
                columns += [moved.scans[file] for file in scans]
            for one in columns:
                step = error.absolute if error.relative is None else error.relative * one[column]
                one[column] = one[column] + sign * STEP * np.asarray(step)
            ends.append(tallied(tmp_path / f"{number}{sign}", day, moved, style))
        slopes.append(slope(*ends))
    same_uncertainties(found, still, slopes)


@pytest.mark.parametrize(
    ("error", "heads"),
    [
        (Error("I", absolute=2e-4, unit="mA", shared="reading"), ("FE / %",)),
        (Error("I", 0.01, shared="reading"), ("FE / %",)),
        (Error("E", absolute=5e-3, unit="mV", shared="reading"), ("E vs RHE / V",)),
    ],
)
def test_noise_of_single_samples_averages_down_as_moving_each_of_them_does(
    error: Error, heads: tuple[str, ...], tmp_path: Path
) -> None:
    # one injection and one sampling, of which the noise is that of one window each
    truth, style = DAYS["inlet"]
    one = replace(
        truth.holds[0],
        # one size for every sample's share of itself
        current_ampere=np.full(9, -0.05),
        injections_second=(700.0,),
        compartments=(
            replace(PLACES[0], share=1.0, volumes_m3=(3e-5,), aliquots_m3=(5e-7,), times_second=(None,)),
        ),
    )
    day = declared(replace(truth, holds=(one,), surfaces={}, specific_capacitance=None, blanks={}), error)
    cells = sheets(day)
    found = tallied(tmp_path / "plain", day, cells, style)
    still = tallied(tmp_path / "still", declared(replace(day, errors=())), cells, style)
    slopes = []
    columns = cells.traces[one.name]
    for number in range(len(columns["t"])):
        ends = []
        for sign in (1.0, -1.0):
            moved = copy.deepcopy(cells)
            values = moved.traces[one.name][error.quantity].copy()
            step = error.absolute if error.relative is None else error.relative * values[number]
            assert step is not None
            values[number] += sign * STEP * step
            moved.traces[one.name][error.quantity] = values
            ends.append(tallied(tmp_path / f"{number}{sign}", day, moved, style))
        slopes.append(slope(*ends))
    compared = {
        key: value
        for key, value in found.value.items()
        if key[-1] in heads and key[0] in ("ledger", "summary")
    }
    kept = [{key: moved for key, moved in one.items() if key in compared} for one in slopes]
    same_uncertainties(Figures(compared, found.u), still, kept)


def test_relaxation_times_move_what_is_counted_by_protons(tmp_path: Path) -> None:
    truth, style = DAYS["inlet"]
    style = replace(
        style,
        heads={"T1": "T1 / s", "repetition time": "repetition time / s", "flip angle": "flip angle / deg"},
        settings='[[uncertainty]]\nquantity = "T1"\nstandard = "10 %"\nshared = "reading"',
    )
    truth = replace(truth, holds=truth.holds[1:])  # cells are many
    # the group of liquid readings is declared by it
    day = replace(truth, errors=tuple(one for one in SILENT if one.quantity != "integral"), blanks={})
    cells = with_cell_voltage(sheets(day))
    for row in cells.tables["liquid"]:
        known = row["analyte"] != "formate"
        time = {"DMSO": 4.0, "ethanol": 6.0}.get(row["analyte"], 5.0)
        row.update({"T1": time, "repetition time": 9.0, "flip angle": 60.0} if known else {})
    found = tallied(tmp_path / "plain", day, cells, style)
    still = tallied(tmp_path / "still", declared(day), cells, replace(style, settings=""))
    slopes = []
    for number, row in enumerate(cells.tables["liquid"]):
        if "T1" not in row:
            continue
        ends = []
        for sign in (1.0, -1.0):
            moved = copy.deepcopy(cells)
            moved.tables["liquid"][number]["T1"] *= 1.0 + sign * STEP * 0.1
            ends.append(tallied(tmp_path / f"{number}{sign}", day, moved, style))
        slopes.append(slope(*ends))
    same_uncertainties(found, still, slopes)


def test_the_days_hold_what_they_are_to_show() -> None:
    assert set(GAS_CURVES) == set(BENT)
    for day, _ in DAYS.values():
        assert [one.headspace_m3 is None for one in day.holds] == [True, False]
