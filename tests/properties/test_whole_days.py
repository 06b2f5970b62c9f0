"""What holds for every valid day, in whatever mode and however written; and for days with a cell gone bad.

The strategies stand in `whole_days.py`; COULOMBOOK_EXAMPLES=500 asks for a long run with fresh days.
"""

from __future__ import annotations

import copy
import csv
import io
import tempfile
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
import pandas as pd
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from rich.console import Console
from tests.forward.files import Style
from tests.forward.tables import Sheets
from tests.forward.truth import expected
from tests.properties.whole_days import WholeDay, examples, styles, whole_days

import coulombook
from coulombook.book import TABLES
from coulombook.findings import Severity
from coulombook.report.results import result_files, write_results
from coulombook.report.stored import open_results, read_book
from coulombook.report.terminal import show_check

SAME = 1e-9  # relative, and absolute in per cent or mA/cm^2: the rounding of some hundred operations
EXACT = 1e-6  # curve fits included
MIXED = 1e-4  # the headspace's convolution may be evaluated numerically
# of a normal error, once in 5e8; of the mean of two injections that scatter, never seen in 1e4 days
COVERAGE = 6.0

KEYS = {
    "ledger": ["run", "product"],
    "summary": ["run"],
    "injections": ["run", "injection", "product"],
    "surface": ["electrode", "purpose"],
}


def tally(day: WholeDay, cells: Sheets | None = None) -> coulombook.Book:
    with tempfile.TemporaryDirectory() as folder:
        return coulombook.tally(day.write(Path(folder) / "day", cells))


def numbers(book: coulombook.Book, table: str) -> pd.DataFrame:
    found = book.tables[table].frame()
    keys = KEYS[table]
    found[keys] = found[keys].astype(str)
    return found.set_index(keys).sort_index().apply(pd.to_numeric, errors="coerce")


def same(one: coulombook.Book, other: coulombook.Book) -> None:
    """Every figure of the tables that matter."""
    for table in KEYS:
        pd.testing.assert_frame_equal(
            numbers(one, table), numbers(other, table), rtol=SAME, atol=SAME, check_dtype=False
        )


@examples(12)
@given(whole_days(), st.integers(0, 999))
def test_order_of_rows_does_not_matter(day: WholeDay, seed: int) -> None:
    same(tally(replace(day, style=Style(shuffle=seed))), tally(day))


@examples(20)
@given(whole_days(), styles())
def test_how_a_day_is_written_does_not_matter(day: WholeDay, style: Style) -> None:
    same(tally(replace(day, style=style)), tally(day))


@examples(12)
@given(whole_days(), st.sampled_from([2.0, 0.25]))
def test_detectors_of_another_gain_give_the_same_day(day: WholeDay, gain: float) -> None:
    cells = day.cells()
    plain = copy.deepcopy(cells)
    rows = [row for name in ("gas", "checks", "liquid") for row in cells.tables.get(name, [])]
    rows += [row for _, standards in cells.calibrations.values() for row in standards]
    for row in rows:
        for quantity in {"peak area", "integral"} & row.keys():
            row[quantity] *= gain
    same(tally(day, cells), tally(day, plain))


@examples(12)
@given(whole_days())
def test_rows_between_rows_of_a_log_change_nothing(day: WholeDay) -> None:
    cells = day.cells()
    plain = copy.deepcopy(cells)
    for columns in cells.traces.values():
        for name, values in columns.items():
            columns[name] = np.insert(values, np.arange(1, len(values)), 0.5 * (values[1:] + values[:-1]))
    same(tally(day, cells), tally(day, plain))


