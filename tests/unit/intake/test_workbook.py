"""Sheets of day.xlsx."""

from __future__ import annotations

import io
import zipfile
from collections.abc import Callable, Sequence
from datetime import datetime
from typing import Any

import openpyxl
import pytest
from tests.unit.intake.conftest import MINIATURE, Opened

from coulombook.findings import Findings
from coulombook.intake import package
from coulombook.intake.workbook import Sheets, read_sheets

Open = Callable[..., Opened]


def _bytes(**sheets: Sequence[Sequence[Any]]) -> bytes:
    book = openpyxl.Workbook()
    book.remove(book.active)
    for name, rows in sheets.items():
        sheet = book.create_sheet(name)
        for row in rows:
            sheet.append(list(row))
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def _rows_of(text: str) -> list[list[Any]]:
    def cell(word: str) -> Any:
        try:
            return float(word)
        except ValueError:
            return word or None

    return [[cell(word) for word in line.split(",")] for line in text.splitlines()]


TABLES = ("runs", "gas", "vials", "liquid")
AS_WORKBOOK = {f"{name}.csv": None for name in TABLES}


def _miniature(**changes: Sequence[Sequence[Any]]) -> bytes:
    return _bytes(**({name: _rows_of(MINIATURE[f"{name}.csv"]) for name in TABLES} | changes))


def _read(data: bytes) -> tuple[Sheets | None, Findings]:
    findings = Findings()
    return read_sheets(data, "day.xlsx", lambda name: name == "gas", findings), findings


def test_a_workbook_gives_the_same_day_as_text(open_changed: Open) -> None:
    text = open_changed()
    book = open_changed({**AS_WORKBOOK, "day.xlsx": _miniature()})
    assert text.source.day is not None
    assert book.source.day is not None
    for one, other in zip(text.source.day.peaks, book.source.day.peaks, strict=True):
        assert (one.injection, one.analyte, one.peak_area) == (
            other.injection,
            other.analyte,
            other.peak_area,
        )
        assert other.origin.sheet == "gas"
        assert other.origin.row == one.origin.row
    assert text.source.day.runs[0].electrode_area_m2 == book.source.day.runs[0].electrode_area_m2


def test_free_text_above_the_heads_of_a_sheet_is_skipped(open_changed: Open) -> None:
    gas = [["measured on the new column"], [], *_rows_of(MINIATURE["gas.csv"])]
    day = open_changed({**AS_WORKBOOK, "day.xlsx": _miniature(gas=gas)}).source.day
    assert day is not None
    assert [peak.origin.row for peak in day.peaks] == [4, 5]


def test_a_date_cell_is_a_date_time(open_changed: Open) -> None:
    runs = _rows_of(MINIATURE["runs.csv"])
    runs[0].append("started")
    runs[1].append(datetime(2043, 5, 18, 9, 30))
    day = open_changed({**AS_WORKBOOK, "day.xlsx": _miniature(runs=runs)}).source.day
    assert day is not None
    assert day.runs[0].started == datetime(2043, 5, 18, 9, 30)


def test_a_sheet_of_unknown_name_is_noted(open_changed: Open) -> None:
    opened = open_changed({**AS_WORKBOOK, "day.xlsx": _miniature(liqiud=[["x"]])})
    assert opened.source.day is not None
    note = opened.one("unread-table")
    assert note.where == "day.xlsx, sheet 'liqiud'"
    assert "'liquid'" in note.mend


def test_a_table_as_file_and_as_sheet_is_a_fault(open_changed: Open) -> None:
    opened = open_changed({**AS_WORKBOOK, "gas.csv": MINIATURE["gas.csv"], "day.xlsx": _miniature()})
    assert opened.one("two-sources").found == "gas.csv and day.xlsx, sheet 'gas'"
    assert opened.source.day is None


def test_an_error_cell_is_a_fault_that_names_it() -> None:
    _, findings = _read(_bytes(gas=[["run", "time / s"], ["a1", "#DIV/0!"]]))
    (fault,) = findings
    assert fault.kind == "not-a-number"
    assert fault.where == "day.xlsx, sheet 'gas', row 2, cell B2"
    assert fault.found == "'#DIV/0!'"


def test_a_formula_nobody_has_computed_is_a_fault() -> None:
    # openpyxl writes formulas without a stored result, as scripts do
    _, findings = _read(_bytes(gas=[["run", "time / s"], ["a1", "=3*60"]]))
    (fault,) = findings
    assert fault.kind == "not-a-number"
    assert "cell B2" in fault.where
    assert fault.found == "'=3*60'"


def test_a_formula_with_its_result_reads_as_the_result() -> None:
    data = _bytes(gas=[["run", "time / s"], ["a1", "=3*60"]])
    stream = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(stream, "w") as new:
        for part in old.infolist():
            content = old.read(part)
            new.writestr(
                part.filename, content.replace(b"<v></v>", b"<v>180</v>").replace(b"<v />", b"<v>180</v>")
            )
    sheets, findings = _read(stream.getvalue())
    assert list(findings) == []
    assert sheets is not None
    assert sheets.rows["gas"][1] == (2, ["a1", 180])


def test_errors_outside_the_tables_of_the_day_do_not_matter() -> None:
    sheets, findings = _read(_bytes(gas=[["run"], ["a1"]], plots=[["#REF!", "=1/0"]]))
    assert list(findings) == []
    assert sheets is not None
    assert sheets.unread == ("plots",)


@pytest.mark.parametrize("keep", [0, 1, 30, 0.5, 0.9, -1])
def test_a_truncated_workbook_is_unreadable(keep: float) -> None:
    whole = _miniature()
    data = whole[: int(keep * len(whole))] if 0 < keep < 1 else whole[: int(keep)]
    sheets, findings = _read(data)
    assert sheets is None
    assert [one.kind for one in findings] == ["unreadable-file"]


def test_a_workbook_that_unpacks_to_too_much_is_not_opened(monkeypatch: pytest.MonkeyPatch) -> None:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("xl/worksheets/sheet1.xml", b"0" * 2_000_000)
    monkeypatch.setattr(package, "LARGEST_UNPACKED_BYTE", 1_000_000)
    sheets, findings = _read(stream.getvalue())
    assert sheets is None
    (fault,) = findings
    assert fault.found == "2 MB in 1 parts when unpacked"


def test_a_document_type_in_a_workbook_is_refused() -> None:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as package:
        package.writestr("xl/workbook.xml", b'<?xml version="1.0"?><!DOCTYPE lolz [<!ENTITY lol "lol">]><x/>')
    sheets, findings = _read(stream.getvalue())
    assert sheets is None
    assert "document type" in next(iter(findings)).found


def test_a_package_that_is_no_workbook_is_unreadable() -> None:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as package:
        package.writestr("hello.txt", b"hello")
    sheets, findings = _read(stream.getvalue())
    assert sheets is None
    assert [one.kind for one in findings] == ["unreadable-file"]
