"""Files that mean harm: each is answered by a clear fault, in bounded time, and nothing is written."""

from __future__ import annotations

import time
from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault
from tests.faults.day import GAS, GOOD, RUNS, TRACE, Changes, add, swap

from coulombook.findings import MOST_OF_A_KIND

A1 = "traces/a1.csv"
GAS_HEAD = GAS.splitlines()[0] + "\n"
SECONDS = (
    120.0  # far above what any case takes on a busy machine; without its limit each takes many times more
)


# --- paths ---

LEADING_OUT = (
    "../outside.csv",
    "traces/../../outside.csv",
    "/etc/passwd",
    "C:/windows/win.ini",
    "c:secret.csv",
    "\\\\server\\share\\a.csv",
    "//server/share/a.csv",
    "..\\outside.csv",
    "traces\\..\\..\\outside.csv",
    "\\outside.csv",
)


@pytest.mark.parametrize("path", LEADING_OUT)
@pytest.mark.parametrize("table", ["runs", "scans"])
def test_path_that_leads_out_of_the_day_is_refused(
    table: str, path: str, command: Command, broken_day: Callable[..., Path], workplace: Path
) -> None:
    (workplace / "outside.csv").write_text(TRACE)
    changes: Changes = {
        "runs": {
            "runs.csv": lambda text: text.replace("resistance / ohm", "trace").replace(
                "6.8,10,20", f"6.8,{path},20"
            )
        },
        "scans": {"scans.csv": swap("scans/m1-20.csv", path)},
    }[table]
    day = broken_day(changes)
    answer = command("tally", day)
    assert answer.status == 1
    faults = [one for one in answer.errors if one.kind == "outside-folder"]
    assert faults, answer.err
    assert all(f"'{path}'" in one.found.replace("/", "\\") or f"'{path}'" in one.found or
               path.replace("\\", "/") in one.found for one in faults)  # fmt: skip
    assert "root:" not in answer.err  # nothing of a file outside is ever shown
    assert not (day / "results").exists()


@pytest.mark.parametrize("what", ["traces", "scans"])
def test_folder_that_is_a_link_out_of_the_day_is_refused(
    what: str, command: Command, broken_day: Callable[..., Path], tmp_path: Path
) -> None:
    day = broken_day()
    (day / what).rename(tmp_path / what)
    (day / what).symlink_to(tmp_path / what)
    answer = command("tally", day)
    assert answer.status == 1
    assert {one.kind for one in answer.errors} == {"outside-folder"}


