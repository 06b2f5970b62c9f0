"""Day folders for the tests of the intake: the day in miniature of the contract, changed file by file."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Mapping
from pathlib import Path

import pytest

from coulombook.findings import Finding, Findings
from coulombook.intake.day import DaySource, open_day

MINIATURE: Mapping[str, str] = {
    "day.toml": '[day]\ncalibrations = ["mini"]\n[reference]\npotential = "0.210 V"\n[gas]\noutlet_flow = "inlet"\n',
    "runs.csv": (
        "run,catalyst,electrode,electrode area / cm^2,pH,temperature / degC,pressure / kPa,resistance / ohm,"
        "inlet flow / sccm\na1,mesh,m1,1.0,6.8,25,101.325,10,20\n"
    ),
    "traces/a1.csv": "t / s,E / V,I / mA\n0,-1.5,-10\n1800,-1.5,-10\n3600,-1.5,-10\n",
    "calibrations/mini/calibration.toml": 'kind = "gas"\n[curve]\nform = "line through zero"\n',
    "calibrations/mini/standards.csv": (
        "channel,analyte,mole fraction / ppm,peak area\n"
        "FID,carbon monoxide,100,10\nFID,carbon monoxide,1000,100\nFID,ethylene,100,20\nFID,ethylene,1000,200\n"
    ),
    "gas.csv": "run,injection,time / s,channel,analyte,peak area\na1,1,1800,FID,CO,50\na1,1,1800,FID,C2H4,20\n",
    "vials.csv": (
        "vial,run,compartment,compartment volume / mL,aliquot / mL,standard,standard amount / umol\n"
        "v1,a1,catholyte,30,0.5,DMSO,0.2\n"
    ),
    "liquid.csv": "vial,analyte,signal,protons,integral\nv1,DMSO,CH3,6,600\nv1,formate,CH,1,250\n",
}

Change = str | bytes | None
Write = Callable[..., Path]


@pytest.fixture
def write_day(tmp_path: Path) -> Write:
    """Write the day in miniature with some files changed (None: left out); give its folder."""

    def write(changes: Mapping[str, Change] | None = None) -> Path:
        folder = tmp_path / "day"
        if folder.exists():
            shutil.rmtree(folder)
        files: dict[str, Change] = {**MINIATURE, **(changes or {})}
        for name, content in files.items():
            if content is None:
                continue
            path = folder / name
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_bytes(content if isinstance(content, bytes) else content.encode())
        return folder

    return write


class Opened:
    """An opened day, with its findings at hand."""

    def __init__(self, folder: Path, *calibration_folders: Path) -> None:
        self.findings = Findings()
        self.source: DaySource = open_day(folder, calibration_folders, self.findings)

    @property
    def kinds(self) -> list[str]:
        """The kinds of all findings."""
        return [one.kind for one in self.findings]

    def one(self, kind: str) -> Finding:
        """The only finding of a kind."""
        found = [one for one in self.findings if one.kind == kind]
        assert len(found) == 1, [f"{one.kind}: {one.where}: {one.text}" for one in self.findings]
        return found[0]


@pytest.fixture
def open_changed(write_day: Write) -> Callable[..., Opened]:
    """Write the changed day and open it."""
    return lambda changes=None: Opened(write_day(changes))
