"""Broken calibrations."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault
from tests.faults.day import GAS_STANDARDS, Changes, add, drop_column, swap

TOML = "calibrations/gases/calibration.toml"
TABLE = "calibrations/gases/standards.csv"
LIQUID_TABLE = "calibrations/liquids/standards.csv"
ETHYLENE = "FID,ethylene,20,4.1\nFID,ethylene,100,19.8\nFID,ethylene,300,60.1\n"

CASES: dict[str, tuple[Changes, tuple[Fault, ...]]] = {
    "kind is unknown": (
        {TOML: swap('kind = "gas"', 'kind = "gass"')},
        (
            Fault(
                "not-allowed",
                f"{TOML}, row 1, key 'kind'",
                "'gass'",
                "'gas' or 'liquid'",
                "did you mean 'gas'",
            ),
        ),
    ),
    "kind is missing": (
        {TOML: swap('kind = "gas"\n', "")},
        (Fault("missing-value", TOML, "nothing", "kind = 'gas' or kind = 'liquid'", "add the key 'kind'"),),
    ),
    "settings are missing": (
        {TOML: None},
        (Fault("missing-file", TOML, "nothing there", f"the file '{TOML}'", "add the file"),),
    ),
    "standards are missing": (
        {TABLE: None},
        (Fault("missing-file", TABLE, "nothing there", f"the file '{TABLE}'", "add the file"),),
    ),
    "settings are no TOML": (
        {TOML: swap('"line"', "line")},
        (Fault("broken-settings", f"{TOML}, row 4", "'form = line'", "TOML", "text stands in quotes"),),
    ),
    "key is misspelt": (
        {TOML: swap("form =", "from =")},
        (
            Fault(
                "unknown-key", f"{TOML}, row 4, [curve], key 'from'", "'from'", "form", "did you mean 'form'"
            ),
        ),
    ),
    "form is unknown": (
        {TOML: swap('"line"', '"cubic"')},
        (
            Fault(
                "not-allowed",
                f"{TOML}, row 4, [curve], key 'form'",
                "'cubic'",
                "'line' or 'line through zero'",
                "correct",
            ),
        ),
    ),
    "weights are unknown": (
        {TOML: add('weights = "1/y"\n')},
        (
            Fault(
                "not-allowed",
                f"{TOML}, row 5, [curve], key 'weights'",
                "'1/y'",
                "'equal' or '1/x'",
                "did you mean '1/x",
            ),
        ),
    ),
    "limits are unknown": (
        {TOML: add('limits = "ISO 11843-3"\n')},
        (
            Fault(
                "not-allowed",
                f"{TOML}, row 5, [curve], key 'limits'",
                "11843-3",
                "'ISO 11843-2'",
                "'ISO 11843-2'",
            ),
        ),
    ),
    "section is that of no curve": (
        {TOML: add('[curve."ethylene@TCD"]\nform = "quadratic"\n')},
        (
            Fault(
                "unknown-name",
                f"{TOML}, row 5, [curve.ethylene@TCD]",
                "'ethylene@tcd'",
                "a curve of standards.csv",
                "'ethylene@",
            ),
        ),
    ),
    "section names no channel": (
        {TOML: add('[curve."ethylene"]\nform = "quadratic"\n')},
        (
            Fault(
                "unknown-key",
                f"{TOML}, row 5, [curve.ethylene]",
                "'ethylene'",
                "'ethylene@FID'",
                "'@' between them",
            ),
        ),
    ),
    "curve is made like one that is not there": (
        {TOML: add('[curve."ethane@FID"]\nlike = "propane@FID"\n')},
        (
            Fault(
                "unknown-name",
                f"{TOML}, row 6, [curve.ethane@FID], key 'like'",
                "'propane@",
                "'ethylene@",
                "name a curve of standards.csv",
            ),
        ),
    ),
    "curve is made like one of another channel": (
        {TOML: add('[curve."ethane@FID"]\nlike = "hydrogen@TCD"\n')},
        (
            Fault(
                "not-allowed",
                f"{TOML}, row 6, [curve.ethane@FID], key 'like'",
                "'hydrogen@TCD'|'hydrogen@tcd'",
                "@fid|@FID",
                "same channel",
            ),
        ),
    ),
    "curve with standards is made like another": (
        {TOML: add('[curve."ethylene@FID"]\nlike = "CO@FID"\n')},
        (
            Fault(
                "not-allowed",
                f"{TOML}, row 6, [curve.ethylene@FID], key 'like'",
                "like = 'carbon monoxide",
                "without standards",
                "delete",
            ),
        ),
    ),
    "date is none": (
        {TOML: swap("2043-04-02", '"in April"')},
        (
            Fault(
                "not-a-time",
                f"{TOML}, row 2, key 'measured_on'",
                "'in April'",
                "2043-05-18",
                "correct the value",
            ),
        ),
    ),
    "curve has too few points": (
        {TABLE: swap("FID,ethylene,20,4.1\nFID,ethylene,100,19.8\n", "")},
        (
            Fault(
                "broken-curve",
                f"{TABLE}, row 8",
                r"1 point\(s\)",
                "standards at two levels or more",
                "correct the standards or choose another form",
            ),
        ),
    ),
    "standards all stand at one level": (
        {TABLE: swap(ETHYLENE, "FID,ethylene,100,19.8\nFID,ethylene,100,20.1\nFID,ethylene,100,20\n")},
        (
            Fault(
                "broken-curve",
                f"{TABLE}, row 8",
                "different x; there are 1",
                "two levels or more",
                "standards",
            ),
        ),
    ),
    "curve falls": (
        {
            TABLE: swap(
                "FID,ethylene,20,4.1", "FID,ethylene,20,70", "FID,ethylene,300,60.1", "FID,ethylene,300,2"
            )
        },
        (
            Fault(
                "broken-curve",
                f"{TABLE}, row 8",
                "does not rise over its whole range",
                "a line that rises",
                "standards",
            ),
        ),
    ),
    "quadratic turns within its range": (
        {
            TOML: add('[curve."ethylene@FID"]\nform = "quadratic"\n'),
            TABLE: swap(
                ETHYLENE, "FID,ethylene,20,4\nFID,ethylene,100,15\nFID,ethylene,200,18\nFID,ethylene,300,16\n"
            ),
        },
        (
            Fault(
                "broken-curve",
                f"{TABLE}, row 8",
                "the quadratic does not rise over its whole range",
                "three levels or more, on a curve that rises",
                "another form",
            ),
        ),
    ),
    "weights cannot be used at zero": (
        {TOML: add('weights = "1/x"\n'), TABLE: swap("FID,ethylene,20,4.1", "FID,ethylene,0,0.02")},
        (
            Fault(
                "broken-curve",
                f"{TABLE}, row 8",
                "weights 1/x need every x above zero; one is 0",
                "every level above zero",
                "weights",
            ),
        ),
    ),
    "weights need replicates that are not there": (
        {TOML: add('[curve."ethylene@FID"]\nweights = "replicates"\n')},
        (
            Fault(
                "broken-curve",
                f"{TABLE}, row 8",
                "at least two points of the same x",
                "replicates that differ",
                "weights",
            ),
        ),
    ),
    "table has heads alone": (
        {TABLE: GAS_STANDARDS.splitlines()[0] + "\n"},
        (
            Fault(
                "missing-value",
                f"{TABLE}, row 1",
                "heads alone",
                "a row for each standard",
                "add the standards",
            ),
        ),
    ),
    "table is empty": (
        {TABLE: ""},
        (Fault("unreadable-file", TABLE, "an empty file", "a line of heads", "save the file again"),),
    ),
    "table is binary": (
        {TABLE: bytes(range(256))},
        (Fault("unreadable-file", TABLE, "binary data|no text", "text in UTF-8", "save the file again"),),
    ),
    "column is missing": (
        {TABLE: drop_column("peak area")},
        (Fault("missing-column", f"{TABLE}, row 1", "'analyte'", "'peak area / pA s'", "add the column"),),
    ),
    "unit is unknown": (
        {TABLE: swap("fraction / ppm", "fraction / ppmw")},
        (
            Fault(
                "unknown-unit",
                f"{TABLE}, row 1, column 'mole fraction / ppmw'",
                "'ppmw'",
                "ppm",
                "did you mean 'ppm'",
            ),
        ),
    ),
    "area is a word": (
        {TABLE: swap("FID,ethylene,20,4.1", "FID,ethylene,20,small")},
        (
            Fault(
                "not-a-number",
                f"{TABLE}, row 8, column 'peak area'",
                "'small'",
                "a finite number",
                "correct the cell",
            ),
        ),
    ),
    "mole fraction is above one": (
        {TABLE: swap("FID,ethylene,300,", "FID,ethylene,3000000,")},
        (
            Fault(
                "not-allowed",
                f"{TABLE}, row 10, column 'mole fraction / ppm'",
                "'3000000'",
                "from 0 to 1",
                "the unit",
            ),
        ),
    ),
    "analyte is unknown": (
        {TABLE: swap("FID,ethylene,20,", "FID,etylene,20,")},
        (
            Fault(
                "unknown-species",
                f"{TABLE}, row 8, column 'analyte'",
                "'etylene'",
                "a species",
                "did you mean 'ethylene'",
            ),
        ),
    ),
    "curve is that of another calibration too": (
        {
            "day.toml": swap('["gases", "liquids"]', '["gases", "liquids", "more"]'),
            "calibrations/more/calibration.toml": 'kind = "gas"\n',
            "calibrations/more/standards.csv": GAS_STANDARDS.splitlines()[0] + "\n" + ETHYLENE,
        },
        (
            Fault(
                "duplicate",
                "calibrations/more/calibration.toml",
                "'gases' and 'more'",
                "one curve for each",
                "name only one",
            ),
        ),
    ),
    "liquid ratio is a word": (
        {LIQUID_TABLE: swap("formate,CH,1,0.998", "formate,CH,one,0.998")},
        (
            Fault(
                "not-a-number",
                f"{LIQUID_TABLE}, row 3, column 'amount ratio'",
                "'one'",
                "a finite number",
                "correct the",
            ),
        ),
    ),
    "liquid curve has one point": (
        {LIQUID_TABLE: swap("formate,CH,1,0.998\nformate,CH,4,4.003\n", "")},
        (
            Fault(
                "broken-curve", f"{LIQUID_TABLE}, row 2", r"1 point\(s\)", "two levels or more", "standards"
            ),
        ),
    ),
    "parent cylinder has two uncertainties": (
        {
            TABLE: lambda text: "".join(
                row + (",parent,u(parent) / %" if n == 0 else f",air-7,{2 if n == 5 else 1}") + "\n"
                for n, row in enumerate(text.splitlines())
            )
        },
        (
            Fault(
                "not-allowed",
                f"{TABLE}, row 6, column 'u(parent) / %'",
                "2 %",
                "1 %, as above",
                "the same uncertainty",
            ),
        ),
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_calibration_is_refused_when_its(
    name: str, command: Command, broken_day: Callable[..., Path]
) -> None:
    changes, faults = CASES[name]
    command.refuses(broken_day(changes), faults)


def test_calibration_that_is_a_link_out_of_the_day_is_refused(
    command: Command, broken_day: Callable[..., Path], tmp_path: Path
) -> None:
    day = broken_day()
    outside = tmp_path / "outside"
    (day / "calibrations" / "gases").rename(outside)
    (day / "calibrations" / "gases").symlink_to(outside, target_is_directory=True)
    place = "day.toml, row 4, [day], key 'calibrations'"
    command.refuses(day, [Fault("outside-folder", place, "'gases'", "inside the folder", "copy the")])


def test_table_of_a_calibration_that_is_a_link_out_of_it_is_refused(
    command: Command, broken_day: Callable[..., Path], tmp_path: Path
) -> None:
    day = broken_day({TABLE: None})
    outside = tmp_path / "standards.csv"
    outside.write_text(GAS_STANDARDS)
    (day / TABLE).symlink_to(outside)
    command.refuses(
        day, [Fault("outside-folder", TABLE, "standards.csv", "inside the folder", "copy the file")]
    )


def test_calibration_of_a_folder_named_on_the_command_line_is_named_by_its_own_path(
    command: Command, broken_day: Callable[..., Path], workplace: Path
) -> None:
    day = broken_day({TABLE: swap("FID,ethylene,20,4.1", "FID,ethylene,20,small")})
    (day / "calibrations").rename(workplace / "shelf")
    fault = Fault(
        "not-a-number",
        f"{TABLE}, row 8, column 'peak area'",
        "'small'",
        "a finite number",
        "correct the cell",
    )
    command.refuses(day, [fault], "--calibrations", workplace / "shelf")
