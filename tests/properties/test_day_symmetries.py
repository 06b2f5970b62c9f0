"""What must not change, or must change in step, when a whole small day is written down differently."""

from __future__ import annotations

import tempfile
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from tests.forward.days import CATHOLYTE, EFFICIENCIES, GAS_CURVES, small_day, uneven_log
from tests.forward.files import Dialect, Style, write_sheets
from tests.forward.tables import Sheets, sheets
from tests.forward.truth import DayTruth

import coulombook

# A day takes some tens of milliseconds on a quiet machine: few examples, no deadline
DAYS = settings(
    max_examples=12, deadline=None, suppress_health_check=[HealthCheck.too_slow], derandomize=True
)
SAME = 1e-9  # relative; the rounding of unit conversions, a hundred operations deep

UNIT_CHOICES = {
    "t": ("s", "min", "h"),
    "E": ("V", "mV"),
    "I": ("mA", "A", "uA"),
    "electrode area": ("cm^2", "mm^2", "m^2"),
    "temperature": ("degC", "K"),
    "pressure": ("kPa", "bar", "Pa", "mbar"),
    "resistance": ("ohm", "mohm"),
    "inlet flow": ("sccm", "slpm", "mL/min", "L/h", "umol/s", "mol/s"),
    "time": ("s", "min"),
    "start": ("s", "min"),
    "compartment volume": ("mL", "L", "cm^3"),
    "aliquot": ("mL", "uL"),
    "standard amount": ("umol", "nmol"),
}


@st.composite
def days(draw: st.DrawFn) -> DayTruth:
    """A small day: any part of the products, any current, flow and conditions a bench would see."""
    runs = []
    day = small_day()
    for number, one in enumerate(day.holds):
        names = draw(st.lists(st.sampled_from(sorted(EFFICIENCIES[0])), min_size=1, max_size=6, unique=True))
        shares = draw(st.lists(st.floats(0.01, 0.16), min_size=len(names), max_size=len(names)))
        log = uneven_log(draw(st.integers(0, 999)), rows=25, milliampere=draw(st.floats(2.0, 60.0)))
        runs.append(
            replace(
                one,
                **log,
                efficiency=dict(zip(names, shares, strict=True)),
                pH=draw(st.floats(4.0, 14.0)),
                temperature_kelvin=draw(st.floats(278.0, 340.0)),
                pressure_pascal=draw(st.floats(9e4, 1.2e5)),
                inlet_mol_per_s=draw(st.floats(4e-6, 6e-5)),
                electrode_area_m2=draw(st.floats(1e-5, 5e-4)),
                resistance_ohm=draw(st.floats(0.5, 40.0)),
                compensated=draw(st.sampled_from([0.0, 0.85, 1.0])),
                headspace_m3=draw(st.sampled_from([None, 4e-5])) if number else None,
                compartments=(CATHOLYTE,) if any(name in one.products("liquid") for name in names) else (),
            )
        )
    return replace(day, holds=tuple(runs))


def _tally(day: DayTruth, cells: Sheets, style: Style | None = None) -> coulombook.Book:
    with tempfile.TemporaryDirectory() as folder:
        return coulombook.tally(write_sheets(Path(folder) / "day", day, cells, style or Style()))


def _numbers(frame: pd.DataFrame, *keys: str) -> pd.DataFrame:
    return frame.set_index(list(keys)).sort_index().select_dtypes("number")


def _assert_same(one: pd.DataFrame, other: pd.DataFrame) -> None:
    # nothing is declared, so that the uncertainties are rounding themselves: 1e-9 of a percent or of a mA/cm^2
    pd.testing.assert_frame_equal(one, other, rtol=SAME, atol=1e-9, check_dtype=False)


@DAYS
@given(day=days(), seed=st.integers(0, 99))
def test_order_of_rows_does_not_matter(day: DayTruth, seed: int) -> None:
    cells = sheets(day)
    plain, shuffled = _tally(day, cells), _tally(day, cells, Style(shuffle=seed))
    _assert_same(_numbers(shuffled.ledger, "run", "product"), _numbers(plain.ledger, "run", "product"))
    _assert_same(_numbers(shuffled.summary, "run"), _numbers(plain.summary, "run"))


