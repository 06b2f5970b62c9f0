"""Broken day.toml."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault
from tests.faults.day import DAY_TOML, Change, add, swap

OUTLET = 'outlet_flow = "inlet"'
REFERENCE = 'electrode = "Ag/AgCl, 3 mol/L KCl"'
FLOW_UNCERTAINTY = 'quantity = "inlet flow"\nstandard = "1.0 %"\nshared = "day"'


def row(text: str) -> int:
    """The row of day.toml in which a text stands."""
    return DAY_TOML[: DAY_TOML.index(text)].count("\n") + 1


def at(text: str, section: str, key: str = "") -> str:
    """The place of a key of day.toml, as messages name it."""
    return f"day.toml, row {row(text)}, [{section}]" + (f", key '{key}'" if key else "")


CASES: dict[str, tuple[Change, tuple[Fault, ...]]] = {
    "text is no TOML": (
        swap(REFERENCE, "electrode = Ag/AgCl, 3 mol/L KCl"),
        (
            Fault(
                "broken-settings",
                f"day.toml, row {row(REFERENCE)}",
                "'electrode = Ag/AgCl, 3 mol/L KCl': invalid value",
                "TOML",
                "text stands in quotes",
            ),
        ),
    ),
    "quote never closes": (
        swap('title = "A small day to break"', 'title = "A small day to break'),
        (
            Fault(
                "broken-settings",
                "day.toml, row 2",
                "'title = \"A small day to break'",
                "TOML",
                "correct the line",
            ),
        ),
    ),
    "bytes are no UTF-8": (
        DAY_TOML.replace("A small", "Ein größerer").encode("cp1252"),
        (Fault("broken-settings", "day.toml", "bytes that are no UTF-8", "TOML", "save the file as UTF-8"),),
    ),
    "bytes are no text": (
        bytes(range(256)),
        (Fault("broken-settings", "day.toml", "bytes that are no UTF-8", "TOML", "save the file as UTF-8"),),
    ),
    "brackets are nested without end": (
        add("x = " + "[" * 100_000 + "\n"),
        (Fault("broken-settings", "day.toml", "nested too deeply", "TOML", "write the settings"),),
    ),
    "size is that of no settings": (
        add("# " + "x" * 1_000_000 + "\n"),
        (Fault("unreadable-file", "day.toml", "1 MB", "a file of at most 1 MB", "save the file"),),
    ),
    "key is misspelt": (
        swap("current_window", "curent_window"),
        (
            Fault(
                "unknown-key",
                at("current_window", "gas", "curent_window"),
                "'curent_window'",
                "current_window",
                "'current_window'",
            ),
        ),
    ),
    "section is misspelt": (
        swap("[surface]", "[surfaces]"),
        (
            Fault(
                "unknown-key",
                at("[surface]", "surfaces"),
                r"\[surfaces\]",
                r"\[surface\]",
                "did you mean 'surface'",
            ),
        ),
    ),
    "key stands in no section": (
        lambda text: 'titel = "x"\n' + text,
        (
            Fault(
                "unknown-key",
                "day.toml, row 1, key 'titel'",
                "'titel'",
                r"\[day\], \[reference\]",
                "correct or delete",
            ),
        ),
    ),
    "column of the defaults is misspelt": (
        swap('pressure = "101.325 kPa"', 'presure = "101.325 kPa"'),
        (
            Fault(
                "unknown-key",
                at("pressure", "defaults", "presure"),
                "'presure'",
                "a head of runs",
                "'pressure",
            ),
        ),
    ),
    "unit of a default is unknown": (
        swap('"temperature / degC" = 25', '"temperature / Grad" = 25'),
        (
            Fault(
                "wrong-dimension",
                at('"temperature', "defaults", "temperature / Grad"),
                "unit 'Grad'",
                "degC",
                "write the key as",
            ),
        ),
    ),
    "default is a word": (
        swap('pressure = "101.325 kPa"', 'pressure = "ambient"'),
        (
            Fault(
                "not-a-number",
                at("pressure", "defaults", "pressure"),
                "'ambient'",
                "above zero",
                "correct the value",
            ),
        ),
    ),
    "default is not possible": (
        swap('"temperature / degC" = 25', '"temperature / degC" = nan'),
        (
            Fault(
                "not-allowed",
                at('"temperature', "defaults", "temperature / degC"),
                "nan",
                "200 K",
                "correct the value",
            ),
        ),
    ),
    "value has another type": (
        swap('calibrations = ["gases", "liquids"]', "calibrations = 3"),
        (
            Fault(
                "not-allowed",
                at("calibrations", "day", "calibrations"),
                r"3 \(a whole number\)",
                "a list",
                "correct the",
            ),
        ),
    ),
    "section is a value": (
        lambda text: "gas = 3\n" + text.replace("[gas]\n" + OUTLET + '\ncurrent_window = "120 s"\n', ""),
        (
            Fault(
                "not-allowed",
                "day.toml, row 1, key 'gas'",
                "3",
                r"a section \[gas\]",
                "write it as a section",
            ),
        ),
    ),
    "date is none": (
        swap("date = 2043-05-18", 'date = "18 May"'),
        (Fault("not-a-time", at("date", "day", "date"), "'18 May'", "2043-05-18", "correct the value"),),
    ),
    "way to the outlet flow is unknown": (
        swap(OUTLET, 'outlet_flow = "inlt"'),
        (
            Fault(
                "not-allowed",
                at("outlet_flow", "gas", "outlet_flow"),
                "'inlt'",
                "'measured'",
                "did you mean 'inlet'",
            ),
        ),
    ),
    "outlet flow is measured and not there": (
        swap(OUTLET, 'outlet_flow = "measured"'),
        (
            Fault(
                "missing-column",
                "runs.csv, row 1",
                "'inlet flow / sccm'",
                "'outlet flow / sccm'",
                "choose another",
            ),
        ),
    ),
    "tracer has no name": (
        swap(OUTLET, 'outlet_flow = "tracer"'),
        (
            Fault(
                "missing-value", at("[gas]", "gas"), "nothing", "tracer = 'nitrogen'", "add the key 'tracer'"
            ),
            Fault(
                "missing-column",
                "runs.csv, row 1",
                "'inlet flow / sccm'",
                "'tracer flow / sccm'",
                "choose another",
            ),
        ),
    ),
    "tracer is unknown": (
        swap(OUTLET, OUTLET + '\ntracer = "nitrogn"'),
        (
            Fault(
                "unknown-species",
                "day.toml, row 15, [gas], key 'tracer'",
                "'nitrogn'",
                "a species",
                "'nitrogen'",
            ),
        ),
    ),
    "reference electrode is unknown": (
        swap(REFERENCE, 'electrode = "Ag/AgCl, 3 M NaCI"'),
        (
            Fault(
                "unknown-name",
                at("electrode =", "reference", "electrode"),
                "'Ag/AgCl, 3 M NaCI'",
                "'SHE'",
                "did you mean 'Ag/AgCl",
            ),
        ),
    ),
    "reference electrode is missing": (
        swap("[reference]\n" + REFERENCE + "\n", ""),
        (
            Fault(
                "missing-value",
                "day.toml, [reference]",
                "nothing",
                "potential = '0.210 V'",
                "add the key 'electrode'",
            ),
        ),
    ),
    "reference potential has no unit": (
        swap(REFERENCE, "potential = 0.21"),
        (
            Fault(
                "not-allowed",
                at("electrode =", "reference", "potential"),
                "0.21",
                "'0.210 V'",
                "correct the value",
            ),
        ),
    ),
    "reference potential has an unknown unit": (
        swap(REFERENCE, 'potential = "210 mVolt"'),
        (
            Fault(
                "unknown-unit",
                at("electrode =", "reference", "potential"),
                "'210 mVolt'",
                "a unit of potential",
                "'mV'",
            ),
        ),
    ),
    "current window is negative": (
        swap('"120 s"', '"-120 s"'),
        (
            Fault(
                "not-allowed",
                at("current_window", "gas", "current_window"),
                "'-120 s'",
                "above zero",
                "correct the",
            ),
        ),
    ),
    "current window is a length": (
        swap('"120 s"', '"120 m"'),
        (
            Fault(
                "wrong-dimension",
                at("current_window", "gas", "current_window"),
                "'120 m'",
                "a unit of time",
                "unit",
            ),
        ),
    ),
    "level of confidence is one": (
        swap('unaccounted = "5 %"', "level = 1.0"),
        (
            Fault(
                "not-allowed",
                at("unaccounted", "balance", "level"),
                "1.0",
                "between 0 and 1",
                "correct the value",
            ),
        ),
    ),
    "two references of roughness are given": (
        swap(
            'specific_capacitance = "28 uF/cm^2"',
            'specific_capacitance = "28 uF/cm^2"\nsmooth_reference = "m1"',
        ),
        (
            Fault(
                "not-allowed",
                "day.toml, row 19, [surface], key 'smooth_reference'",
                "and",
                "one of them",
                "delete one",
            ),
        ),
    ),
    "uncertainty is of an unknown quantity": (
        swap('quantity = "inlet flow"', 'quantity = "inlet flw"'),
        (
            Fault(
                "unknown-name",
                at('quantity = "', "uncertainty", "quantity"),
                "'inlet flw'",
                "numeric column",
                "'inlet flow'",
            ),
        ),
    ),
    "uncertainty is shared by nobody known": (
        swap('shared = "day"', 'shared = "weekly"'),
        (
            Fault(
                "not-allowed",
                at("shared", "uncertainty", "shared"),
                "'weekly'",
                "'day' or 'run' or 'reading'",
                "correct",
            ),
        ),
    ),
    "uncertainty is negative": (
        swap('standard = "1.0 %"', 'standard = "-1.0 %"'),
        (
            Fault(
                "not-allowed",
                at("standard", "uncertainty", "standard"),
                "'-1.0 %'",
                "above zero",
                "correct the value",
            ),
        ),
    ),
    "uncertainty has no number": (
        swap('standard = "1.0 %"', 'standard = "little"'),
        (
            Fault(
                "not-a-number",
                at("standard", "uncertainty", "standard"),
                "'little'",
                "'1.0 %'",
                "correct the value",
            ),
        ),
    ),
    "uncertainty has a unit of something else": (
        swap('standard = "1.0 %"', 'standard = "1.0 mV"'),
        (
            Fault(
                "wrong-dimension",
                at("standard", "uncertainty", "standard"),
                "'1.0 mV'",
                "a unit of flow",
                "correct the",
            ),
        ),
    ),
    "uncertainty is in another kind of flow": (
        swap('standard = "1.0 %"', 'standard = "0.2 mL/min"'),
        (
            Fault(
                "wrong-dimension",
                f"day.toml, row {row('standard')}",
                "a flow that is actual",
                "standard",
                "relative in %",
            ),
        ),
    ),
    "uncertainty lacks its sharing": (
        swap('shared = "day"', ""),
        (
            Fault(
                "missing-value",
                at("[[uncertainty]]", "uncertainty"),
                "nothing",
                "'day', 'run' or",
                "add the key 'shared'",
            ),
        ),
    ),
    "uncertainty is declared twice": (
        add("\n[[uncertainty]]\n" + FLOW_UNCERTAINTY + "\n"),
        (
            Fault(
                "duplicate",
                "day.toml, row 29, [uncertainty], key 'quantity'",
                "inlet flow",
                "once",
                "correct the value",
            ),
        ),
    ),
    "species has a formula that no reduction gives": (
        add('\n[species.soot]\nformula = "CO3"\nphase = "gas"\n'),
        (
            Fault(
                "not-allowed",
                "day.toml, row 29, [species.soot], key 'formula'",
                "'CO3'",
                "takes up",
                "correct the value",
            ),
        ),
    ),
    "species has a formula of other atoms": (
        add('\n[species.ammonia]\nformula = "NH3"\nphase = "gas"\n'),
        (
            Fault(
                "not-allowed",
                "day.toml, row 29, [species.ammonia], key 'formula'",
                "'NH3'",
                "C, H and O",
                "correct the",
            ),
        ),
    ),
    "separator of traces is unknown": (
        add('\n[read.traces]\nseparator = "pipe"\n'),
        (
            Fault(
                "not-allowed",
                "day.toml, row 29, [read.traces], key 'separator'",
                "'pipe'",
                "';'",
                "correct the value",
            ),
        ),
    ),
    "column of traces is unknown": (
        add('\n[read.traces]\ncolumns = { temp = "T" }\n'),
        (
            Fault(
                "unknown-key",
                "day.toml, row 29, [read.traces], key 'columns'",
                "'temp'",
                "t, E, I, j or U",
                "correct or",
            ),
        ),
    ),
    "calibration is missing": (
        swap('["gases", "liquids"]', '["gasses", "liquids"]'),
        (
            Fault(
                "missing-calibration",
                at("calibrations", "day", "calibrations"),
                "'gasses'",
                "<day>/calibrations",
                "'gases'",
            ),
        ),
    ),
    "calibration has a name longer than a file system takes": (
        swap('"gases", "liquids"', f'"gases", "liquids", "{"c" * 300}"'),
        (
            Fault(
                "missing-calibration",
                at("calibrations", "day", "calibrations"),
                "'ccc",
                "a folder 'ccc",
                "add the",
            ),
        ),
    ),
    "current window is of no size that a clock has": (
        swap('"120 s"', '"1e300 s"'),
        (
            Fault(
                "not-a-number",
                at("current_window", "gas", "current_window"),
                "'1e300 s'",
                "its unit",
                "correct the",
            ),
        ),
    ),
    "calibration is named twice": (
        swap('["gases", "liquids"]', '["gases", "liquids", "gases"]'),
        (
            Fault(
                "duplicate",
                at("calibrations", "day", "calibrations"),
                "'gases'",
                "each name once",
                "correct the value",
            ),
        ),
    ),
    "calibration lies outside": (
        swap('["gases", "liquids"]', '["gases", "liquids", "../gases"]'),
        (
            Fault(
                "outside-folder",
                at("calibrations", "day", "calibrations"),
                r"'\.\./gases'",
                "inside the",
                "copy the",
            ),
        ),
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_day_toml_is_refused_when_its(name: str, command: Command, broken_day: Callable[..., Path]) -> None:
    change, faults = CASES[name]
    command.refuses(broken_day({"day.toml": change}), faults)
