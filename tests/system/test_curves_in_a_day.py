"""What curves bring into a whole day: detection, borrowed curves, saturation, odd signals, checks off the chart."""

from __future__ import annotations

import math
from collections.abc import Mapping
from pathlib import Path

import pytest

import coulombook

DAY = '[day]\ncalibrations = ["gc"]\n[reference]\npotential = "0.210 V"\n'
RUNS = (
    "run,catalyst,electrode,electrode area / cm^2,pH,resistance / ohm,inlet flow / sccm,started\n"
    "a1,mesh,m1,1.0,6.8,10,20,2043-05-18T09:00:00\n"
)
TRACE = "t / s,E / V,I / mA\n0,-1.5,-10\n1800,-1.5,-10\n3600,-1.5,-10\n"
# an ethylene line with scatter: area = 0.2 per ppm, alternately 0.4 above and below
LEVELS = (10, 20, 40, 60, 80, 100)
STANDARDS = "channel,analyte,mole fraction / ppm,peak area\n" + "".join(
    f"FID,ethylene,{level},{0.2 * level + sign * 0.4:.4f}\n" for level in LEVELS for sign in (1, -1)
)
GAS_HEAD = "run,injection,time / s,channel,analyte,peak area\n"


def _tally(folder: Path, files: Mapping[str, str]) -> coulombook.Book:
    every = {
        "day.toml": DAY,
        "runs.csv": RUNS,
        "traces/a1.csv": TRACE,
        "calibrations/gc/calibration.toml": 'kind = "gas"\n',
        "calibrations/gc/standards.csv": STANDARDS,
        **files,
    }
    for name, text in every.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
    return coulombook.tally(folder)


def _kinds(book: coulombook.Book) -> list[str]:
    return [one.kind for one in book.findings]


def test_a_product_below_detection_keeps_its_estimate_and_stays_out_of_totals(tmp_path: Path) -> None:
    # the curve cannot tell 1 ppm (area 0.2) from nothing: its scatter is 0.4, so its decision limit is near 4 ppm
    book = _tally(tmp_path, {"gas.csv": GAS_HEAD + "a1,1,1800,FID,ethylene,0.2\n"})
    row = book.ledger.iloc[0]
    assert row["status"] == "below detection"
    assert 0 < row["FE / %"] < row["FE limit / %"]
    summary = book.summary.iloc[0]
    assert summary["total FE / %"] == 0.0
    assert summary["C2+ FE / %"] == 0.0
    # the limit in FE is the limit of the curve, read like any mole fraction: FE per ppm is the same
    limit = book.calibrations.iloc[0]["detection limit / ppm"]
    per_ppm = row["FE / %"] / book.injections.iloc[0]["mole fraction / ppm"]
    assert row["FE limit / %"] == pytest.approx(limit * per_ppm, rel=1e-9)


def test_more_injections_see_less(tmp_path: Path) -> None:
    peaks = "".join(f"a1,{k},{600 * k},FID,ethylene,0.2\n" for k in range(1, 6))
    one = _tally(tmp_path / "one", {"gas.csv": GAS_HEAD + "a1,1,1800,FID,ethylene,0.2\n"})
    five = _tally(tmp_path / "five", {"gas.csv": GAS_HEAD + peaks})
    assert five.ledger.iloc[0]["FE limit / %"] < one.ledger.iloc[0]["FE limit / %"]


def test_a_clear_product_has_no_limit_beside_it(tmp_path: Path) -> None:
    row = _tally(tmp_path, {"gas.csv": GAS_HEAD + "a1,1,1800,FID,ethylene,12\n"}).ledger.iloc[0]
    assert row["status"] == "quantified"
    assert math.isnan(row["FE limit / %"])


