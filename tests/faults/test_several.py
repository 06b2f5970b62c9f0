"""Many faults at once, warnings, and the command as a process of its own."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

from tests.faults.answer import Command, Fault, hold, said, snapshot
from tests.faults.day import GAS, LIQUID, Changes, add, drop_column, swap

Place = Callable[..., Path]

SEVERAL: Changes = {
    "day.toml": swap("current_window", "curent_window"),
    "runs.csv": swap("6.8,10,20\na2", "6.8,ten,20\na2"),
    "gas.csv": swap("hydrogen,71", "hydrogen,-71", "C2H4,22.8", "etylene,22.8"),
    "vials.csv": swap("aliquot / mL", "aliquot / mg"),
    "liquid.csv": swap("v2,formate", "v7,formate"),
    "checks.csv": swap("2043-05-18T09:00:00", "nine"),
    "scans/m1-80.csv": None,
    "calibrations/gases/standards.csv": swap("FID,ethylene,20,4.1", "FID,ethylene,20,small"),
}
SEVERAL_FAULTS = (
    Fault(
        "unknown-key",
        "day.toml, row 15, [gas], key 'curent_window'",
        "'curent",
        "current_window",
        "'current_window'",
    ),
    Fault(
        "not-a-number",
        "runs.csv, row 2, column 'resistance / ohm'",
        "'ten'",
        "a finite number",
        "correct the cell",
    ),
    Fault(
        "not-allowed",
        "gas.csv, row 5, column 'peak area'",
        "'-71'",
        "zero or a number above",
        "correct the value",
    ),
    Fault(
        "unknown-species",
        "gas.csv, row 10, column 'analyte'",
        "'etylene'",
        "by name",
        "did you mean 'ethylene'",
    ),
    Fault(
        "wrong-dimension",
        "vials.csv, row 1, column 'aliquot / mg'",
        "unit 'mg'",
        "a unit of volume",
        "in the head",
    ),
    Fault("unknown-name", "liquid.csv, row 5, column 'vial'", "'v7'", "'v1', 'v2', 'b0'", "did you mean 'v"),
    Fault("not-a-time", "checks.csv, row 2, column 'at'", "'nine'", "ISO 8601", "write year, month, day"),
    Fault(
        "missing-file",
        "scans.csv, row 4, column 'file'",
        "no file 'scans/m1-80.csv'",
        "in the day folder",
        "add the file",
    ),
    Fault(
        "not-a-number",
        "calibrations/gases/standards.csv, row 8, column 'peak area'",
        "'small'",
        "a finite number",
        "correct the cell",
    ),
)


def test_faults_of_many_files_are_listed_together(command: Command, broken_day: Place) -> None:
    command.refuses(broken_day(SEVERAL), SEVERAL_FAULTS)


def test_faults_of_several_traces_and_scans_are_listed_together(command: Command, broken_day: Place) -> None:
    day = broken_day(
        {
            "traces/a1.csv": swap("1800,-1.5,-10", "600,-1.5,-10"),
            "traces/a2.csv": swap("1800,-1.5,-10", "1800,-1.5,overload"),
            "scans/m1-20.csv": "E / V,I / mA\n" + "0,1\n" * 9,
        }
    )
    faults = [
        Fault(
            "broken-trace",
            "traces/a1.csv, row 4, column 't / s'",
            "600 s after 900 s",
            "later than",
            "one log a file",
        ),
        Fault(
            "not-a-number",
            "traces/a2.csv, row 4, column 'I / mA'",
            "'overload'",
            "a finite number",
            "correct the cell",
        ),
        Fault(
            "broken-scan",
            "scans/m1-20.csv (scans.csv, row 2)",
            "does not move",
            "rises and falls",
            "the file",
        ),
    ]
    command.refuses(day, faults)


def test_faults_of_one_table_are_all_listed(command: Command, broken_day: Place) -> None:
    day = broken_day(
        {
            "gas.csv": swap(
                "hydrogen,70", "hydrogen,?", "hydrogen,71", "hydrogen,-1", "hydrogen,69", "hydrogen,"
            )
        }
    )
    faults = [
        Fault(
            "not-a-number",
            "gas.csv, row 2, column 'peak area'",
            r"'\?'",
            "a finite number",
            "correct the cell",
        ),
        Fault(
            "not-allowed",
            "gas.csv, row 5, column 'peak area'",
            "'-1'",
            "zero or a number above",
            "correct the value",
        ),
        Fault(
            "missing-value",
            "gas.csv, row 8, column 'peak area'",
            "nothing",
            "zero or a number above",
            "fill in",
        ),
    ]
    command.refuses(day, faults)


def test_more_than_ten_of_one_kind_are_cut_at_ten(command: Command, broken_day: Place) -> None:
    rows = "".join(f"a1,{n},1800,TCD,hydrogen,#{n}\n" for n in range(3, 34))
    day = broken_day({"gas.csv": add(rows)})
    answer = command("tally", day)
    assert answer.status == 1
    assert [one.found for one in answer.errors] == [f"'#{n}'" for n in range(3, 13)]
    assert "and 21 more of error[not-a-number]" in answer.err
    assert "the day's data have 31 faults; nothing was written" in answer.err
    checked = command("check", day)
    assert checked.status == 1
    assert checked.errors == answer.errors
    assert "and 21 more of error[not-a-number]" in checked.out


def test_equal_faults_at_many_places_are_cut_at_ten_places(command: Command, broken_day: Place) -> None:
    day = broken_day({"gas.csv": add("".join(f"a1,{n},1800,TCD,hydrogen,-5\n" for n in range(3, 34)))})
    answer = command("tally", day)
    (error,) = answer.errors
    assert error.where.startswith(
        "gas.csv, row 11, column 'peak area'; gas.csv, row 12, column 'peak area'; "
    )
    assert error.where.endswith("; and 21 more")


def test_check_says_how_many_faults_there_are_to_mend(command: Command, broken_day: Place) -> None:
    answer = command("check", broken_day(SEVERAL))
    assert answer.status == 1
    assert "9 faults to mend before this day can be tallied." in answer.out
    assert "Traceback" not in answer.out + answer.err


def test_narrow_screen_shows_the_same_words(command: Command, broken_day: Place, monkeypatch: object) -> None:
    day = broken_day(SEVERAL)
    wide = " ".join(command("tally", day).err.split())
    os.environ["COLUMNS"] = "80"  # set by the fixture, which restores it
    narrow = command("tally", day).err
    assert max(map(len, narrow.splitlines())) <= 80
    # breaking lines moves blanks about and nothing else
    assert "".join(narrow.split()) == "".join(wide.split())


WARNED: Changes = {"runs.csv": drop_column("resistance / ohm")}


def test_warning_alone_lets_the_day_be_tallied(command: Command, broken_day: Place) -> None:
    day = broken_day(WARNED)
    answer = command("tally", day)
    assert answer.status == 0
    assert "warning[resistance-missing]: runs.csv" in answer.out
    assert (day / "results" / "manifest.json").exists()
    assert command("check", day).status == 0


def test_strict_writes_nothing_after_a_warning(command: Command, broken_day: Place) -> None:
    day = broken_day(WARNED)
    before = snapshot(day)
    answer = command("tally", day, "--strict")
    assert answer.status == 1
    assert "warning[resistance-missing]: runs.csv" in answer.err
    assert "nothing was written, for --strict was given" in answer.err
    assert answer.out == ""
    assert snapshot(day) == before
    assert command("check", day, "--strict").status == 1


def test_strict_lets_notes_pass(command: Command, broken_day: Place) -> None:
    day = broken_day({"runs.csv": swap("resistance", "remarks of today,resistance", "6.8,10,20\na2", "6.8,x,10,20\na2",
                                       "6.8,10,20\n", "6.8,y,10,20\n")})  # fmt: skip
    answer = command("tally", day, "--strict")
    assert answer.status == 0, answer.err
    assert "note[unread-column]: runs.csv, row 1, column 'remarks of today'" in answer.out


def test_warnings_are_shown_beside_faults_and_left_out_when_quiet(
    command: Command, broken_day: Place
) -> None:
    day = broken_day({**WARNED, "gas.csv": swap("hydrogen,71", "hydrogen,-71")})
    assert "warning[resistance-missing]" in command("tally", day).err
    quiet = command("tally", day, "--quiet")
    assert quiet.status == 1
    assert "warning[" not in quiet.err
    assert "error[not-allowed]: gas.csv, row 5" in quiet.err


def test_large_day_of_faults_is_still_answered_in_full(command: Command, broken_day: Place) -> None:
    # every row of two tables is at fault in its own way, and the count says so
    gas = GAS + "".join(f"x{n},1,0,FID,CO,1\n" for n in range(300))
    liquid = LIQUID + "".join(f"y{n},formate,CH,1,1\n" for n in range(300))
    answer = command("tally", broken_day({"gas.csv": gas, "liquid.csv": liquid}))
    assert answer.status == 1
    assert "and 590 more of error[unknown-name]" in answer.err
    assert "the day's data have 600 faults" in answer.err


def process(*arguments: object) -> subprocess.CompletedProcess[str]:
    """The command as a user starts it."""
    return subprocess.run(
        [sys.executable, "-m", "coulombook", *map(str, arguments)],
        capture_output=True,
        text=True,
        encoding="utf-8",
        env={**os.environ, "COLUMNS": "2000", "PYTHONIOENCODING": "utf-8"},
        timeout=60,
        check=False,
    )


def test_process_ends_with_status_1_for_faults(broken_day: Place) -> None:
    day = broken_day(SEVERAL)
    before = snapshot(day)
    answer = process("tally", day)
    assert answer.returncode == 1
    assert answer.stdout == ""
    hold([one for one in said(answer.stderr) if one.word == "error"], SEVERAL_FAULTS, answer.stderr)
    assert "Traceback" not in answer.stderr
    assert snapshot(day) == before


def test_process_ends_with_status_1_for_numbers_that_break_a_formula(broken_day: Place) -> None:
    bent = "FID,ethylene,20,3.92\nFID,ethylene,100,18\nFID,ethylene,300,42\nFID,ethylene,400,48\n"
    day = broken_day(
        {
            "calibrations/gases/standards.csv": swap(
                "FID,ethylene,20,4.1\nFID,ethylene,100,19.8\nFID,ethylene,300,60.1\n", bent
            ),
            "calibrations/gases/calibration.toml": add('[curve."ethylene@FID"]\nform = "quadratic"\n'),
            "gas.csv": swap("C2H4,23.2", "C2H4,5100"),
        }
    )
    answer = process("tally", day)
    assert answer.returncode == 1
    assert "error[broken-curve]: gas.csv, row 7, column 'peak area'" in answer.stderr
    # a warning of a library's own would stand here as well
    assert "Warning" not in answer.stderr
    assert not (day / "results").exists()


def test_process_ends_with_status_2_for_a_folder_that_is_not_there(tmp_path: Path) -> None:
    answer = process("tally", tmp_path / "nowhere")
    assert answer.returncode == 2
    assert "does not exist" in answer.stderr
    assert answer.stdout == ""


def test_process_ends_with_status_2_for_a_wrong_option(broken_day: Place) -> None:
    answer = process("check", broken_day(), "--outt", "x")
    assert answer.returncode == 2
    assert "unknown option '--outt'" in answer.stderr


def test_process_ends_with_status_1_for_junk_in_every_file(broken_day: Place) -> None:
    junk = bytes(range(256)) * 8
    day = broken_day(
        dict.fromkeys(("day.toml", "runs.csv", "gas.csv", "vials.csv", "liquid.csv", "scans.csv"), junk)
    )
    answer = process("tally", day)
    assert answer.returncode == 1
    places = {one.where for one in said(answer.stderr) if one.word == "error"}
    found = {place for one in places for place in one.split("; ")}
    assert found == {"day.toml", "runs.csv", "gas.csv", "vials.csv", "liquid.csv", "scans.csv"}
    assert "Traceback" not in answer.stderr
