"""Packages that mean harm: each is answered at once, by its limit."""

from __future__ import annotations

import io
import time
import zipfile
from collections.abc import Callable

import openpyxl
import pytest

from coulombook.findings import Findings
from coulombook.intake import package, workbook
from coulombook.intake.workbook import read_sheets

SHEET = "xl/worksheets/sheet1.xml"
OPEN = b'<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><sheetData>'
CLOSE = b"</sheetData></worksheet>"
STYLES = b'<styleSheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><cellXfs>'
STRINGS = b'<sst xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">'
BOOK = (
    b'<workbook xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main" '
    b'xmlns:r="http://schemas.openxmlformats.org/officeDocument/2006/relationships"><sheets>'
)
DOCTYPE = b'<!DOCTYPE a [<!ENTITY b "ha"><!ENTITY c "&b;&b;&b;&b;&b;&b;&b;&b;&b;&b;">]>'
# more than any case takes on a busy machine, and far less than what each would take if it were parsed
SECONDS = 60.0


def with_part(name: str, content: bytes) -> bytes:
    """A good workbook with one part replaced or added."""
    book = openpyxl.Workbook()
    book.active.title = "gas"
    book.active.append(["run", "time / s"])
    whole, changed = io.BytesIO(), io.BytesIO()
    book.save(whole)
    with zipfile.ZipFile(whole) as old, zipfile.ZipFile(changed, "w", zipfile.ZIP_DEFLATED) as new:
        for one in dict.fromkeys([*old.namelist(), name]):
            new.writestr(one, content if one == name else old.read(one))
    return changed.getvalue()


def rows(count: int, row: bytes) -> bytes:
    return OPEN + row * count + CLOSE


