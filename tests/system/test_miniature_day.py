"""The day in miniature of the file contract, worked by hand there; the tally must give these figures."""

from __future__ import annotations

from pathlib import Path

import pytest

import coulombook

FILES = {
    "day.toml": (
        '[day]\ncalibrations = ["mini"]\n[reference]\npotential = "0.210 V"\n[gas]\noutlet_flow = "inlet"\n'
    ),
    "runs.csv": (
        "run,catalyst,electrode,electrode area / cm^2,pH,resistance / ohm,inlet flow / sccm\n"
        "a1,mesh,m1,1.0,6.8,10,20\n"
    ),
    "traces/a1.csv": "t / s,E / V,I / mA\n0,-1.5,-10\n1800,-1.5,-10\n3600,-1.5,-10\n",
    "calibrations/mini/calibration.toml": 'kind = "gas"\n[curve]\nform = "line through zero"\n',
    "calibrations/mini/standards.csv": (
        "channel,analyte,mole fraction / ppm,peak area\n"
        "FID,carbon monoxide,100,10\nFID,carbon monoxide,1000,100\n"
        "FID,ethylene,100,20\nFID,ethylene,1000,200\n"
    ),
    "gas.csv": (
        "run,injection,time / s,channel,analyte,peak area\na1,1,1800,FID,CO,50\na1,1,1800,FID,C2H4,20\n"
    ),
    "vials.csv": (
        "vial,run,compartment,compartment volume / mL,aliquot / mL,standard,standard amount / umol\n"
        "v1,a1,catholyte,30,0.5,DMSO,0.2\n"
    ),
    "liquid.csv": "vial,analyte,signal,protons,integral\nv1,DMSO,CH3,6,600\nv1,formate,CH,1,250\n",
}


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> coulombook.Book:
    folder: Path = tmp_path_factory.mktemp("miniature")
    for name, text in FILES.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
    return coulombook.tally(folder)


def test_miniature_charge_and_potential(book: coulombook.Book) -> None:
    row = book.summary.iloc[0]
    assert row["charge / C"] == pytest.approx(36.0, rel=1e-12)  # 0.010 A x 3600 s
    # -1.5 + 0.210 + 0.0591594 x 6.8 + 0.010 x 10; half of the last digit of -0.78772
    assert row["E vs RHE / V"] == pytest.approx(-0.78772, abs=5e-6)
    assert row["j / mA cm^-2"] == pytest.approx(10.0, rel=1e-12)


def test_miniature_outlet_flow_and_mole_fractions(book: coulombook.Book) -> None:
    rows = book.injections.set_index("product")
    # 20e-6 m^3/min x 101325 / (R x 273.15) / 60, to the last digit printed
    assert rows.loc["carbon monoxide", "outlet flow / umol/s"] == pytest.approx(14.871678, abs=5e-7)
    assert rows.loc["carbon monoxide", "mole fraction / ppm"] == pytest.approx(500.0, rel=1e-9)
    assert rows.loc["ethylene", "mole fraction / ppm"] == pytest.approx(100.0, rel=1e-9)
    assert rows.loc["ethylene", "current / mA"] == pytest.approx(10.0, rel=1e-9)
    assert set(rows["used"]) == {"yes"}


@pytest.mark.parametrize(
    ("product", "percent", "group", "electrons"),
    [
        ("carbon monoxide", 14.3490, "C1", 2),
        ("ethylene", 17.2188, "C2", 12),
        ("formate", 16.0809, "C1", 2),
    ],
)
def test_miniature_faradaic_efficiencies(
    book: coulombook.Book, product: str, percent: float, group: str, electrons: int
) -> None:
    row = book.ledger.set_index("product").loc[product]
    assert row["FE / %"] == pytest.approx(percent, abs=5e-5)  # half of the last printed digit
    assert row["j / mA cm^-2"] == pytest.approx(
        percent / 10, abs=5e-6
    )  # a tenth of 10 mA/cm^2 for each percent
    assert row["group"] == group
    assert row["electrons"] == electrons
    # 36 C x FE / (n F); F = 96485.332 C/mol
    assert row["amount / umol"] == pytest.approx(percent / 100 * 36e6 / (electrons * 96485.33212), rel=1e-5)


def test_miniature_total_and_ratio(book: coulombook.Book) -> None:
    row = book.summary.iloc[0]
    assert row["total FE / %"] == pytest.approx(47.6487, abs=5e-5)
    assert row["C2+/C1"] == pytest.approx(0.56585, abs=5e-6)
    # by amount: (17.2188/12) / (14.3490/2 + 16.0809/2)
    assert row["C2+/C1 molar"] == pytest.approx(17.2188 / 12 / ((14.3490 + 16.0809) / 2), rel=1e-5)
