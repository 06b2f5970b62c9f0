"""The sheets of day.xlsx as numbered rows of cells."""

from __future__ import annotations

import io
import re
import warnings
import zipfile
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any

from coulombook.findings import Findings, Origin
from coulombook.intake.files import unreadable
from coulombook.intake.grid import Cell, FaultyCell
from coulombook.intake.limits import MOST_CELLS, MOST_SHEET_ROWS
from coulombook.intake.package import DAMAGE, BadPackage, blocks, refuse_foreign, refuse_harmful

Rows = list[tuple[int, Sequence[Cell]]]

_ERROR_CELLS = frozenset(
    ("#DIV/0!", "#REF!", "#N/A", "#NAME?", "#NULL!", "#NUM!", "#VALUE!", "#SPILL!", "#CALC!", "#GETTING_DATA")
)
_MERGED = re.compile(
    rb'<(?:[\w.-]+:)?mergeCell(?=\s)[^<>]*?\sref="([A-Z]{1,3})(\d{1,7}):([A-Z]{1,3})(\d{1,7})"'
)
_HIDDEN_ROW = re.compile(rb'<(?:[\w.-]+:)?row(?=\s)[^<>]*?\shidden="(?:1|true)"')
_HIDDEN_COLUMN = re.compile(rb'<(?:[\w.-]+:)?col(?=\s)[^<>]*?\shidden="(?:1|true)"')


@dataclass(frozen=True, slots=True)
class Merged:
    """Cells that were made one: rows as the spreadsheet counts, columns from 0."""

    top: int
    left: int
    bottom: int
    name: str


@dataclass(frozen=True, slots=True)
class Look:
    """What a sheet shows that its cells do not tell."""

    merged: tuple[Merged, ...] = ()
    hidden: tuple[str, ...] = ()  # in words: the sheet, rows, columns


@dataclass(frozen=True, slots=True, eq=False)
class Sheets:
    """The sheets read, by name, and the names of the filled sheets that were left unread.

    ``epoch`` is day 0 of the workbook's serial dates.
    """

    rows: dict[str, Rows]
    unread: tuple[str, ...]
    looks: dict[str, Look] = field(default_factory=dict)
    epoch: datetime | None = None


@dataclass(slots=True, eq=False)
class _Read:
    """The wanted sheets, whether the others hold anything, and what one look at the package tells."""

    rows: dict[str, Rows]
    unread: list[str]
    paths: dict[str, str]
    states: dict[str, str]
    epoch: datetime | None = None


def read_sheets(data: bytes, file: str, wanted: Callable[[str], bool], findings: Findings) -> Sheets | None:
    """Rows of every wanted sheet, trailing blank cells removed; None after a fault that makes the file unreadable.

    Cells hold what the workbook last computed. A cell with an error, or with a formula nobody has computed, is a
    fault that names it, and reads as a `FaultyCell`.
    """
    try:
        refuse_foreign(data)
        with zipfile.ZipFile(io.BytesIO(data)) as package:
            refuse_harmful(package)
    except BadPackage as error:
        unreadable(findings, file, error.found, error.expected, error.mend)
        return None
    except DAMAGE as error:
        unreadable(findings, file, _first_line(error), "a workbook (.xlsx) that opens",
                   "save the workbook again; it may be cut short")  # fmt: skip
        return None
    try:
        with warnings.catch_warnings():
            warnings.simplefilter(
                "ignore"
            )  # openpyxl warns of decorations it does not keep; nothing is saved
            read = _load(data, wanted, data_only=True)
            formulas = _load(data, wanted, data_only=False).rows if _has_formulas(data) else {}
            looks = _looks(data, read)
    except BadPackage as error:
        unreadable(findings, file, error.found, error.expected, error.mend)
        return None
    except Exception as error:  # a damaged package raises whatever its damaged part happens to hit
        unreadable(
            findings, file, _first_line(error), "a workbook (.xlsx) that opens", "save the workbook again"
        )
        return None
    for name, rows in read.rows.items():
        # a row of formulas that nobody has computed holds no value, and would be missed
        held, written = dict(rows), dict(formulas.get(name, []))
        rows[:] = [
            (
                number,
                _checked(held.get(number, ()), written.get(number, ()), Origin(file, name, number), findings),
            )
            for number in sorted({*held, *written})
        ]
    return Sheets(read.rows, tuple(read.unread), looks, read.epoch)


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


