"""Habits of tables: what is read for what it plainly is, and told of."""

from __future__ import annotations

import io
import zipfile
from collections.abc import Callable, Mapping
from datetime import datetime
from typing import Any

import openpyxl
import pytest
from tests.unit.intake.conftest import MINIATURE, Opened

from coulombook.findings import Severity

Open = Callable[..., Opened]
TABLES = ("runs", "gas", "vials", "liquid")
AS_WORKBOOK: Mapping[str, None] = {f"{name}.csv": None for name in TABLES}


def workbook(change: Callable[[Any], None] = lambda book: None) -> bytes:
    """The day in miniature as a workbook, changed."""
    book = openpyxl.Workbook()
    book.remove(book.active)
    for name in TABLES:
        sheet = book.create_sheet(name)
        for line in MINIATURE[f"{name}.csv"].splitlines():
            sheet.append([_cell(word) for word in line.split(",")])
    change(book)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def _cell(word: str) -> Any:
    try:
        return float(word)
    except ValueError:
        return word or None


def areas(opened: Opened) -> list[float]:
    assert opened.source.day is not None, [f"{one.kind}: {one.where}: {one.found}" for one in opened.findings]
    return [peak.peak_area for peak in opened.source.day.peaks]


# --- of text and of workbooks ---


def test_comments_between_rows_are_passed_over_and_told(open_changed: Open) -> None:
    head, one, two = MINIATURE["gas.csv"].splitlines()
    gas = (
        "\n".join([head, "# first injection", one, "", "// again, after, the, pause", two, "% end,,,,,"])
        + "\n"
    )
    opened = open_changed({"gas.csv": gas})
    assert areas(opened) == [50.0, 20.0]
    told = opened.one("lines-passed-over")
    assert (told.where, told.severity) == ("gas.csv, row 2", Severity.NOTE)
    assert told.text == "rows 2, 5, 7 are each a comment; passed over"


def test_run_whose_name_begins_like_a_comment_is_a_run(open_changed: Open) -> None:
    runs = MINIATURE["runs.csv"].replace("\na1,", "\n#1,").replace("6.8,25", "6.8,25")
    changes = {name: MINIATURE[name].replace("a1,", "#1,") for name in ("gas.csv", "vials.csv")}
    opened = open_changed({"runs.csv": runs, "traces/#1.csv": MINIATURE["traces/a1.csv"], **changes})
    assert areas(opened) == [50.0, 20.0]
    assert "lines-passed-over" not in opened.kinds


def test_row_that_begins_like_a_comment_and_lacks_a_number_is_a_fault(open_changed: Open) -> None:
    opened = open_changed({"gas.csv": MINIATURE["gas.csv"] + "#1,2,,FID,CO,\n"})
    assert opened.source.day is None
    assert opened.kinds.count("missing-value") == 2


def test_heads_repeated_in_a_table_are_passed_over_and_told(open_changed: Open) -> None:
    head, one, two = MINIATURE["gas.csv"].splitlines()
    opened = open_changed({"gas.csv": "\n".join([head, one, head.upper(), two]) + "\n"})
    assert areas(opened) == [50.0, 20.0]
    told = opened.one("lines-passed-over")
    assert told.where == "gas.csv, row 3"
    assert "the heads are repeated in row 3" in told.text


@pytest.mark.parametrize("units", [",,min,,,pA s", "-,-,[min],-,-,(pA s)"])
def test_units_in_the_row_under_the_heads_are_taken_and_told(open_changed: Open, units: str) -> None:
    gas = f"run,injection,time,channel,analyte,peak area\n{units}\na1,1,30,FID,CO,50\na1,1,30,FID,C2H4,20\n"
    opened = open_changed({"gas.csv": gas})
    assert areas(opened) == [50.0, 20.0]
    assert opened.source.day is not None
    assert opened.source.day.peaks[0].time_second == 1800.0
    told = opened.one("units-row")
    assert (told.where, told.severity) == ("gas.csv, row 2", Severity.NOTE)
    assert opened.source.day.peaks[0].origin.row == 3


def test_units_under_the_heads_that_contradict_them_are_a_fault(open_changed: Open) -> None:
    head, one, two = MINIATURE["gas.csv"].splitlines()
    opened = open_changed({"gas.csv": "\n".join([head, ",,min,,,", one, two]) + "\n"})
    assert opened.source.day is None
    assert {"not-a-number", "missing-value"} <= set(opened.kinds)


# --- of workbooks alone ---


def test_cells_merged_over_rows_hold_for_each_and_are_told(open_changed: Open) -> None:
    def change(book: Any) -> None:
        for letter in "ABC":
            book["gas"].merge_cells(f"{letter}2:{letter}3")  # which empties the lower cells

    opened = open_changed({**AS_WORKBOOK, "day.xlsx": workbook(change)})
    assert areas(opened) == [50.0, 20.0]
    assert opened.source.day is not None
    assert [(peak.run, peak.time_second) for peak in opened.source.day.peaks] == [("a1", 1800.0)] * 2
    told = opened.one("merged-cells")
    assert (told.where, told.severity) == ("day.xlsx, sheet 'gas'", Severity.NOTE)
    assert "A2:A3, B2:B3, C2:C3" in told.text