@examples(12)
@given(whole_days(), st.integers(1, 3), st.floats(0.5, 900.0), st.sampled_from([0.0, 1e-3, -0.05]))
def test_rows_beyond_the_window_change_nothing(
    day: WholeDay, rows: int, step_second: float, idle_ampere: float
) -> None:
    plain = day.cells()
    for run in plain.tables["runs"]:
        # the window is told, so that it does not grow with the log
        time = plain.traces[run["run"]]["t"]
        run["start"] = time[0] if run["start"] is None else run["start"]
        run["stop"] = time[-1] if run["stop"] is None else run["stop"]
    cells = copy.deepcopy(plain)
    steps = step_second * np.arange(1, rows + 1)
    for columns in cells.traces.values():
        time = columns["t"]
        columns["t"] = np.concatenate([time[0] - steps[::-1], time, time[-1] + steps])
        columns["E"] = np.pad(columns["E"], rows, constant_values=0.1)
        columns["I"] = np.pad(columns["I"], rows, constant_values=idle_ampere)
    same(tally(day, cells), tally(day, plain))


@examples(30)
@given(whole_days())
def test_values_without_errors_give_the_truth(day: WholeDay) -> None:
    book = tally(day)
    found = book.ledger.set_index(["run", "product"])["FE / %"]
    summary = book.summary.set_index("run")
    for hold in day.truth.holds:
        known = expected(day.truth, hold)
        near = EXACT if hold.headspace_m3 is None else MIXED
        assert set(found[hold.name].index) == set(known.efficiency)
        for product, share in known.efficiency.items():
            assert found[hold.name, product] == pytest.approx(100.0 * share, rel=near), product
        row = summary.loc[hold.name]
        assert row["charge / C"] == pytest.approx(known.charge_coulomb, rel=EXACT)
        assert row["E vs RHE / V"] == pytest.approx(known.potential_rhe_volt, abs=1e-6)
        assert row["j / mA cm^-2"] == pytest.approx(0.1 * known.current_density, rel=EXACT)
        assert row["total FE / %"] == pytest.approx(100.0 * known.total, rel=near)
        for group, share in known.group.items():
            assert row[f"{group} FE / %"] == pytest.approx(100.0 * share, rel=near, abs=1e-9)
        for head, ratio in (("C2+/C1", known.ratio), ("C2+/C1 molar", known.ratio_molar)):
            if ratio is not None:
                assert row[head] == pytest.approx(ratio, rel=near)
        assert known.conversion is not None
        assert row["CO2 conversion / %"] == pytest.approx(100.0 * known.conversion, rel=near)
        if known.roughness is not None:
            assert row["roughness factor"] == pytest.approx(known.roughness, rel=EXACT)


@examples(30)
@given(whole_days(everything_declared=True), st.integers(0, 2**32 - 1))
def test_the_truth_lies_within_the_uncertainty(day: WholeDay, seed: int) -> None:
    book = tally(replace(day, noise=seed))
    for row in book.ledger.to_dict("records"):
        hold = next(one for one in day.truth.holds if one.name == row["run"])
        off = abs(row["FE / %"] - 100.0 * hold.efficiency[row["product"]])
        assert off < COVERAGE * row["u(FE) / %"], row
    known = {hold.name: expected(day.truth, hold) for hold in day.truth.holds}
    lost = book.ledger.loc[book.ledger["status"] == "below detection", "run"].tolist()
    for row in book.summary.to_dict("records"):
        if row["run"] not in lost:
            assert (
                abs(row["total FE / %"] - 100.0 * known[row["run"]].total) < COVERAGE * row["u(total FE) / %"]
            )


