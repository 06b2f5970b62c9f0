"""Small folders of calibrations, written for one test."""

from __future__ import annotations

from pathlib import Path

GAS_HEAD = "channel,analyte,mole fraction / ppm,peak area,parent,u(parent) / %"
LEVELS = (10.0, 10.0, 100.0, 100.0, 1000.0, 1000.0)
# relative; alike for no two levels, adding to nothing in pairs, with no trend
WOBBLE = (0.004, -0.006, -0.003, 0.005, 0.002, -0.002)


def gas_rows(
    analyte: str = "ethylene",
    channel: str = "FID",
    slope: float = 2.0,
    parent: str = "",
    levels: tuple[float, ...] = LEVELS,
) -> list[str]:
    """Rows of a curve through zero of this slope per ppm, wobbling by half a percent."""
    u = "0.5" if parent else ""
    return [
        f"{channel},{analyte},{x:g},{slope * x * (1.0 + wobble):.10g},{parent},{u}"
        for x, wobble in zip(levels, WOBBLE, strict=True)
    ]


def write_calibration(
    shelf: Path,
    name: str,
    rows: list[str],
    measured: str = "2043-01-01",
    until: str = "2043-07-01",
    curve: str = 'form = "line"\nweights = "1/x^2"',
) -> Path:
    folder = shelf / name
    folder.mkdir(parents=True)
    dates = "".join(
        f"{key} = {value}\n" for key, value in (("measured_on", measured), ("valid_until", until)) if value
    )
    (folder / "calibration.toml").write_text(f'kind = "gas"\n{dates}[curve]\n{curve}\n', encoding="utf-8")
    (folder / "standards.csv").write_text("\n".join([GAS_HEAD, *rows]) + "\n", encoding="utf-8")
    return folder


def falling_rows() -> list[str]:
    """Standards no rising curve goes through."""
    return [f"FID,ethylene,{x},{100 - x},," for x in (10, 20, 30, 40)]
