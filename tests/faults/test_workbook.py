"""Broken workbooks."""

from __future__ import annotations

import io
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault
from tests.faults.day import GOOD, RUNS, TABLES, workbook_of

Place = Callable[..., Path]


@pytest.fixture
def day(broken_day: Place) -> Path:
    """The good day as a workbook."""
    return broken_day(workbook=True)


def test_good_day_as_workbook_is_tallied(command: Command, day: Path) -> None:
    assert command("tally", day, "--strict", "--quiet").status == 0
    assert (day / "results" / "ledger.csv").exists()


def change_cell(day: Path, sheet: str, cell: str, value: object) -> None:
    """Put something into one cell of day.xlsx."""
    import openpyxl

    book = openpyxl.load_workbook(day / "day.xlsx")
    book[sheet][cell] = value
    book.save(day / "day.xlsx")


def change_part(day: Path, part: str, edit: Callable[[bytes], bytes]) -> None:
    """Rewrite one part of the package."""
    source = zipfile.ZipFile(io.BytesIO((day / "day.xlsx").read_bytes()))
    with zipfile.ZipFile(day / "day.xlsx", "w", zipfile.ZIP_DEFLATED) as target:
        for one in source.namelist():
            target.writestr(one, edit(source.read(one)) if one == part else source.read(one))


ERROR_WORDS = ("#DIV/0!", "#N/A", "#REF!", "#VALUE!")


@pytest.mark.parametrize("word", ERROR_WORDS)
def test_cell_with_an_error_is_refused(word: str, command: Command, day: Path) -> None:
    change_cell(day, "gas", "F5", word)
    # one fault, not a second one for the cell being blank
    fault = Fault(
        "not-a-number", "day.xlsx, sheet 'gas', row 5, cell F5", f"'{word}'", "a value", "mend the formula"
    )
    command.refuses(day, [fault])


def test_error_in_a_cell_that_may_be_blank_is_refused(command: Command, day: Path) -> None:
    change_cell(day, "runs", "J2", "#REF!")
    fault = Fault(
        "not-a-number", "day.xlsx, sheet 'runs', row 2, cell J2", "'#REF!'", "a value", "mend the formula"
    )
    command.refuses(day, [fault])


def test_formula_that_was_never_computed_is_refused(command: Command, day: Path) -> None:
    change_cell(day, "gas", "F5", "=10*7.1")
    place = "day.xlsx, sheet 'gas', row 5, cell F5"
    command.refuses(
        day,
        [
            Fault(
                "not-a-number",
                place,
                r"'=10\*7\.1'",
                "a formula with its result",
                "let it compute and save it",
            )
        ],
    )


def test_row_of_formulas_that_were_never_computed_is_refused(command: Command, day: Path) -> None:
    """Without a single value in it the row must not pass for a blank one."""
    for column in "ABCDEF":
        change_cell(day, "gas", f"{column}10", f"=raw!{column}10")
    faults = [
        Fault(
            "not-a-number",
            f"day.xlsx, sheet 'gas', row 10, cell {column}10",
            f"'=raw!{column}10'",
            "result",
            "compute",
        )
        for column in "ABCDEF"
    ]
    command.refuses(day, faults)


@pytest.mark.parametrize("share", [0.02, 0.5, 0.99])
def test_workbook_that_is_cut_short_is_refused(share: float, command: Command, day: Path) -> None:
    data = (day / "day.xlsx").read_bytes()
    (day / "day.xlsx").write_bytes(data[: int(share * len(data))])
    command.refuses(day, [unreadable("zip")])


def unreadable(
    found: str, expected: str = r"a workbook \(.xlsx\) that opens", mend: str = "save the workbook"
) -> Fault:
    return Fault("unreadable-file", "day.xlsx", found, expected, mend)


NO_RUNS = Fault("missing-file", "runs.csv", "nothing there", "a row for each hold", "add runs.csv")


@pytest.mark.parametrize(
    "content", [b"", RUNS.encode(), bytes(range(256)) * 8], ids=["nothing", "text", "junk"]
)
def test_workbook_that_is_no_package_is_refused(content: bytes, command: Command, day: Path) -> None:
    (day / "day.xlsx").write_bytes(content)
    command.refuses(day, [unreadable("zip")])


def test_package_that_is_no_workbook_is_refused(command: Command, day: Path) -> None:
    with zipfile.ZipFile(day / "day.xlsx", "w") as package:
        package.writestr("letter.txt", "not a workbook")
    command.refuses(day, [unreadable("no item named .*Content_Types")])