@examples(20)
@given(whole_days(), st.integers(0, 2**32 - 1))
def test_totals_are_the_sums_of_what_was_counted(day: WholeDay, seed: int) -> None:
    book = tally(replace(day, noise=seed))
    counted = book.ledger[book.ledger["status"] != "below detection"]
    for row in book.summary.to_dict("records"):
        own = counted[counted["run"] == row["run"]]
        carbon = own["group"].map(lambda group: "H2" if group == "H2" else min(int(group[1:]), 2))
        parts = {"H2": "H2", "C1": 1, "C2+": 2}
        sums = {name: own.loc[carbon == group, "FE / %"].sum() for name, group in parts.items()}
        assert row["total FE / %"] == pytest.approx(own["FE / %"].sum(), rel=SAME)
        for name, value in sums.items():
            assert row[f"{name} FE / %"] == pytest.approx(value, rel=SAME, abs=1e-12)
        if (carbon == 1).any():
            assert row["C2+/C1"] == pytest.approx(sums["C2+"] / sums["C1"], rel=SAME)
        else:
            assert np.isnan(row["C2+/C1"])
        partial = own["FE / %"] * row["j / mA cm^-2"] / 100.0
        np.testing.assert_allclose(own["j / mA cm^-2"], partial, rtol=SAME)


@examples(20)
@given(whole_days(), st.one_of(st.none(), st.integers(0, 2**32 - 1)))
def test_squares_of_the_budget_add_up(day: WholeDay, seed: int | None) -> None:
    book = tally(replace(day, noise=seed))
    stated = {(row["run"], row["product"]): row["u(FE) / %"] for row in book.ledger.to_dict("records")}
    stated |= {
        (row["run"], f"j real {row['product']}"): row["u(j real) / mA cm^-2"]
        for row in book.ledger.to_dict("records")
    }
    for row in book.summary.to_dict("records"):
        stated |= {
            (row["run"], output): row[f"u({output}){unit}"]
            for output, unit in (("total FE", " / %"), ("C2+ FE", " / %"), ("C2+/C1", ""))
        }
    groups = book.tables["budget"].frame().groupby(["run", "output"])
    assert set(groups.groups) <= stated.keys()
    explained = set()
    for output, rows in groups:
        u = stated[output]
        assert np.sqrt((rows["u / %"] ** 2).sum()) == pytest.approx(u, rel=1e-9), output
        assert rows["share / %"].sum() == pytest.approx(100.0, rel=1e-9)
        explained.add(output)
    # what has an uncertainty is explained
    assert {output for output, u in stated.items() if u and u > 1e-9} <= explained


@examples(12)
@given(whole_days(), styles(), st.one_of(st.none(), st.integers(0, 999)))
def test_results_come_back_from_their_files(day: WholeDay, style: Style, seed: int | None) -> None:
    book = tally(replace(day, style=style, noise=seed))
    with tempfile.TemporaryDirectory() as folder:
        out = write_results(book, Path(folder) / "results", tables_only=True)
        again = read_book(open_results(out))
        with open(out / "ledger.csv", encoding="utf-8", newline="") as stream:
            plain = [float(row["FE / %"]) for row in csv.DictReader(stream)]
    assert again.title == book.title
    for name in TABLES:
        if name in book.tables:
            # an empty text and no text are the same cell
            written = tuple(
                tuple(None if cell == "" else cell for cell in row) for row in book.tables[name].rows
            )
            assert again.tables[name].rows == written, name
    assert plain == book.ledger["FE / %"].tolist()


class _Tags(HTMLParser):
    def __init__(self, text: str) -> None:
        super().__init__()
        self.seen: set[str] = set()
        self.feed(text)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.seen.add(tag)


@examples(3)
@given(whole_days(), st.integers(0, 999))
def test_workbook_and_page_can_be_made_of_every_day(day: WholeDay, seed: int) -> None:
    book = tally(replace(day, noise=seed))
    files = result_files(book)
    sheets = openpyxl.load_workbook(io.BytesIO(files["book.xlsx"]))
    cells = [cell for sheet in sheets for row in sheet.iter_rows() for cell in row if cell.value is not None]
    assert any(cell.data_type == "f" for cell in cells)
    # what came from the files is text there, and nothing but text
    entered = {"=1+1", "=A1", '=HYPERLINK("x")'}
    assert not [cell.coordinate for cell in cells if cell.data_type == "f" and cell.value in entered]
    page = files["report.html"].decode("utf-8")
    tags = _Tags(page).seen
    assert {"html", "title", "table", "svg"} <= tags
    assert "blink" not in tags


