"""A day drawn from a known truth without noise gives that truth back, in every mode of the file contract."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace
from datetime import timedelta
from pathlib import Path

import pandas as pd
import pytest
from tests.forward.chemistry import FARADAY, PRODUCTS
from tests.forward.days import EFFICIENCIES, GAS_CURVES, MORNING, RESONANCES, hold, small_day
from tests.forward.files import Dialect, Style, write_day
from tests.forward.truth import (
    Compartment,
    Curve,
    DayTruth,
    Drift,
    Expected,
    Hold,
    Resonance,
    Surface,
    expected,
    gas_reading,
    roughness,
)

import coulombook

EXACT = 1e-6  # files carry 17 digits; what is left is the rounding of the arithmetic, curve fits included
MIXED = 1e-4  # the headspace convolution may be evaluated numerically


@dataclass(frozen=True)
class Case:
    """One day, how it is written, and how nearly it must come back."""

    day: Callable[[], DayTruth]
    style: Style = field(default_factory=Style)
    relative: float = EXACT


def _drift_day() -> DayTruth:
    at = tuple(MORNING + timedelta(minutes=minutes) for minutes in (-30, 25, 55))
    drift = {
        ("FID", "carbon monoxide"): Drift(1e-3, at, (1.0, 0.96, 0.91)),
        ("FID", "ethylene"): Drift(5e-4, at, (1.02, 0.99, 0.94)),
        ("TCD", "hydrogen"): Drift(2e-3, at[:2], (1.0, 1.03)),  # held constant after the second check
    }
    return small_day(drift=drift)


def _measured(wet: bool) -> DayTruth:
    return small_day(
        {"outlet_mol_per_s": 14.1e-6, "temperature_kelvin": 295.65, "pressure_pascal": 99.2e3},
        outlet_flow="measured",
        meter_wet=wet,
    )


def _tracer(**holds: object) -> DayTruth:
    changes = {"outlet_mol_per_s": 13.7e-6, "outlet_trend": 0.015, "tracer_mol_per_s": 0.31e-6, **holds}
    return small_day(
        changes,
        outlet_flow="tracer",
        tracer="nitrogen",
        gas_curves={**GAS_CURVES, ("TCD", "nitrogen"): Curve(0.37)},
    )


def _balance(**holds: object) -> DayTruth:
    # a tenfold current, so that the products change the flow by several per cent
    runs = tuple(
        replace(one, current_ampere=10 * one.current_ampere, carbonate_mol_per_s=0.4e-6, **holds)
        for one in small_day().holds
    )
    return replace(small_day(outlet_flow="balance"), holds=runs)


def _liquid_places() -> tuple[Compartment, ...]:
    return (
        Compartment(
            "catholyte",
            0.86,
            (31.0e-6, 30.4e-6, 29.8e-6),
            (0.5e-6, 0.55e-6, 0.6e-6),
            (500.0, 1000.0, None),
        ),
        Compartment("anolyte", 0.09, (25.0e-6,), (0.4e-6,), (None,)),
        Compartment("trap", 0.05, (10.0e-6,), (0.5e-6,), (None,)),
    )


def _liquids() -> DayTruth:
    return small_day(
        {"compartments": _liquid_places()},
        standard="phenol",
        standard_resonances=(Resonance("phenol", "ortho", 2), Resonance("phenol", "meta", 2)),
        blanks={"catholyte": {"formate": 0.021, "ethanol": 0.013}, "anolyte": {"acetate": 0.004}},
    )


def _curved() -> DayTruth:
    return small_day(
        gas_curves={
            ("TCD", "hydrogen"): Curve(0.41, 0.9, -2.2e-6, "quadratic"),
            ("FID", "carbon monoxide"): Curve(0.93, 0.7, 0.0, "line"),
            ("FID", "methane"): Curve(0.95, 0.2, 0.0, "line", "1/x"),
            ("FID", "ethylene"): Curve(1.86, 0.0, 0.0, "line through zero", "1/x^2"),
            ("FID", "ethane"): Curve(1.89, 0.1, 3e-6, "quadratic", "1/x"),
        }
    )


def _liquid_curves() -> DayTruth:
    slopes = (0.93, 0.99, 0.96, 0.98, 0.97)
    curves = {
        (one.analyte, one.signal): Curve(
            slope, 0.002 * (number % 2), form=("line through zero", "line")[number % 2]
        )
        for number, (one, slope) in enumerate(zip(RESONANCES, slopes, strict=True))
    }
    return small_day(liquid_curves=curves)


def _surfaces(**changes: object) -> DayTruth:
    surfaces = {
        "m1": Surface(1.71e-3, offset_ampere=2e-6, leakage_siemens=4e-4, drift_ampere=-3e-5),
        "s1": Surface(0.21e-3, 0.72e-4, leakage_siemens=1e-5, margin_volt=0.05, cycles=3),
        "polished": Surface(28.4e-6, offset_ampere=1e-8, cycles=1),
    }
    return small_day(surfaces=surfaces, **changes)


GERMAN = Dialect(
    ";", ",", "cp1252", ("Prüfstand 2", "Elektrolyt: 0,1 mol/L; gesättigt"), "\r\n", trailing_blanks=True
)

CASES = {
    "inlet flow, sccm": Case(small_day),
    "inlet flow, slpm": Case(small_day, Style(units={"inlet flow": "slpm"})),
    "inlet flow, mL/min at the run's own temperature and pressure": Case(
        lambda: small_day({"temperature_kelvin": 295.15, "pressure_pascal": 97.4e3}),
        Style(units={"inlet flow": "mL/min"}),
    ),
    "inlet flow, umol/s": Case(small_day, Style(units={"inlet flow": "umol/s"})),
    "standard state of 25 degC and 1 bar": Case(
        lambda: small_day(standard_temperature_kelvin=298.15, standard_pressure_pascal=1e5)
    ),
    "measured dry outlet, sccm": Case(lambda: _measured(False)),
    "measured dry outlet, mL/min": Case(lambda: _measured(False), Style(units={"outlet flow": "mL/min"})),
    "measured wet outlet, mL/min": Case(lambda: _measured(True), Style(units={"outlet flow": "mL min^-1"})),
    "tracer": Case(_tracer),
    "balance": Case(_balance),
    "headspace": Case(lambda: small_day({"headspace_m3": 61e-6}), relative=MIXED),
    "headspace that has hardly filled": Case(
        lambda: small_day({"headspace_m3": 0.4e-3, "injections_second": (60.0, 180.0, 1200.0)}),
        relative=MIXED,
    ),
    "headspace much smaller than the flow": Case(lambda: small_day({"headspace_m3": 0.5e-6}), relative=MIXED),
    "headspace, dead time and other conditions": Case(
        lambda: small_day(
            {"headspace_m3": 61e-6, "temperature_kelvin": 293.15, "pressure_pascal": 103e3},
            dead_time_second=37.0,
        ),
        relative=MIXED,
    ),
    "headspace with balance": Case(lambda: _balance(headspace_m3=61e-6), relative=MIXED),
    "headspace with tracer": Case(lambda: _tracer(headspace_m3=61e-6), relative=MIXED),
    "dead time and a long current window": Case(
        lambda: small_day(dead_time_second=45.0, current_window_second=600.0)  # clipped at the window's start
    ),
    "drift by check gas": Case(_drift_day),
    "spoiled injections": Case(lambda: small_day({"spoiled": {1: 0.3}})),
    "blanks, aliquots, anolyte, trap and two signals of the standard": Case(_liquids),
    "line and quadratic gas curves": Case(_curved),
    "liquid curves": Case(_liquid_curves),
    "signals combined by plain mean": Case(
        _liquid_curves, Style(settings='[liquid]\ncombine_signals = "mean"')
    ),
    "set potential": Case(lambda: small_day({"set_potential_volt": -1.5, "level": None})),
    "set current": Case(lambda: small_day({"set_current_ampere": -0.012, "level": None})),
    "roughness from a specific capacitance": Case(lambda: _surfaces(specific_capacitance=0.28)),
    "roughness from a smooth electrode": Case(lambda: _surfaces(smooth_reference="polished")),
    "temperature coefficient of the reference": Case(
        lambda: small_day({"temperature_kelvin": 308.15}, reference_volt_per_kelvin=-0.73e-3)
    ),
    "diluted feed": Case(lambda: small_day(feed_co2=0.8)),
    "semicolons, decimal commas and free text": Case(small_day, Style(GERMAN, GERMAN, GERMAN, GERMAN)),
    "tabs, byte order mark": Case(
        small_day,
        Style(
            Dialect("\t", encoding="utf-8-sig", suffix=".tsv"),
            Dialect("\t", ",", "utf-8-sig", suffix=".txt"),
            calibrations=Dialect(encoding="utf-8-sig"),
        ),
    ),
    "UTF-16": Case(
        small_day,
        Style(
            Dialect(";", encoding="utf-16", quote=True),
            Dialect("\t", encoding="utf-16", preamble=("Zelle Ü",)),
            calibrations=Dialect(encoding="utf-16"),
        ),
    ),
    "workbook": Case(_liquids, Style(workbook=True)),
    "workbook with drift": Case(_drift_day, Style(workbook=True, aliases=True)),
    "workbook with scans": Case(
        lambda: _surfaces(specific_capacitance=0.28), Style(workbook=True, scans=GERMAN)
    ),
    "other units and spellings of heads": Case(
        lambda: _surfaces(specific_capacitance=0.28),
        Style(
            units={
                "t": "min", "E": "mV", "I": "uA", "electrode area": "mm^2", "temperature": "K",
                "pressure": "mbar", "resistance": "kohm", "time": "min", "compartment volume": "L",
                "aliquot": "uL", "standard amount": "nmol", "scan rate": "V/s", "window low": "mV",
                "start": "min", "stop": "h", "mole fraction": "percent",
            },
            heads={"t": "Time", "E": "potential", "I": "CURRENT", "electrode area": "Electrode   Area"},
            aliases=True,
        ),
    ),
    "rows in any order": Case(_liquids, Style(shuffle=3)),
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_truth_returns(name: str, tmp_path: Path) -> None:
    case = CASES[name]
    day = case.day()
    book = coulombook.tally(write_day(tmp_path / "a day", day, case.style))
    _assert_truth(book, day, case.relative)


def _assert_truth(book: coulombook.Book, day: DayTruth, relative: float) -> None:
    ledger, summary = book.ledger, book.summary.set_index("run")
    assert sorted(summary.index) == sorted(one.name for one in day.holds)
    for one in day.holds:
        truth = expected(day, one)
        rows = ledger[ledger["run"] == one.name].set_index("product")
        assert sorted(rows.index) == sorted(truth.efficiency)  # no carrier, no tracer, nothing lost
        for product, share in truth.efficiency.items():
            row = rows.loc[product]
            assert row["FE / %"] == pytest.approx(100 * share, rel=relative), product
            # A/m^2 to mA/cm^2 is a tenth
            assert row["j / mA cm^-2"] == pytest.approx(share * truth.current_density / 10, rel=relative)
            moles = share * truth.charge_coulomb / (PRODUCTS[product].electrons * FARADAY)
            assert row["amount / umol"] == pytest.approx(1e6 * moles, rel=relative)
            assert row["electrons"] == PRODUCTS[product].electrons
            assert row["phase"] == PRODUCTS[product].phase
            assert row["group"] == ("H2" if product == "hydrogen" else f"C{PRODUCTS[product].carbon}")
            if truth.roughness is not None:
                real = share * truth.current_density / 10 / truth.roughness
                assert row["j real / mA cm^-2"] == pytest.approx(real, rel=relative)
        _assert_summary(summary.loc[one.name], truth, relative)
    _assert_injections(book.injections, day, relative)
    _assert_surface(book.surface, day)


def _assert_summary(row: pd.Series, truth: Expected, relative: float) -> None:
    assert row["charge / C"] == pytest.approx(truth.charge_coulomb, rel=EXACT)
    assert row["E vs RHE / V"] == pytest.approx(truth.potential_rhe_volt, rel=EXACT)
    assert row["j / mA cm^-2"] == pytest.approx(truth.current_density / 10, rel=EXACT)
    assert row["total FE / %"] == pytest.approx(100 * truth.total, rel=relative)
    assert row["H2 FE / %"] == pytest.approx(100 * truth.group["H2"], rel=relative)
    assert row["C1 FE / %"] == pytest.approx(100 * truth.group["C1"], rel=relative)
    assert row["C2+ FE / %"] == pytest.approx(100 * truth.group["C2+"], rel=relative)
    assert row["C2+/C1"] == pytest.approx(truth.ratio, rel=relative)
    assert row["C2+/C1 molar"] == pytest.approx(truth.ratio_molar, rel=relative)
    if truth.conversion is not None:
        assert row["CO2 conversion / %"] == pytest.approx(100 * truth.conversion, rel=relative)
    if truth.roughness is not None:
        assert row["roughness factor"] == pytest.approx(truth.roughness, rel=EXACT)


def _assert_injections(injections: pd.DataFrame, day: DayTruth, relative: float) -> None:
    found = {(row["run"], str(row["injection"]), row["product"]): row for _, row in injections.iterrows()}
    for one in day.holds:
        for number in range(len(one.injections_second)):
            reading = gas_reading(day, one, number)
            for product in one.products("gas"):
                row = found[(one.name, str(number + 1), product)]
                assert row["time / s"] == pytest.approx(reading.time_second, rel=EXACT)
                assert row["outlet flow / umol/s"] == pytest.approx(
                    1e6 * reading.outlet_mol_per_s, rel=relative
                )
                assert row["used"] == ("no" if number in one.spoiled else "yes")
                if number not in one.spoiled:
                    fraction = 1e6 * reading.mole_fraction[product]
                    assert row["mole fraction / ppm"] == pytest.approx(fraction, rel=relative)
                    assert row["current / mA"] == pytest.approx(1e3 * reading.current_ampere, rel=relative)
                    assert row["FE / %"] == pytest.approx(100 * one.efficiency[product], rel=relative)


def _assert_surface(surface: pd.DataFrame, day: DayTruth) -> None:
    assert sorted(surface["electrode"]) == sorted(day.surfaces)
    rows = surface.set_index("electrode")
    for name, truth in day.surfaces.items():
        assert rows.loc[name, "capacitance / mF"] == pytest.approx(1e3 * truth.capacitance_farad, rel=EXACT)
        assert rows.loc[name, "roughness factor"] == pytest.approx(roughness(day, name), rel=EXACT)
        assert rows.loc[name, "linearity"] == pytest.approx(1.0, abs=EXACT)
        if truth.offset_ampere == 0:
            assert rows.loc[name, "exponent"] == pytest.approx(1.0, abs=EXACT)


def test_tracer_is_no_product(tmp_path: Path) -> None:
    book = coulombook.tally(write_day(tmp_path, _tracer()))
    assert "nitrogen" not in set(book.ledger["product"])
    assert "nitrogen" not in set(book.injections["product"])


def test_replicates_are_pooled_at_their_level(tmp_path: Path) -> None:
    twins: tuple[Hold, ...] = (
        hold(0, name="a", electrode="m1"),
        hold(0, name="b", electrode="m2", started=MORNING + timedelta(hours=1)),
        hold(1, name="c"),
    )
    series = coulombook.tally(write_day(tmp_path, replace(small_day(), holds=twins))).series
    mesh = series[series["catalyst"] == "mesh"].set_index("product")
    assert set(mesh["runs"]) == {2}
    assert set(mesh["level"]) == {"-1.5 V"}
    assert mesh.loc["ethylene", "FE / %"] == pytest.approx(100 * EFFICIENCIES[0]["ethylene"], rel=EXACT)
    # two equal truths without noise do not scatter
    assert mesh.loc["ethylene", "s(FE) / %"] == pytest.approx(0.0, abs=1e-6)
    foam = series[series["catalyst"] == "foam"].set_index("product")
    assert set(foam["runs"]) == {1}


def test_runs_without_a_level_share_their_set_potential(tmp_path: Path) -> None:
    runs = (
        hold(0, name="a", level=None, set_potential_volt=-1.5),
        hold(0, name="b", level=None, set_potential_volt=-1.5, started=MORNING + timedelta(hours=1)),
        hold(0, name="c", level=None, set_potential_volt=-1.6, started=MORNING + timedelta(hours=2)),
    )
    summary = coulombook.tally(write_day(tmp_path, replace(small_day(), holds=runs))).summary.set_index("run")
    assert summary.loc["a", "level"] == summary.loc["b", "level"]
    assert summary.loc["a", "level"] != summary.loc["c", "level"]


def test_defaults_fill_what_runs_leave_out(tmp_path: Path) -> None:
    day = small_day({"electrode_area_m2": 0.8e-4, "pH": 7.2, "start_second": None, "stop_second": None})
    plain = coulombook.tally(write_day(tmp_path / "plain", day))
    settings = '[defaults]\n"electrode area / mm^2" = 80\npH = 7.2\n'
    folder = write_day(tmp_path / "defaults", day, Style(settings=settings))
    lines = [line.split(",") for line in (folder / "runs.csv").read_text(encoding="utf-8").splitlines()]
    kept = [n for n, head in enumerate(lines[0]) if head not in ("pH", "electrode area / cm^2")]
    assert len(kept) == len(lines[0]) - 2
    text = "\n".join(",".join(line[n] for n in kept) for line in lines) + "\n"
    (folder / "runs.csv").write_text(text, encoding="utf-8")
    pd.testing.assert_frame_equal(coulombook.tally(folder).ledger, plain.ledger, rtol=1e-12)


def test_foreign_heads_of_a_trace_are_read_as_told(tmp_path: Path) -> None:
    day = small_day()
    german = Dialect(";", ",", "cp1252", suffix=".txt")
    told = '[read.traces]\ncolumns = { t = "Zeit [s]", E = "Spannung [V]", I = "Strom [mA]" }\n'
    folder = write_day(tmp_path, day, Style(traces=german, settings=told))
    for path in (folder / "traces").iterdir():
        text = path.read_text(encoding="cp1252")
        path.write_text(
            text.replace("t / s;E / V;I / mA", "Zeit [s];Spannung [V];Strom [mA]"), encoding="cp1252"
        )
    _assert_truth(coulombook.tally(folder), day, EXACT)


def test_current_density_in_a_trace_is_taken_with_the_area(tmp_path: Path) -> None:
    day = small_day()
    folder = write_day(tmp_path, day)
    for one in day.holds:
        path = folder / "traces" / f"{one.name}.csv"
        lines = path.read_text(encoding="utf-8").splitlines()
        rows = [line.split(",") for line in lines[1:]]
        area = one.electrode_area_m2 * 1e4
        dense = [f"{t},{e},{float(i) / area!r}" for t, e, i in rows]
        path.write_text("\n".join(["t / s,E / V,j / mA cm^-2", *dense]) + "\n", encoding="utf-8")
    _assert_truth(coulombook.tally(folder), day, EXACT)


def test_run_without_products_of_one_carbon_has_no_ratio_and_no_complaint(tmp_path: Path) -> None:
    one = hold(0, efficiency={"ethylene": 0.3, "hydrogen": 0.5}, compartments=())
    book = coulombook.tally(write_day(tmp_path, replace(small_day(), holds=(one,))))
    row = book.summary.iloc[0]
    assert pd.isna(row["C2+/C1"])
    assert pd.isna(row["u(C2+/C1)"])
    assert row["total FE / %"] == pytest.approx(80.0, rel=EXACT)
