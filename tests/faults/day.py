"""A small good day to break: two runs, every table of the contract, one calibration of each kind. Invented."""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Callable, Mapping
from pathlib import Path

TABLES = ("runs", "gas", "vials", "liquid", "scans", "checks")

DAY_TOML = """\
[day]
title = "A small day to break"
date = 2043-05-18
calibrations = ["gases", "liquids"]

[reference]
electrode = "Ag/AgCl, 3 mol/L KCl"

[defaults]
"temperature / degC" = 25
pressure = "101.325 kPa"

[gas]
outlet_flow = "inlet"
current_window = "120 s"

[surface]
specific_capacitance = "28 uF/cm^2"

[balance]
unaccounted = "5 %"

[[uncertainty]]
quantity = "inlet flow"
standard = "1.0 %"
shared = "day"
"""

RUNS = """\
run,catalyst,electrode,started,start / s,stop / s,electrode area / cm^2,pH,resistance / ohm,inlet flow / sccm
a1,mesh,m1,2043-05-18T09:30:00,0,3600,1.0,6.8,10,20
a2,mesh,m1,2043-05-18T11:00:00,0,3600,1.0,6.8,10,20
"""

# 10 mA and 14.87 umol/s: 1000 ppm of a product of two electrons are 28.7 %, 100 ppm of ethylene 17.2 %
GAS = """\
run,injection,time / s,channel,analyte,peak area
a1,1,1800,TCD,hydrogen,70
a1,1,1800,FID,CO,105
a1,1,1800,FID,C2H4,23
a1,2,3000,TCD,hydrogen,71
a1,2,3000,FID,CO,104
a1,2,3000,FID,C2H4,23.2
a2,1,1800,TCD,hydrogen,69
a2,1,1800,FID,CO,106
a2,1,1800,FID,C2H4,22.8
"""

VIALS = """\
vial,run,compartment,time / s,compartment volume / mL,aliquot / mL,standard,standard amount / umol,role
v1,a1,catholyte,,30,0.5,DMSO,0.2,sample
v2,a2,catholyte,,30,0.5,DMSO,0.2,sample
b0,,catholyte,,,0.5,DMSO,0.2,blank
"""

LIQUID = """\
vial,analyte,signal,protons,integral
v1,DMSO,CH3,6,600
v1,formate,CH,1,124
v2,DMSO,CH3,6,610
v2,formate,CH,1,126
b0,DMSO,CH3,6,600
b0,formate,CH,1,0.4
"""

SCANS = """\
electrode,file,scan rate / mV s^-1,electrode area / cm^2,window low / V,window high / V
m1,scans/m1-20.csv,20,1.0,-0.1,0.1
m1,scans/m1-40.csv,40,1.0,-0.1,0.1
m1,scans/m1-80.csv,80,1.0,-0.1,0.1
"""

CHECKS = """\
at,channel,analyte,mole fraction / ppm,peak area
2043-05-18T09:00:00,FID,CO,1000,100
2043-05-18T13:00:00,FID,CO,1000,100.6
"""

TRACE = "t / s,E / V,I / mA\n0,-1.5,-10\n900,-1.5,-10\n1800,-1.5,-10\n2700,-1.5,-10\n3600,-1.5,-10\n"

GAS_STANDARDS = """\
channel,analyte,mole fraction / ppm,peak area
TCD,hydrogen,100,5.1
TCD,hydrogen,1000,49.8
TCD,hydrogen,3000,150.1
FID,carbon monoxide,100,10.1
FID,carbon monoxide,1000,99.7
FID,carbon monoxide,3000,300.2
FID,ethylene,20,4.1
FID,ethylene,100,19.8
FID,ethylene,300,60.1
"""

LIQUID_STANDARDS = """\
analyte,signal,amount ratio,integral ratio
formate,CH,0.2,0.201
formate,CH,1,0.998
formate,CH,4,4.003
"""