@DAYS
@given(
    day=days(),
    units=st.fixed_dictionaries({name: st.sampled_from(all_) for name, all_ in UNIT_CHOICES.items()}),
)
def test_choice_of_unit_does_not_matter(day: DayTruth, units: dict[str, str]) -> None:
    cells = sheets(day)
    plain, changed = _tally(day, cells), _tally(day, cells, Style(units=units))
    _assert_same(_numbers(changed.ledger, "run", "product"), _numbers(plain.ledger, "run", "product"))
    _assert_same(_numbers(changed.summary, "run"), _numbers(plain.summary, "run"))


@DAYS
@given(
    day=days(),
    separator=st.sampled_from([";", "\t"]),
    decimal=st.sampled_from([".", ","]),
    encoding=st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "cp1252"]),
    preamble=st.lists(
        st.sampled_from(["Zelle links", "Messung vom 18.05.", "Temperatur 25 °C", ""]), max_size=3
    ),
    blanks=st.booleans(),
)
def test_dialect_of_the_text_does_not_matter(
    day: DayTruth, separator: str, decimal: str, encoding: str, preamble: list[str], blanks: bool
) -> None:
    cells = sheets(day)
    dialect = Dialect(separator, decimal, encoding, tuple(preamble), "\r\n", blanks)
    plain, changed = _tally(day, cells), _tally(day, cells, Style(dialect, dialect, dialect, dialect))
    _assert_same(_numbers(changed.ledger, "run", "product"), _numbers(plain.ledger, "run", "product"))


@DAYS
@given(day=days(), factor=st.sampled_from([2.0, 0.5, 3.7]))
def test_larger_electrode_lowers_the_current_density_and_leaves_the_efficiency(
    day: DayTruth, factor: float
) -> None:
    larger = replace(
        day, holds=tuple(replace(one, electrode_area_m2=factor * one.electrode_area_m2) for one in day.holds)
    )
    plain, changed = _tally(day, sheets(day)), _tally(larger, sheets(larger))
    before, after = (_numbers(book.ledger, "run", "product") for book in (plain, changed))
    _assert_same(after[["FE / %", "amount / umol"]], before[["FE / %", "amount / umol"]])
    np.testing.assert_allclose(after["j / mA cm^-2"] * factor, before["j / mA cm^-2"], rtol=SAME)
    first, second = (_numbers(book.summary, "run") for book in (plain, changed))
    np.testing.assert_allclose(second["j / mA cm^-2"] * factor, first["j / mA cm^-2"], rtol=SAME)
    np.testing.assert_allclose(second["total FE / %"], first["total FE / %"], rtol=SAME)
    np.testing.assert_allclose(second["charge / C"], first["charge / C"], rtol=SAME)


@DAYS
@given(day=days(), factor=st.floats(0.3, 3.0))
def test_current_and_readings_scaled_together_leave_the_efficiency(day: DayTruth, factor: float) -> None:
    assert all(curve.form == "line through zero" for curve in GAS_CURVES.values())
    cells, scaled = sheets(day), sheets(day)
    for columns in scaled.traces.values():
        columns["I"] = factor * columns["I"]
    for row in scaled.tables.get("gas", []):
        row["peak area"] *= factor
    for row in scaled.tables.get("liquid", []):
        if row["analyte"] != day.standard:
            row["integral"] *= factor
    before, after = (_numbers(_tally(day, one).ledger, "run", "product") for one in (cells, scaled))
    np.testing.assert_allclose(after["FE / %"], before["FE / %"], rtol=SAME)
    np.testing.assert_allclose(after["j / mA cm^-2"], factor * before["j / mA cm^-2"], rtol=SAME)
    np.testing.assert_allclose(after["amount / umol"], factor * before["amount / umol"], rtol=SAME)


@DAYS
@given(day=days())
def test_one_day_is_the_same_as_its_runs_on_days_of_their_own(day: DayTruth) -> None:
    together = _numbers(_tally(day, sheets(day)).ledger, "run", "product")
    for one in day.holds:
        alone = replace(day, holds=(one,))
        found = _numbers(_tally(alone, sheets(alone)).ledger, "run", "product")
        shared = found.columns.intersection(together.columns)
        _assert_same(found[shared], together.loc[[one.name], shared])
