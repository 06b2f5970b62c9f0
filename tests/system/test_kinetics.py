"""Tafel slopes, onsets and drifts of whole days whose laws are known. Invented days."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import replace
from datetime import timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from tests.forward.days import GAS_CURVES, MORNING, hold
from tests.forward.files import Style, write_day
from tests.forward.truth import DayTruth, Error, Hold, Surface

import coulombook
from coulombook.book import Book

LEVELS = (-0.60, -0.68, -0.76, -0.84, -0.92)
# volts per decade, and mA/cm^2 at the first level
LAWS = {"carbon monoxide": (0.118, 0.06), "hydrogen": (0.150, 0.3)}
CATALYST = "mesh"


def current_of(product: str, potential: float) -> float:
    """Partial current density by the law of the product. [mA/cm^2]"""
    slope, first = LAWS[product]
    return float(first * 10.0 ** ((LEVELS[0] - potential) / slope))


def run_at(name: str, potential: float, limit: float = math.inf, **changes: Any) -> Hold:
    """A hold of half an hour at a constant potential, its currents limited by ``limit``. [mA/cm^2]"""
    currents = {product: 1.0 / (1.0 / current_of(product, potential) + 1.0 / limit) for product in LAWS}
    total = sum(currents.values())
    plain: dict[str, Any] = {
        "name": name,
        "time_second": np.array([0.0, 900.0, 1800.0]),
        "current_ampere": np.full(3, -1e-3 * total),
        "potential_rhe_volt": np.full(3, potential),
        "efficiency": {product: one / total for product, one in currents.items()},
        "catalyst": CATALYST,
        "electrode": "m1",
        "level": f"{potential:g} V",
        "started": MORNING + timedelta(hours=1),
        "start_second": None,
        "stop_second": None,
        "electrode_area_m2": 1e-4,
        "injections_second": (600.0, 1000.0, 1400.0, 1800.0),
        "compartments": (),
    }
    return hold(0, **{**plain, **changes})


def series_day(
    limit: float = math.inf, electrodes: Mapping[int, str] | None = None, **changes: Any
) -> DayTruth:
    """Two runs at each level, a few millivolts apart; ``electrodes`` names those of the two, m1 unless given."""
    names = electrodes or {}
    runs = tuple(
        run_at(
            f"r{number}{which}",
            potential - 0.004 * which,
            limit,
            level=f"{potential:g} V",
            electrode=names.get(which, "m1"),
        )
        for number, potential in enumerate(LEVELS)
        for which in range(2)
    )
    plain: dict[str, Any] = {"holds": runs, "gas_curves": GAS_CURVES}
    return DayTruth(**{**plain, **changes})


def tallied(folder: Path, day: DayTruth, style: Style | None = None) -> Book:
    return coulombook.tally(write_day(folder, day, style or Style()))


def kinetics(book: Book) -> dict[tuple[str, str], dict[str, Any]]:
    return {(str(row["product"]), str(row["basis"])): dict(row) for row in book.tables["kinetics"].records()}


def kinds(book: Book) -> set[str]:
    return {one.kind for one in book.findings}


@pytest.fixture(scope="module")
def plain(tmp_path_factory: pytest.TempPathFactory) -> Book:
    return tallied(tmp_path_factory.mktemp("plain"), series_day())


@pytest.mark.parametrize("product", LAWS)
def test_tafel_slopes_of_a_day_are_those_it_was_made_with(plain: Book, product: str) -> None:
    row = kinetics(plain)[product, "geometric"]
    # the files carry 17 digits; the slope is that of ten points on one line
    assert row["Tafel slope / mV"] == pytest.approx(1e3 * LAWS[product][0], rel=1e-6)
    assert row["verdict"] == "straight"
    assert (row["runs"], row["levels"], row["straight levels"]) == (10, 5, 5)
    assert row["range"] == "-0.6 V; -0.68 V; -0.76 V; -0.84 V; -0.92 V"
    assert row["from E vs RHE / V"] == pytest.approx(-0.60, abs=1e-6)
    assert row["to E vs RHE / V"] == pytest.approx(-0.924, abs=1e-6)
    assert 0.0 < row["u(Tafel slope) / mV"] < 5.0


def test_a_current_that_falls_has_neither_a_slope_nor_a_bound_of_one(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(LAWS, "carbon monoxide", (-0.3, 2.0))
    row = kinetics(tallied(tmp_path, series_day()))["carbon monoxide", "geometric"]
    assert row["verdict"] == "no rise"
    assert [row[f"Tafel slope{end} / mV"] for end in ("", " low", " high")] == [None, None, None]


def test_a_straight_day_has_no_finding_about_transport(plain: Book) -> None:
    assert not kinds(plain) & {"transport-limit", "falls-away", "drifting-run"}


def test_the_onset_of_a_day_lies_where_its_law_passes_the_stated_current(plain: Book) -> None:
    row = kinetics(plain)["carbon monoxide", "geometric"]
    slope, first = LAWS["carbon monoxide"]
    # the mean over replicates lies on the line as well: log j and E are averaged alike
    assert row["E onset vs RHE / V"] == pytest.approx(LEVELS[0] - slope * math.log10(0.1 / first), abs=1e-6)
    assert row["onset j / mA cm^-2"] == pytest.approx(0.1)
    assert kinetics(plain)["hydrogen", "geometric"]["onset"] == "below the lowest level"


def test_the_current_of_the_onset_is_a_setting_of_the_day(tmp_path: Path) -> None:
    book = tallied(tmp_path, series_day(), Style(settings='[kinetics]\nonset = "10 A/m^2"\n'))
    row = kinetics(book)["hydrogen", "geometric"]
    slope, first = LAWS["hydrogen"]
    assert row["onset j / mA cm^-2"] == pytest.approx(1.0)
    assert row["E onset vs RHE / V"] == pytest.approx(LEVELS[0] - slope * math.log10(1.0 / first), abs=1e-6)


def test_one_roughness_factor_leaves_the_slope_and_moves_the_onset(tmp_path: Path) -> None:
    day = series_day(surfaces={"m1": Surface(112e-6)}, specific_capacitance=0.28)
    found = kinetics(tallied(tmp_path, day))
    row = found["hydrogen", "real"]
    assert row["verdict"] == "as geometric"
    assert row["Tafel slope / mV"] is None
    slope, first = LAWS["hydrogen"]
    # 112 uF over 1 cm^2 and 28 uF/cm^2: the real current is a quarter
    assert row["E onset vs RHE / V"] == pytest.approx(LEVELS[0] - slope * math.log10(0.4 / first), abs=1e-5)


def test_two_roughness_factors_give_a_slope_of_their_own(tmp_path: Path) -> None:
    day = series_day(
        electrodes={0: "m1", 1: "m2"},
        surfaces={"m1": Surface(112e-6), "m2": Surface(56e-6)},
        specific_capacitance=0.28,
    )
    found = kinetics(tallied(tmp_path, day))
    assert found["hydrogen", "geometric"]["Tafel slope / mV"] == pytest.approx(150.0, rel=1e-6)
    assert found["hydrogen", "real"]["verdict"] == "straight"
    # two parallel lines, four millivolts apart and a factor of two in current: a line through both is nearly theirs
    assert found["hydrogen", "real"]["Tafel slope / mV"] == pytest.approx(150.0, rel=0.05)
    assert (
        found["hydrogen", "real"]["u(Tafel slope) / mV"]
        > found["hydrogen", "geometric"]["u(Tafel slope) / mV"]
    )


def test_a_limit_of_transport_is_found_and_cut_off(tmp_path: Path) -> None:
    book = tallied(tmp_path, series_day(limit=2.0))
    found = [one for one in book.findings if one.kind == "transport-limit"]
    assert [one.where for one in found] == [CATALYST]
    assert "carbon monoxide" in found[0].text
    assert "the CO2 used as a whole" in found[0].text
    row = kinetics(book)["carbon monoxide", "geometric"]
    assert row["verdict"] in ("falls away", "no straight range")
    assert row["straight levels"] < 5


def test_a_product_alone_that_falls_away_is_no_limit_of_transport(tmp_path: Path) -> None:
    day = series_day()
    # carbon monoxide gives way to ethylene, two CO2 each, so that the CO2 used keeps to its line
    given_way = (0.0, 0.15, 0.4, 0.7, 0.9)
    runs = []
    for one in day.holds:
        share = given_way[int(one.name[1])]
        carbon = one.efficiency["carbon monoxide"]
        currents = {
            "hydrogen": one.efficiency["hydrogen"],
            "carbon monoxide": (1.0 - share) * carbon,
            # c/n of ethylene is 2/12, of carbon monoxide 1/2
            "ethylene": 3.0 * share * carbon,
        }
        total = sum(currents.values())
        runs.append(
            replace(
                one,
                current_ampere=one.current_ampere * total,
                efficiency={name: value / total for name, value in currents.items() if value},
            )
        )
    book = tallied(tmp_path, replace(day, holds=tuple(runs)))
    assert "transport-limit" not in kinds(book)
    (found,) = (one for one in book.findings if one.kind == "falls-away")
    assert "carbon monoxide" in found.text


def test_a_run_that_uses_most_of_its_feed_is_told(tmp_path: Path) -> None:
    day = series_day()
    starved = replace(day.holds[-1], inlet_mol_per_s=5.5e-8)
    book = tallied(tmp_path, replace(day, holds=(*day.holds[:-1], starved)))
    (found,) = (one for one in book.findings if one.kind == "transport-limit")
    assert f"run {starved.name} uses" in found.text


@pytest.mark.parametrize(
    "style",
    [
        Style(shuffle=3),
        Style(units={"electrode area": "mm^2", "I": "uA", "E": "mV"}),
    ],
    ids=["order of rows", "units"],
)
def test_order_and_units_of_the_files_do_not_matter(plain: Book, tmp_path: Path, style: Style) -> None:
    found, other = kinetics(plain), kinetics(tallied(tmp_path, series_day(), style))
    assert set(found) == set(other)
    for key, row in found.items():
        for head in ("Tafel slope / mV", "u(Tafel slope) / mV", "E onset vs RHE / V", "u(E onset) / V"):
            assert other[key][head] == (None if row[head] is None else pytest.approx(row[head], rel=1e-6))


def test_an_error_of_the_flow_that_the_day_shares_does_not_widen_a_slope(tmp_path: Path) -> None:
    rows = []
    for size in (0.001, 0.2):
        day = series_day(
            errors=(Error("inlet flow", relative=size), Error("peak area", relative=0.01, shared="reading"))
        )
        rows.append(kinetics(tallied(tmp_path / str(size), day))["hydrogen", "geometric"])
    assert rows[1]["u(Tafel slope) / mV"] == pytest.approx(rows[0]["u(Tafel slope) / mV"], rel=1e-3)


# --- stability ---


def fading_day(per_hour: float, hours: float = 4.0) -> DayTruth:
    """One run whose current falls by a share of its first value per hour, at constant selectivity."""
    time = np.linspace(0.0, 3600.0 * hours, 241)
    current = -8e-3 * (1.0 - per_hour * time / 3600.0)
    run = run_at(
        "long",
        -0.8,
        time_second=time,
        current_ampere=current,
        potential_rhe_volt=np.full(len(time), -0.8),
        injections_second=tuple(np.linspace(600.0, 3600.0 * hours, 12)),
    )
    return DayTruth(holds=(run,), gas_curves=GAS_CURVES)


def stability(book: Book) -> dict[tuple[str, str], dict[str, Any]]:
    return {
        (str(row["product"]), str(row["quantity"])): dict(row) for row in book.tables["stability"].records()
    }


def test_the_drift_of_a_fading_run_is_that_of_its_current(tmp_path: Path) -> None:
    book = tallied(tmp_path, fading_day(0.05))
    found = stability(book)
    row = found["hydrogen", "j / mA cm^-2"]
    share = run_at("long", -0.8).efficiency["hydrogen"]
    # the window of two minutes before an injection lags by one
    assert row["drift / h^-1"] == pytest.approx(-8.0 * 0.05 * share, rel=1e-6)
    start = 8.0 * (1.0 - 0.05 * 540.0 / 3600.0) * share
    assert row["start"] == pytest.approx(start, rel=1e-6)
    assert row["time to 80 % / h"] == pytest.approx(0.2 * start / (8.0 * 0.05 * share), rel=1e-6)
    assert row["verdict"] == "by extension"
    assert row["earliest / h"] < row["time to 80 % / h"] < row["latest / h"]
    assert row["injections"] == 12
    assert row["span / h"] == pytest.approx((4.0 * 3600.0 - 600.0) / 3600.0)
    assert row["charge / C"] == pytest.approx(8e-3 * 4.0 * 3600.0 * 0.9, rel=1e-9)
    assert found["hydrogen", "FE / %"]["drift / h^-1"] == pytest.approx(0.0, abs=1e-6)
    assert found["hydrogen", "FE / %"]["verdict"] == "not reached"
    (told,) = (one for one in book.findings if one.kind == "drifting-run")
    assert "j -5" in told.text
    assert "FE" not in told.text


def test_a_steady_run_does_not_drift(tmp_path: Path) -> None:
    book = tallied(tmp_path, fading_day(0.0))
    assert "drifting-run" not in kinds(book)
    for row in book.tables["stability"].records():
        assert row["verdict"] == "not reached"
        assert row["time to 80 % / h"] is None
        assert isinstance(row["earliest / h"], float)


def test_the_sum_over_gas_products_has_a_row_of_its_own(tmp_path: Path) -> None:
    found = stability(tallied(tmp_path, fading_day(0.02)))
    assert found["gas total", "FE / %"]["mean"] == pytest.approx(100.0, rel=1e-6)
    # only one product of two carbons or more could be summed: none is
    assert ("gas C2+", "FE / %") not in found


def test_a_run_of_three_injections_has_no_row(plain: Book, tmp_path: Path) -> None:
    assert len(plain.tables["stability"]) > 0
    run = run_at("short", -0.8, injections_second=(600.0, 1200.0, 1800.0))
    assert len(tallied(tmp_path, DayTruth(holds=(run,), gas_curves=GAS_CURVES)).tables["stability"]) == 0


def test_a_headspace_that_still_fills_is_no_drift_of_the_current(tmp_path: Path) -> None:
    day = fading_day(0.0)
    filling = replace(day.holds[0], headspace_m3=400e-6)
    row = stability(tallied(tmp_path, replace(day, holds=(filling,))))["hydrogen", "j / mA cm^-2"]
    share = filling.efficiency["hydrogen"]
    # the convolution of the headspace is good to 1e-4
    assert row["start"] == pytest.approx(8.0 * share, rel=1e-3)
    assert abs(row["drift / h^-1"]) < 1e-3 * 8.0 * share