CASES: dict[str, tuple[Callable[[], bytes], str]] = {
    "a row of endless cells": (
        lambda: with_part(SHEET, rows(1, b"<row>" + b"<c/>" * 2_000_000 + b"</row>")),
        "more than 131072 tags from one row to the next in xl/worksheets/sheet1.xml",
    ),
    "a row of endless cells with empty rows between": (
        lambda: with_part(SHEET, rows(1, b"<row>" + (b"<c/>" * 60_000 + b"<row/>") * 30 + b"</row>")),
        "more than 131072 tags from one row to the next",
    ),
    "more cells than any day has": (
        lambda: with_part(SHEET, rows(300_000, b"<row>" + b"<c><v>1</v></c>" * 10 + b"</row>")),
        "13 million tags of cells",
    ),
    "a row far below": (
        lambda: with_part(SHEET, rows(1, b'<row r="99999999999"><c r="A99999999999"><v>1</v></c></row>')),
        "more than 1048576 rows in sheet 'gas'",
    ),
    "cells far to the right": (
        lambda: with_part(
            SHEET,
            OPEN
            + b"".join(b'<row r="%d"><c r="XFD%d"><v>1</v></c></row>' % (n, n) for n in range(1, 10_000))
            + CLOSE,
        ),
        "more than 3000000 cells",
    ),
    "a column beyond all": (
        lambda: with_part(SHEET, rows(1, b'<row r="1"><c r="ZZZZ1"><v>1</v></c></row>')),
        "column name",
    ),
    "a document type": (lambda: with_part(SHEET, DOCTYPE + rows(0, b"")), f"a document type in {SHEET}"),
    "a document type behind a comment": (
        lambda: with_part(SHEET, b"<!--" + b"x" * 100_000 + b"-->" + DOCTYPE + rows(0, b"")),
        f"a document type in {SHEET}",
    ),
    "a document type in UTF-16": (
        lambda: with_part(
            SHEET,
            ('<?xml version="1.0" encoding="UTF-16"?>' + DOCTYPE.decode() + "<worksheet/>").encode("utf-16"),
        ),
        f"a document type in {SHEET}",
    ),
    "a document type in a part of another name": (
        lambda: with_part("xl/harmless.bin", DOCTYPE + b"<a/>"),
        "a document type in xl/harmless.bin",
    ),
    "a comment without end": (
        lambda: with_part("xl/x.xml", b"<!--" + b"x" * 100_000_000),
        "more than 1 MB of comments above the XML of xl/x.xml",
    ),
    "endless styles": (
        lambda: with_part("xl/styles.xml", STYLES + b"<xf/>" * 2_000_000 + b"</cellXfs></styleSheet>"),
        "2.0 million tags of styles and the like",
    ),
    "a styles part of many megabytes": (
        lambda: with_part("xl/styles.xml", STYLES + b" " * 20_000_000 + b"</cellXfs></styleSheet>"),
        "20 MB of xl/styles.xml",
    ),
    "endless texts": (
        lambda: with_part("xl/sharedStrings.xml", STRINGS + b"<si/>" * 9_000_000 + b"</sst>"),
        "9 million tags of cells",
    ),
    "texts of many megabytes": (
        lambda: with_part(
            "xl/sharedStrings.xml", STRINGS + b"<si><t>" + b"x" * 130_000_000 + b"</t></si></sst>"
        ),
        "130 MB of cells when unpacked",
    ),
    "many sheets of one part": (
        lambda: with_part(
            "xl/workbook.xml",
            BOOK + b'<sheet name="gas" sheetId="1" r:id="rId1"/>' * 5_000 + b"</sheets></workbook>",
        ),
        "5000 sheets",
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_workbook_is_refused_at_once_for(name: str) -> None:
    make, found = CASES[name]
    data = make()
    assert len(data) < 2_000_000, "a bomb is small"
    findings = Findings()
    start = time.perf_counter()
    assert read_sheets(data, "day.xlsx", lambda title: title == "gas", findings) is None
    assert time.perf_counter() - start < SECONDS
    (fault,) = findings
    assert fault.kind == "unreadable-file"
    assert found in fault.found
    assert fault.expected
    assert fault.mend


def test_many_parts_are_refused() -> None:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:
        for number in range(10_001):
            archive.writestr(f"{number}", b"")
    findings = Findings()
    assert read_sheets(stream.getvalue(), "day.xlsx", lambda title: True, findings) is None
    assert next(iter(findings)).found == "0 MB in 10001 parts when unpacked"


def test_sheet_nobody_wants_is_not_read_beyond_its_first_row() -> None:
    data = with_part(SHEET, rows(20_000, b"<row><c><v>1</v></c></row>"))
    findings = Findings()
    reads: list[int] = []
    trimmed = workbook._trimmed

    def counted(cells: object) -> object:
        reads.append(1)
        return trimmed(cells)  # type: ignore[arg-type]  # passed on as it came

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(workbook, "_trimmed", counted)
        sheets = read_sheets(data, "day.xlsx", lambda title: False, findings)
    assert sheets is not None
    assert sheets.unread == ("gas",)
    assert len(reads) == 1


def test_many_unique_texts_are_no_endless_row() -> None:
    texts = b"".join(b"<si><t>%d</t></si>" % number for number in range(60_000))
    assert read_sheets(with_part("xl/sharedStrings.xml", STRINGS + texts + b"</sst>"), "day.xlsx",
                       lambda title: True, Findings()) is not None  # fmt: skip


@pytest.mark.parametrize("block", [1, 3, 64, 1 << 20])
def test_tags_are_counted_alike_across_blocks(block: int, monkeypatch: pytest.MonkeyPatch) -> None:
    content = b"<a><row><c/><c><v>1</v></c></row><x:row r='1'/><row><c/></row></a>"
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:
        archive.writestr("part", content)
    monkeypatch.setattr(package, "_BLOCK", block)
    with zipfile.ZipFile(stream) as archive:
        monkeypatch.setattr(package, "blocks", lambda of, part: (
            content[place : place + block] for place in range(0, len(content), block)))  # fmt: skip
        tags, in_row = package._tags(archive, archive.infolist()[0])
    # a, row, c, c, v, /v, /c, /row, row, row, c, /row, /a; up to the first row's end: all before it but that end
    assert (tags, in_row) == (13, 7)