def _column_of(letters: str) -> int:
    """Place of a column, from 0, by its letters."""
    number = 0
    for letter in letters:
        number = number * 26 + ord(letter) - ord("A") + 1
    return number - 1


def _has_formulas(data: bytes) -> bool:
    with zipfile.ZipFile(io.BytesIO(data)) as package:
        for part in package.infolist():
            if part.filename.startswith("xl/worksheets/") and part.filename.endswith(".xml"):
                content = package.read(part)
                if b"<f>" in content or b"<f " in content or b"<f/>" in content:
                    return True
    return False


def _load(data: bytes, wanted: Callable[[str], bool], *, data_only: bool) -> _Read:
    """The rows of the wanted sheets. Raises `BadPackage` for more cells than any day has."""
    import openpyxl

    book: Any = openpyxl.load_workbook(
        io.BytesIO(data), read_only=True, data_only=data_only, keep_links=False
    )
    try:
        read = _Read({}, [], {}, {}, book.epoch)
        cells = 0
        for sheet in book.worksheets:
            # the size a sheet claims may be wrong, and would pad every row to it
            sheet.reset_dimensions()
            title = str(sheet.title)
            is_wanted = wanted(title)
            rows: Rows = []
            for number, row in enumerate(sheet.iter_rows(values_only=True), 1):
                cells += len(row) + 1
                if number > MOST_SHEET_ROWS or cells > MOST_CELLS:
                    raise BadPackage(
                        f"more than {MOST_SHEET_ROWS} rows in sheet '{title:.60}'" if number > MOST_SHEET_ROWS
                        else f"more than {MOST_CELLS} cells, the blank ones before a filled one with them",
                        f"tables of at most {MOST_CELLS} cells",
                        "delete what stands far below or beside the tables, or write them as CSV",
                    )  # fmt: skip
                if kept := _trimmed(row):
                    rows.append((number, kept))
                    if not is_wanted:
                        break
            if is_wanted:
                read.rows[title] = rows
                read.paths[title] = str(sheet._worksheet_path)
                read.states[title] = str(sheet.sheet_state)
            elif rows:
                read.unread.append(title)
        return read
    finally:
        book.close()


def _looks(data: bytes, read: _Read) -> dict[str, Look]:
    """Merged and hidden cells of the sheets read, which a reader of cells does not tell of."""
    looks = {}
    with zipfile.ZipFile(io.BytesIO(data)) as package:
        for title, path in read.paths.items():
            content = b"".join(blocks(package, path))
            merged = tuple(
                Merged(int(top), _column_of(left.decode()), int(bottom), f"{left.decode()}{int(top)}:"
                       f"{right.decode()}{int(bottom)}")
                for left, top, right, bottom in _MERGED.findall(content)
                if int(bottom) > int(top)
            )  # fmt: skip
            hidden = []
            if read.states[title] != "visible":
                hidden.append("the sheet")
            for pattern, one in ((_HIDDEN_ROW, "row"), (_HIDDEN_COLUMN, "column")):
                count = len(pattern.findall(content))
                if count:
                    hidden.append(f"{count} {one}{'s' if count > 1 else ''}")
            looks[title] = Look(tuple(sorted(merged, key=lambda one: (one.top, one.left))), tuple(hidden))
    return looks


def _trimmed(cells: Sequence[Cell]) -> Sequence[Cell]:
    width = len(cells)
    while width and cells[width - 1] is None:
        width -= 1
    return cells[:width]


def _first_line(error: BaseException) -> str:
    lines = str(error).strip().splitlines()
    return lines[0][:1].lower() + lines[0][1:120] if lines else type(error).__name__
