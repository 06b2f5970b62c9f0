"""Broken tables of runs, as files and as sheets."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault
from tests.faults.day import TRACE, drop_column, swap
from tests.faults.table_cases import Cases, as_file_and_sheet, refuse_table

INLET = "inlet flow / sccm"
AREA = "electrode area / cm^2"

CASES: Cases = {
    "unit is misspelt": (
        swap(INLET, "inlet flow / sccn"),
        (
            Fault(
                "unknown-unit",
                "runs.csv, row 1, column 'inlet flow / sccn'",
                "unit 'sccn'",
                "a unit of flow, such as sccm, mL/min or umol/s",
                "did you mean 'sccm'",
            ),
        ),
    ),
    "unit measures something else": (
        swap(AREA, "electrode area / cm"),
        (
            Fault(
                "wrong-dimension",
                "runs.csv, row 1, column 'electrode area / cm'",
                "unit 'cm'",
                r"a unit of area, such as cm\^2",
                r"as in 'electrode area / cm\^2'",
            ),
        ),
    ),
    "temperature is given as an energy": (
        swap(INLET, "temperature / J", ",10,20\na2", ",10,25\na2", ",10,20\n", ",10,25\n"),
        (
            Fault(
                "wrong-dimension",
                "runs.csv, row 1, column 'temperature / J'",
                "unit 'J'",
                "degC",
                "in the head",
            ),
            Fault("missing-column", "runs.csv, row 1", "'temperature / J'", "inlet flow", "add the column"),
        ),
    ),
    "unit is missing": (
        swap(AREA, "electrode area"),
        (
            Fault(
                "unknown-unit",
                "runs.csv, row 1, column 'electrode area'",
                "no unit in the head",
                r"the head 'electrode area / cm\^2'",
                "correct the unit in the head",
            ),
        ),
    ),
    "unit is a trap for an evaluator": (
        swap(INLET, "inlet flow / 9**9**9**9"),
        (
            Fault(
                "unknown-unit",
                "runs.csv, row 1, column 'inlet flow / 9**9**9**9'",
                r"unit '9\*\*9\*\*9\*\*9'",
                "sccm",
                "correct the unit",
            ),
        ),
    ),
    "number stands with its unit in the cell": (
        swap("6.8,10,20\na2", "6.8,10 ohm,20\na2"),
        (
            Fault(
                "not-a-number",
                "runs.csv, row 2, column 'resistance / ohm'",
                "'10 ohm'",
                "a finite number with a decimal point and nothing else",
                "correct the cell",
            ),
        ),
    ),
    "pH is a word": (
        swap("1.0,6.8,10,20\na2", "1.0,neutral,10,20\na2"),
        (
            Fault(
                "not-a-number",
                "runs.csv, row 2, column 'pH'",
                "'neutral'",
                "a finite number",
                "correct the cell",
            ),
        ),
    ),
    "pH is that of no electrolyte": (
        swap("1.0,6.8,10,20\na2", "1.0,68,10,20\na2"),
        (
            Fault(
                "not-allowed",
                "runs.csv, row 2, column 'pH'",
                "'68'",
                "a pH from -2 to 16",
                "correct the value",
            ),
        ),
    ),
    "number is not finite": (
        swap("1.0,6.8,10,20\na2", "1.0,6.8,inf,20\na2"),
        (
            Fault(
                "not-a-number",
                "runs.csv, row 2, column 'resistance / ohm'",
                "'inf'",
                "a finite number",
                "correct the cell",
            ),
        ),
    ),
    "number is no number by name": (
        swap("1.0,6.8,10,20\na2", "nan,6.8,10,20\na2"),
        (
            Fault(
                "not-a-number",
                f"runs.csv, row 2, column '{AREA}'",
                "'nan'",
                "a finite number",
                "correct the cell",
            ),
        ),
    ),
    "electrode has no area": (
        swap("1.0,6.8,10,20\na2", "0,6.8,10,20\na2"),
        (
            Fault(
                "not-allowed",
                f"runs.csv, row 2, column '{AREA}'",
                "'0'",
                "a number above zero",
                "or the unit in the head",
            ),
        ),
    ),
    "area is left blank": (
        swap("1.0,6.8,10,20\na2", ",6.8,10,20\na2"),
        (
            Fault(
                "missing-value",
                f"runs.csv, row 2, column '{AREA}'",
                "nothing",
                "above zero",
                "fill in the cell",
            ),
        ),
    ),
    "name is left blank": (
        swap("\na2,mesh", "\n,mesh"),
        (
            Fault("missing-value", "runs.csv, row 3, column 'run'", "nothing", "the run", "fill in the cell"),
            Fault(
                "unknown-name",
                "gas.csv, row 8, column 'run'",
                r"'a2' \(3 rows\)",
                "'a1'",
                "did you mean 'a1'",
            ),
            Fault("unknown-name", "vials.csv, row 3, column 'run'", "'a2'", "'a1'", "add it to runs"),
        ),
    ),
    "flow is negative": (
        swap("6.8,10,20\na2", "6.8,10,-20\na2"),
        (
            Fault(
                "not-allowed",
                f"runs.csv, row 2, column '{INLET}'",
                "'-20'",
                "above zero",
                "correct the value",
            ),
        ),
    ),
    "flow is left blank": (
        swap("6.8,10,20\na2", "6.8,10,\na2"),
        (
            Fault(
                "missing-value",
                f"runs.csv, row 2, column '{INLET}'",
                "nothing",
                "inlet flow / sccm",
                "fill in the cell",
            ),
        ),
    ),
    "column of the flow is missing": (
        drop_column(INLET),
        (
            Fault(
                "missing-column",
                "runs.csv, row 1",
                "'run', 'catalyst'",
                "'inlet flow / sccm'",
                r"or choose another outlet_flow",
            ),
        ),
    ),
    "needed column is missing": (
        drop_column("pH"),
        (Fault("missing-column", "runs.csv, row 1", "'run', 'catalyst'", "'pH'", "add the column 'pH'"),),
    ),
    "needed column is misspelt": (
        swap("catalyst", "katalyst"),
        (
            Fault(
                "missing-column",
                "runs.csv, row 1",
                "'katalyst'",
                "'catalyst'",
                "did you mean it by 'katalyst'",
            ),
        ),
    ),
    "column stands twice": (
        swap("resistance / ohm", "pH"),
        (
            Fault(
                "repeated-column",
                "runs.csv, row 1, column 'pH'",
                "'pH' and 'pH'",
                "one column 'pH'",
                "delete or rename",
            ),
        ),
    ),
    "run stands twice": (
        swap("\na2,mesh", "\nA1,mesh"),
        (
            Fault(
                "duplicate",
                "runs.csv, row 3, column 'run'",
                "run 'A1', as in row 2",
                "the run once",
                "correct its name",
            ),
            Fault(
                "missing-file",
                "runs.csv, row 3",
                "no file 'traces/A1.csv'",
                "traces/A1.csv",
                "did you mean 'a1.csv'",
            ),
            Fault(
                "unknown-name", "gas.csv, row 8, column 'run'", r"'a2' \(3 rows\)", "'a1'", "correct the name"
            ),
            Fault("unknown-name", "vials.csv, row 3, column 'run'", "'a2'", "'a1'", "correct the name"),
        ),
    ),
    "run is compensated twice over": (
        swap(
            "resistance / ohm", "compensated", "6.8,10,20\na2", "6.8,2,20\na2", "6.8,10,20\n", "6.8,0.5,20\n"
        ),
        (
            Fault(
                "not-allowed",
                "runs.csv, row 2, column 'compensated'",
                "'2'",
                "from 0 to 1",
                "correct the value",
            ),
        ),
    ),
    "run stops before it starts": (
        swap("09:30:00,0,3600", "09:30:00,1800,600"),
        (
            Fault(
                "not-allowed",
                "runs.csv, row 2, column 'stop / s'",
                "600 s",
                "after the start, 1800 s",
                "correct either end",
            ),
        ),
    ),
    "window ends after the trace": (
        swap("09:30:00,0,3600", "09:30:00,0,7200"),
        (
            Fault(
                "not-allowed",
                "runs.csv, row 2, column 'stop / s'",
                "7200 s",
                "traces/a1.csv, which runs from 0 s to 3600 s",
                "leave the cell blank",
            ),
        ),
    ),
    "window starts before the trace": (
        swap("09:30:00,0,3600", "09:30:00,-5,3600"),
        (
            Fault(
                "not-allowed",
                "runs.csv, row 2, column 'start / s'",
                "-5 s",
                "traces/a1.csv, which runs from 0 s to 3600 s",
                "leave the cell blank",
            ),
        ),
    ),
    "start is no date": (
        swap("2043-05-18T09:30:00", "half past nine"),
        (
            Fault(
                "not-a-time",
                "runs.csv, row 2, column 'started'",
                "'half past nine'",
                "2043-05-18T09:30:00",
                "write year, month",
            ),
        ),
    ),
    "start has no time of day": (
        swap("2043-05-18T09:30:00", "2043-05-18"),
        (
            Fault(
                "not-a-time",
                "runs.csv, row 2, column 'started'",
                "'2043-05-18'",
                "T09:30:00",
                "then the time",
            ),
        ),
    ),
    "start has a time zone and the others none": (
        swap("2043-05-18T09:30:00", "2043-05-18T09:30:00+02:00"),
        (
            Fault(
                "not-allowed",
                "runs.csv, row 2, column 'started'",
                "1 of 4",
                "without a time zone",
                "without a time zone",
            ),
        ),
    ),
    "start is missing while checks need it": (
        swap("2043-05-18T09:30:00", ""),
        (
            Fault(
                "missing-value",
                "runs.csv, row 2, column 'started'",
                "nothing",
                "T09:30:00",
                "t = 0 of the trace",
            ),
        ),
    ),
    "starts are missing while checks need them": (
        drop_column("started"),
        (
            Fault(
                "missing-column",
                "runs.csv, row 1",
                "'run', 'catalyst'",
                "'started'",
                "add the column 'started'",
            ),
        ),
    ),
    "temperature is in kelvin under degC": (
        swap(
            "resistance / ohm",
            "temperature / degC",
            "6.8,10,20\na2",
            "6.8,298,20\na2",
            "6.8,10,20\n",
            "6.8,25,20\n",
        ),
        (
            Fault(
                "not-allowed",
                "runs.csv, row 2, column 'temperature / degC'",
                "'298'",
                "200 K to 500 K",
                "unit in the head",
            ),
        ),
    ),
    "table has heads alone": (
        lambda text: text.splitlines()[0] + "\n",
        (
            Fault("missing-value", "runs.csv, row 1", "heads alone", "at least one run", "add a row"),
            Fault("unknown-name", "gas.csv, row 2, column 'run'", "'a1'", "a run of runs", "add it to runs"),
            Fault("unknown-name", "gas.csv, row 8, column 'run'", "'a2'", "a run of runs", "add it to runs"),
            Fault(
                "unknown-name", "vials.csv, row 2, column 'run'", "'a1'", "a run of runs", "add it to runs"
            ),
            Fault(
                "unknown-name", "vials.csv, row 3, column 'run'", "'a2'", "a run of runs", "add it to runs"
            ),
        ),
    ),
}


@as_file_and_sheet
@pytest.mark.parametrize("name", CASES)
def test_table_of_runs_is_refused_when_its(
    name: str, workbook: bool, command: Command, broken_day: Callable[..., Path]
) -> None:
    refuse_table("runs", CASES[name], workbook, command, broken_day)


def test_run_whose_current_is_anodic_is_refused(command: Command, broken_day: Callable[..., Path]) -> None:
    day = broken_day({"traces/a2.csv": TRACE.replace("-10", "10")})
    fault = Fault("anodic-run", r"run a2 (traces/a2.csv)", "36 C", "negative", "cathodic is negative")
    command.refuses(day, [fault])


def test_run_whose_current_is_zero_is_refused(command: Command, broken_day: Callable[..., Path]) -> None:
    day = broken_day({"traces/a2.csv": TRACE.replace("-10", "0")})
    command.refuses(
        day,
        [Fault("anodic-run", "run a2 (traces/a2.csv)", "0 C", "negative", "check the sign of the current")],
    )


@pytest.mark.parametrize(("milliampere", "found"), [("0", "0 mA"), ("5", r"\d mA")])
def test_injection_without_a_cathodic_current_is_refused(
    milliampere: str, found: str, command: Command, broken_day: Callable[..., Path]
) -> None:
    # the cell rests from before the window of the first injection until after it, and works again for the second
    rest = f"1600,-1.5,{milliampere}\n1900,-1.5,{milliampere}\n"
    trace = TRACE.replace("1800,-1.5,-10\n", "1599,-1.5,-10\n" + rest + "1901,-1.5,-10\n")
    day = broken_day({"traces/a1.csv": trace})
    place = "run a1, injection 1 (gas.csv, row 2)"
    command.refuses(
        day, [Fault("anodic-run", place, found, "a cathodic current", "check the sign of the current")]
    )
