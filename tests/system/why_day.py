"""A small good day that the examples of the pages are put into: one run, nothing to tell of. Invented.

The examples show whole tables, and of a settings file the sections they are about; the rest stands here. One gas
product and one liquid product make the tables short enough to be read on a page.
"""

from __future__ import annotations

import io
import re
from collections.abc import Callable, Mapping, Sequence
from functools import cache, partial
from pathlib import Path
from typing import Any

import numpy as np
from tests.faults.day import workbook_of
from tests.unit.cell.rc_circuit import Record, sweep

from coulombook.cell.impedance import circuit_impedance

DAY_TOML = """\
[day]
title = "A day for the pages"
date = 2043-05-18
calibrations = ["gc-2043-04", "nmr-2043-05"]

[reference]
electrode = "Ag/AgCl, 3 mol/L KCl"

[defaults]
"electrode area / cm^2" = 1.0
pH = 6.8
"temperature / degC" = 25
"pressure / kPa" = 101.325
"resistance / ohm" = 10

[gas]
outlet_flow = "inlet"
current_window = "120 s"

[surface]
specific_capacitance = "28 uF/cm^2"

[balance]
unaccounted = "5 %"

[[uncertainty]]
quantity = "inlet flow"
standard = "1 %"
shared = "day"

[[uncertainty]]
quantity = "integral"
standard = "1 %"
shared = "reading"

[[uncertainty]]
quantity = "I"
standard = "0.2 %"
shared = "day"
"""

# 10 mA and 14.87 umol/s: 2500 ppm of a product of two electrons are 71.7 %; 53 umol of one in 36 C are 28.4 %
GOOD: Mapping[str, str] = {
    "day.toml": DAY_TOML,
    "runs.csv": ("run,catalyst,electrode,started,inlet flow / sccm\na1,mesh,m1,2043-05-18T09:30:00,20\n"),
    "traces/a1.csv": "t / s,E / V,I / mA\n0,-1.5,-10\n1800,-1.5,-10\n3600,-1.5,-10\n",
    "gas.csv": (
        "run,injection,time / s,channel,analyte,peak area\na1,1,1200,FID,CO,250\na1,2,2400,FID,CO,251\n"
    ),
    "vials.csv": (
        "vial,run,compartment,compartment volume / mL,aliquot / mL,standard,standard amount / umol,role\n"
        "v1,a1,catholyte,30,0.5,DMSO,0.2,sample\n"
        "b0,,catholyte,,0.5,DMSO,0.2,blank\n"
    ),
    "liquid.csv": (
        "vial,analyte,signal,protons,integral\n"
        "v1,DMSO,CH3,6,600\nv1,formate,CH,1,440\n"
        "b0,DMSO,CH3,6,600\nb0,formate,CH,1,0.4\n"
    ),
    "checks.csv": (
        "at,channel,analyte,mole fraction / ppm,peak area\n"
        "2043-05-18T09:00:00,FID,CO,1000,100\n2043-05-18T13:00:00,FID,CO,1000,100.2\n"
    ),
    "scans.csv": (
        "electrode,file,scan rate / mV s^-1,electrode area / cm^2\n"
        "m1,scans/m1-20.csv,20,1.0\nm1,scans/m1-40.csv,40,1.0\nm1,scans/m1-80.csv,80,1.0\n"
    ),
    "calibrations/gc-2043-04/calibration.toml": 'kind = "gas"\nmeasured_on = 2043-04-02\n\n[curve]\nform = "line"\n',
    "calibrations/gc-2043-04/standards.csv": (
        "channel,analyte,mole fraction / ppm,peak area\n"
        "FID,CO,100,10.1\nFID,CO,1000,99.7\nFID,CO,2000,200.2\nFID,CO,3000,300.1\n"
        "FID,CO,4000,399.8\n"
    ),
    "calibrations/nmr-2043-05/calibration.toml": 'kind = "liquid"\n\n[curve]\nform = "line"\n',
    "calibrations/nmr-2043-05/standards.csv": (
        "analyte,signal,amount ratio,integral ratio\n"
        "formate,CH,0.2,0.201\nformate,CH,1,0.998\nformate,CH,4,4.004\nformate,CH,8,7.997\n"
    ),
}

