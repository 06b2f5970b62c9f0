"""A real spreadsheet program, LibreOffice without a window, and a plain reader of what workbooks hold.

`recalculated` takes away every cached value first, so that what comes back was computed by the program and by
nothing else.
"""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import zipfile
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from io import BytesIO
from pathlib import Path
from xml.etree import ElementTree as ET

import pytest

# set where every test must run: a program that is missing is then a failure, and no reason to skip
ALL_TESTS = "COULOMBOOK_ALL_TESTS"
HEAD_ROW, FIRST_ROW = 4, 6  # of every sheet of a book.xlsx that holds records
_CACHED = re.compile(rb"(<f>[^<]*</f>)<v>[^<]*</v>")
_MAIN = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"
_RELATION = "{http://schemas.openxmlformats.org/officeDocument/2006/relationships}id"


@dataclass(frozen=True, slots=True)
class SheetCell:
    """One cell: its formula without the equals sign, or None; its value; whether it shows an error."""

    formula: str | None
    value: float | str | None
    error: bool


Cells = dict[str, dict[str, SheetCell]]
"""Cells by sheet and coordinate."""


def read_cells(workbook: bytes) -> Cells:
    """Every cell of a workbook that holds anything."""
    with zipfile.ZipFile(BytesIO(workbook)) as archive:
        strings = list(_shared_strings(archive))
        return {name: dict(_cells(archive.read(path), strings)) for name, path in _sheets(archive)}


def _sheets(archive: zipfile.ZipFile) -> Iterator[tuple[str, str]]:
    relations = ET.fromstring(archive.read("xl/_rels/workbook.xml.rels"))
    targets = {one.attrib["Id"]: one.attrib["Target"] for one in relations}
    for sheet in ET.fromstring(archive.read("xl/workbook.xml")).iter(f"{_MAIN}sheet"):
        target = targets[sheet.attrib[_RELATION]]
        yield sheet.attrib["name"], "xl/" + target.removeprefix("/xl/")


def _shared_strings(archive: zipfile.ZipFile) -> Iterator[str]:
    for one in ET.fromstring(archive.read("xl/sharedStrings.xml")).iter(f"{_MAIN}si"):
        yield "".join(part.text or "" for part in one.iter(f"{_MAIN}t"))


def _cells(content: bytes, strings: list[str]) -> Iterator[tuple[str, SheetCell]]:
    for one in ET.fromstring(content).iter(f"{_MAIN}c"):
        formula, value = one.find(f"{_MAIN}f"), one.find(f"{_MAIN}v")
        kind, text = one.attrib.get("t", "n"), None if value is None else value.text or ""
        if formula is None and text is None:
            continue
        shown: float | str | None = text
        if text is not None and kind == "s":
            shown = strings[int(text)]
        elif text and kind in ("n", "b"):
            shown = float(text)
        yield (
            one.attrib["r"],
            SheetCell(None if formula is None else formula.text or "", shown, kind == "e"),
        )


def records(cells: Mapping[str, SheetCell]) -> list[dict[str, float | str | None]]:
    """The records of a sheet of book.xlsx, by head; an empty cell is None."""
    heads, rows = {}, {}
    for place, cell in cells.items():
        letters, number = split(place)
        if number == HEAD_ROW:
            heads[letters] = str(cell.value)
        elif number >= FIRST_ROW:
            rows.setdefault(number, {})[letters] = None if cell.value == "" else cell.value
    return [{head: rows[number].get(letters) for letters, head in heads.items()} for number in sorted(rows)]


def place_of(cells: Mapping[str, SheetCell], head: str, **where: str) -> str:
    """Coordinate of the one cell under ``head`` in the record whose cells under other heads are as given."""
    letters = {
        str(cell.value): split(place)[0] for place, cell in cells.items() if split(place)[1] == HEAD_ROW
    }
    found = [
        number
        for number, record in enumerate(records(cells), FIRST_ROW)
        if all(str(record[name]) == value for name, value in where.items())
    ]
    assert len(found) == 1, f"{len(found)} records with {where}"
    return f"{letters[head]}{found[0]}"


def split(place: str) -> tuple[str, int]:
    """Letters and number of a coordinate."""
    letters = place.rstrip("0123456789")
    return letters, int(place[len(letters) :])


def program() -> str:
    """Path of the program; skips the test where there is none, or fails it where all must run."""
    found = shutil.which("soffice") or shutil.which("libreoffice")
    if found is None:
        reason = "LibreOffice (soffice) is not installed: no spreadsheet program can recalculate the workbook"
        if os.environ.get(ALL_TESTS):
            pytest.fail(reason)
        pytest.skip(reason)
    return found


def without_cached_values(workbook: bytes) -> bytes:
    """The same workbook with nothing but the formula in every formula cell."""
    changed = BytesIO()
    taken = 0
    with (
        zipfile.ZipFile(BytesIO(workbook)) as before,
        zipfile.ZipFile(changed, "w", zipfile.ZIP_DEFLATED) as after,
    ):
        for name in before.namelist():
            content = before.read(name)
            if name.startswith("xl/worksheets/"):
                content, count = _CACHED.subn(rb"\1", content)
                taken += count
            after.writestr(name, content)
    assert taken, "the workbook held no cached value"
    return changed.getvalue()


def recalculated(workbooks: Mapping[str, bytes], folder: Path) -> dict[str, Cells]:
    """Cells of workbooks without cached values, by name, computed in one start of the program."""
    soffice = program()
    given, back = folder / "given", folder / "back"
    given.mkdir(parents=True)
    names = {f"book{number}": name for number, name in enumerate(workbooks)}
    for file, name in names.items():
        (given / f"{file}.xlsx").write_bytes(workbooks[name])
    command = [
        soffice,
        # a profile of its own: one that is open elsewhere would swallow the call
        f"-env:UserInstallation={(folder / 'profile').as_uri()}",
        "--headless",
        "--norestore",
        "--convert-to",
        "xlsx:Calc MS Excel 2007 XML",
        "--outdir",
        str(back),
        *(str(given / f"{file}.xlsx") for file in names),
    ]
    done = subprocess.run(command, capture_output=True, text=True, timeout=600, check=False)
    missing = [name for file, name in names.items() if not (back / f"{file}.xlsx").is_file()]
    assert not missing, f"{missing}: {done.stdout}{done.stderr}"
    return {name: read_cells((back / f"{file}.xlsx").read_bytes()) for file, name in names.items()}
