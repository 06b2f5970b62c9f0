"""What the day folder lacks or has too much of, and text files that are none."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault, snapshot
from tests.faults.day import GAS, GOOD, RUNS, Changes, add, swap

Place = Callable[..., Path]

CASES: dict[str, tuple[Changes, tuple[Fault, ...]]] = {
    "no day.toml": (
        {"day.toml": None},
        (Fault("missing-file", "day.toml", "nothing there", "the settings of the day", "coulombook new"),),
    ),
    "no table of runs": (
        {"runs.csv": None},
        (
            Fault(
                "missing-file",
                "runs.csv",
                "nothing there",
                "a row for each hold",
                "or a sheet 'runs' in day.xlsx",
            ),
        ),
    ),
    "neither of them": (
        {"day.toml": None, "runs.csv": None},
        (
            Fault("missing-file", "day.toml", "nothing there", "the settings of the day", "coulombook new"),
            Fault(
                "missing-file",
                "runs.csv",
                "nothing there",
                "a row for each hold",
                "or a sheet 'runs' in day.xlsx",
            ),
        ),
    ),
    "a run without its trace": (
        {"traces/a2.csv": None},
        (
            Fault(
                "missing-file",
                "runs.csv, row 3",
                "no file 'traces/a2.csv'",
                "traces/a2.csv",
                "did you mean 'a1.csv'",
            ),
        ),
    ),
    "no trace at all": (
        {"traces/a1.csv": None, "traces/a2.csv": None},
        (
            Fault(
                "missing-file",
                "runs.csv, row 2",
                "no file 'traces/a1.csv'",
                "in the day folder",
                "add the file",
            ),
            Fault(
                "missing-file",
                "runs.csv, row 3",
                "no file 'traces/a2.csv'",
                "in the day folder",
                "add the file",
            ),
        ),
    ),
    "a voltammogram missing": (
        {"scans/m1-80.csv": None},
        (
            Fault(
                "missing-file",
                "scans.csv, row 4, column 'file'",
                "no file 'scans/m1-80.csv'",
                "in the day",
                "add the file",
            ),
        ),
    ),
    "a table of junk": (
        {"gas.csv": bytes(range(256)) * 16},
        (Fault("unreadable-file", "gas.csv", "binary data|no text", "text in UTF-8", "save the file again"),),
    ),
    "a table of zeros": (
        {"gas.csv": b"\0" * 4096},
        (Fault("unreadable-file", "gas.csv", "byte 0x00", "text in UTF-8", "save the file again"),),
    ),
    "an empty table": (
        {"gas.csv": ""},
        (Fault("unreadable-file", "gas.csv", "an empty file", "a line of heads", "save the file again"),),
    ),
    "a table of blank lines": (
        {"gas.csv": "\n \n\n"},
        (Fault("unreadable-file", "gas.csv", "an empty file", "a line of heads", "save the file again"),),
    ),
    "a table in UTF-16 without its mark": (
        {"gas.csv": GAS.encode("utf-16-le")},
        (
            Fault(
                "unreadable-file",
                "gas.csv",
                "byte 0x00",
                "UTF-16 with byte order mark",
                "save the file again",
            ),
        ),
    ),
    "a table that is a workbook": (
        {"gas.csv": b"PK\x03\x04\x14\0\0\0\x08\0" + bytes(200)},
        (Fault("unreadable-file", "gas.csv", "binary data", "text in UTF-8", "save the file again"),),
    ),
    "a line of heads that never ends": (
        {"gas.csv": "run,injection,time / s,channel,analyte,peak area" + "x" * 3_000_000},
        (
            Fault(
                "unreadable-file",
                "gas.csv",
                "a line of more than 65536 characters in row 1",
                "at most 65536",
                "save the",
            ),
        ),
    ),
    "a quote that never closes": (
        {"gas.csv": swap("a1,2,3000,TCD", 'a1,2,3000,"TCD')},
        (
            Fault(
                "unreadable-file", "gas.csv", "in row 5", "quotes that open and close", "save the file again"
            ),
        ),
    ),
    "decimal commas between commas": (
        {"gas.csv": swap("C2H4,22.8", "C2H4,22,8")},
        (
            Fault(
                "unreadable-file", "gas.csv, row 10", "7 cells", "6 cells", "put semicolons between the cells"
            ),
        ),
    ),
    "decimal commas among points": (
        {"gas.csv": GAS.replace(",", ";").replace("22.8", "22,8")},
        (
            Fault(
                "not-a-number",
                "gas.csv, row 10, column 'peak area'",
                "'22,8'",
                "a finite number",
                "correct the",
            ),
        ),
    ),
}


def test_good_day_is_tallied_without_a_finding(command: Command, broken_day: Place) -> None:
    answer = command("tally", broken_day(), "--strict")
    assert answer.status == 0
    assert answer.err == ""
    assert "warning[" not in answer.out


@pytest.mark.parametrize("name", CASES)
def test_day_is_refused_with(name: str, command: Command, broken_day: Place) -> None:
    changes, faults = CASES[name]
    command.refuses(broken_day(changes), faults)


@pytest.mark.parametrize("table", ["runs", "gas", "scans"])
def test_table_that_is_a_link_out_of_the_day_is_refused(
    table: str, command: Command, broken_day: Place, tmp_path: Path
) -> None:
    day = broken_day()
    (day / f"{table}.csv").rename(tmp_path / "elsewhere.csv")
    (day / f"{table}.csv").symlink_to(tmp_path / "elsewhere.csv")
    fault = Fault(
        "outside-folder", f"{table}.csv", f"'{table}.csv'", "inside the folder", "copy the file into"
    )
    command.refuses(day, [fault])
    assert (tmp_path / "elsewhere.csv").read_text() == GOOD[f"{table}.csv"]


def test_settings_that_are_a_link_out_of_the_day_are_refused(
    command: Command, broken_day: Place, tmp_path: Path
) -> None:
    day = broken_day()
    (day / "day.toml").rename(tmp_path / "elsewhere.toml")
    (day / "day.toml").symlink_to(tmp_path / "elsewhere.toml")
    command.refuses(
        day, [Fault("outside-folder", "day.toml", "'day.toml'", "inside the folder", "copy the file into")]
    )


def test_table_that_is_a_folder_is_refused_where_it_is_needed(command: Command, broken_day: Place) -> None:
    day = broken_day({"runs.csv": None})
    (day / "runs.csv").mkdir()
    command.refuses(
        day, [Fault("missing-file", "runs.csv", "nothing there", "a row for each hold", "add runs.csv")]
    )


def test_settings_that_are_a_folder_are_refused(command: Command, broken_day: Place) -> None:
    day = broken_day({"day.toml": None})
    (day / "day.toml").mkdir()
    command.refuses(
        day, [Fault("missing-file", "day.toml", "something that is no file", "day.toml", "add the file")]
    )


def test_table_larger_than_any_is_refused_unread(command: Command, broken_day: Place) -> None:
    day = broken_day()
    with (day / "gas.csv").open("r+b") as stream:
        stream.truncate(2_000_000_000)  # holes: nothing is written to the disk
    answer = command("tally", day)
    assert answer.status == 1
    (error,) = answer.errors
    assert (error.kind, error.where) == ("unreadable-file", "gas.csv")
    assert error.found == "2000 MB"
    assert error.expected == "a file of at most 100 MB"


def test_text_of_a_cell_cannot_act_on_the_screen(command: Command, broken_day: Place) -> None:
    day = broken_day(
        {"runs.csv": RUNS.replace("1.0,6.8,10,20\na2", "1.0,\x7f[bold]6\u202e8[/bold],10,20\na2")}
    )
    fault = Fault(
        "not-a-number",
        "runs.csv, row 2, column 'pH'",
        r"'\\x7f\[bold\]6\\u202e8\[/bold\]'",
        "a finite number",
        "correct",
    )
    command.refuses(day, [fault])


@pytest.mark.parametrize("word", ["tally", "check"])
def test_day_folder_that_is_not_there_is_a_wrong_call(word: str, command: Command) -> None:
    answer = command(word, "no-such-day")
    assert answer.status == 2
    assert answer.err == "coulombook: the folder of the day, 'no-such-day', does not exist\n"


def test_day_folder_that_is_a_file_is_a_wrong_call(command: Command, workplace: Path) -> None:
    (workplace / "day.xlsx").write_bytes(b"")
    answer = command("tally", "day.xlsx")
    assert answer.status == 2
    assert "'day.xlsx', is a file, not a folder" in answer.err


def test_folder_of_calibrations_that_is_not_there_is_a_wrong_call(
    command: Command, broken_day: Place
) -> None:
    day = broken_day()
    answer = command("tally", day, "--calibrations", "no-such-folder")
    assert answer.status == 2
    assert "the folder of the calibrations, 'no-such-folder', does not exist" in answer.err
    assert not (day / "results").exists()


@pytest.mark.parametrize(
    ("wrong", "message"),
    [
        (["--strikt"], "unknown option '--strikt'; did you mean '--strict'?"),
        (["--out"], "argument --out: expected one argument"),
        (["again"], "unknown argument 'again'"),
    ],
)
def test_wrong_option_is_a_wrong_call(
    wrong: list[str], message: str, command: Command, broken_day: Place
) -> None:
    day = broken_day()
    before = snapshot(day)
    answer = command("tally", day, *wrong)
    assert answer.status == 2
    assert message in answer.err
    assert snapshot(day) == before


def test_results_folder_of_somebody_else_is_refused_before_the_work(
    command: Command, broken_day: Place
) -> None:
    day = broken_day({"results/thesis.txt": "three years of work"})
    before = snapshot(day)
    answer = command("tally", day)
    assert answer.status == 2
    assert "is not empty and was not written by coulombook" in answer.err
    assert "--out" in answer.err
    assert snapshot(day) == before


def test_stranger_in_a_results_folder_of_ours_is_refused(command: Command, broken_day: Place) -> None:
    day = broken_day()
    assert command("tally", day, "--quiet").status == 0
    (day / "results" / "remarks.txt").write_text("mine")
    before = snapshot(day)
    answer = command("tally", day)
    assert answer.status == 2
    assert "holds 'remarks.txt', which coulombook did not write" in answer.err
    assert snapshot(day) == before


def test_file_where_the_results_should_go_is_refused(command: Command, broken_day: Place) -> None:
    day = broken_day({"results": "a file"})
    answer = command("tally", day)
    assert answer.status == 2
    assert "is a file; give a folder to --out" in answer.err
    assert (day / "results").read_text() == "a file"


def test_earlier_results_stay_when_the_day_has_faults(command: Command, broken_day: Place) -> None:
    day = broken_day()
    assert command("tally", day, "--quiet").status == 0
    (day / "gas.csv").write_text(add("a3,1,0,FID,CO,1\n")(GAS))
    fault = Fault("unknown-name", "gas.csv, row 11, column 'run'", "'a3'", "'a1', 'a2'", "correct the name")
    command.refuses(day, [fault])
