"""The sheets of day.xlsx as numbered rows of cells."""

from __future__ import annotations

import io
import warnings
import zipfile
import zlib
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from coulombook.findings import Findings, Origin
from coulombook.intake.files import unreadable
from coulombook.intake.grid import Cell, FaultyCell

Rows = list[tuple[int, Sequence[Cell]]]

LARGEST_UNPACKED_BYTE = 300_000_000  # ten times the text of a day of 50,000 peaks
_MOST_PARTS = 10_000
_ERROR_CELLS = frozenset(
    ("#DIV/0!", "#REF!", "#N/A", "#NAME?", "#NULL!", "#NUM!", "#VALUE!", "#SPILL!", "#CALC!", "#GETTING_DATA")
)


@dataclass(frozen=True, slots=True, eq=False)
class Sheets:
    """The sheets read, by name, and the names of the filled sheets that were left unread."""

    rows: dict[str, Rows]
    unread: tuple[str, ...]


def read_sheets(data: bytes, file: str, wanted: Callable[[str], bool], findings: Findings) -> Sheets | None:
    """Rows of every wanted sheet, trailing blank cells removed; None after a fault that makes the file unreadable.

    Cells hold what the workbook last computed. A cell with an error, or with a formula nobody has computed, is a
    fault that names it, and reads as a `FaultyCell`.
    """
    if not _sound(data, file, findings):
        return None
    try:
        with warnings.catch_warnings():
            warnings.simplefilter(
                "ignore"
            )  # openpyxl warns of decorations it does not keep; nothing is saved
            sheets = _load(data, data_only=True)
            formulas = _load(data, data_only=False) if _has_formulas(data) else {}
    except Exception as error:  # a damaged package raises whatever its damaged part happens to hit
        unreadable(
            findings, file, _first_line(error), "a workbook (.xlsx) that opens", "save the workbook again"
        )
        return None
    unread = tuple(name for name, rows in sheets.items() if rows and not wanted(name))
    sheets = {name: rows for name, rows in sheets.items() if wanted(name)}
    for name, rows in sheets.items():
        # a row of formulas that nobody has computed holds no value, and would be missed
        held, written = dict(rows), dict(formulas.get(name, []))
        rows[:] = [
            (
                number,
                _checked(held.get(number, ()), written.get(number, ()), Origin(file, name, number), findings),
            )
            for number in sorted({*held, *written})
        ]
    return Sheets(sheets, unread)


def _checked(
    cells: Sequence[Cell], written: Sequence[Cell], where: Origin, findings: Findings
) -> Sequence[Cell]:
    width = max(len(cells), len(written))
    values: list[Cell] = [*cells, *(None,) * (width - len(cells))]
    for column, value in enumerate(values):
        if isinstance(value, str) and value.startswith("#") and value in _ERROR_CELLS:
            findings.add(
                "not-a-number",
                _cell_place(where, column),
                "the cell holds an error",
                "mend the formula, or put in the value",
                found=f"'{value}'",
                expected="a value",
            )
            values[column] = FaultyCell()
    for column, formula in enumerate(written):
        # an array formula is an object of its own
        is_formula = formula.startswith("=") if isinstance(formula, str) else hasattr(formula, "ref")
        if values[column] is None and is_formula:
            findings.add(
                "not-a-number",
                _cell_place(where, column),
                "the formula has no stored result",
                "open the workbook, let it compute and save it, or put in the value",
                found=f"'{getattr(formula, 'text', formula)!s:.60}'",
                expected="a formula with its result, or a value",
            )
            values[column] = FaultyCell()
    return values


def _cell_place(where: Origin, column: int) -> str:
    letters = ""
    number = column + 1
    while number:
        number, rest = divmod(number - 1, 26)
        letters = chr(ord("A") + rest) + letters
    return f"{where}, cell {letters}{where.row}"


def _sound(data: bytes, file: str, findings: Findings) -> bool:
    """Whether the package is whole and unpacks to a size worth opening."""
    wanted = "a workbook (.xlsx) that opens"
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as package:
            parts = package.infolist()
            unpacked = sum(part.file_size for part in parts)
            if unpacked > LARGEST_UNPACKED_BYTE or len(parts) > _MOST_PARTS:
                unreadable(
                    findings,
                    file,
                    f"{unpacked / 1e6:.0f} MB in {len(parts)} parts when unpacked",
                    f"a workbook of at most {LARGEST_UNPACKED_BYTE / 1e6:.0f} MB unpacked",
                    "move what is no table of the day to another workbook",
                )
                return False
            for part in parts:
                # a document type is where entity bombs live; no spreadsheet program writes one
                if part.filename.endswith((".xml", ".rels")):
                    with package.open(part) as stream:
                        if b"<!DOCTYPE" in stream.read(1024):
                            unreadable(findings, file, f"a document type in {part.filename}", wanted)
                            return False
    except (zipfile.BadZipFile, OSError, ValueError, EOFError, RuntimeError, zlib.error) as error:
        unreadable(findings, file, _first_line(error), wanted, "save the workbook again; it may be cut short")
        return False
    return True


def _has_formulas(data: bytes) -> bool:
    with zipfile.ZipFile(io.BytesIO(data)) as package:
        for part in package.infolist():
            if part.filename.startswith("xl/worksheets/") and part.filename.endswith(".xml"):
                content = package.read(part)
                if b"<f>" in content or b"<f " in content or b"<f/>" in content:
                    return True
    return False


def _load(data: bytes, *, data_only: bool) -> dict[str, Rows]:
    import openpyxl

    book: Any = openpyxl.load_workbook(
        io.BytesIO(data), read_only=True, data_only=data_only, keep_links=False
    )
    try:
        sheets: dict[str, Rows] = {}
        for sheet in book.worksheets:
            # the size a sheet claims may be wrong, and would pad every row to it
            sheet.reset_dimensions()
            sheets[str(sheet.title)] = [
                (number, kept)
                for number, cells in enumerate(sheet.iter_rows(values_only=True), 1)
                if (kept := _trimmed(cells))
            ]
        return sheets
    finally:
        book.close()


def _trimmed(cells: Sequence[Cell]) -> Sequence[Cell]:
    width = len(cells)
    while width and cells[width - 1] is None:
        width -= 1
    return cells[:width]


def _first_line(error: BaseException) -> str:
    lines = str(error).strip().splitlines()
    return lines[0][:1].lower() + lines[0][1:120] if lines else type(error).__name__
