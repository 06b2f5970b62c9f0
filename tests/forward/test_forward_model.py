"""The forward model itself, against working by hand and against a solver that knows nothing of it."""

from __future__ import annotations

import csv
from datetime import datetime
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from tests.forward.chemistry import FARADAY, GAS_CONSTANT, PRODUCTS, water_vapour_pascal
from tests.forward.files import Dialect, Style, write_day
from tests.forward.programme import PiecewiseLinear
from tests.forward.truth import (
    Compartment,
    Curve,
    DayTruth,
    Drift,
    Hold,
    Resonance,
    Surface,
    gas_reading,
    roughness,
)


def _hold(**changes: object) -> Hold:
    plain = {
        "name": "a1",
        "time_second": np.array([0.0, 1800.0, 3600.0]),
        "current_ampere": np.array([-0.010, -0.010, -0.010]),
        "potential_rhe_volt": np.full(3, -0.78772),
        "efficiency": {"carbon monoxide": 0.143490},
        "inlet_mol_per_s": 14.871678e-6,
        "injections_second": (1800.0,),
    }
    return Hold(**{**plain, **changes})  # type: ignore[arg-type] # keywords by name


def test_integral_of_a_ramp_is_its_triangle() -> None:
    ramp = PiecewiseLinear([0.0, 10.0], [0.0, 4.0])
    # between 2 and 6 the ramp rises from 0.8 to 2.4: mean 1.6 over 4
    assert ramp.integral(2.0, 6.0) == pytest.approx(6.4, rel=1e-14)
    assert ramp.mean(2.0, 6.0) == pytest.approx(1.6, rel=1e-14)


def test_stirred_vessel_agrees_with_a_differential_equation_solver() -> None:
    knots = np.array([0.0, 70.0, 75.0, 300.0, 420.0, 600.0])
    programme = PiecewiseLinear(knots, np.array([1.0, 1.2, 3.0, 2.0, 2.5, 0.4]))
    tau, content = 137.0, np.array([0.0])
    edges = [20.0, 70.0, 75.0, 300.0, 420.0, 511.0]  # solved piece by piece: the slope jumps at the knots
    for left, right in pairwise(edges):
        step = solve_ivp(
            lambda t, y: (programme.at(t) - y) / tau, (left, right), content, "DOP853", rtol=1e-12, atol=1e-14
        )
        content = step.y[:, -1]
    assert programme.mixed(20.0, 511.0, tau) == pytest.approx(float(content[0]), rel=1e-10)


def test_stirred_vessel_under_constant_feed_fills_exponentially() -> None:
    programme = PiecewiseLinear([0.0, 50.0, 100.0], [2.0, 2.0, 2.0])
    assert programme.mixed(0.0, 80.0, 40.0) == pytest.approx(2.0 * (1 - np.exp(-2.0)), rel=1e-14)


def test_mole_fraction_of_the_miniature_day_is_500_ppm() -> None:
    day = DayTruth(holds=(_hold(),), gas_curves={("FID", "carbon monoxide"): Curve(0.1)})
    reading = gas_reading(day, day.holds[0], 0)
    # 0.143490 x 0.010 A / (2 F) / 14.871678 umol/s = 500 ppm; six digits of the efficiency are given
    assert reading.mole_fraction["carbon monoxide"] == pytest.approx(500e-6, rel=5e-6)


def test_outlet_of_a_balance_accounts_for_every_carbon_and_every_molecule() -> None:
    hold = _hold(
        efficiency={"hydrogen": 0.4, "ethylene": 0.3, "formate": 0.1, "ethanol": 0.1},
        carbonate_mol_per_s=0.7e-6,
        current_ampere=np.full(3, -0.25),
    )
    day = DayTruth(holds=(hold,), outlet_flow="balance")
    reading = gas_reading(day, hold, 0)
    rate = {
        name: share * 0.25 / (PRODUCTS[name].electrons * FARADAY) for name, share in hold.efficiency.items()
    }
    co2_left = 14.871678e-6 - 2 * rate["ethylene"] - rate["formate"] - 2 * rate["ethanol"] - 0.7e-6
    outlet = co2_left + rate["hydrogen"] + rate["ethylene"]
    assert reading.outlet_mol_per_s == pytest.approx(outlet, rel=1e-13)
    x = reading.mole_fraction
    assert x["hydrogen"] == pytest.approx(rate["hydrogen"] / outlet, rel=1e-13)
    # the contract's own form: n_out = (n_in - liquids - carbonate) / (1 - sum (1 - c_i) x_i)
    net = 14.871678e-6 - rate["formate"] - 2 * rate["ethanol"] - 0.7e-6
    assert net / (1 - (x["hydrogen"] - x["ethylene"])) == pytest.approx(outlet, rel=1e-13)


