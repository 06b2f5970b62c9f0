"""Untidy days: what is sure is read as if it were tidy, and told of; the numbers are those of the tidy day."""

from __future__ import annotations

import csv
from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault
from tests.faults.day import GAS, TRACE, Changes, add, swap, write_day

from coulombook.cli import main

A1 = "traces/a1.csv"
HEAD, *ROWS = TRACE.splitlines()
SEMICOLONS = TRACE.replace(",", ";").replace("-1.5", "-1,5")
TIMES = (0, 900, 1800, 2700, 3600)


def rows_at(*times: str) -> str:
    return HEAD + "\n" + "".join(f"{time},-1.5,-10\n" for time in times)


# --- what gives the good day's numbers: changes, and the findings that tell of them (kind, place) ---

HABITS: dict[str, tuple[Changes, list[tuple[str, str]]]] = {
    "blank lines between blocks": ({A1: "\n".join([HEAD, *ROWS[:2], "", "  ", *ROWS[2:]])}, []),
    "trailing semicolons": ({A1: SEMICOLONS.replace("\n", ";;\n")}, []),
    "quoted heads": ({A1: TRACE.replace(HEAD, '"t / s","E / V","I / mA"')}, []),
    "a byte order mark": ({A1: b"\xef\xbb\xbf" + TRACE.encode()}, []),
    "returns as line ends": ({A1: TRACE.replace("\n", "\r").encode()}, []),
    "comments between readings": (
        {A1: "\n".join([HEAD, *ROWS[:2], "# electrolyte topped up", *ROWS[2:], ""])},
        [("lines-passed-over", f"{A1}, row 4")],
    ),
    "heads repeated between blocks": (
        {A1: "\n".join([HEAD, *ROWS[:2], HEAD, *ROWS[2:], ""])},
        [("lines-passed-over", f"{A1}, row 4")],
    ),
    "units under the heads": (
        {A1: TRACE.replace(HEAD, "time,potential,current\n[s],[V],[mA]")},
        [("units-row", f"{A1}, row 2")],
    ),
    "thousands parted": (
        {A1: SEMICOLONS.replace("1800;", "1.800,0;").replace("2700;", "2.700,0;").replace("3600;", "3.600,0;")},
        [("numbers-interpreted", f"{A1}, row 4, column 't / s'")],
    ),
    "points before exponents": (
        {A1: SEMICOLONS.replace("-10\n", "-1.000E+01\n")},
        [("numbers-interpreted", f"{A1}, row 2, column 'I / mA'")],
    ),
    "units in the cells": (
        {A1: TRACE.replace("-10\n", "-10 mA\n").replace("1800,-1.5,-10 mA", "1800,-1.5,-10000 uA")},
        [("numbers-interpreted", f"{A1}, row 2, column 'I / mA'")],
    ),
    "hours, minutes and seconds": (
        {A1: rows_at("0:00:00", "0:15:00", "0:30:00", "0:45:00", "1:00:00")},
        [("clock-read", f"{A1}, column 't / s'")],
    ),
    "times of day": (
        {A1: rows_at("09:30:00", "09:45:00", "10:00:00", "10:15:00", "10:30:00")},
        [("clock-read", f"{A1}, column 't / s'")],
    ),
    "date-times": (
        {A1: rows_at(*(f"2043-05-18 {hour}" for hour in ("09:30:00", "09:45:00", "10:00:00", "10:15:00", "10:30:00")))},
        [("clock-read", f"{A1}, column 't / s'")],
    ),
    "date-times with the month first": (
        {
            A1: rows_at(*(f"5/18/2043 {h}:00" for h in ("9:30", "9:45", "10:00", "10:15", "10:30"))),
            "day.toml": add('[read.traces]\ndates = "month first"\n'),
        },
        [("clock-read", f"{A1}, column 't / s'")],
    ),
    "days": ({A1: rows_at("0", *(f"{time / 86400!r}" for time in TIMES[1:])).replace("t / s", "t / d")}, []),
    "a reading logged twice": (
        {A1: "\n".join([HEAD, *ROWS[:3], *ROWS[2:], ""])},
        [("times-repeated", f"{A1}, column 't / s'")],
    ),
    "a last line half written": ({A1: TRACE + "4500,-1."}, [("last-line-cut", f"{A1}, row 7")]),
    "a log of another make than the others": (
        {
            A1: SEMICOLONS.replace("t / s;E / V;I / mA", "Zeit;Spannung;Strom"),
            "day.toml": add(
                '[read.traces."traces/a1.csv"]\nseparator = "semicolon"\ndecimal = "comma"\n'
                'columns = { "t / s" = "Zeit", "E / V" = "Spannung", "I / mA" = "Strom" }\n'
            ),
        },
        [],
    ),
    "comments and heads again among peaks": (
        {"gas.csv": GAS.replace("a1,2,3000,TCD", "# after the pause\n" + GAS.splitlines()[0] + "\na1,2,3000,TCD")},
        [("lines-passed-over", "gas.csv, row 6"), ("lines-passed-over", "gas.csv, row 5")],
    ),
    "units under the heads of peaks": (
        {"gas.csv": GAS.replace("time / s", "time").replace("peak area\n", "peak area\n,,s,,,\n", 1)},
        [("units-row", "gas.csv, row 2")],
    ),
}  # fmt: skip