def test_a_borrowed_curve_is_scaled_by_carbon_numbers_and_says_so(tmp_path: Path) -> None:
    toml = 'kind = "gas"\n[curve]\nform = "line through zero"\n[curve."ethane@FID"]\nlike = "ethylene@FID"\n'
    files = {
        "calibrations/gc/calibration.toml": toml,
        "gas.csv": GAS_HEAD + "a1,1,1800,FID,ethylene,12\na1,1,1800,FID,ethane,12\n",
    }
    book = _tally(tmp_path, files)
    x = book.injections.set_index("product")["mole fraction / ppm"]
    # effective carbon numbers 1.9 (two olefinic carbons) and 2.0 (Scanlon & Willis, J. Chromatogr. Sci. 23 (1985) 333)
    assert x["ethylene"] / x["ethane"] == pytest.approx(2.0 / 1.9, rel=1e-9)
    assert "borrowed-curve" in _kinds(book)
    u = book.ledger.set_index("product")
    relative = u["u(FE) / %"] / u["FE / %"]
    assert relative["ethane"] > 0.1 > relative["ethylene"]  # the estimate of a carbon number is good to 10 %
    shared = book.tables["budget"].frame()
    assert set(shared[shared["output"] == "ethane"]["source"]) >= {
        "curve ethylene@FID",
        "carbon number ethane@FID",
    }


def _liquid(folder: Path, rows: str, head: str = "", toml: str = "", **files: str) -> coulombook.Book:
    return _tally(
        folder,
        {
            "day.toml": DAY + toml,
            "vials.csv": "vial,run,compartment,compartment volume / mL,aliquot / mL,standard,standard amount / umol\n"
            "v1,a1,catholyte,30,0.5,DMSO,0.2\n",
            "liquid.csv": f"vial,analyte,signal,protons,integral{head}\n{rows}",
            **files,
        },
    )


def test_saturation_of_counted_protons_is_corrected(tmp_path: Path) -> None:
    head = ",T1 / s,repetition time / s,flip angle / deg"
    plain = _liquid(tmp_path / "plain", "v1,DMSO,CH3,6,600\nv1,formate,CH,1,250\n")
    book = _liquid(tmp_path / "saturated", "v1,DMSO,CH3,6,600,3,9,90\nv1,formate,CH,1,250,9,9,90\n", head)
    # at 90 degrees f = 1 - exp(-TR/T1): 0.9502 for TR = 3 T1 and 0.6321 for TR = T1 (Ernst & Anderson 1966)
    ratio = (1 - math.exp(-3)) / (1 - math.exp(-1))
    found = book.ledger.iloc[0]["FE / %"] / plain.ledger.iloc[0]["FE / %"]
    assert found == pytest.approx(ratio, rel=1e-12)


def test_t1_of_a_signal_that_is_read_by_a_curve_corrects_nothing_and_is_told(tmp_path: Path) -> None:
    curve = {
        "day.toml": DAY.replace('["gc"]', '["nmr"]'),
        "calibrations/nmr/calibration.toml": 'kind = "liquid"\n',
        "calibrations/nmr/standards.csv": "analyte,signal,amount ratio,integral ratio\n"
        "formate,CH,0.5,0.5\nformate,CH,1,1\nformate,CH,4,4\n",
    }
    head = ",T1 / s,repetition time / s"
    plain = _liquid(tmp_path / "plain", "v1,DMSO,CH3,6,600\nv1,formate,CH,1,250\n", **curve)
    book = _liquid(tmp_path / "t1", "v1,DMSO,CH3,6,600,3,9\nv1,formate,CH,1,250,9,9\n", head, **curve)
    assert "saturation-in-curve" not in _kinds(plain)
    assert [one.where for one in book.findings if one.kind == "saturation-in-curve"] == ["liquid.csv, row 3"]
    assert book.ledger.iloc[0]["FE / %"] == pytest.approx(plain.ledger.iloc[0]["FE / %"], rel=1e-12)


def test_t1_without_repetition_time_is_a_fault(tmp_path: Path) -> None:
    with pytest.raises(coulombook.DayFaults) as caught:
        _liquid(tmp_path, "v1,DMSO,CH3,6,600,\nv1,formate,CH,1,250,9\n", ",T1 / s")
    assert [(one.kind, one.where) for one in caught.value.stops] == [("missing-value", "liquid.csv, row 3")]


