from __future__ import annotations

import re
import zipfile
from datetime import datetime
from io import BytesIO
from pathlib import Path

import openpyxl
import pytest
from hypothesis import given
from hypothesis import strategies as st
from tests.forward.days import small_day
from tests.forward.files import write_day
from tests.unit.report.sample import sample_book

import coulombook
from coulombook.report.results import ResultsError, write_results
from coulombook.report.workbook import workbook_bytes
from coulombook.report.workbook.cells import Sheet
from coulombook.report.workbook.charts import Chart, Series
from coulombook.report.workbook.write import name_of, shown, written

WHEN = datetime(2043, 5, 18)


def _opened(sheet: Sheet) -> openpyxl.Workbook:
    return openpyxl.load_workbook(BytesIO(written([sheet], (), (), "a day", WHEN)))


@pytest.mark.parametrize(
    "text", ["=1+1", "+1", "-1", "@A1", "{=1}", "http://x.invalid", "internal:A1", "1.5", "A!B2"]
)
def test_a_text_is_written_as_a_text(text: str) -> None:
    sheet = Sheet("runs", "Runs", "about", 1)
    sheet.text("run", [text])
    cell = _opened(sheet)["runs"]["A6"]
    assert cell.value == text
    assert cell.data_type == "s"
    assert cell.hyperlink is None


def test_a_formula_is_written_with_its_value_beside_it() -> None:
    sheet = Sheet("runs", "Runs", "about", 1)
    letter = sheet.entered("area / cm^2", [2.0])
    sheet.formula("twice / cm^2", [f"={letter}6*2"], [4.0])
    with zipfile.ZipFile(BytesIO(written([sheet], (), (), "a day", WHEN))) as archive:
        assert b"<f>A6*2</f><v>4.0</v>" in archive.read("xl/worksheets/sheet1.xml")


def test_a_record_without_a_value_is_an_empty_cell() -> None:
    sheet = Sheet("runs", "Runs", "about", 2)
    sheet.formula("x", ["=1/0", "=1"], [float("nan"), 1.0])
    page = _opened(sheet)["runs"]
    assert page["A6"].value is None
    assert page["A7"].value == "=1"


@given(st.text(max_size=200))
def test_any_text_comes_back_as_it_is_shown(text: str) -> None:
    sheet = Sheet("runs", "Runs", "about", 1)
    sheet.text("run", [text])
    assert (_opened(sheet)["runs"]["A6"].value or "") == shown(text)


def test_a_text_longer_than_a_cell_is_cut() -> None:
    # 32,767 units of UTF-16 are the most a cell holds (ECMA-376 leaves it open; the limit of the common programs)
    for text in ("x" * 40_000, "\N{GRINNING FACE}" * 40_000, "\x01" * 40_000):
        assert len(shown(text).encode("utf-16-le")) // 2 <= 32_767
        assert shown(text).endswith("...")


def test_a_name_holds_what_a_name_may_hold() -> None:
    assert name_of("ledger", "u(FE) / %") == "ledger_u_FE"
    assert name_of("injections", "outlet flow / umol/s") == "injections_outlet_flow"
    assert name_of("gas", "=cmd|' /C'!A0") == "gas_cmd_C_A0"


def test_columns_whose_names_would_be_the_same_are_numbered() -> None:
    sheet = Sheet("chart data", "Data", "about", 1)
    for product in ("\u03b1", "\u03b2"):
        sheet.computed(f"{product}: FE / %", [1.0])
    assert set(_opened(sheet).defined_names) == {"chart_data_FE", "chart_data_FE_2"}


def test_a_chart_takes_its_name_from_a_cell() -> None:
    sheet = Sheet("runs", "Runs", "about", 1)
    sheet.text("run", ["=evil!A1"])
    sheet.computed("E vs RHE / V", [-0.8])
    sheet.computed("FE / %", [31.0])
    series = Series("=evil!A1", "=runs!$A$6", "=runs!$B$6", "=runs!$C$6")
    content = written([sheet], [Chart("=runs!$A$6", True, (series,))], (), "a day", WHEN)
    with zipfile.ZipFile(BytesIO(content)) as archive:
        chart = archive.read("xl/charts/chart1.xml")
    # title, name, potentials, heights: cells of our own, and no other formula
    assert re.findall(rb"<c:f>([^<]*)</c:f>", chart) == [
        b"runs!$A$6", b"runs!$A$6", b"runs!$B$6", b"runs!$C$6",
    ]  # fmt: skip


def test_a_book_without_what_it_was_computed_from_has_no_workbook() -> None:
    with pytest.raises(ValueError, match="computed from"):
        workbook_bytes(sample_book())


def test_a_day_longer_than_a_sheet_is_refused_with_a_way_out(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    book = coulombook.tally(write_day(tmp_path / "day", small_day()))
    monkeypatch.setattr("coulombook.report.workbook.cells.MOST_ROWS", 20)
    with pytest.raises(ResultsError, match=r"too long for a workbook: the sheet '\w+' .* --tables-only"):
        write_results(book, tmp_path / "results")
    assert not (tmp_path / "results").exists()
    assert write_results(book, tmp_path / "results", tables_only=True).is_dir()
