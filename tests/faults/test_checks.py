"""Broken tables of check-gas injections, as files and as sheets."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault
from tests.faults.day import drop_column, swap
from tests.faults.table_cases import Cases, as_file_and_sheet, refuse_table

FIRST = "2043-05-18T09:00:00,FID,CO,1000,100\n"

CASES: Cases = {
    "time is no time": (
        swap("2043-05-18T09:00:00", "nine"),
        (
            Fault(
                "not-a-time", "checks.csv, row 2, column 'at'", "'nine'", "ISO 8601", "write year, month, day"
            ),
        ),
    ),
    "time is that of another calendar": (
        swap("2043-05-18T09:00:00", "18.05.2043 09:00"),
        (
            Fault(
                "not-a-time",
                "checks.csv, row 2, column 'at'",
                "'18.05.2043 09:00'",
                "ISO 8601",
                "write year, month, day",
            ),
        ),
    ),
    "time is blank": (
        swap("2043-05-18T09:00:00", ""),
        (
            Fault(
                "missing-value",
                "checks.csv, row 2, column 'at'",
                "nothing",
                "2043-05-18T09:30:00",
                "fill in the cell",
            ),
        ),
    ),
    "time has a zone and the others none": (
        swap("2043-05-18T09:00:00", "2043-05-18T09:00:00Z"),
        (
            Fault(
                "not-allowed",
                "checks.csv, row 2, column 'at'",
                "1 of 4 are so",
                "without a time zone",
                "every date-time",
            ),
        ),
    ),
    "mole fraction is above one": (
        swap(FIRST, FIRST.replace("1000", "2000000")),
        (
            Fault(
                "not-allowed",
                "checks.csv, row 2, column 'mole fraction / ppm'",
                "'2000000'",
                "at most 1",
                "unit in the",
            ),
        ),
    ),
    "mole fraction is in mL": (
        swap("fraction / ppm", "fraction / mL"),
        (
            Fault(
                "wrong-dimension",
                "checks.csv, row 1, column 'mole fraction / mL'",
                "unit 'mL'",
                "ppm",
                "unit in the head",
            ),
        ),
    ),
    "peak area is zero": (
        swap(FIRST, FIRST.replace(",100\n", ",0\n")),
        (
            Fault(
                "not-allowed",
                "checks.csv, row 2, column 'peak area'",
                "'0'",
                "above zero",
                "correct the value",
            ),
        ),
    ),
    "analyte is unknown": (
        swap(FIRST, FIRST.replace("CO", "CX")),
        (
            Fault(
                "unknown-species",
                "checks.csv, row 2, column 'analyte'",
                "'CX'",
                "by name",
                "correct the name",
            ),
        ),
    ),
    "check stands twice": (
        swap("13:00:00,FID,CO", "09:00:00,FID,carbon monoxide"),
        (
            Fault(
                "duplicate",
                "checks.csv, row 3, column 'analyte'",
                "carbon monoxide, as in row 2",
                "once",
                "delete one",
            ),
        ),
    ),
    "column of the channels is missing": (
        drop_column("channel"),
        (Fault("missing-column", "checks.csv, row 1", "'analyte'", "'channel'", "add the column 'channel'"),),
    ),
}


@as_file_and_sheet
@pytest.mark.parametrize("name", CASES)
def test_table_of_checks_is_refused_when_its(
    name: str, workbook: bool, command: Command, broken_day: Callable[..., Path]
) -> None:
    refuse_table("checks", CASES[name], workbook, command, broken_day)


def test_check_gas_without_a_curve_is_a_warning_for_it_corrects_nothing(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    day = broken_day({"checks.csv": swap(FIRST, FIRST.replace("CO", "methane"))})
    answer = command("tally", day, "--strict")
    assert answer.status == 1
    assert "warning[injection-left-out]: checks.csv, row 2, column 'analyte'" in answer.err
    assert "the check gas methane has no curve on channel FID; it corrects no drift" in answer.err
    assert not (day / "results").exists()