def test_package_that_unpacks_to_too_much_is_refused(command: Command, day: Path) -> None:
    with zipfile.ZipFile(day / "day.xlsx", "a", zipfile.ZIP_DEFLATED) as package:
        package.writestr("xl/media/blank.bin", b"\0" * 310_000_000)
    assert (day / "day.xlsx").stat().st_size < 1_000_000
    command.refuses(
        day, [unreadable("310 MB in .* parts when unpacked", "at most 300 MB", "another workbook")]
    )


def test_package_that_claims_to_unpack_to_little_is_not_believed(command: Command, day: Path) -> None:
    """A sheet whose size in the directory is a lie ends as a fault, not as full memory."""
    change_part(day, "xl/worksheets/sheet1.xml", lambda part: part + b"<!-- " + b"x" * 1_000_000 + b" -->")
    data = bytearray((day / "day.xlsx").read_bytes())
    # the entry of the directory and the local head both give 1000 byte as the size
    for mark, size_at, name_at in ((b"PK\x01\x02", 24, 46), (b"PK\x03\x04", 22, 30)):
        place = data.find(mark)
        while place >= 0:
            if data[place + name_at : place + name_at + 24] == b"xl/worksheets/sheet1.xml":
                data[place + size_at : place + size_at + 4] = (1000).to_bytes(4, "little")
            place = data.find(mark, place + 4)
    (day / "day.xlsx").write_bytes(data)
    command.refuses(day, [unreadable("bad CRC-32 for file 'xl/worksheets/sheet1.xml'")])


def test_part_with_a_document_type_is_refused(command: Command, day: Path) -> None:
    bomb = b'<!DOCTYPE a [<!ENTITY b "ha"><!ENTITY c "&b;&b;&b;">]>'
    change_part(day, "xl/workbook.xml", lambda part: bomb + part)
    command.refuses(day, [unreadable("a document type in xl/workbook.xml", mend="save the file again")])


def test_part_that_is_no_xml_is_refused(command: Command, day: Path) -> None:
    change_part(day, "xl/worksheets/sheet1.xml", lambda part: part[: len(part) // 2])
    command.refuses(day, [unreadable("unclosed token|no element")])


def test_table_that_is_a_file_and_a_sheet_is_refused(command: Command, day: Path) -> None:
    (day / "gas.csv").write_text(GOOD["gas.csv"])
    fault = Fault(
        "two-sources", "gas.csv", "gas.csv and day.xlsx, sheet 'gas'", "one file or one sheet", "delete one"
    )
    command.refuses(day, [fault])


def test_table_that_is_two_files_is_refused(command: Command, broken_day: Place) -> None:
    day = broken_day({"gas.tsv": GOOD["gas.csv"].replace(",", "\t")})
    command.refuses(
        day, [Fault("two-sources", "gas.csv", "gas.csv and gas.tsv", "one file or one sheet", "delete one")]
    )


def test_workbook_without_a_sheet_of_runs_is_refused(command: Command, day: Path) -> None:
    (day / "day.xlsx").write_bytes(
        workbook_of({name: GOOD[f"{name}.csv"] for name in TABLES if name != "runs"})
    )
    command.refuses(day, [NO_RUNS])


def test_workbook_that_is_a_link_out_of_the_day_is_refused(
    command: Command, day: Path, tmp_path: Path
) -> None:
    (day / "day.xlsx").rename(tmp_path / "elsewhere.xlsx")
    (day / "day.xlsx").symlink_to(tmp_path / "elsewhere.xlsx")
    command.refuses(
        day,
        [Fault("outside-folder", "day.xlsx", "'day.xlsx'", "inside the folder", "copy the file")],
    )


def test_word_in_a_cell_of_numbers_names_the_sheet_row_and_column(command: Command, day: Path) -> None:
    change_cell(day, "liquid", "E3", "124 (again)")
    place = "day.xlsx, sheet 'liquid', row 3, column 'integral'"
    command.refuses(
        day, [Fault("not-a-number", place, r"'124 \(again\)'", "a finite number", "correct the cell")]
    )


def test_yes_or_no_of_the_workbook_is_no_number(command: Command, day: Path) -> None:
    change_cell(day, "gas", "F5", True)
    place = "day.xlsx, sheet 'gas', row 5, column 'peak area'"
    command.refuses(day, [Fault("not-a-number", place, "'True'", "a finite number", "correct the cell")])


def test_date_in_a_cell_of_numbers_is_refused(command: Command, day: Path) -> None:
    from datetime import datetime

    # what a spreadsheet makes of 7.1 typed with another country's decimal sign
    change_cell(day, "gas", "F5", datetime(2043, 1, 7))
    place = "day.xlsx, sheet 'gas', row 5, column 'peak area'"
    command.refuses(day, [Fault("not-a-number", place, "'2043-01-07", "a finite number", "correct the cell")])
