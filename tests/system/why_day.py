"""A small good day that the examples of the pages are put into: one run, nothing to tell of. Invented.

The examples show whole tables, and of a settings file the sections they are about; the rest stands here. One gas
product and one liquid product make the tables short enough to be read on a page.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from functools import cache
from pathlib import Path

import numpy as np
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
    ),
    "calibrations/nmr-2043-05/calibration.toml": 'kind = "liquid"\n\n[curve]\nform = "line"\n',
    "calibrations/nmr-2043-05/standards.csv": (
        "analyte,signal,amount ratio,integral ratio\n"
        "formate,CH,0.2,0.201\nformate,CH,1,0.998\nformate,CH,4,4.004\nformate,CH,8,7.997\n"
    ),
}

_HEADER = re.compile(r"^(?=\[)", re.MULTILINE)


def files_of(shown: Mapping[str, str]) -> dict[str, str]:
    """The files of the good day with those of an example in their places.

    A table is shown whole. Of a settings file the sections shown take the places of those of the same heading; all
    entries of ``[[uncertainty]]`` count as one section.
    """
    files = dict(GOOD)
    for name, text in shown.items():
        files[name] = _merged(GOOD[name], text) if name.endswith(".toml") and name in GOOD else text
    for name, make in RECORDS.items():
        if any(name in text for text in files.values()):
            files.setdefault(name, make())
    return files


def write_day(folder: Path, shown: Mapping[str, str]) -> Path:
    """Write the day of an example."""
    for name, content in files_of(shown).items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(content, encoding="utf-8")
    return folder


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
    made["spectra/m1.csv"] = lambda: _spectrum(8.0)
    made["spectra/m1-drifting.csv"] = lambda: _spectrum(8.0, drift=0.2)
    made["spectra/m1-reacting.csv"] = lambda: _spectrum(8.0, element=1e-2)
    made["spectra/m1-two-arcs.csv"] = lambda: _spectrum(8.0, second=2.0)
    return made


RECORDS: Mapping[str, Callable[[], str]] = {name: cache(make) for name, make in _records().items()}
