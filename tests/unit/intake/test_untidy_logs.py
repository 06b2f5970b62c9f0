"""Logs as benches write them: each habit is read and told of, and what cannot be known is a fault."""

from __future__ import annotations

import sys
from collections.abc import Callable
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest

from coulombook.balance.readings import Trace
from coulombook.findings import Finding, Findings, Severity
from coulombook.intake import log_cache
from coulombook.intake.files import Folder
from coulombook.intake.settings import TraceOptions
from coulombook.intake.traces import read_trace, read_voltammogram

HEADS = "t / s;E / V;I / mA\n"
ROWS = ("0;-1.5;-10.25\n", "0.5;-1.25;-10\n", "2;-1.5;0\n")
TIDY = HEADS + "".join(ROWS)
AUTOMATIC = TraceOptions({})
Read = Callable[..., tuple[Trace | None, list[Finding]]]


@pytest.fixture(params=["numpy", "pandas"])
def read(request: pytest.FixtureRequest, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Read:
    """Write a trace and read it, with each of the fast readers standing before the patient one."""
    assert pd is not None
    if request.param == "numpy":
        monkeypatch.delitem(sys.modules, "pandas")

    def written(
        data: bytes | str, options: TraceOptions = AUTOMATIC, **more: Any
    ) -> tuple[Trace | None, list[Finding]]:
        (tmp_path / "a.csv").write_bytes(data if isinstance(data, bytes) else data.encode())
        findings = Findings()
        trace = read_trace(Folder(tmp_path), tmp_path / "a.csv", 1e-4, options, findings, **more)
        return trace, list(findings)

    return written


def _assert_tidy(trace: Trace | None) -> None:
    assert trace is not None
    np.testing.assert_allclose(trace.time_second, [0.0, 0.5, 2.0], rtol=1e-15)
    np.testing.assert_allclose(trace.potential_volt, [-1.5, -1.25, -1.5], rtol=1e-15)
    # times 1e-3: one rounding
    np.testing.assert_allclose(trace.current_ampere, [-0.01025, -0.01, 0.0], rtol=1e-15)


def kinds(findings: list[Finding]) -> list[str]:
    return [one.kind for one in findings]


# --- what is the same log, without a word ---


@pytest.mark.parametrize(
    "text",
    [
        HEADS + ROWS[0] + "\n\n" + ROWS[1] + "   \n;;\n" + ROWS[2],  # blank lines between blocks
        HEADS + "".join(row.replace("\n", ";\n") for row in ROWS),  # trailing semicolons
        HEADS.replace("\n", ";;\n") + "".join(row.replace("\n", ";\n") for row in ROWS),
        '"t / s";"E / V";"I / mA"\n' + "".join(ROWS),  # quoted heads
        '"t / s";"E / V";"I / mA";"note; of ours"\n' + "".join(row.replace("\n", ";x\n") for row in ROWS),
        "\ufeff" + TIDY,  # byte order mark
        TIDY.replace("\n", "\r\n"),
        TIDY.replace("\n", "\r"),
        HEADS + ROWS[0].replace("\n", "\r\n") + ROWS[1] + ROWS[2].replace("\n", "\r\n"),  # both in one file
        TIDY.replace("-", "\N{MINUS SIGN}"),
        TIDY.rstrip("\n"),
    ],
)
def test_harmless_habits_give_the_same_trace(read: Read, text: str) -> None:
    trace, findings = read(text)
    assert findings == []
    _assert_tidy(trace)


# --- lines that are no readings ---


@pytest.mark.parametrize(
    ("text", "row", "words"),
    [
        (HEADS + ROWS[0] + "# changed the cell\n" + ROWS[1] + ROWS[2], 3, "1 line is no reading"),
        (HEADS + ROWS[0] + "% 2 mA more;;\n// 3\n" + ROWS[1] + ROWS[2], 3, "2 lines are no reading"),
        (TIDY + "end of the measurement\n", 5, "'end of the measurement'"),
        (HEADS + ROWS[0] + "pause;pause;pause\n" + ROWS[1] + ROWS[2], 3, "'pause'"),
        # two logs in one file: the preamble of the second stands between
        (
            HEADS + ROWS[0] + "Log of the afternoon\nSample;12;mesh\n1;2\n" + HEADS + ROWS[1] + ROWS[2],
            3,
            "3 lines",
        ),
    ],
)
def test_lines_that_are_no_readings_are_passed_over_and_told(
    read: Read, text: str, row: int, words: str
) -> None:
    trace, findings = read(text)
    _assert_tidy(trace)
    passed = findings[0]
    assert (passed.kind, passed.severity, passed.where) == (
        "lines-passed-over",
        Severity.NOTE,
        f"a.csv, row {row}",
    )
    assert words in passed.text


def test_repeated_heads_of_a_concatenated_log_are_told(read: Read) -> None:
    trace, findings = read(
        HEADS + ROWS[0] + "\ufeff" + HEADS + ROWS[1] + HEADS.upper().replace("/ S", "/ s") + ROWS[2]
    )
    _assert_tidy(trace)
    (told,) = findings
    assert told.kind == "lines-passed-over"
    assert told.where == "a.csv, row 3"
    assert "repeated in 2 lines" in told.text


def test_second_log_that_begins_at_zero_again_is_a_fault(read: Read) -> None:
    trace, findings = read(TIDY + HEADS + "".join(ROWS))
    assert trace is None
    (fault,) = [one for one in findings if one.severity is Severity.STOP]
    assert (fault.kind, fault.where, fault.text) == (
        "broken-trace",
        "a.csv, row 6, column 't / s'",
        "the time goes back",
    )
    assert fault.found == "0 s after 2 s"
    assert "one log a file" in fault.mend


@pytest.mark.parametrize(
    ("block", "row"),
    [
        ("t / s;I / mA;E / V\n0.5;-10;-1.25\n2;0;-1.5\n", 3),  # another order
        ("t / s;E / V;I / A\n0.5;-1.25;-0.01\n2;-1.5;0\n", 3),  # another unit
        (HEADS + "s;mV;mA\n0.5;-1250;-10\n2;-1500;0\n", 4),
    ],
)
def test_block_with_other_columns_or_units_is_a_fault(read: Read, block: str, row: int) -> None:
    trace, findings = read(HEADS + ROWS[0] + block)
    assert trace is None
    (fault,) = [one for one in findings if one.severity is Severity.STOP]
    assert (fault.kind, fault.where) == ("unreadable-file", f"a.csv, row {row}")
    assert fault.text == "the heads or units change within the file"


def test_text_in_a_reading_is_a_fault_and_no_line_to_pass_over(read: Read) -> None:
    trace, findings = read(HEADS + ROWS[0] + "0.5;-1.25;overload\n" + ROWS[2])
    assert trace is None
    assert [(one.kind, one.where) for one in findings] == [("not-a-number", "a.csv, row 3, column 'I / mA'")]


def test_log_of_faults_alone_is_answered_at_its_ten_thousandth(read: Read) -> None:
    trace, findings = read(HEADS + "1x;1y;1z\n" * 20_000)
    assert trace is None
    assert kinds(findings) == ["not-a-number"] * 3
    assert all("at least" in one.found for one in findings)


# --- units ---


@pytest.mark.parametrize("units", ["s;V;mA\n", "[s];[V];[mA]\n", "(s);(V);(mA);\n"])
def test_row_of_units_under_the_heads_is_taken_and_told(read: Read, units: str) -> None:
    trace, findings = read("free text\n\nTime;Potential;Current\n" + units + "".join(ROWS))
    _assert_tidy(trace)
    (told,) = findings
    assert (told.kind, told.where) == ("units-row", "a.csv, row 4")
    assert "Current: " in told.text


def test_row_of_units_counts_for_the_numbers_below_it(read: Read) -> None:
    trace, _ = read("t;E;I\nmin;mV;A\n0;-1500;-0.01025\n1;-1250;-0.01\n")
    assert trace is not None
    np.testing.assert_allclose(trace.time_second, [0.0, 60.0], rtol=1e-15)
    np.testing.assert_allclose(trace.potential_volt, [-1.5, -1.25], rtol=1e-15)
    np.testing.assert_allclose(trace.current_ampere, [-0.01025, -0.01], rtol=1e-15)


def test_row_of_units_that_contradicts_the_heads_is_a_fault(read: Read) -> None:
    trace, findings = read("t / s;E / V;I / mA\ns;mV;mA\n0;-1.5;-10\n1;-1.5;-10\n")
    assert trace is None
    (fault,) = findings
    assert (fault.kind, fault.where) == ("unknown-unit", "a.csv, row 1, column 'E / V'")
    assert fault.found == "unit 'V' and 'mV'"


def test_units_in_the_cells_of_an_autoranging_current_are_taken_and_told(read: Read) -> None:
    trace, findings = read("t / s;E / V;I\n0;-1.5;-10.25 mA\n0.5;-1.25;-10000 µA\n2;-1.5;0 nA\n")
    _assert_tidy(trace)
    (told,) = findings
    assert (told.kind, told.where) == ("numbers-interpreted", "a.csv, row 2, column 'I'")
    assert "3 cells with the unit in the cell, such as '-10.25 mA'" in told.text


def test_unit_in_a_single_cell_wins_over_the_head(read: Read) -> None:
    trace, findings = read(TIDY.replace("0.5;-1.25;-10\n", "0.5;-1.25;-10000 uA\n"))
    _assert_tidy(trace)
    assert kinds(findings) == ["numbers-interpreted"]


@pytest.mark.parametrize("cell", ["-10 mV", "-10 foo", "-10 mA x 2"])
def test_other_words_behind_a_number_are_a_fault(read: Read, cell: str) -> None:
    trace, findings = read(TIDY.replace("0.5;-1.25;-10\n", f"0.5;-1.25;{cell}\n"))
    assert trace is None
    assert [(one.kind, one.where) for one in findings] == [("not-a-number", "a.csv, row 3, column 'I / mA'")]


# --- numbers ---


@pytest.mark.parametrize(
    ("rows", "example"),
    [
        ("1,000.0;-1.5;-1\n2,000.5;-1.5;-1\n", "'1,000.0'"),
        ("1.000,0;-1,5;-1\n2.000,5;-1,5;-1\n", "'1.000,0'"),
        ("1'000.0;-1.5;-1\n2'000.5;-1.5;-1\n", '"1\'000.0"'),
        ("1 000,0;-1,5;-1\n2 000,5;-1,5;-1\n", "'1 000,0'"),
        # 1.000 alone might be one: the cell below says what the point is
        ("1.000;-1,5;-1\n2.000,5;-1,5;-1\n", "'1.000'"),
    ],
)
def test_thousands_are_read_where_they_are_sure_and_told(read: Read, rows: str, example: str) -> None:
    trace, findings = read(HEADS + rows)
    assert trace is not None
    np.testing.assert_array_equal(trace.time_second, [1000.0, 2000.5])
    np.testing.assert_array_equal(trace.potential_volt, [-1.5, -1.5])
    (told,) = findings
    assert (told.kind, told.where) == ("numbers-interpreted", "a.csv, row 2, column 't / s'")
    assert example.strip("\"'") in told.text


def test_sign_that_may_part_thousands_or_decimals_is_a_fault_until_day_toml_says_which(read: Read) -> None:
    text = HEADS + "0;-1,5;-1\n1.000;-1,5;-1\n"
    trace, findings = read(text)
    assert trace is None
    (fault,) = findings
    assert (fault.kind, fault.where) == ("not-a-number", "a.csv, row 3, column 't / s'")
    assert "[read.traces] decimal" in fault.mend
    trace, findings = read(text, TraceOptions({}, None, ","))
    assert trace is not None
    assert trace.time_second[-1] == 1000.0
    assert kinds(findings) == ["numbers-interpreted"]


def test_point_before_an_exponent_among_decimal_commas_is_read_and_told(read: Read) -> None:
    trace, findings = read("t / s;E / V;I / A\n0;-1,5;-1.025E-02\n0,5;-1,25;-1.000E-02\n2;-1,5;0.000E+00\n")
    _assert_tidy(trace)
    (told,) = findings
    assert told.kind == "numbers-interpreted"
    assert "-1.025E-02" in told.text


def test_exponents_with_commas_throughout_are_plain(read: Read) -> None:
    trace, findings = read(
        "t / s;E / V;I / A\n0;-1,5E+00;-1,025E-02\n0,5;-1,25E+00;-1E-02\n2;-1,5E+00;0E+00\n"
    )
    _assert_tidy(trace)
    assert findings == []


# --- the end of the file ---


@pytest.mark.parametrize("last", ["2.5;-1.", "2.5;", "2.5", "2.5;-1.5;", "2.5;-1.5;-", "2.5;-1.5;-1.2e", "3"])
def test_last_line_half_written_is_left_out_and_told(read: Read, last: str) -> None:
    trace, findings = read(TIDY + last)
    _assert_tidy(trace)
    (told,) = findings
    assert (told.kind, told.severity, told.where) == ("last-line-cut", Severity.NOTE, "a.csv, row 5")
    assert "left out" in told.text


def test_half_a_line_with_its_end_is_a_fault(read: Read) -> None:
    trace, findings = read(TIDY + "2.5;-1.\n")
    assert trace is None
    assert [(one.kind, one.where) for one in findings] == [("not-a-number", "a.csv, row 5, column 'I / mA'")]


def test_last_number_with_fewer_decimals_than_all_others_is_told(read: Read) -> None:
    rows = "".join(f"{second};-1.500;-10.{second:03}\n" for second in range(20))
    trace, findings = read(HEADS + rows.rstrip("\n")[:-2])
    assert trace is not None
    assert trace.current_ampere[-1] == pytest.approx(-0.010, rel=1e-12)  # -10.0 mA as it stands
    (told,) = findings
    assert (told.kind, told.where) == ("last-line-cut", "a.csv")
    assert "'-10.0'" in told.text
    assert read(HEADS + rows.rstrip("\n"))[1] == []


# --- times ---


@pytest.mark.parametrize(
    "times",
    [
        ("00:00:00", "00:00:00.5", "00:00:02"),
        ("0:00:00,0", "0:00:00,5", "0:00:02,0"),
    ],
)
def test_hours_minutes_and_seconds_from_zero_are_elapsed(read: Read, times: tuple[str, ...]) -> None:
    rows = "".join(f"{time};{row.split(';', 1)[1]}" for time, row in zip(times, ROWS, strict=True))
    trace, findings = read("Time;E / V;I / mA\n" + rows)
    _assert_tidy(trace)
    assert [(one.kind, one.severity) for one in findings] == [("clock-read", Severity.NOTE)]


def clock_rows(*times: str) -> str:
    return "t / s;E / V;I / mA\n" + "".join(f"{time};-1.5;-10\n" for time in times)


def test_times_of_day_count_from_the_start_of_the_run(read: Read) -> None:
    trace, findings = read(clock_rows("09:30:02", "09:30:03"), started=datetime(2043, 5, 18, 9, 30))
    assert trace is not None
    np.testing.assert_array_equal(trace.time_second, [2.0, 3.0])
    (told,) = findings
    assert told.kind == "clock-read"
    assert "times of day, the first 09:30:02; t = 0 is the run's start, 2 s before" in told.text


def test_clock_that_may_be_either_is_a_fault_until_day_toml_says_which(read: Read) -> None:
    text = clock_rows("09:30:02", "09:30:03")
    trace, findings = read(text)
    assert trace is None
    (fault,) = findings
    assert fault.kind == "not-a-time"
    assert fault.found == "a first reading at 09:30:02"
    assert "time = 'elapsed' or time = 'clock'" in fault.mend
    elapsed, _ = read(text, TraceOptions({}, time="elapsed"))
    of_day, _ = read(text, TraceOptions({}, time="clock"))
    assert elapsed is not None
    assert of_day is not None
    np.testing.assert_array_equal(elapsed.time_second, [34202.0, 34203.0])
    np.testing.assert_array_equal(of_day.time_second, [0.0, 1.0])


def test_count_of_hours_beyond_a_day_is_elapsed(read: Read) -> None:
    trace, _ = read(clock_rows("23:59:59", "24:00:00", "24:00:01"))
    assert trace is not None
    np.testing.assert_array_equal(trace.time_second, [86399.0, 86400.0, 86401.0])


def test_clock_past_midnight_goes_on_and_is_told(read: Read) -> None:
    trace, findings = read(
        clock_rows("23:59:58", "23:59:59", "00:00:00", "00:00:01"), started=datetime(2043, 5, 18, 23, 59, 58)
    )
    assert trace is not None
    np.testing.assert_array_equal(trace.time_second, [0.0, 1.0, 2.0, 3.0])
    assert kinds(findings) == ["clock-jump", "clock-read"]
    assert "past midnight once" in findings[0].text


def test_date_times_count_from_the_start_of_the_run_with_or_without_zone(read: Read) -> None:
    plain = clock_rows("2043-05-18T09:30:00.5", "2043-05-18T09:30:01")
    trace, findings = read(plain, started=datetime(2043, 5, 18, 9, 29, 30))
    assert trace is not None
    np.testing.assert_array_equal(trace.time_second, [30.5, 31.0])
    assert kinds(findings) == ["clock-read"]
    zoned = clock_rows("2043-05-18T09:30:00+02:00", "2043-05-18T07:30:01Z")
    trace, _ = read(zoned, started=datetime.fromisoformat("2043-05-18T07:29:30+00:00"))
    assert trace is not None
    np.testing.assert_array_equal(trace.time_second, [30.0, 31.0])
    trace, findings = read(zoned, started=datetime(2043, 5, 18, 9, 29, 30))
    assert trace is None
    assert [(one.kind, one.text) for one in findings] == [
        ("not-a-time", "of the run's start and the log one has a time zone and one has none")
    ]


def test_date_times_without_a_start_of_the_run_count_from_the_first(read: Read) -> None:
    trace, findings = read(clock_rows("18.05.2043 09:30:00", "18.05.2043 09:30:01"))
    assert trace is not None
    np.testing.assert_array_equal(trace.time_second, [0.0, 1.0])
    assert "t = 0 was taken at the first reading" in findings[0].text


def test_date_whose_order_cannot_be_known_is_a_fault_until_day_toml_says_it(read: Read) -> None:
    text = clock_rows("5/6/2043 09:30:00", "5/6/2043 09:30:01")
    trace, findings = read(text)
    assert trace is None
    assert kinds(findings) == ["not-a-time"]
    assert "[read.traces] dates" in findings[0].mend
    started = datetime(2043, 6, 5, 9, 30)
    trace, _ = read(text, TraceOptions({}, dates="day first"), started=started)
    assert trace is not None
    np.testing.assert_array_equal(trace.time_second, [0.0, 1.0])
    trace, findings = read(text, TraceOptions({}, dates="month first"), started=started)
    assert trace is None
    assert "not of the day its run was started" in findings[0].text


def test_serial_dates_of_a_spreadsheet_count_from_the_start_of_the_run(read: Read) -> None:
    # spreadsheet programs document 39448 for 2008-01-01; 35 years, nine leap days and 137 days later is 52369
    first = 39448 + 35 * 365 + 9 + 137 + 9.5 / 24
    text = "t / d;E / V;I / mA\n" + "".join(f"{first + n / 86400:.9f};-1.5;-10\n" for n in range(3))
    trace, findings = read(text, started=datetime(2043, 5, 18, 9, 29))
    assert trace is not None
    # nine decimals of a day are 0.09 ms
    np.testing.assert_allclose(trace.time_second, [60.0, 61.0, 62.0], atol=2e-4)
    assert kinds(findings) == ["clock-read"]
    elapsed, findings = read("t / d;E / V;I / mA\n0;-1.5;-10\n0.5;-1.5;-10\n")
    assert elapsed is not None
    np.testing.assert_array_equal(elapsed.time_second, [0.0, 43200.0])
    assert findings == []


def test_two_parts_of_a_time_may_be_either_and_are_a_fault(read: Read) -> None:
    trace, findings = read(clock_rows("00:01", "00:02"))
    assert trace is None
    assert kinds(findings) == ["not-a-time"]
    assert "hours and minutes, or minutes and seconds" in findings[0].text


def test_end_of_summer_time_is_put_right_and_its_beginning_only_when_told(read: Read) -> None:
    autumn = clock_rows(
        *(f"2043-10-25 02:59:{s:02}" for s in range(50, 60)), "2043-10-25 02:00:00", "2043-10-25 02:00:01"
    )
    trace, findings = read(autumn)
    assert trace is not None
    np.testing.assert_array_equal(np.diff(trace.time_second), 1.0)
    assert kinds(findings) == ["clock-jump", "clock-read"]
    spring = clock_rows(*(f"2043-03-29 01:59:{s:02}" for s in range(48, 60)), "2043-03-29 03:00:00")
    trace, findings = read(spring)
    assert trace is not None
    assert trace.time_second[-1] == 3612.0
    assert kinds(findings) == ["log-gap", "clock-read", "log-gap"]
    assert "clock_put_forward = true" in findings[0].mend
    trace, findings = read(spring, TraceOptions({}, clock_put_forward=True))
    assert trace is not None
    np.testing.assert_array_equal(np.diff(trace.time_second), 1.0)
    assert kinds(findings) == ["clock-jump", "clock-read"]


def test_time_logged_twice_counts_once_and_differing_readings_are_averaged(read: Read) -> None:
    trace, findings = read(HEADS + ROWS[0] + ROWS[1] + ROWS[1] + ROWS[2])
    _assert_tidy(trace)
    (told,) = findings
    assert (told.kind, told.severity) == ("times-repeated", Severity.NOTE)
    assert "1 reading at the time of the reading above (the first at 0.5 s): the same once more" in told.text
    trace, findings = read(HEADS + ROWS[0] + "0.5;-1.0;-8\n0.5;-1.5;-12\n" + ROWS[2])
    _assert_tidy(trace)
    assert "the mean was taken" in findings[0].text


def test_stamps_to_the_second_of_a_faster_log_keep_its_charge(read: Read) -> None:
    """A ramp logged four times a second under stamps of whole seconds."""
    quarter = np.arange(400)
    rows = "".join(f"{n // 4};-1.5;{-10 - 0.01 * n:.2f}\n" for n in quarter)
    trace, findings = read(HEADS + rows)
    assert trace is not None
    assert trace.time_second.size == 100
    assert kinds(findings) == ["times-repeated"]
    # the mean of four is the current in the middle of its second: of n = 0 to 3 that is 10.015 mA
    assert trace.current_ampere[0] == pytest.approx(-0.010015, rel=1e-12)


def test_clock_that_stands_still_is_a_fault(read: Read) -> None:
    rows = "".join(f"{n};-1.5;-10\n" for n in range(50)) + "50;-1.5;-10\n" * 40
    trace, findings = read(HEADS + rows)
    assert trace is None
    (fault,) = findings
    assert (fault.kind, fault.text, fault.found) == (
        "broken-trace",
        "the time stands still",
        "40 readings at 50 s",
    )


def test_hole_in_the_log_is_a_warning_where_it_lies_in_the_window(read: Read) -> None:
    times = [*range(100), *range(200, 300)]
    text = HEADS + "".join(f"{time};-1.5;-10\n" for time in times)
    trace, findings = read(text)
    assert trace is not None
    (told,) = findings
    assert (told.kind, told.severity) == ("log-gap", Severity.WARN)
    # 101 s of 299 s
    assert "no reading from 99 s to 200 s (34% of the log)" in told.text
    assert read(text, window=(200.0, None))[1] == []
    assert kinds(read(text, window=(150.0, None))[1]) == ["log-gap"]


def test_slow_and_uneven_logs_have_no_holes(read: Read) -> None:
    uneven = "".join(f"{n * n};-1.5;-10\n" for n in range(50))
    assert read(HEADS + uneven)[1] == []
    assert read(HEADS + "0;-1.5;-10\n1800;-1.5;-10\n3600;-1.5;-10\n")[1] == []


@pytest.mark.parametrize("step", ["1e-300", "1e-12"])
def test_steps_of_next_to_nothing_are_a_fault(read: Read, step: str) -> None:
    trace, findings = read(HEADS + f"0;-1.5;-10\n{step};-1.5;-10\n1;-1.5;-10\n")
    assert trace is None
    (fault,) = findings
    assert (fault.kind, fault.where) == ("broken-trace", "a.csv, row 3, column 't / s'")
    assert fault.expected == "steps of 1e-09 s and more"


def test_column_of_denormal_numbers_is_a_fault(read: Read) -> None:
    trace, findings = read(HEADS + "0;-1.5;-1e-310\n1;-1.5;-1e-310\n")
    assert trace is None
    assert [(one.kind, one.where) for one in findings] == [("not-a-number", "a.csv, column 'I / mA'")]


# --- heads ---


def test_head_with_a_foreign_letter_is_named_by_it(read: Read) -> None:
    _, findings = read(TIDY.replace("E / V", "\u0415 / V"))
    (fault,) = findings
    assert fault.kind == "missing-column"
    assert "sign 1 is '\u0415' (U+0415, cyrillic capital letter ie), not 'E'" in fault.mend
    _, findings = read(TIDY.replace("I / mA", "I / m\u0410"))
    (fault,) = findings
    assert fault.kind == "unknown-unit"
    assert "U+0410" in fault.mend


def test_thousands_of_columns_are_a_fault(read: Read) -> None:
    heads = ";".join(["t / s", "E / V", "I / mA", *("x" for _ in range(2000))])
    trace, findings = read(heads + "\n" + "0;" * 2002 + "0\n")
    assert trace is None
    (fault,) = findings
    assert (fault.kind, fault.found, fault.expected) == (
        "unreadable-file",
        "2003 heads",
        "at most 1000 columns",
    )


# --- other long files ---


def test_voltammograms_have_the_same_habits(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("Time;E;I\nhh:mm:ss;V;mA\n00:00:00;0,1;1\n# turned\n00:00:01;0,2;-1\n", encoding="utf-8")
    findings = Findings()
    read = read_voltammogram(Folder(tmp_path), path, 1e-4, AUTOMATIC, findings)
    assert read is not None
    assert read.time_second is not None
    np.testing.assert_array_equal(read.time_second, [0.0, 1.0])
    np.testing.assert_array_equal(read.potential_volt, [0.1, 0.2])
    assert kinds(list(findings)) == ["lines-passed-over", "units-row", "clock-read"]


def test_untidy_log_of_more_than_a_gigabyte_is_refused_unread(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from coulombook.intake import patient_body

    monkeypatch.setattr(patient_body, "LARGEST_UNTIDY_LOG_BYTE", 1_000)
    monkeypatch.setenv(log_cache.VARIABLE, "off")
    (tmp_path / "a.csv").write_text(TIDY + "# x\n" * 1_000, encoding="utf-8")
    findings = Findings()
    assert read_trace(Folder(tmp_path), tmp_path / "a.csv", 1e-4, AUTOMATIC, findings) is None
    assert kinds(list(findings)) == ["unreadable-file"]


def test_lines_across_blocks_of_the_reader_stay_whole(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from coulombook.intake import patient_body

    text = ("free text\r\n" + HEADS.replace("\n", "\r\n") + "# x\r\n" + "".join(
        f"{n};-1.5;-{n}.25\r\n" for n in range(200)))  # fmt: skip
    (tmp_path / "a.csv").write_bytes(text.encode())
    for block in (1, 2, 7, 100, 1 << 20):
        monkeypatch.setattr(patient_body, "_BLOCK", block)
        findings = Findings()
        trace = read_trace(Folder(tmp_path), tmp_path / "a.csv", 1e-4, AUTOMATIC, findings)
        assert trace is not None
        np.testing.assert_array_equal(trace.time_second, np.arange(200.0))
        assert [(one.kind, one.where) for one in findings] == [("lines-passed-over", "a.csv, row 3")]