def test_aliquots_taken_earlier_are_missing_later(tmp_path: Path) -> None:
    places = (Compartment("catholyte", 1.0, (30e-6, 29e-6), (1e-6, 0.5e-6), (1800.0, None)),)
    day = DayTruth(
        holds=(_hold(efficiency={"formate": 0.5}, compartments=places),),
        resonances=(Resonance("formate", "CH", 1),),
    )
    write_day(tmp_path, day)
    with (tmp_path / "liquid.csv").open() as handle:
        rows = [row for row in csv.DictReader(handle) if row["analyte"] == "formate"]
    made = 0.5 * 18 / (2 * FARADAY)  # mol in the first half hour
    first = made / 30e-6
    second = (2 * made - first * 1e-6) / 29e-6
    standards = (57.0 * 0.2, 64.0 * 0.2)  # integral per proton of the standard in the first and second tube
    for row, concentration, aliquot, standard in zip(
        rows, (first, second), (1e-6, 0.5e-6), standards, strict=True
    ):
        expected = concentration * aliquot / 0.2e-6 * standard
        assert float(row["integral"]) == pytest.approx(expected, rel=1e-12)


def test_wet_meter_reads_the_vapour_as_well(tmp_path: Path) -> None:
    hold = _hold(outlet_mol_per_s=15e-6, temperature_kelvin=298.15)
    day = DayTruth(holds=(hold,), outlet_flow="measured", meter_wet=True)
    write_day(tmp_path, day, Style(units={"outlet flow": "mL/min"}))
    with (tmp_path / "runs.csv").open() as handle:
        row = next(csv.DictReader(handle))
    wet = 15e-6 * GAS_CONSTANT * 298.15 / (101325 - 3169.747) * 60e6  # p_w(25 degC) by IAPWS-IF97
    assert float(row["outlet flow / mL/min"]) == pytest.approx(wet, rel=1e-7)
    assert water_vapour_pascal(298.15) == pytest.approx(3169.7468549523626, rel=1e-9)


def test_roughness_is_the_capacitance_over_the_smooth_one() -> None:
    surfaces = {"rough": Surface(560e-6), "smooth": Surface(14e-6, electrode_area_m2=0.5e-4)}
    assert roughness(DayTruth((), surfaces=surfaces, smooth_reference="smooth"), "rough") == pytest.approx(
        20.0
    )
    assert roughness(DayTruth((), surfaces=surfaces, specific_capacitance=0.28), "rough") == pytest.approx(
        20.0
    )


def test_dialect_changes_bytes_and_not_cells(tmp_path: Path) -> None:
    day = DayTruth(holds=(_hold(),))
    german = Dialect(
        ";", ",", "utf-16", ("Prüfling: Netz", "Messung;1,5"), "\r\n", trailing_blanks=True, suffix=".txt"
    )
    write_day(tmp_path, day, Style(traces=german))
    lines = (tmp_path / "traces" / "a1.txt").read_bytes().decode("utf-16").split("\r\n")
    assert lines[:3] == ["Prüfling: Netz", "Messung;1,5", "t / s;E / V;I / mA;;"]
    assert lines[3].startswith("0;-1,5")
    assert float(lines[3].split(";")[1].replace(",", ".")) == pytest.approx(-1.5, abs=1e-5)
    assert lines[6] == ";;;;"


def test_drift_lies_on_the_line_between_two_checks() -> None:
    drift = Drift(1e-3, (datetime(2043, 5, 18, 8), datetime(2043, 5, 18, 10)), (1.0, 0.9))
    assert drift.at_time(datetime(2043, 5, 18, 8, 30)) == pytest.approx(0.975)
    assert drift.at_time(datetime(2043, 5, 18, 12)) == pytest.approx(0.9)
