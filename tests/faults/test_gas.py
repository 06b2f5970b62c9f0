"""Broken tables of gas peaks, as files and as sheets."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault
from tests.faults.day import add, drop_column, swap
from tests.faults.table_cases import Cases, as_file_and_sheet, refuse_table

CASES: Cases = {
    "peak area is negative": (
        swap("hydrogen,71", "hydrogen,-71"),
        (
            Fault(
                "not-allowed",
                "gas.csv, row 5, column 'peak area'",
                "'-71'",
                "zero or a number above",
                "correct the value",
            ),
        ),
    ),
    "peak area is a remark": (
        swap("hydrogen,71", "hydrogen,n.d."),
        (
            Fault(
                "not-a-number",
                "gas.csv, row 5, column 'peak area'",
                "'n.d.'",
                "a finite number",
                "correct the cell",
            ),
        ),
    ),
    "peak area overflows": (
        swap("hydrogen,71", "hydrogen,1e400"),
        (
            Fault(
                "not-a-number",
                "gas.csv, row 5, column 'peak area'",
                "'1e400'",
                "a finite number",
                "correct the cell",
            ),
        ),
    ),
    "peak area is of no size that a detector gives": (
        swap("hydrogen,71", "hydrogen,1e300"),
        (
            Fault(
                "not-allowed",
                "gas.csv, row 5, column 'peak area'",
                "'1e\\+?300'",
                "a size from 1e-60 to 1e\\+30",
                "correct the value",
            ),
        ),
    ),
    "peak area is blank": (
        swap("hydrogen,71", "hydrogen,"),
        (
            Fault(
                "missing-value",
                "gas.csv, row 5, column 'peak area'",
                "nothing",
                "zero or a number",
                "fill in the cell",
            ),
        ),
    ),
    "peak stands twice": (
        add("a2,1,1800,FID,ethylene,22.8\n"),
        (
            Fault(
                "duplicate",
                "gas.csv, row 11, column 'analyte'",
                "a2, 1, FID, ethylene, as in row 10",
                "the peak once",
                "delete one of the rows",
            ),
        ),
    ),
    "analyte has no curve": (
        swap("a1,1,1800,FID,C2H4,23\n", "a1,1,1800,FID,methane,23\n"),
        (
            Fault(
                "missing-curve",
                "gas.csv, row 4, column 'analyte'",
                "methane@FID",
                "a curve of that analyte and channel",
                r"name the calibration in \[day\] calibrations",
            ),
        ),
    ),
    "channel is another than the curve's": (
        swap("a1,1,1800,FID,C2H4,23\n", "a1,1,1800,TCD,C2H4,23\n"),
        (
            Fault(
                "missing-curve",
                "gas.csv, row 4, column 'analyte'",
                "ethylene@TCD",
                "a curve of that analyte and channel",
                "did you mean channel FID",
            ),
        ),
    ),
    "analyte is misspelt": (
        swap("a1,1,1800,FID,C2H4,23\n", "a1,1,1800,FID,etylene,23\n"),
        (
            Fault(
                "unknown-species",
                "gas.csv, row 4, column 'analyte'",
                "'etylene'",
                "by name, formula",
                "did you mean 'ethylene'",
            ),
        ),
    ),
    "run is unknown": (
        swap("a1,2,3000,TCD", "a3,2,3000,TCD"),
        (Fault("unknown-name", "gas.csv, row 5, column 'run'", "'a3'", "'a1', 'a2'", "did you mean"),),
    ),
    "injection stands at two times": (
        swap("a1,2,3000,TCD", "a1,2,3001,TCD"),
        (
            Fault(
                "not-allowed",
                "gas.csv, row 6, column 'time / s'; gas.csv, row 7, column 'time / s'",
                "3000 s",
                r"3001 s, as in .*row 5",
                "the same time",
            ),
        ),
    ),
    "time has a unit of charge": (
        swap("time / s", "time / C"),
        (
            Fault(
                "wrong-dimension",
                "gas.csv, row 1, column 'time / C'",
                "unit 'C'",
                "a unit of time",
                "unit in the head",
            ),
        ),
    ),
    "answer to use is neither yes nor no": (
        lambda text: "".join(
            f"{row},{'use' if not n else 'maybe' if n == 3 else 'yes'}\n"
            for n, row in enumerate(text.splitlines())
        ),
        (Fault("not-allowed", "gas.csv, row 4, column 'use'", "'maybe'", "yes or no", "write yes or no"),),
    ),
    "column of the analytes is missing": (
        drop_column("analyte"),
        (Fault("missing-column", "gas.csv, row 1", "'channel'", "'analyte'", "add the column 'analyte'"),),
    ),
    "column of the areas is missing": (
        drop_column("peak area"),
        (Fault("missing-column", "gas.csv, row 1", "'analyte'", "'peak area / pA s'", "add the column"),),
    ),
    "column of the areas is misspelt": (
        swap("peak area", "peak aera"),
        (
            Fault(
                "missing-column",
                "gas.csv, row 1",
                "'peak aera'",
                "'peak area / pA s'",
                "did you mean it by 'peak aera'",
            ),
        ),
    ),
}


@as_file_and_sheet
@pytest.mark.parametrize("name", CASES)
def test_table_of_gas_peaks_is_refused_when_its(
    name: str, workbook: bool, command: Command, broken_day: Callable[..., Path]
) -> None:
    refuse_table("gas", CASES[name], workbook, command, broken_day)


def test_peak_beyond_the_turning_point_of_a_quadratic_is_refused(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    # ppm and area of y = 0.2 x - 0.0002 x^2, x in ppm: it turns at 500 ppm and 50
    bent = "FID,ethylene,20,3.92\nFID,ethylene,100,18\nFID,ethylene,300,42\nFID,ethylene,400,48\n"
    standards = swap("FID,ethylene,20,4.1\nFID,ethylene,100,19.8\nFID,ethylene,300,60.1\n", bent)
    day = broken_day(
        {
            "calibrations/gases/standards.csv": standards,
            "calibrations/gases/calibration.toml": add('[curve."ethylene@FID"]\nform = "quadratic"\n'),
            "gas.csv": swap("C2H4,23.2", "C2H4,51"),
        }
    )
    fault = Fault(
        "broken-curve",
        "gas.csv, row 7, column 'peak area'",
        "51",
        "an area below that of the curve's turning point, 50",
        "use = no",
    )
    command.refuses(day, [fault])


def test_peak_without_its_tracer_is_refused(command: Command, broken_day: Callable[..., Path]) -> None:
    day = broken_day(
        {
            "day.toml": swap('outlet_flow = "inlet"', 'outlet_flow = "tracer"\ntracer = "N2"'),
            "runs.csv": swap("inlet flow", "tracer flow"),
            "gas.csv": add("a1,1,1800,TCD,N2,40\na1,2,3000,TCD,N2,40\n"),
            "calibrations/gases/standards.csv": add("TCD,N2,1000,10\nTCD,N2,5000,50.1\nTCD,N2,9000,89.9\n"),
        }
    )
    fault = Fault(
        "missing-value",
        "gas.csv, row 8",
        "injection 1 of run a2 without",
        "a peak of the tracer nitrogen",
        "add the peak",
    )
    command.refuses(day, [fault])


@pytest.mark.parametrize("headspace", [("", ""), (",headspace / mL", ",30")], ids=["plug flow", "headspace"])
def test_flow_that_the_balance_eats_up_is_refused(
    headspace: tuple[str, str], command: Command, broken_day: Callable[..., Path]
) -> None:
    # 20 sccm are 14.87 umol/s; the first run gives more than that to the electrolyte, the second a third of it
    day = broken_day(
        {
            "day.toml": swap('outlet_flow = "inlet"', 'outlet_flow = "balance"'),
            "runs.csv": swap(
                "resistance / ohm,inlet flow / sccm", f"carbonate uptake / umol/s,inlet flow / sccm{headspace[0]}",
                "10,20\na2", f"16,20{headspace[1]}\na2", "10,20\n", f"5,20{headspace[1]}\n",
            ),
        }
    )  # fmt: skip
    places = "run a1, injection 1 (gas.csv, row 2); run a1, injection 2 (gas.csv, row 5)"
    fault = Fault("not-allowed", places, r"-\d\.\d+ umol/s", "a flow above zero", "carbonate uptake")
    command.refuses(day, [fault])