def test_section_of_day_toml_for_a_file_outside_reads_nothing_there(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    day = broken_day({"day.toml": add('[read.traces."../outside.csv"]\ndecimal = ","\n')})
    command.refuses(
        day,
        [Fault("unknown-name", "day.toml, row 27, [read.traces.../outside.csv]", "'../outside.csv'", "by its path",
               "delete the section")],
    )  # fmt: skip


# --- columns, rows, cells ---


@pytest.mark.parametrize(
    ("columns", "found"), [(2_000, "20.. heads"), (100_000, "a line of more than 6553. characters")]
)
def test_thousands_of_columns_are_refused(
    columns: int, found: str, command: Command, broken_day: Callable[..., Path]
) -> None:
    wide = "," + ",".join(f"c{number}" for number in range(columns))
    faults = [
        Fault("unreadable-file", "gas.csv", found, "at most", "save the file again"),
        Fault(
            "unreadable-file", A1 + (", row 1" if columns == 2_000 else ""), found, "at most", "columns|save"
        ),
    ]
    gas = broken_day({"gas.csv": lambda text: text.replace("peak area", "peak area" + wide)})
    command.refuses(gas, faults[:1])
    trace = broken_day({A1: TRACE.replace("I / mA", "I / mA" + wide)})
    command.refuses(trace, faults[1:])


def test_table_of_half_a_million_lines_and_more_is_refused(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    day = broken_day({"gas.csv": GAS_HEAD + "a1,1,1800,FID,CO,50\n" * 600_000})
    command.refuses(
        day,
        [Fault("unreadable-file", "gas.csv", "600001 lines", "at most 500000 lines", "save the file")],
        check=False,
    )


def repeated(change: str, count: int) -> Changes:
    rows = {
        "cells that are no numbers": "a1,x,1800,FID,CO,z\n" * count,
        "runs nobody defined": "".join(f"r{number},1,1800,FID,CO,50\n" for number in range(count)),
        "analytes nobody knows": "".join(f"a1,1,1800,FID,C{number}O,50\n" for number in range(count)),
        "peaks entered again": "a1,1,1800,FID,CO,50\n" * count,
    }
    return {"gas.csv": GAS_HEAD + rows[change]}


@pytest.mark.parametrize(
    ("what", "kind"),
    [
        ("cells that are no numbers", "not-a-number"),
        ("runs nobody defined", "unknown-name"),
        ("analytes nobody knows", "unknown-species"),
        ("peaks entered again", "duplicate"),
    ],
)
def test_a_hundred_thousand_faults_are_counted_and_the_first_shown(
    what: str, kind: str, command: Command, broken_day: Callable[..., Path]
) -> None:
    day = broken_day(repeated(what, 100_000))
    start = time.perf_counter()
    answer = command("tally", day)
    assert time.perf_counter() - start < SECONDS
    assert answer.status == 1
    shown = [one for one in answer.errors if one.kind == kind]
    assert 1 <= len(shown) <= 10
    assert shown[0].where.startswith("gas.csv, row ")
    assert len(answer.err) < 1_000_000
    assert not (day / "results").exists()


def test_findings_beyond_ten_thousand_of_a_kind_are_counted(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    from coulombook.findings import Findings
    from coulombook.intake.day import open_day

    findings = Findings()
    open_day(broken_day(repeated("runs nobody defined", 50_000)), [], findings)
    named = [one for one in findings if one.kind == "unknown-name"]
    assert len(named) == MOST_OF_A_KIND + 1
    assert (named[-1].where, named[-1].found) == ("further places", f"{50_000 - MOST_OF_A_KIND} more")


def test_twenty_thousand_runs_without_logs_are_answered(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    head, row, _ = RUNS.splitlines()
    runs = "".join(f"r{number},{row.split(',', 1)[1]}\n" for number in range(20_000))
    day = broken_day({"runs.csv": f"{head}\n{runs}", "gas.csv": None, "vials.csv": None, "liquid.csv": None})
    start = time.perf_counter()
    answer = command("tally", day)
    assert time.perf_counter() - start < SECONDS
    assert answer.status == 1
    assert {one.kind for one in answer.errors} == {"missing-file"}


def test_log_of_a_million_faulty_cells_is_answered(command: Command, broken_day: Callable[..., Path]) -> None:
    day = broken_day({A1: TRACE.splitlines()[0] + "\n" + "1x,1y,1z\n" * 350_000})
    start = time.perf_counter()
    answer = command("tally", day)
    assert time.perf_counter() - start < SECONDS
    assert [(one.kind, one.where) for one in answer.errors] == [
        ("not-a-number", f"{A1}, row 2, column '{head}'") for head in ("t / s", "E / V", "I / mA")
    ]


# --- numbers ---


@pytest.mark.parametrize("cell", ["1e308", "-1e308", "1e999", "nan", "1e31"])
def test_extreme_numbers_of_a_log_are_refused(
    cell: str, command: Command, broken_day: Callable[..., Path]
) -> None:
    day = broken_day({A1: swap("1800,-1.5,-10", f"1800,-1.5,{cell}")})
    command.refuses(
        day,
        [
            Fault(
                "not-a-number",
                f"{A1}, row 4, column 'I / mA'",
                f"'{cell}'",
                "a finite number",
                "correct the cell",
            )
        ],
        check=False,
    )


@pytest.mark.parametrize("cell", ["1e308", "5e-324", "1e-300", "-1e308", "inf"])
@pytest.mark.parametrize("table", ["gas", "runs"])
def test_extreme_numbers_of_a_table_are_refused(
    table: str, cell: str, command: Command, broken_day: Callable[..., Path]
) -> None:
    changes: Changes = {
        "gas": {"gas.csv": swap("a1,1,1800,FID,CO,105", f"a1,1,1800,FID,CO,{cell}")},
        "runs": {"runs.csv": lambda text: text.replace("6.8,10,20\na2", f"6.8,10,{cell}\na2")},
    }[table]
    answer = command("tally", broken_day(changes))
    assert answer.status == 1
    assert {one.kind for one in answer.errors} <= {"not-allowed", "not-a-number"}
    assert all(f"'{cell}'" in one.found for one in answer.errors)


@pytest.mark.parametrize("time_step", ["1e-300", "5e-324", "1e-12"])
def test_log_whose_clock_hardly_moves_is_refused(
    time_step: str, command: Command, broken_day: Callable[..., Path]
) -> None:
    day = broken_day({A1: swap("0,-1.5,-10\n900", f"0,-1.5,-10\n{time_step},-1.5,-10\n900")})
    command.refuses(
        day,
        [Fault("broken-trace", f"{A1}, row 3, column 't / s'", f"{time_step}.* s after 0 s|4.9.*e-324 s after 0 s",
               "steps of 1e-09 s and more", "correct the unit")],
    )  # fmt: skip


# --- heads and names that deceive ---


@pytest.mark.parametrize(
    ("file", "old", "new", "kind"),
    [
        (A1, "E / V", "\u0415 / V", "missing-column"),
        (A1, "I / mA", "I / m\u0410", "unknown-unit"),
        ("gas.csv", "channel", "\u0441hannel", "missing-column"),
        ("gas.csv", "peak area", "peak\u200b area", "missing-column"),
        ("runs.csv", "inlet flow / sccm", "inlet flow / s\u0441cm", "unknown-unit"),
    ],
)
def test_head_with_a_foreign_letter_is_told_by_its_code(
    file: str, old: str, new: str, kind: str, command: Command, broken_day: Callable[..., Path]
) -> None:
    answer = command("tally", broken_day({file: GOOD[file].replace(old, new)}))
    assert answer.status == 1
    said = next(one for one in answer.errors if one.kind == kind)
    letter = next(one for one in new if not one.isascii())
    assert f"U+{ord(letter):04X}" in said.mend


def test_run_with_a_foreign_letter_is_told_by_its_code(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    answer = command("tally", broken_day({"gas.csv": GAS.replace("a2,", "\u04302,")}))
    (said,) = [one for one in answer.errors if one.kind == "unknown-name"]
    assert "sign 1 is '\u0430' (U+0430, cyrillic small letter a), not 'a'" in said.mend


# --- settings ---


@pytest.mark.parametrize(
    ("text", "found"),
    [
        ("a = " + "[" * 200_000, "brackets nested too deeply"),
        ("[day]\nx = " + "9" * 400_000, "Exceeds the limit|digits"),
        ("x" * 2_000_000, "2 MB"),
    ],
)
def test_settings_that_mean_harm_are_refused(
    text: str, found: str, command: Command, broken_day: Callable[..., Path]
) -> None:
    answer = command("tally", broken_day({"day.toml": text}))
    assert answer.status == 1
    assert "Traceback" not in answer.err
    (said,) = [one for one in answer.errors if one.kind in ("broken-settings", "unreadable-file")]
    assert any(one in said.found for one in found.split("|"))