BAD = (None, "", "x", "-", "1,2,3", 0.0, -1.0, 1e-300, 1e300, float("nan"), float("inf"), "=1/0", "é" * 40)


@st.composite
def damaged(draw: st.DrawFn, cells: Sheets) -> Sheets:
    """One thing gone wrong: a bad cell, a row twice or lost, a table lost, a log cut, backwards or lost."""
    what = draw(st.sampled_from(["cell", "cell", "cell", "row twice", "row lost", "table lost", "log"]))
    if what == "log":
        name = draw(st.sampled_from(sorted(cells.traces)))
        columns = cells.traces[name]
        how = draw(st.sampled_from(["lost", "backwards", "one row", "anodic", "bad value", "column lost"]))
        if how == "lost":
            del cells.traces[name]
        elif how == "column lost":
            del columns[draw(st.sampled_from(sorted(columns)))]
        elif how == "anodic":
            columns["I"] = -columns["I"]
        elif how == "bad value":
            quantity, place = (
                draw(st.sampled_from(sorted(columns))),
                draw(st.integers(0, len(columns["t"]) - 1)),
            )
            columns[quantity] = columns[quantity].copy()
            columns[quantity][place] = draw(st.sampled_from([np.nan, np.inf, 1e300, -1e9]))
        else:
            for quantity, values in columns.items():
                columns[quantity] = values[:1] if how == "one row" else values[::-1]
        return cells
    name = draw(st.sampled_from(sorted(cells.tables)))
    rows = cells.tables[name]
    if what == "table lost":
        del cells.tables[name]
        return cells
    number = draw(st.integers(0, len(rows) - 1))
    if what == "row twice":
        rows.insert(number, dict(rows[number]))
    elif what == "row lost" and len(rows) > 1:
        del rows[number]
    else:
        # by the names of its runs the forward model finds what its flows are converted with
        quantities = sorted(rows[number].keys() - ({"run"} if name == "runs" else set()))
        rows[number][draw(st.sampled_from(quantities))] = draw(st.sampled_from(BAD))
    return cells


@examples(40)
@given(whole_days(runs=2), styles(), st.data())
def test_check_says_that_a_day_can_be_tallied_when_it_can(day: WholeDay, style: Style, data: Any) -> None:
    cells = data.draw(damaged(day.cells()))
    with tempfile.TemporaryDirectory() as folder:
        path = replace(day, style=style).write(Path(folder) / "day", cells)
        checked = coulombook.check(path)
        try:
            coulombook.tally(path)
        except coulombook.DayFaults as faults:
            stopped = [one for one in faults.findings if one.severity is Severity.STOP]
            assert stopped
        else:
            stopped = []
    assert [one for one in checked.findings if one.severity is Severity.STOP] == stopped
    console = Console(file=io.StringIO(), width=80)
    show_check(checked.lines, checked.findings, console)
    said = console.file.getvalue()  # type: ignore[attr-defined] # the stream given above
    assert ("can be tallied." in said and "before this day" not in said) == (not stopped)


@examples(15)
@given(whole_days(runs=3))
def test_another_run_moves_no_value_of_the_others(day: WholeDay) -> None:
    assume(len(day.truth.holds) > 1)
    fewer = replace(day, truth=replace(day.truth, holds=day.truth.holds[:-1]))
    more, less = tally(day), tally(fewer)
    for table in ("ledger", "summary", "injections"):
        one, other = numbers(more, table), numbers(less, table)
        values = [head for head in one.columns.intersection(other.columns) if not head.startswith("u(")]
        pd.testing.assert_frame_equal(
            one.loc[other.index, values], other[values], rtol=SAME, atol=SAME, check_dtype=False
        )
