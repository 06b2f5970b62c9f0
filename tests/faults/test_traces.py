"""Broken potentiostat logs."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault
from tests.faults.day import TRACE, Changes, add, swap

A1 = "traces/a1.csv"
JUNK = bytes(range(256)) * 40

CASES: dict[str, tuple[Changes, tuple[Fault, ...]]] = {
    "time goes back": (
        {A1: swap("1800,-1.5", "600,-1.5")},
        (
            Fault(
                "broken-trace",
                f"{A1}, row 4, column 't / s'",
                "600 s after 900 s",
                "later than",
                "keep one log a file",
            ),
        ),
    ),
    "time stands still": (
        {A1: add("".join(f"3600,-1.5,-{second}\n" for second in range(60)))},
        (
            Fault(
                "broken-trace",
                f"{A1}, row 7, column 't / s'",
                "61 readings at 3600 s",
                "later than",
                "delete the rows logged while it stood",
            ),
        ),
    ),
    "time hardly moves": (
        {A1: swap("1800,-1.5", "900.0000000000001,-1.5")},
        (
            Fault(
                "broken-trace",
                f"{A1}, row 4, column 't / s'",
                "900.00000000000011 s after 900 s",
                "steps of 1e-09 s and more",
                "correct the unit",
            ),
        ),
    ),
    "time has steps of next to nothing": (
        {A1: "t / s,E / V,I / mA\n0,-1.5,-10\n1e-300,-1.5,-10\n2e-300,-1.5,-10\n"},
        (
            Fault(
                "not-a-number",
                f"{A1}, column 't / s'",
                "nothing larger than 2e-300",
                "a size from 1e-60",
                "correct the values",
            ),
        ),
    ),
    "time begins with steps of next to nothing": (
        {A1: swap("0,-1.5,-10\n900", "0,-1.5,-10\n1e-300,-1.5,-10\n900")},
        (
            Fault(
                "broken-trace",
                f"{A1}, row 3, column 't / s'",
                "1e-300 s after 0 s",
                "steps of 1e-09 s",
                "correct the unit",
            ),
        ),
    ),
    "file is empty": (
        {A1: ""},
        (
            Fault(
                "broken-trace",
                A1,
                "no rows of numbers",
                "a row of heads and rows of numbers",
                "put in the log",
            ),
        ),
    ),
    "file has heads alone": (
        {A1: TRACE.splitlines()[0] + "\n"},
        (
            Fault(
                "broken-trace",
                A1,
                "no rows of numbers",
                "a row of heads and rows of numbers",
                "put in the log",
            ),
        ),
    ),
    "file has one row": (
        {A1: "".join(TRACE.splitlines(keepends=True)[:2])},
        (Fault("broken-trace", A1, "one row of numbers", "two rows or more", "put in the log"),),
    ),
    "current is a word": (
        {A1: swap("1800,-1.5,-10", "1800,-1.5,overload")},
        (
            Fault(
                "not-a-number",
                f"{A1}, row 4, column 'I / mA'",
                "'overload'",
                "a finite number",
                "correct the cell",
            ),
        ),
    ),
    "current is no number by name": (
        {A1: swap("1800,-1.5,-10", "1800,-1.5,nan")},
        (
            Fault(
                "not-a-number",
                f"{A1}, row 4, column 'I / mA'",
                "'nan'",
                "a finite number",
                "correct the cell",
            ),
        ),
    ),
    "potential is infinite": (
        {A1: swap("1800,-1.5,-10", "1800,-inf,-10")},
        (
            Fault(
                "not-a-number",
                f"{A1}, row 4, column 'E / V'",
                "'-inf'",
                "a finite number",
                "correct the cell",
            ),
        ),
    ),
    "potential is of no size that a cell has": (
        {A1: swap("1800,-1.5,-10", "1800,-1e200,-10")},
        (
            Fault(
                "not-a-number",
                f"{A1}, row 4, column 'E / V'",
                "'-1e200'",
                r"of a size up to 1e\+30",
                "correct",
            ),
        ),
    ),
    "name comes from a run that climbs": (
        {
            "runs.csv": swap("\na1,mesh", "\n../x,mesh"),
            "gas.csv": None,
            "vials.csv": None,
            "liquid.csv": None,
        },
        (
            Fault(
                "missing-file",
                "runs.csv, row 2",
                "no file 'traces/../x.csv'",
                "in the day folder",
                "add the file",
            ),
        ),
    ),
    "name comes from a run that climbs out": (
        {
            "runs.csv": swap("\na1,mesh", "\n../../x,mesh"),
            "gas.csv": None,
            "vials.csv": None,
            "liquid.csv": None,
        },
        (
            Fault(
                "outside-folder",
                "runs.csv, row 2",
                "'traces/../../x.csv'",
                "inside the folder",
                "copy the file",
            ),
        ),
    ),
    "name is longer than a file system takes": (
        {
            "runs.csv": swap("\na1,mesh", f"\n{'a' * 300},mesh"),
            "gas.csv": None,
            "vials.csv": None,
            "liquid.csv": None,
        },
        (
            Fault(
                "missing-file", "runs.csv, row 2", "no file 'traces/aaa", "a file 'traces/aaa", "add the file"
            ),
        ),
    ),
    "cell is blank in two rows": (
        {A1: swap("1800,-1.5,-10", "1800,-1.5,", "2700,-1.5,-10", "2700,-1.5,")},
        (
            Fault(
                "not-a-number",
                f"{A1}, row 4, column 'I / mA'",
                "nothing; 1 more cells",
                "a finite number",
                "delete the row",
            ),
        ),
    ),
    "row is cut short": (
        {A1: swap("2700,-1.5,-10\n", "2700,-1.\n")},
        (
            Fault(
                "not-a-number",
                f"{A1}, row 5, column 'I / mA'",
                "nothing",
                "a finite number",
                "delete the row",
            ),
        ),
    ),
    "end is cut off within the window of its run": (
        {A1: swap("3600,-1.5,-10\n", "3600,-1.")},
        (
            Fault(
                "not-allowed",
                "runs.csv, row 2, column 'stop / s'",
                "3600 s",
                "from 0 s to 2700 s",
                "correct the time",
            ),
        ),
    ),
    "decimal comma stands between commas": (
        {A1: swap("1800,-1.5,-10", "1800,-1,5,-10")},
        (Fault("unreadable-file", f"{A1}, row 4", "4 cells", "3 cells", "write decimals with a point"),),
    ),
    "unit of the current is unknown": (
        {A1: swap("I / mA", "I / mAmp")},
        (
            Fault(
                "unknown-unit",
                f"{A1}, row 1, column 'I / mAmp'",
                "unit 'mAmp'",
                "such as mA, uA or A",
                "did you mean 'mA'",
            ),
        ),
    ),
    "unit of the current is that of a power": (
        {A1: swap("I / mA", "I / mW")},
        (
            Fault(
                "wrong-dimension",
                f"{A1}, row 1, column 'I / mW'",
                "unit 'mW'",
                "a unit of current",
                "write the head as",
            ),
        ),
    ),
    "unit of the potential is missing": (
        {A1: swap("E / V", "E")},
        (
            Fault(
                "unknown-unit",
                f"{A1}, row 1, column 'E'",
                "no unit in the head",
                "the head 'E / V'",
                "write the head as",
            ),
        ),
    ),
    "column of the current is missing": (
        {A1: swap("I / mA", "Strom [mA]")},
        (Fault("missing-column", f"{A1}, row 1", r"'Strom \[mA\]'", "'I / mA'", r"\[read.traces\] columns"),),
    ),
    "heads are missing": (
        {A1: TRACE.split("\n", 1)[1]},
        (
            Fault(
                "missing-column",
                A1,
                "'0,-1.5,-10'",
                "'t / s', 'E / V', 'I / mA'",
                "write the heads as expected",
            ),
        ),
    ),
    "current stands twice": (
        {A1: TRACE.replace("I / mA", "I / mA,current / A").replace("-10\n", "-10,-0.01\n")},
        (
            Fault(
                "repeated-column",
                f"{A1}, row 1, column 'current / A'",
                "'I / mA' and 'current / A'",
                "one column",
                r"\[read.traces\]",
            ),
        ),
    ),
    "bytes are no text": (
        {A1: JUNK},
        (Fault("unreadable-file", A1, "binary data|no text", "text in UTF-8", "save the file again"),),
    ),
    "bytes below the heads are no text": (
        {A1: TRACE.encode() + JUNK},
        (Fault("unreadable-file", A1, "binary data|no text", "text in UTF-8", "save the file again"),),
    ),
    "line of heads has no end": (
        # as long as a disk image that was dropped into the folder; what is read of it is bounded
        {A1: b"t / s,E / V,I / mA" + b"x" * 8_000_000},
        (
            Fault(
                "unreadable-file",
                A1,
                r"a line of more than 655\d\d characters in row 1",
                "at most 65536",
                "save the file",
            ),
        ),
    ),
    "file belongs to a workbook": (
        {A1: b"PK\x03\x04" + JUNK},
        (Fault("unreadable-file", A1, "binary data|no text", "text in UTF-8", "save the file again"),),
    ),
    "quote never closes": (
        {A1: swap("1800,-1.5,-10", '1800,"-1.5,-10')},
        (Fault("unreadable-file", A1, "in row 4", "quotes that open and close", "save the file again"),),
    ),
    "name leads out of the folder": (
        {
            "runs.csv": swap(
                "resistance / ohm",
                "trace",
                "6.8,10,20\na2",
                "6.8,../outside.csv,20\na2",
                "6.8,10,20\n",
                "6.8,,20\n",
            )
        },
        (
            Fault(
                "outside-folder",
                "runs.csv, row 2, column 'trace'",
                "'../outside.csv'",
                "inside the folder",
                "copy the file into",
            ),
        ),
    ),
    "name is absolute": (
        {
            "runs.csv": swap(
                "resistance / ohm",
                "trace",
                "6.8,10,20\na2",
                "6.8,/etc/passwd,20\na2",
                "6.8,10,20\n",
                "6.8,,20\n",
            )
        },
        (
            Fault(
                "outside-folder",
                "runs.csv, row 2, column 'trace'",
                "'/etc/passwd'",
                "inside the folder",
                "relative to it",
            ),
        ),
    ),
    "name is that of a folder": (
        {
            "runs.csv": swap(
                "resistance / ohm", "trace", "6.8,10,20\na2", "6.8,traces,20\na2", "6.8,10,20\n", "6.8,,20\n"
            )
        },
        (
            Fault(
                "missing-file",
                "runs.csv, row 2, column 'trace'",
                "'traces'",
                "a file 'traces'",
                "correct its name",
            ),
        ),
    ),
    "name is misspelt": (
        {"traces/a1.csv": None, "traces/a_1.csv": TRACE},
        (
            Fault(
                "missing-file",
                "runs.csv, row 2",
                "no file 'traces/a1.csv'",
                "traces/a1.csv",
                "did you mean 'a_1.csv'",
            ),
        ),
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_trace_is_refused_when_its(name: str, command: Command, broken_day: Callable[..., Path]) -> None:
    changes, faults = CASES[name]
    command.refuses(broken_day(changes), faults)


def test_trace_that_is_a_link_out_of_the_folder_is_refused(
    command: Command, broken_day: Callable[..., Path], tmp_path: Path
) -> None:
    outside = tmp_path / "outside.csv"
    outside.write_text(TRACE)
    day = broken_day({"traces/a1.csv": None})
    (day / "traces" / "a1.csv").symlink_to(outside)
    fault = Fault(
        "outside-folder", "runs.csv, row 2", "'traces/a1.csv'", "inside the folder", "copy the file into"
    )
    command.refuses(day, [fault])
    assert outside.read_text() == TRACE


def test_trace_that_links_to_itself_is_refused(command: Command, broken_day: Callable[..., Path]) -> None:
    day = broken_day({"traces/a1.csv": None})
    (day / "traces" / "a1.csv").symlink_to(day / "traces" / "a1.csv")
    answer = command("tally", day)
    assert answer.status == 1
    assert [one.kind for one in answer.errors] in (["outside-folder"], ["missing-file"])
    assert answer.errors[0].where == "runs.csv, row 2"


def test_trace_too_large_to_be_one_is_refused_unread(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    day = broken_day()
    with (day / "traces" / "a1.csv").open("r+b") as stream:
        stream.truncate(5_000_000_000)  # holes: nothing is written to the disk
    answer = command("tally", day)
    assert answer.status == 1
    (error,) = answer.errors
    assert (error.kind, error.where) == ("unreadable-file", "traces/a1.csv")
    assert error.found == "5 GB"
    assert error.expected == "a file of at most 4 GB"
    assert not (day / "results").exists()


def test_current_density_without_current_needs_no_mend_but_both_words_do(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    # the good case beside the broken ones: 10 mA on 1 cm^2
    day = broken_day({A1: swap("I / mA", "j / mA cm^-2")})
    assert command("tally", day, "--quiet").status == 0
