from __future__ import annotations

import csv
import io
import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coulombook.book import TABLES, Table
from coulombook.report.tables import csv_cell, csv_text, harmless_text, original_text

HOSTILE = [
    "=cmd|' /C calc'!A0",
    "+1+cmd|' /C calc'!A0",
    "-2+3+cmd|' /C calc'!A0",
    "@SUM(1+1)*cmd|' /C calc'!A0",
    "\t=1+1",
    "\r=1+1",
    "\n=1+1",
    "  =1+1",
    '"=1+1',
    "＝1+1",
    "mesh;=1+1;x",
    "mesh\t@SUM(A1)",
    "'=1+1",
    "-",
    "-1.1 V+A1",
    "-1(2)",
]
HARMLESS = ["-1.1", "-1.1 V", "+3", "-2,5", "-1e-3", "-10 mA", "mesh", "a=b", "m-1", "it's", "", "'quoted'"]


def read_back(text: str) -> list[list[str]]:
    return list(csv.reader(io.StringIO(text, newline="")))


def table(*cells: Any) -> Table:
    return Table("any", tuple(f"head {n}" for n in range(len(cells))), (tuple(cells),))


@pytest.mark.parametrize("text", HOSTILE)
@pytest.mark.parametrize("separator", [",", ";", "\t"])
def test_no_cell_begins_a_formula_whatever_separator_the_spreadsheet_is_set_to(
    text: str, separator: str
) -> None:
    content = csv_text(table("run", text, "after"))
    # split as crudely as a spreadsheet that does not take our quotes for quotes
    for line in content.splitlines():
        for cell in line.split(separator):
            bare = cell.strip(' "')
            assert bare[:1] not in {*"=+@-", "＝"} or bare.lstrip("-").replace(".", "").isdecimal(), cell


@pytest.mark.parametrize("text", HOSTILE)
def test_a_hostile_name_comes_back_as_it_was(text: str) -> None:
    cell = read_back(csv_text(table("run", text)))[1][1]
    assert cell != text
    assert original_text(cell) == text


@pytest.mark.parametrize("text", HARMLESS)
def test_numbers_units_and_plain_names_are_left_as_they_are(text: str) -> None:
    assert read_back(csv_text(table("run", text)))[1][1] == text


@given(st.text(alphabet=st.sampled_from("=+-@'\"; \t\r\n,a1.é＝"), max_size=12))
def test_any_text_comes_back_through_the_file(text: str) -> None:
    assert original_text(harmless_text(text)) == text
    # two columns, because a lone empty cell is an empty line to a reader
    assert original_text(read_back(csv_text(table("x", text)))[1][1]) == text


@given(st.floats(allow_nan=False))
def test_a_number_comes_back_as_the_same_double(value: float) -> None:
    assert float(csv_cell(value)) == value


def test_numpy_numbers_are_written_as_plain_numbers() -> None:
    cells: Any = (np.float64(0.1), np.int64(12), True)
    assert [csv_cell(one) for one in cells] == ["0.1", "12", "1"]


def test_an_absent_value_is_an_empty_cell() -> None:
    assert csv_text(table("a", None, "b")) == "head 0,head 1,head 2\na,,b\n"
    heads = TABLES["surface"]
    assert heads[0] == "electrode"
    assert csv_text(Table.of("surface", [{"electrode": "m1", "linearity": math.nan}])).splitlines()[
        1
    ] == "m1" + "," * (len(heads) - 1)


def test_commas_quotes_and_line_breaks_are_quoted_as_in_rfc_4180() -> None:
    assert csv_text(table('a "b"', "c, d", "e\r\nf")).partition("\n")[2] == '"a ""b""","c, d","e\r\nf"\n'


def test_pandas_reads_the_table_as_it_was() -> None:
    import pandas as pd

    rows: Any = (("m1", "-1.1 V", 14.349012345678901, 2, None), ("m2", "=x", 1e-300, 3, 0.5))
    read = pd.read_csv(
        io.StringIO(csv_text(Table("any", ("run", "level", "FE / %", "electrons", "u"), rows)))
    )
    assert read["FE / %"].tolist() == [14.349012345678901, 1e-300]
    assert read["level"].tolist() == ["-1.1 V", "'=x"]
    assert read["u"].isna().tolist() == [True, False]