_HEADER = re.compile(r"^(?=\[)", re.MULTILINE)
_SHEET = re.compile(r"day\.xlsx, sheet '(?P<table>[a-z]+)'(?P<hidden> \(hidden\))?")
MERGED = "^"  # in a sheet of an example: merged with the cell above


def files_of(shown: Mapping[str, str]) -> dict[str, str | bytes]:
    """The files of the good day with those of an example in their places.

    A table is shown whole, and an empty text says that the file is not there. Of a settings file the sections shown
    take the places of those of the same heading; all entries of ``[[uncertainty]]`` count as one section.
    """
    files: dict[str, str | bytes] = dict(GOOD)
    sheets = {}
    for name, text in shown.items():
        if sheet := _SHEET.fullmatch(name):
            sheets[sheet["table"]] = text, bool(sheet["hidden"])
            files.pop(f"{sheet['table']}.csv", None)
        elif name.endswith(".toml") and name in GOOD:
            files[name] = _merged(GOOD[name], text)
        elif text:
            files[name] = text
        else:
            del files[name]
    if sheets:
        files["day.xlsx"] = _workbook(sheets)
    for name, make in RECORDS.items():
        if any(name in text for text in files.values() if isinstance(text, str)):
            files.setdefault(name, make())
    return files


def write_day(folder: Path, shown: Mapping[str, str]) -> Path:
    """Write the day of an example."""
    for name, content in files_of(shown).items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return folder


def _workbook(sheets: Mapping[str, tuple[str, bool]]) -> bytes:
    """A workbook of sheets, each written as a comma-separated table, hidden or not."""
    import openpyxl

    book = openpyxl.load_workbook(io.BytesIO(workbook_of({name: text for name, (text, _) in sheets.items()})))
    for name, (_, hidden) in sheets.items():
        sheet = book[name]
        sheet.sheet_state = "hidden" if hidden else "visible"
        for column in sheet.iter_cols():
            _merge(sheet, column)
    if all(hidden for _, hidden in sheets.values()):
        book.create_sheet("remarks")  # a workbook must show something
    target = io.BytesIO()
    book.save(target)
    return target.getvalue()


def _merge(sheet: Any, column: Sequence[Any]) -> None:
    """Merge the cells of a column that say so with the one above them."""
    start = 0
    for place, cell in enumerate([*column, None]):
        if cell is None or cell.value != MERGED:
            if place - start > 1:
                sheet.merge_cells(f"{column[start].coordinate}:{column[place - 1].coordinate}")
            start = place


def _merged(good: str, shown: str) -> str:
    new = [part for part in _HEADER.split(shown) if part]
    taken = {_heading(part) for part in new}
    kept = [part for part in _HEADER.split(good) if _heading(part) not in taken]
    # keys that stand in no section must come first
    parts = sorted([*kept, *new], key=lambda part: bool(_heading(part)))
    return "\n".join(parts)


def _heading(part: str) -> str:
    return part.partition("\n")[0].strip() if part.startswith("[") else ""


# --- records too long for a page: an example names them in a table ---


_POTENTIALS = (1.2, 1.3, 1.4, 1.5, 1.6)
# mA: log j bends as under a limit of transport; it is straight, 250 mV a decade behind 10 ohm; CO2 used is straight
_CURRENTS = {
    "at": (0.3, 1.096, 2.865, 5.684, 9.283),
    "stirred": (0.3, 0.725, 1.669, 3.531, 6.653),
    "split": (0.3, 0.844, 2.451, 5.72, 10.601),
}


def _steady(volt: float, milliampere: float) -> str:
    return "t / s,E / V,I / mA\n" + "".join(f"{t},{-volt:g},{-milliampere:g}\n" for t in (0, 1800, 3600))