def test_uncertainty_of_t1_travels_into_the_amount(tmp_path: Path) -> None:
    head = ",T1 / s,repetition time / s,flip angle / deg"
    declared = '[[uncertainty]]\nquantity = "T1"\nstandard = "10 %"\nshared = "reading"\n'
    rows = "v1,DMSO,CH3,6,600,,,\nv1,formate,CH,1,250,9,9,90\n"
    row = _liquid(tmp_path, rows, head, declared).tables["budget"].frame()
    part = row[(row["output"] == "formate") & (row["source"] == "T1")].iloc[0]
    # d ln f / d ln T1 at TR = T1, 90 degrees: -e^-1/(1 - e^-1) = -0.582; 10 % of T1 is 5.82 % of the amount
    whole = _liquid(tmp_path, rows, head, declared).ledger.iloc[0]["FE / %"]
    assert part["u / %"] / whole == pytest.approx(0.1 * math.exp(-1) / (1 - math.exp(-1)), rel=1e-9)


def test_an_odd_signal_is_named(tmp_path: Path) -> None:
    declared = '[[uncertainty]]\nquantity = "integral"\nstandard = "1 %"\nshared = "reading"\n'
    rows = "v1,DMSO,CH3,6,600\nv1,n-propanol,CH3,3,300\nv1,n-propanol,CH2 1.42,2,201\nv1,n-propanol,CH2 3.44,2,260\n"
    odd = [one for one in _liquid(tmp_path, rows, toml=declared).findings if one.kind == "signals-disagree"]
    assert len(odd) == 1
    assert "CH2 3.44 is the odd one" in odd[0].text


def test_signals_that_agree_are_not_called_odd(tmp_path: Path) -> None:
    declared = '[[uncertainty]]\nquantity = "integral"\nstandard = "1 %"\nshared = "reading"\n'
    rows = "v1,DMSO,CH3,6,600\nv1,n-propanol,CH3,3,300\nv1,n-propanol,CH2 1.42,2,202\nv1,n-propanol,CH2 3.44,2,199\n"
    assert "signals-disagree" not in _kinds(_liquid(tmp_path, rows, toml=declared))


def test_a_check_off_its_chart_is_a_finding(tmp_path: Path) -> None:
    checks = "at,channel,analyte,mole fraction / ppm,peak area\n2043-05-18T08:50:00,FID,ethylene,50,{}\n"
    gas = GAS_HEAD + "a1,1,1800,FID,ethylene,12\n"
    good = _tally(tmp_path / "good", {"gas.csv": gas, "checks.csv": checks.format(10.1)})
    off = _tally(tmp_path / "off", {"gas.csv": gas, "checks.csv": checks.format(14.0)})
    assert "check-off" not in _kinds(good)
    found = next(one for one in off.findings if one.kind == "check-off")
    assert found.where == "checks.csv, row 2"
    assert "the drift correction takes it for drift" in found.text


def test_standards_of_one_cylinder_widen_the_curve_together(tmp_path: Path) -> None:
    head = "channel,analyte,mole fraction / ppm,peak area,parent,u(parent) / %\n"
    rows = "".join(f"FID,ethylene,{level},{0.2 * level:.4f},mix,{{}}\n" for level in LEVELS)
    gas = {"gas.csv": GAS_HEAD + "a1,1,1800,FID,ethylene,12\n"}
    toml = {"calibrations/gc/calibration.toml": 'kind = "gas"\n[curve]\nform = "line through zero"\n'}
    book = _tally(tmp_path, {**gas, **toml, "calibrations/gc/standards.csv": head + rows.format(*[2] * 6)})
    row = book.tables["budget"].frame()
    part = row[(row["output"] == "ethylene") & (row["source"] == "curve ethylene@FID")].iloc[0]
    # all standards are off by the same 2 %, and so is every mole fraction read by the curve
    assert part["u / %"] / book.ledger.iloc[0]["FE / %"] == pytest.approx(0.02, rel=1e-6)


def test_a_gas_named_as_tracer_is_no_product_in_any_mode(tmp_path: Path) -> None:
    gas = {"gas.csv": GAS_HEAD + "a1,1,1800,FID,ethylene,12\n"}
    # ethylene as tracer is odd, but the day says so, and the outlet flow is taken as the inlet flow all the same
    toml = {"day.toml": DAY + '[gas]\noutlet_flow = "inlet"\ntracer = "ethylene"\n'}
    assert len(_tally(tmp_path / "product", gas).ledger) == 1
    assert len(_tally(tmp_path / "tracer", {**gas, **toml}).ledger) == 0