Results = tuple[str, str, list[dict[str, str]]]


def results(command: Command, day: Path, *options: str) -> Results:
    """Ledger and summary as written, and the findings."""
    answer = command("tally", day, "--quiet", "--tables-only", *options)
    assert answer.status == 0, answer.err
    read = {name: (day / "results" / f"{name}.csv").read_text() for name in ("ledger", "summary", "findings")}
    return read["ledger"], read["summary"], list(csv.DictReader(read["findings"].splitlines()))


@pytest.fixture(scope="module")
def tidy(tmp_path_factory: pytest.TempPathFactory) -> Results:
    """What the good day gives."""
    day = write_day(tmp_path_factory.mktemp("tidy") / "day", {})
    assert main(["tally", str(day), "--quiet", "--tables-only"]) == 0
    read = {name: (day / "results" / f"{name}.csv").read_text() for name in ("ledger", "summary", "findings")}
    return read["ledger"], read["summary"], list(csv.DictReader(read["findings"].splitlines()))


@pytest.mark.parametrize("name", HABITS)
def test_untidy_day_gives_the_numbers_of_the_tidy_one(
    name: str, command: Command, broken_day: Callable[..., Path], tidy: Results
) -> None:
    changes, told = HABITS[name]
    # nothing that was interpreted is a warning
    ledger, summary, findings = results(command, broken_day(changes), "--strict")
    assert (ledger, summary) == tidy[:2]
    fresh = [one for one in findings if one not in tidy[2]]
    assert [(one["kind"], one["where"]) for one in fresh] == told
    assert {one["severity"] for one in fresh} <= {"note"}


def test_hole_in_a_log_is_a_warning_that_a_strict_tally_refuses(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    times = [*range(0, 1500, 10), *range(2100, 3610, 10)]
    day = broken_day({A1: HEAD + "\n" + "".join(f"{time},-1.5,-10\n" for time in times)})
    _, _, findings = results(command, day)
    (told,) = [one for one in findings if one["kind"] == "log-gap"]
    assert (told["severity"], told["where"]) == ("warn", f"{A1}, column 't / s'")
    assert "no reading from 1490 s to 2100 s" in told["text"]
    assert command("tally", day, "--strict", "--quiet", "--tables-only").status == 1


def test_hours_without_a_clue_are_refused_until_day_toml_says_what_they_are(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    times = rows_at("00:10:00", "00:25:00", "00:40:00", "00:55:00", "01:10:00")
    day = broken_day({A1: times, "runs.csv": swap("0,3600,1.0,6.8,10,20\na2", "600,4200,1.0,6.8,10,20\na2")})
    fault = Fault(
        "not-a-time", f"{A1}, column 't / s'", "a first reading at 00:10:00", "00:00:00", "time = 'elapsed'"
    )
    command.refuses(day, [fault])
    with (day / "day.toml").open("a") as stream:
        stream.write('[read.traces]\ntime = "elapsed"\n')
    assert command("tally", day, "--quiet", "--tables-only").status == 0


UNKNOWN_KEYS = {
    "[read.traces]\ntimes = 'clock'\n": ("unknown-key", "[read.traces], key 'times'", "'times'", "did you mean 'time'"),
    "[read.traces]\ncolums = { t = 'Zeit' }\n": (
        "unknown-key", "[read.traces], key 'colums'", "'colums'", "did you mean 'columns'",
    ),
    "[read.traces.'traces/a1.csv']\ndecimals = ','\n": (
        "unknown-key", "[read.traces.traces/a1.csv], key 'decimals'", "'decimals'", "did you mean 'decimal'",
    ),
    "[read.traces.'traces/a9.csv']\ndecimal = ','\n": (
        "unknown-name", "[read.traces.traces/a9.csv]", "'traces/a9.csv'", "did you mean 'traces/a",
    ),
    "[read.traces]\ntime = 'wall'\n": ("not-allowed", "[read.traces], key 'time'", "'wall'", "correct the value"),
    "[read.traces]\ndates = 'year first'\n": (
        "not-allowed", "[read.traces], key 'dates'", "'year first'", "correct the value",
    ),
    "[read.traces]\nclock_put_forward = 'yes'\n": (
        "not-allowed", "[read.traces], key 'clock_put_forward'", "'yes'", "correct the value",
    ),
}  # fmt: skip


@pytest.mark.parametrize("text", UNKNOWN_KEYS)
def test_slip_in_the_settings_of_logs_is_refused(
    text: str, command: Command, broken_day: Callable[..., Path]
) -> None:
    kind, place, found, mend = UNKNOWN_KEYS[text]
    answer = command("tally", broken_day({"day.toml": add(text)}))
    assert answer.status == 1
    (said,) = answer.errors
    assert said.kind == kind
    assert said.where.endswith(place)
    assert said.where.startswith("day.toml, row 2")
    assert said.found == found
    assert mend in said.mend