def _voltammogram(record: Record) -> str:
    rows = zip(record.time_second, record.potential_volt, 1e3 * record.current_ampere, strict=True)
    return "t / s,E / V,I / mA\n" + "".join(f"{t:.12g},{e:.12g},{i:.12g}\n" for t, e, i in rows)


def _scan(rate_mv: float, *, farad: float = 1e-3, rc_second: float = 0.0, **more: float) -> str:
    rate = rate_mv * 1e-3
    return _voltammogram(sweep(farad, rc_second / farad, rate, per_sweep=100, **more))  # type: ignore[arg-type]


def _reacting(rate_mv: float) -> str:
    """A reduction at the low end, ten times the slowest charging current there."""
    record = sweep(1e-3, 0.0, rate_mv * 1e-3, per_sweep=100, low=-0.35, high=-0.05)
    extra = 2e-4 * np.exp(-(record.potential_volt + 0.35) / 0.02)
    return _voltammogram(Record(record.time_second, record.potential_volt, record.current_ampere - extra))


def _spectrum(
    resistance_ohm: float,
    *,
    drift: float = 0.0,
    bridge_ohm: float = 200.0,
    element: float = 1e-3,
    second: float = 0.0,
) -> str:
    """A constant-phase element, bridged; ``drift`` is the growth of the resistance, ``second`` a second process."""
    frequency = np.geomspace(1e5, 0.1, 43)
    growing = resistance_ohm * (1.0 + drift * np.linspace(0.0, 1.0, frequency.size))
    omega = 2 * np.pi * frequency
    z = circuit_impedance(omega, 0.0, bridge_ohm, element, 0.9) + growing
    if second:
        z = z + second / (1.0 + 1j * omega * second * 1e-5)
    rows = (f"{f:.12g},{one.real:.12g},{one.imag:.12g}\n" for f, one in zip(frequency, z, strict=True))
    return "f / Hz,Zre / ohm,Zim / ohm\n" + "".join(rows)


def _records() -> dict[str, Callable[[], str]]:
    made: dict[str, Callable[[], str]] = {}
    for rate in (5, 10, 20, 40, 80, 160):
        made[f"scans/m1-{rate}.csv"] = lambda rate=rate: _scan(rate)
        made[f"scans/m1-after-{rate}.csv"] = lambda rate=rate: _scan(rate, farad=1.3e-3, noise=1e-7)
        # 10 ohm and 10 mF
        made[f"scans/foam-{rate}.csv"] = lambda rate=rate: _scan(rate, farad=1e-2, rc_second=0.1)
        made[f"scans/reacting-{rate}.csv"] = lambda rate=rate: _reacting(rate)
        # 1 mS over 0.05 V to either side is 50 uA
        made[f"scans/air-{rate}.csv"] = lambda rate=rate: _scan(rate, leak=1e-3)
        # pores that are no longer reached above 40 mV/s
        made[f"scans/pores-{rate}.csv"] = lambda rate=rate: _scan(
            rate, farad=1e-3 * (max(rate, 20) / 20) ** -0.2
        )
        made[f"scans/coarse-{rate}.csv"] = lambda rate=rate: _voltammogram(
            sweep(1e-3, 0.0, rate * 1e-3, per_sweep=4)
        )
    for kind, currents in _CURRENTS.items():
        for volt, milliampere in zip(_POTENTIALS, currents, strict=True):
            made[f"traces/{kind}-{volt}V.csv"] = partial(_steady, volt, milliampere)
    made["spectra/m1.csv"] = lambda: _spectrum(8.0)
    made["spectra/m1-drifting.csv"] = lambda: _spectrum(8.0, drift=0.2)
    made["spectra/m1-reacting.csv"] = lambda: _spectrum(8.0, element=1e-2)
    made["spectra/m1-two-arcs.csv"] = lambda: _spectrum(8.0, second=2.0)
    return made


RECORDS: Mapping[str, Callable[[], str]] = {name: cache(make) for name, make in _records().items()}
