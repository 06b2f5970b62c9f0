"""Broken tables of voltammograms, and broken voltammograms."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault
from tests.faults.day import GOOD, Changes, add, swap
from tests.faults.table_cases import Cases, as_file_and_sheet, refuse_table

M20 = "scans/m1-20.csv"
ROW = "m1,scans/m1-20.csv,20,1.0,-0.1,0.1"

TABLE: Cases = {
    "file is missing": (
        swap("m1-20.csv", "m1_20.csv"),
        (
            Fault(
                "missing-file",
                "scans.csv, row 2, column 'file'",
                "no file 'scans/m1_20.csv'",
                "in the day folder",
                "'m1-20.csv'",
            ),
        ),
    ),
    "file lies outside": (
        swap("scans/m1-20.csv", "scans/../../m1.csv"),
        (
            Fault(
                "outside-folder",
                "scans.csv, row 2, column 'file'",
                r"m1\.csv",
                "inside the folder",
                "copy the file",
            ),
        ),
    ),
    "file has a name longer than a file system takes": (
        swap("scans/m1-20.csv", "scans/" + "m" * 300),
        (
            Fault(
                "missing-file",
                "scans.csv, row 2, column 'file'",
                "no file 'scans/mmm",
                "a file 'scans/mmm",
                "add the file",
            ),
        ),
    ),
    "file stands twice": (
        swap("m1-40.csv", "m1-20.csv"),
        (
            Fault(
                "duplicate",
                "scans.csv, row 3, column 'file'",
                "m1-20.csv, as in row 2",
                "the scan once",
                "delete one",
            ),
        ),
    ),
    "scan rate is zero": (
        swap(ROW, ROW.replace(",20,", ",0,")),
        (
            Fault(
                "not-allowed",
                "scans.csv, row 2, column 'scan rate / mV s^-1'",
                "'0'",
                "above zero",
                "correct the value",
            ),
        ),
    ),
    "scan rate has the unit of a potential": (
        swap("mV s^-1", "mV"),
        (
            Fault(
                "wrong-dimension",
                "scans.csv, row 1, column 'scan rate / mV'",
                "unit 'mV'",
                "a unit of scan rate",
                "mV s",
            ),
        ),
    ),
    "window ends before it begins": (
        swap(ROW, ROW.replace("-0.1,0.1", "0.1,-0.1")),
        (
            Fault(
                "not-allowed",
                "scans.csv, row 2, column 'window high / V'",
                "-0.1 V",
                "above the low end, 0.1 V",
                "either",
            ),
        ),
    ),
    "window lies beyond the scan": (
        swap(ROW, ROW.replace("-0.1,0.1", "0.4,0.6")),
        (
            Fault(
                "broken-scan",
                "scans/m1-20.csv (scans.csv, row 2)",
                "the window 0.4 V to 0.6 V",
                "a window within -0.15 V to 0.15 V",
                "window",
            ),
        ),
    ),
    "cycle was never run": (
        lambda text: "".join(
            f"{row},{'cycle' if n == 0 else 7 if n == 1 else 2}\n" for n, row in enumerate(text.splitlines())
        ),
        (
            Fault(
                "broken-scan", "scans/m1-20.csv (scans.csv, row 2)", "no cycle 7", "from 1 to 2", "the cycle"
            ),
        ),
    ),
}

FILES: dict[str, tuple[Changes, tuple[Fault, ...]]] = {
    "never crosses its window": (
        {M20: "E / V,I / mA\n" + "".join(f"{0.01 * n - 0.15:.2f},0.016\n" for n in range(31))},
        (
            Fault(
                "broken-scan",
                f"{M20} (scans.csv, row 2)",
                "the falling sweep of cycle 1",
                "both ways",
                "check the window",
            ),
        ),
    ),
    "stands still": (
        {M20: "E / V,I / mA\n" + "0.05,0.016\n" * 30},
        (Fault("broken-scan", f"{M20} (scans.csv, row 2)", "does not move", "rises and falls", "the file"),),
    ),
    "is empty": (
        {M20: ""},
        (Fault("broken-scan", M20, "no rows of numbers", "a row of heads", "put in the voltammogram"),),
    ),
    "has a single reading": (
        {M20: "E / V,I / mA\n0,1\n"},
        (Fault("broken-scan", f"{M20} (scans.csv, row 2)", r"1 sample\(s\)", "rises and falls", "the file"),),
    ),
    "holds a word": (
        {M20: GOOD[M20].replace("0.00,0.016", "0.00,#", 1)},
        (
            Fault(
                "not-a-number",
                f"{M20}, row 17, column 'I / mA'",
                "'#'",
                "a finite number",
                "correct the cell",
            ),
        ),
    ),
    "has no current": (
        {M20: GOOD[M20].replace("I / mA", "Q / mC")},
        (Fault("missing-column", f"{M20}, row 1", "'Q / mC'", "'I / mA'", "add the column"),),
    ),
    "is binary": (
        {M20: bytes(range(256)) * 4},
        (Fault("unreadable-file", M20, "binary data|no text", "text in UTF-8", "save the file again"),),
    ),
    "is held against an unknown electrode": (
        {"day.toml": swap('specific_capacitance = "28 uF/cm^2"', 'smooth_reference = "m2"')},
        (
            Fault(
                "unknown-name",
                "day.toml, row 18, [surface], key 'smooth_reference'",
                "'m2'",
                "an electrode of scans",
                "'m1'",
            ),
        ),
    ),
    "is held against an electrode with one rate": (
        {
            "day.toml": swap('specific_capacitance = "28 uF/cm^2"', 'smooth_reference = "p1"'),
            "scans.csv": add("p1,scans/p1-20.csv,20,1.0,-0.1,0.1\n"),
            "scans/p1-20.csv": GOOD[M20],
        },
        (
            Fault(
                "unknown-name",
                "day.toml, [surface] smooth_reference",
                "p1",
                "one of m1",
                "scanned at several rates",
            ),
        ),
    ),
}


@as_file_and_sheet
@pytest.mark.parametrize("name", TABLE)
def test_table_of_scans_is_refused_when_its(
    name: str, workbook: bool, command: Command, broken_day: Callable[..., Path]
) -> None:
    refuse_table("scans", TABLE[name], workbook, command, broken_day)


@pytest.mark.parametrize("name", FILES)
def test_voltammogram_is_refused_when_it(
    name: str, command: Command, broken_day: Callable[..., Path]
) -> None:
    changes, faults = FILES[name]
    command.refuses(broken_day(changes), faults)
