"""Writing the audit workbook of the example day, against a bare loop that writes the same cells; prints JSON.

    python -m tests.benchmarks.workbook FOLDER REPEATS

The other side is what one would write with XlsxWriter alone: every cell's place, formula, value and format are given
beforehand, and it does nothing but write them.
"""

from __future__ import annotations

import json
import sys
from io import BytesIO
from pathlib import Path
from typing import Any, NamedTuple

import openpyxl
from tests.benchmarks.days import CALIBRATIONS, copy_example
from tests.benchmarks.measure import in_turns, timed
from xlsxwriter import Workbook

import coulombook
from coulombook.report.workbook import workbook_bytes


class Given(NamedTuple):
    """One cell: its place, and what is written there."""

    row: int
    column: int
    formula: str | None
    value: Any
    format: str


def cells_of(content: bytes) -> dict[str, list[Given]]:
    """Every cell of a workbook by sheet."""
    values = openpyxl.load_workbook(BytesIO(content), data_only=True)
    found = {}
    for page in openpyxl.load_workbook(BytesIO(content)):
        found[page.title] = [
            Given(
                cell.row - 1,
                cell.column - 1,
                cell.value if cell.data_type == "f" else None,
                values[page.title][cell.coordinate].value,
                cell.number_format,
            )
            for row in page.iter_rows()
            for cell in row
            if cell.value is not None
        ]
    return found


def bare(cells: dict[str, list[Given]]) -> bytes:
    """The cells written one by one."""
    stream = BytesIO()
    workbook = Workbook(stream, {"in_memory": True})
    formats = {
        one: workbook.add_format({"num_format": one})
        for one in {cell.format for held in cells.values() for cell in held}
    }
    for name, held in cells.items():
        page = workbook.add_worksheet(name)
        for cell in held:
            if cell.formula is not None:
                page.write_formula(cell.row, cell.column, cell.formula, formats[cell.format], cell.value)
            elif isinstance(cell.value, str):
                page.write_string(cell.row, cell.column, cell.value, formats[cell.format])
            else:
                page.write_number(cell.row, cell.column, cell.value, formats[cell.format])
    workbook.close()
    return stream.getvalue()


def main(folder: Path, repeats: int) -> dict[str, float]:
    """Seconds of both sides, and how many cells they wrote."""
    copy_example(folder)
    book = coulombook.tally(folder, calibrations=[CALIBRATIONS])
    content = workbook_bytes(book)
    cells = cells_of(content)
    if cells_of(bare(cells)).keys() != cells.keys() or workbook_bytes(book) != content:
        raise AssertionError("the two sides do not write the same sheets, or not the same bytes twice")
    costs = in_turns(
        {"ours": timed(lambda: workbook_bytes(book)), "bare": timed(lambda: bare(cells))}, repeats
    )
    return {
        "cells": sum(map(len, cells.values())),
        "ours": costs["ours"].second,
        "bare": costs["bare"].second,
    }


if __name__ == "__main__":
    print(json.dumps(main(Path(sys.argv[1]), int(sys.argv[2]))))
