"""Stated uncertainty is true: over many drawn days (FE - truth)/u scatters like a standard normal variable.

The truth stays, the errors are drawn anew each day just as they are declared: one error of the flow meter and
of the internal standard for the whole day, errors of a run, errors of single readings, and standards of the
calibration that scatter, so that each day has curves of its own.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from datetime import timedelta
from pathlib import Path

import numpy as np
import pytest
from tests.forward.days import GAS_CURVES, MORNING, RESONANCES, hold, small_day
from tests.forward.files import write_day
from tests.forward.truth import Compartment, Curve, DayTruth, Drift, Error, Standards, expected

import coulombook

pytestmark = pytest.mark.slow  # 600 days, about a minute and a half

DAYS = 200
# The root mean square of n independent standard normals has the standard deviation 1/sqrt(2 n): 5 % for 200
# days, less for classes with several nearly independent members. The band is the one the project promises.
LOW, HIGH = 0.9, 1.1

READINGS = (
    Error("peak area", relative=0.010, shared="reading"),
    Error("integral", relative=0.012, shared="reading"),
    Error("aliquot", relative=0.007, shared="reading"),
    Error("compartment volume", relative=0.008, shared="run"),
    Error("standard amount", relative=0.010, shared="day"),
    Error("electrode area", relative=0.020, shared="run"),
)

SIXTEEN_PPM = tuple(np.geomspace(20.0, 15000.0, 16).round(2).tolist())
SIXTEEN_RATIOS = tuple(np.geomspace(0.02, 10.0, 16).round(4).tolist())


def _scattered(
    curves: dict[tuple[str, str], Curve], x: tuple[float, ...]
) -> dict[tuple[str, str], Standards]:
    """Standards whose response scatters by 3 %: what 1/x^2 weights are made for."""
    return {key: Standards(x, sd_relative=0.03) for key in curves}


def _plain_day() -> DayTruth:
    """Two pieces of one catalyst with the same truth, and one of another."""
    gas = {
        ("TCD", "hydrogen"): Curve(0.41, form="line through zero", weights="1/x^2"),
        ("FID", "carbon monoxide"): Curve(0.93, 0.3, form="line", weights="1/x^2"),
        ("FID", "methane"): Curve(0.95, form="line through zero", weights="1/x^2"),
        ("FID", "ethylene"): Curve(1.86, 0.4, form="line", weights="1/x^2"),
        ("FID", "ethane"): Curve(1.89, form="line through zero", weights="1/x^2"),
    }
    liquid = {
        (one.analyte, one.signal): Curve(0.96, form="line through zero", weights="1/x^2")
        for one in RESONANCES
    }
    day = small_day(
        gas_curves=gas,
        gas_standards=_scattered(gas, SIXTEEN_PPM),
        liquid_curves=liquid,
        liquid_standards=_scattered(liquid, SIXTEEN_RATIOS),
        errors=(
            Error("inlet flow", relative=0.015, shared="day"),
            Error("inlet flow", relative=0.005, shared="run"),
            *READINGS,
        ),
    )
    again = hold(0, name="again", electrode="m2", started=MORNING + timedelta(hours=2))
    return replace(day, holds=(*day.holds, again))


def _full_day() -> DayTruth:
    """Headspace, balance, drift, blanks, several compartments, curves with equal weights."""
    gas = {
        ("TCD", "hydrogen"): Curve(0.41, 4.0, -3e-6, form="quadratic"),
        ("FID", "carbon monoxide"): Curve(0.93, 2.0, form="line"),
        ("FID", "methane"): Curve(0.95, form="line through zero", weights="1/x^2"),
        ("FID", "ethylene"): Curve(1.86, form="line through zero"),
        ("FID", "ethane"): Curve(1.89, form="line through zero", weights="1/x^2"),
    }
    linear_ppm = tuple(np.linspace(500.0, 15000.0, 20).tolist())
    standards = {key: Standards(linear_ppm, sd_absolute=30.0 * curve.a1) for key, curve in gas.items()}
    # traces are calibrated for traces
    standards["FID", "methane"] = Standards(SIXTEEN_PPM, sd_relative=0.03)
    standards["FID", "ethane"] = Standards(SIXTEEN_PPM, sd_relative=0.03)
    at = (MORNING - timedelta(minutes=20), MORNING + timedelta(minutes=80))
    places = (
        Compartment("catholyte", 0.9, (31e-6, 30e-6), (0.8e-6, 0.5e-6), (800.0, None)),
        Compartment("anolyte", 0.1, (25e-6,), (0.5e-6,), (None,)),
    )
    runs = tuple(
        replace(
            hold(number),
            current_ampere=8 * hold(number).current_ampere,
            compartments=places,
            headspace_m3=40e-6,
            carbonate_mol_per_s=0.5e-6,
        )
        for number in range(2)
    )
    return replace(
        small_day(
            outlet_flow="balance",
            gas_curves=gas,
            gas_standards=standards,
            drift={key: Drift(3e-3, at, (1.0, 0.94)) for key in gas if key[1] != "ethane"},
            blanks={"catholyte": {"formate": 0.05, "ethanol": 0.02}},
            errors=(
                Error("inlet flow", relative=0.015, shared="day"),
                Error("headspace", relative=0.05, shared="day"),
                Error("carbonate uptake", relative=0.20, shared="run"),
                *READINGS,
            ),
        ),
        holds=runs,
    )


def _tracer_day() -> DayTruth:
    plain = {**GAS_CURVES, ("TCD", "nitrogen"): Curve(0.37)}
    curves = {key: replace(curve, weights="1/x^2") for key, curve in plain.items()}
    return small_day(
        {"outlet_mol_per_s": 13.7e-6, "tracer_mol_per_s": 0.31e-6},
        outlet_flow="tracer",
        tracer="nitrogen",
        gas_curves=curves,
        gas_standards=_scattered(curves, SIXTEEN_PPM),
        errors=(
            Error("tracer flow", relative=0.012, shared="day"),
            Error("tracer flow", relative=0.008, shared="run"),
            *READINGS,
        ),
    )


TRUTHS: dict[str, Callable[[], DayTruth]] = {
    "inlet": _plain_day,
    "everything": _full_day,
    "tracer": _tracer_day,
}

Deviations = dict[str, np.ndarray]  # class -> (DAYS, members)


@pytest.fixture(scope="module", params=list(TRUTHS))
def deviations(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Deviations:
    day = TRUTHS[request.param]()
    folder: Path = tmp_path_factory.mktemp(request.param)
    found: dict[str, list[list[float]]] = {}
    for number in range(DAYS):
        generator = np.random.default_rng([list(TRUTHS).index(request.param), number])
        # the same folder each time: every file of a day is written anew
        book = coulombook.tally(write_day(folder, day, generator=generator))
        for name, values in _deviations(book, day).items():
            found.setdefault(name, []).append(values)
    return {name: np.array(rows) for name, rows in found.items()}


def _deviations(book: coulombook.Book, day: DayTruth) -> dict[str, list[float]]:
    out: dict[str, list[float]] = {"gas": [], "liquid": [], "j": [], "total": [], "C2+": [], "ratio": []}
    out |= {"pooled": [], "pooled j": []}
    truths = {one.name: expected(day, one) for one in day.holds}
    for row in book.ledger.to_dict("records"):
        truth = truths[row["run"]]
        share = truth.efficiency[row["product"]]
        out[row["phase"]].append((row["FE / %"] - 100 * share) / row["u(FE) / %"])
        partial = share * truth.current_density / 10  # A/m^2 to mA/cm^2
        out["j"].append((row["j / mA cm^-2"] - partial) / row["u(j) / mA cm^-2"])
    for row in book.summary.to_dict("records"):
        truth = truths[row["run"]]
        out["total"].append((row["total FE / %"] - 100 * truth.total) / row["u(total FE) / %"])
        out["C2+"].append((row["C2+ FE / %"] - 100 * truth.group["C2+"]) / row["u(C2+ FE) / %"])
        out["ratio"].append((row["C2+/C1"] - truth.ratio) / row["u(C2+/C1)"])
    by_level = {one.level: one for one in day.holds}
    for row in book.series.to_dict("records"):
        truth = truths[by_level[row["level"]].name]
        share = truth.efficiency[row["product"]]
        out["pooled"].append((row["FE / %"] - 100 * share) / row["u(FE) / %"])
        partial = share * truth.current_density / 10
        out["pooled j"].append((row["j / mA cm^-2"] - partial) / row["u(j) / mA cm^-2"])
    return out


@pytest.mark.parametrize("what", ["gas", "liquid", "total", "ratio", "C2+", "j", "pooled", "pooled j"])
def test_deviations_from_the_truth_are_as_large_as_their_uncertainty(
    deviations: Deviations, what: str
) -> None:
    rms = float(np.sqrt(np.mean(deviations[what] ** 2)))
    assert LOW < rms < HIGH, f"root mean square of z for {what}: {rms:.3f}"


@pytest.mark.parametrize("what", ["gas", "liquid", "total", "ratio"])
def test_deviations_from_the_truth_have_no_preferred_side(deviations: Deviations, what: str) -> None:
    # the mean of n independent z has the standard deviation 1/sqrt(n); four of them for one value each day
    assert abs(float(np.mean(deviations[what]))) < 4 / np.sqrt(DAYS)