def _voltammogram(milliampere: float) -> str:
    """Two cycles between -0.15 V and 0.15 V in steps of 10 mV, with the current of a capacitor."""
    rising = [-15 + step for step in range(30)]
    falling = [15 - step for step in range(30)]
    rows = [
        f"{volt / 100:.2f},{sign * milliampere:g}"
        for sign, sweep in ((1, rising), (-1, falling))
        for volt in sweep
    ]
    return "E / V,I / mA\n" + "\n".join([*rows, *rows, "-0.15,0"]) + "\n"


GOOD: Mapping[str, str] = {
    "day.toml": DAY_TOML,
    "runs.csv": RUNS,
    "gas.csv": GAS,
    "vials.csv": VIALS,
    "liquid.csv": LIQUID,
    "scans.csv": SCANS,
    "checks.csv": CHECKS,
    "traces/a1.csv": TRACE,
    "traces/a2.csv": TRACE,
    # a capacitor of 0.8 mF
    "scans/m1-20.csv": _voltammogram(0.016),
    "scans/m1-40.csv": _voltammogram(0.032),
    "scans/m1-80.csv": _voltammogram(0.064),
    "calibrations/gases/calibration.toml": 'kind = "gas"\nmeasured_on = 2043-04-02\n[curve]\nform = "line"\n',
    "calibrations/gases/standards.csv": GAS_STANDARDS,
    "calibrations/liquids/calibration.toml": 'kind = "liquid"\n[curve]\nform = "line"\n',
    "calibrations/liquids/standards.csv": LIQUID_STANDARDS,
}

# what becomes of a file: other text or bytes, none at all, or an edit of the good text
Change = str | bytes | Callable[[str], str] | None
Changes = Mapping[str, Change]


def swap(*pairs: str) -> Callable[[str], str]:
    """Edit: each old text (which stands in the file exactly once) by the new one that follows it."""

    def edit(text: str) -> str:
        for old, new in zip(pairs[::2], pairs[1::2], strict=True):
            assert text.count(old) == 1, f"{old!r} stands {text.count(old)} times in the good file"
            text = text.replace(old, new)
        return text

    return edit


def add(more: str) -> Callable[[str], str]:
    """Edit: more text at the end."""
    return lambda text: text + more


def drop_column(head: str) -> Callable[[str], str]:
    """Edit: the table without one column."""

    def edit(text: str) -> str:
        rows = list(csv.reader(io.StringIO(text)))
        place = rows[0].index(head)
        return "".join(",".join(row[:place] + row[place + 1 :]) + "\n" for row in rows)

    return edit


def changed(changes: Changes) -> dict[str, str | bytes]:
    """The files of the good day with changes made."""
    files: dict[str, str | bytes] = {**GOOD}
    for name, change in changes.items():
        if change is None:
            del files[name]
        else:
            files[name] = change(GOOD[name]) if callable(change) else change
    return files


def write_day(folder: Path, changes: Changes, *, workbook: bool = False) -> Path:
    """Write the changed day; ``workbook`` puts its tables into the sheets of day.xlsx."""
    files = changed(changes)
    if workbook:
        sheets = {}
        for table in TABLES:
            text = files.pop(f"{table}.csv", None)
            if text is not None:
                assert isinstance(text, str)
                sheets[table] = text
        files["day.xlsx"] = workbook_of(sheets)
    for name, content in files.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return folder


def workbook_of(sheets: Mapping[str, str]) -> bytes:
    """A workbook of tables written as comma-separated text; what is a plain number becomes one."""
    import openpyxl

    book = openpyxl.Workbook()
    book.remove(book.active)
    for name, text in sheets.items():
        sheet = book.create_sheet(name)
        for row in csv.reader(io.StringIO(text)):
            sheet.append([_cell(one) for one in row])
    target = io.BytesIO()
    book.save(target)
    return target.getvalue()


def _cell(text: str) -> str | float | None:
    if not text:
        return None
    try:
        number = float(text)
        # a workbook has no such numbers: they would be words
        return number if math.isfinite(number) else text
    except ValueError:
        return text
