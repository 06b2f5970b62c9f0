"""Broken tables of vials and of their integrals, as files and as sheets."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault
from tests.faults.day import add, drop_column, swap
from tests.faults.table_cases import Cases, as_file_and_sheet, refuse_table

ONE = "v1,a1,catholyte,,30,0.5,DMSO,0.2,sample"

VIALS: Cases = {
    "vial stands twice": (
        swap("v2,a2", "v1,a2"),
        (
            Fault(
                "duplicate",
                "vials.csv, row 3, column 'vial'",
                "vial 'v1', as in row 2",
                "the vial once",
                "delete one",
            ),
            Fault(
                "unknown-name",
                "liquid.csv, row 4, column 'vial'",
                r"'v2' \(2 rows\)",
                "'v1'",
                "add it to vials",
            ),
        ),
    ),
    "vial comes from an unknown run": (
        swap("v2,a2", "v2,a9"),
        (Fault("unknown-name", "vials.csv, row 3, column 'run'", "'a9'", "'a1', 'a2'", "correct the name"),),
    ),
    "vial comes from no run": (
        swap("v2,a2", "v2,"),
        (
            Fault(
                "missing-value",
                "vials.csv, row 3, column 'run'",
                "nothing",
                "the run",
                "mark the vial as a blank",
            ),
        ),
    ),
    "vial was taken before the run": (
        swap(ONE, ONE.replace("catholyte,,", "catholyte,-60,")),
        (Fault("not-allowed", "vials.csv, row 2, column 'time / s'", "-60 s", "after 0 s", "role = blank"),),
    ),
    "standard has no signals": (
        swap(ONE, ONE.replace("DMSO", "DSS")),
        (
            # DMSO is no product, so that its row has no meaning any more
            Fault(
                "unknown-species",
                "liquid.csv, row 2, column 'analyte'",
                "'DMSO'",
                "by name, formula",
                "correct the name",
            ),
            Fault(
                "missing-standard",
                "vials.csv, row 2, column 'standard'",
                "vial 'v1' with 'formate'",
                "'DSS'",
                "add the",
            ),
        ),
    ),
    "standard is blank": (
        swap(ONE, ONE.replace("DMSO", "")),
        (
            Fault(
                "missing-value",
                "vials.csv, row 2, column 'standard'",
                "nothing",
                "the standard",
                "fill in the cell",
            ),
        ),
    ),
    "aliquot is larger than its compartment": (
        swap(ONE, ONE.replace("30,0.5", "30,500")),
        (
            Fault(
                "not-allowed",
                "vials.csv, row 2, column 'aliquot / mL'",
                "500 mL",
                "at most 30 mL",
                "their units",
            ),
        ),
    ),
    "aliquot is zero": (
        swap(ONE, ONE.replace("30,0.5", "30,0")),
        (
            Fault(
                "not-allowed",
                "vials.csv, row 2, column 'aliquot / mL'",
                "'0'",
                "above zero",
                "correct the value",
            ),
        ),
    ),
    "sample has no compartment volume": (
        swap(ONE, ONE.replace("30,0.5", ",0.5")),
        (
            Fault(
                "missing-value",
                "vials.csv, row 2, column 'compartment volume / mL'",
                "nothing",
                "above zero",
                "fill in",
            ),
        ),
    ),
    "amount has a unit of mass": (
        swap("standard amount / umol", "standard amount / mg"),
        (
            Fault(
                "wrong-dimension",
                "vials.csv, row 1, column 'standard amount / mg'",
                "unit 'mg'",
                "a unit of amount",
                "umol",
            ),
        ),
    ),
    "role is unknown": (
        swap(",blank", ",blanck"),
        (
            Fault(
                "not-allowed",
                "vials.csv, row 4, column 'role'",
                "'blanck'",
                "sample or blank",
                "did you mean 'blank'",
            ),
        ),
    ),
    "volume has the unit of another language": (
        swap("compartment volume / mL", "compartment volume / ccm"),
        (
            Fault(
                "unknown-unit",
                "vials.csv, row 1, column 'compartment volume / ccm'",
                "unit 'ccm'",
                "a unit of volume, such as mL",
                "did you mean 'cm",
            ),
        ),
    ),
}

LIQUID: Cases = {
    "vial is unknown": (
        swap("v2,formate", "v3,formate"),
        (
            Fault(
                "unknown-name",
                "liquid.csv, row 5, column 'vial'",
                "'v3'",
                "'v1', 'v2', 'b0'",
                "did you mean 'v",
            ),
        ),
    ),
    "standard has a zero integral": (
        swap("6,610", "6,0"),
        (
            Fault(
                "missing-standard",
                "liquid.csv, row 4, column 'integral'",
                "0",
                "above zero",
                "integrate the signal again",
            ),
        ),
    ),
    "standard has a negative integral": (
        swap("6,610", "6,-610"),
        (
            Fault(
                "missing-standard", "liquid.csv, row 4, column 'integral'", "-610", "above zero", "use = no"
            ),
        ),
    ),
    "standard is missing": (
        swap("v2,DMSO,CH3,6,610\n", ""),
        (
            Fault(
                "missing-standard",
                "vials.csv, row 3, column 'standard'",
                "vial 'v2' with 'formate'",
                "'DMSO'",
                "add the standard",
            ),
        ),
    ),
    "signal stands twice": (
        add("v2,HCOO-,CH,1,126\n"),
        (
            Fault(
                "duplicate",
                "liquid.csv, row 8, column 'analyte'",
                "v2, formate, CH, as in row 5",
                "the signal once",
                "delete one of the rows",
            ),
        ),
    ),
    "signal has no protons": (
        swap("v1,formate,CH,1,124", "v1,formate,CH,0,124"),
        (
            Fault(
                "not-allowed", "liquid.csv, row 3, column 'protons'", "'0'", "above zero", "correct the value"
            ),
        ),
    ),
    "signal has next to no protons": (
        swap("v1,formate,CH,1,124", "v1,formate,CH,1e-200,124"),
        (
            Fault(
                "not-allowed",
                "liquid.csv, row 3, column 'protons'",
                "'1e-200'",
                "a size from 1e-60",
                "correct the value",
            ),
        ),
    ),
    "integral is a word": (
        swap("v1,formate,CH,1,124", "v1,formate,CH,1,traces"),
        (
            Fault(
                "not-a-number",
                "liquid.csv, row 3, column 'integral'",
                "'traces'",
                "a finite number",
                "correct the cell",
            ),
        ),
    ),
    "analyte is misspelt": (
        swap("v1,formate,CH,1,124", "v1,formatte,CH,1,124"),
        (
            Fault(
                "unknown-species",
                "liquid.csv, row 3, column 'analyte'",
                "'formatte'",
                "by name",
                "did you mean 'formate'",
            ),
        ),
    ),
    "column of the protons is missing": (
        drop_column("protons"),
        (
            Fault(
                "missing-column", "liquid.csv, row 1", "'integral'", "'protons'", "add the column 'protons'"
            ),
        ),
    ),
}


@as_file_and_sheet
@pytest.mark.parametrize("name", VIALS)
def test_table_of_vials_is_refused_when_its(
    name: str, workbook: bool, command: Command, broken_day: Callable[..., Path]
) -> None:
    refuse_table("vials", VIALS[name], workbook, command, broken_day)


@as_file_and_sheet
@pytest.mark.parametrize("name", LIQUID)
def test_table_of_integrals_is_refused_when_its(
    name: str, workbook: bool, command: Command, broken_day: Callable[..., Path]
) -> None:
    refuse_table("liquid", LIQUID[name], workbook, command, broken_day)


@pytest.mark.parametrize(("gone", "left"), [("liquid", "vials"), ("vials", "liquid")])
@as_file_and_sheet
def test_vials_without_integrals_and_integrals_without_vials_are_refused(
    gone: str, left: str, workbook: bool, command: Command, broken_day: Callable[..., Path]
) -> None:
    day = broken_day({f"{gone}.csv": None}, workbook=workbook)
    fault = Fault("missing-file", f"{gone}.csv", "nothing there", f"the table {gone}", f"or take {left} away")
    command.refuses(day, [fault])


def test_integral_beyond_the_turning_point_of_a_quadratic_is_refused(
    command: Command, broken_day: Callable[..., Path]
) -> None:
    # y = x - 0.1 x^2 turns at 5 and 2.5
    bent = "formate,CH,0.2,0.196\nformate,CH,1,0.9\nformate,CH,2,1.6\nformate,CH,4,2.4\n"
    day = broken_day(
        {
            "calibrations/liquids/calibration.toml": swap('"line"', '"quadratic"'),
            "calibrations/liquids/standards.csv": "analyte,signal,amount ratio,integral ratio\n" + bent,
            "liquid.csv": swap("v2,formate,CH,1,126", "v2,formate,CH,1,260"),
        }
    )
    # 260 per proton to 610/6 per proton
    fault = Fault(
        "broken-curve",
        "liquid.csv, row 5, column 'integral'",
        "260",
        r"an integral ratio per proton below .*turning point, 2\.5",
        "range that holds it",
    )
    command.refuses(day, [fault])
