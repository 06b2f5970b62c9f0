from __future__ import annotations

import numpy as np
import pytest

from coulombook.report.workbook.cells import FIRST_ROW, Kind, Sheet, joined, letters_of, listed


def test_columns_are_lettered_as_a_spreadsheet_letters_them() -> None:
    # 26 letters, then 26^2 pairs: the last pair is number 26 + 676
    assert [letters_of(place) for place in (0, 25, 26, 51, 52, 701, 702)] == [
        "A",
        "Z",
        "AA",
        "AZ",
        "BA",
        "ZZ",
        "AAA",
    ]


def test_a_sheet_tells_where_its_cells_stand() -> None:
    sheet = Sheet("chart data", "t", "a", 3)
    assert sheet.text("run", ["a", "b", "c"]) == "A"
    assert sheet.entered("area", [1.0, 2.0, 3.0]) == "B"
    assert sheet["area"] == "'chart data'!B"
    assert sheet.span("area", 1, 3) == f"'chart data'!B{FIRST_ROW + 1}:B{FIRST_ROW + 2}"
    assert list(sheet.lines) == [6, 7, 8]
    assert joined("gas!M", [0, 2]) == "gas!M6,gas!M8"


def test_a_column_of_another_length_is_refused() -> None:
    sheet = Sheet("gas", "t", "a", 3)
    with pytest.raises(AssertionError, match="gas, area"):
        sheet.entered("area", [1.0])


def test_what_is_no_number_is_an_absent_value() -> None:
    assert listed(np.array([1.0, np.nan, np.inf, -np.inf])) == [1.0, None, None, None]
    assert listed(["a", None, 3]) == ["a", None, 3]


def test_an_entered_number_reads_as_it_was_typed() -> None:
    # 0.1 + 0.2 is 0.30000000000000004 in binary, as many a change of unit and back
    sheet = Sheet("runs", "t", "a", 2)
    sheet.entered("flow", [0.1 + 0.2, 1.0])
    assert sheet.columns[0].values == [0.3, 1.0]
    assert sheet.columns[0].kind is Kind.ENTERED