def test_title_merged_above_the_heads_is_no_value_of_the_rows(open_changed: Open) -> None:
    def change(book: Any) -> None:
        book["gas"].insert_rows(1, 2)
        book["gas"]["A1"] = "All injections of the day"
        book["gas"].merge_cells("A1:F2")

    opened = open_changed({**AS_WORKBOOK, "day.xlsx": workbook(change)})
    assert areas(opened) == [50.0, 20.0]
    assert "merged-cells" not in opened.kinds


def test_merged_cells_never_overwrite_a_value(open_changed: Open) -> None:
    data = workbook()
    stream = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(stream, "w") as new:
        for part in old.namelist():
            content = old.read(part)
            if part == "xl/worksheets/sheet2.xml":
                merged = b'</sheetData><mergeCells count="1"><mergeCell ref="F2:F3"/></mergeCells>'
                assert content.count(b"</sheetData>") == 1
                content = content.replace(b"</sheetData>", merged)
            new.writestr(part, content)
    assert areas(open_changed({**AS_WORKBOOK, "day.xlsx": stream.getvalue()})) == [50.0, 20.0]


@pytest.mark.parametrize("state", ["hidden", "veryHidden"])
def test_hidden_sheet_is_read_and_told(open_changed: Open, state: str) -> None:
    def change(book: Any) -> None:
        book["gas"].sheet_state = state

    opened = open_changed({**AS_WORKBOOK, "day.xlsx": workbook(change)})
    assert areas(opened) == [50.0, 20.0]
    told = opened.one("hidden-sheet")
    assert (told.where, told.severity) == ("day.xlsx, sheet 'gas'", Severity.NOTE)
    assert told.text.endswith("the sheet")


def test_hidden_rows_and_columns_are_read_and_told(open_changed: Open) -> None:
    def change(book: Any) -> None:
        book["gas"].row_dimensions[3].hidden = True  # as a filter does
        book["gas"].column_dimensions["D"].hidden = True

    opened = open_changed({**AS_WORKBOOK, "day.xlsx": workbook(change)})
    assert areas(opened) == [50.0, 20.0]
    assert opened.one("hidden-sheet").text.endswith("1 row, 1 column")


@pytest.mark.parametrize(("epoch", "offset"), [(datetime(1899, 12, 30), 0), (datetime(1904, 1, 1), 1462)])
def test_serial_date_in_place_of_a_date_time_is_read_and_told(
    open_changed: Open, epoch: datetime, offset: int
) -> None:
    """The two date systems of workbooks lie 1462 days apart."""

    def change(book: Any) -> None:
        book.epoch = epoch
        book["runs"]["J1"] = "started"
        book["runs"]["J2"] = 52369 + 9.5 / 24 - offset

    opened = open_changed({**AS_WORKBOOK, "day.xlsx": workbook(change)})
    assert opened.source.day is not None
    assert opened.source.day.runs[0].started == datetime(2043, 5, 18, 9, 30)
    told = opened.one("date-from-number")
    assert (told.where, told.severity) == ("day.xlsx, sheet 'runs', row 2, column 'started'", Severity.NOTE)
    assert "2043-05-18 09:30:00" in told.text


@pytest.mark.parametrize("cell", [52369, 0.4, 1e9, -3.5])
def test_number_that_is_no_date_time_is_a_fault(open_changed: Open, cell: float) -> None:
    def change(book: Any) -> None:
        book["runs"]["J1"], book["runs"]["J2"] = "started", cell

    opened = open_changed({**AS_WORKBOOK, "day.xlsx": workbook(change)})
    assert opened.one("not-a-time").where == "day.xlsx, sheet 'runs', row 2, column 'started'"


def test_serial_date_in_a_text_file_is_a_fault_for_its_day_zero_is_not_known(open_changed: Open) -> None:
    head, row = MINIATURE["runs.csv"].splitlines()
    opened = open_changed({"runs.csv": f"{head},started\n{row},52369.395833\n"})
    assert opened.one("not-a-time").where == "runs.csv, row 2, column 'started'"


def test_numbers_kept_as_text_are_read_and_told(open_changed: Open) -> None:
    def change(book: Any) -> None:
        book["gas"]["F2"], book["gas"]["F3"] = "50", "20,5"

    opened = open_changed({**AS_WORKBOOK, "day.xlsx": workbook(change)})
    assert areas(opened) == [50.0, 20.5]
    told = opened.one("numbers-interpreted")
    assert (told.where, told.severity) == ("day.xlsx, sheet 'gas', row 2, column 'peak area'", Severity.NOTE)
    assert told.text == "2 cells hold numbers as text, such as '50'"


def test_protected_sheets_and_workbooks_are_read(open_changed: Open) -> None:
    def change(book: Any) -> None:
        book["gas"].protection.sheet = True
        book["gas"].protection.password = "invented"
        book.security = openpyxl.workbook.protection.WorkbookProtection(lockStructure=True)

    opened = open_changed({**AS_WORKBOOK, "day.xlsx": workbook(change)})
    assert areas(opened) == [50.0, 20.0]


def test_workbook_behind_a_password_is_told_from_a_broken_one(open_changed: Open) -> None:
    locked = bytes.fromhex("d0cf11e0a1b11ae1") + bytes(4000)
    fault = open_changed({**AS_WORKBOOK, "day.xlsx": locked}).one("unreadable-file")
    assert fault.found == "an old workbook (.xls), or one locked with a password"
    assert "without a password" in fault.mend
