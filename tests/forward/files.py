"""Writing a day to disk in any of the dialects a bench may use."""

from __future__ import annotations

import io
import random
import re
import zipfile
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np
from tests.forward.chemistry import GAS_CONSTANT, PRODUCTS
from tests.forward.noise import Draws
from tests.forward.tables import Sheets, Table, sheets
from tests.forward.truth import DayTruth, Hold

# SI value of one unit, worked out by hand; temperatures are handled apart
UNITS = {
    "s": 1.0, "ms": 1e-3, "min": 60.0, "h": 3600.0,
    "V": 1.0, "mV": 1e-3, "A": 1.0, "mA": 1e-3, "uA": 1e-6,
    "m^2": 1.0, "cm^2": 1e-4, "mm^2": 1e-6, "cm2": 1e-4,
    "Pa": 1.0, "kPa": 1e3, "mbar": 100.0, "bar": 1e5, "ohm": 1.0, "mohm": 1e-3, "kohm": 1e3,
    "mL": 1e-6, "uL": 1e-9, "L": 1e-3, "cm^3": 1e-6,
    "mol": 1.0, "mmol": 1e-3, "umol": 1e-6, "nmol": 1e-9,
    "mol/s": 1.0, "umol/s": 1e-6, "nmol/s": 1e-9, "umol/min": 1e-6 / 60,
    "ppm": 1e-6, "percent": 1e-2, "%": 1e-2,
    "V/s": 1.0, "mV s^-1": 1e-3, "mV/s": 1e-3, "pA s": 1.0,
}  # fmt: skip
STANDARD_FLOWS = {"sccm": 1e-6 / 60, "slpm": 1e-3 / 60}  # m^3 of standard gas per second
ACTUAL_FLOWS = {"mL/min": 1e-6 / 60, "mL min^-1": 1e-6 / 60, "L/h": 1e-3 / 3600}  # m^3/s at T and p
FLOWS = ("inlet flow", "outlet flow", "tracer flow")

# The unit each quantity is written in unless a style says otherwise; others are text or pure numbers
DEFAULT_UNITS = {
    "set potential": "V", "set current": "mA", "start": "s", "stop": "s", "electrode area": "cm^2",
    "temperature": "degC", "pressure": "kPa", "resistance": "ohm", "inlet flow": "sccm",
    "outlet flow": "sccm", "tracer flow": "sccm", "headspace": "mL", "carbonate uptake": "umol/s",
    "time": "s", "peak area": "pA s",
    "compartment volume": "mL", "aliquot": "mL", "standard amount": "umol", "scan rate": "mV s^-1",
    "window low": "V", "window high": "V", "mole fraction": "ppm", "t": "s", "E": "V", "I": "mA", "U": "V",
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class Dialect:
    """How a text table is written."""

    separator: str = ","
    decimal: str = "."
    encoding: str = "utf-8"
    preamble: tuple[str, ...] = ()  # free text above the heads
    newline: str = "\n"
    trailing_blanks: bool = False  # empty rows and columns at the end, as spreadsheets leave them
    quote: bool = False
    suffix: str = ".csv"


@dataclass(frozen=True, slots=True)
class Style:
    """Everything about a day's files that must not change a result."""

    tables: Dialect = Dialect()
    traces: Dialect = Dialect()
    scans: Dialect = Dialect()
    calibrations: Dialect = Dialect()
    workbook: bool = False
    units: Mapping[str, str] = field(default_factory=dict)
    heads: Mapping[str, str] = field(default_factory=dict)  # quantity -> another spelling of it
    digits: Mapping[str, int] = field(default_factory=dict)  # significant digits; others in full
    decimals: Mapping[str, int] = field(default_factory=dict)  # digits after the point; wins over significant
    aliases: bool = False  # species by formula or alias
    names: Mapping[str, str] = field(default_factory=dict)  # species -> how it is written; wins over aliases
    shuffle: int | None = None  # seed of a random order of rows
    drop_empty: bool = True  # leave a column out when all its cells are empty
    extra_columns: Mapping[str, Mapping[str, str]] = field(
        default_factory=dict
    )  # table -> head -> the same cell
    settings: str = ""  # more lines for day.toml
    comment: str = ""  # first lines of day.toml
    inside: bool = True  # calibrations go into the day folder; otherwise nowhere


def write_day(
    folder: Path, day: DayTruth, style: Style = Style(), generator: np.random.Generator | None = None
) -> Path:
    """Write a day into ``folder`` and return it. With a generator the declared errors are drawn."""
    cells = sheets(day, Draws(day.errors, generator))
    return write_sheets(folder, day, cells, style)


def write_sheets(folder: Path, day: DayTruth, cells: Sheets, style: Style = Style()) -> Path:
    """Write cells that were made (and perhaps changed) before."""
    folder.mkdir(parents=True, exist_ok=True)
    tables = {name: list(rows) for name, rows in cells.tables.items()}
    holds = {hold.name: hold for hold in day.holds}
    if style.traces.suffix != ".csv":
        tables["runs"] = [
            {**row, "trace": f"traces/{row['run']}{style.traces.suffix}"} for row in tables["runs"]
        ]
    if style.shuffle is not None:
        order = random.Random(style.shuffle)
        for rows in tables.values():
            order.shuffle(rows)
    grids = {name: _grid(name, rows, day, holds, style) for name, rows in tables.items()}
    if style.workbook:
        _write_workbook(folder / "day.xlsx", grids)
    else:
        for name, grid in grids.items():
            write_text(folder / f"{name}{style.tables.suffix}", grid, style.tables)
    for name, columns in cells.traces.items():
        path = folder / "traces" / f"{name}{style.traces.suffix}"
        write_text(path, _columns(columns, style), style.traces)
    for file, columns in cells.scans.items():
        write_text(folder / file, _columns(columns, style), style.scans)
    if style.inside:
        write_calibrations(folder / "calibrations", cells, style)
    names = list(cells.calibrations)
    (folder / "day.toml").write_text(settings_text(day, names, style), encoding="utf-8", newline="\n")
    return folder


def write_calibrations(folder: Path, cells: Sheets, style: Style = Style()) -> None:
    """Write the calibrations of a day under ``folder``."""
    for name, (settings, rows) in cells.calibrations.items():
        (folder / name).mkdir(parents=True, exist_ok=True)
        (folder / name / "calibration.toml").write_text(settings, encoding="utf-8", newline="\n")
        plain = Style(
            digits=style.digits, decimals=style.decimals, units={"peak area": _unit("peak area", style)}
        )
        write_text(
            folder / name / "standards.csv", _grid("standards", rows, None, {}, plain), style.calibrations
        )


def _unit(quantity: str, style: Style) -> str | None:
    return style.units.get(quantity, DEFAULT_UNITS.get(quantity))


def _head(quantity: str, style: Style) -> str:
    unit = _unit(quantity, style)
    name = style.heads.get(quantity, quantity)
    return name if unit is None else f"{name} / {unit}"


def in_unit(value: float, unit: str | None) -> float:
    """An SI value in another unit."""
    if unit is None:
        return value
    if unit == "degC":
        # decimal places, not arithmetic: 298.15 K is to be written as 25 degC and not as 25.000000000000057
        return round(value - 273.15, 9)
    if unit == "K":
        return value
    return value / UNITS[unit]


def flow_in_unit(mol_per_s: float, unit: str, day: DayTruth, hold: Hold) -> float:
    """A molar flow as a standard or an actual volume flow."""
    if unit in STANDARD_FLOWS:
        volume = mol_per_s * GAS_CONSTANT * day.standard_temperature_kelvin / day.standard_pressure_pascal
        return volume / STANDARD_FLOWS[unit]
    if unit in ACTUAL_FLOWS:
        return mol_per_s * hold.molar_volume_m3 / ACTUAL_FLOWS[unit]
    return mol_per_s / UNITS[unit]


def _written_species(name: str, style: Style) -> str:
    if name in style.names:
        return style.names[name]
    return PRODUCTS[name].alias if style.aliases and name in PRODUCTS else name


def _grid(
    name: str, rows: Table, day: DayTruth | None, holds: Mapping[str, Hold], style: Style
) -> list[list[Any]]:
    """Heads and cells: numbers as float, moments as datetime, anything else as text."""
    quantities: dict[str, None] = {}
    for row in rows:
        for quantity in row:
            quantities.setdefault(quantity)
    kept = [
        q for q in quantities if not style.drop_empty or any(row.get(q) not in (None, "") for row in rows)
    ]
    grid: list[list[Any]] = [[_head(q, style) for q in kept]]
    for row in rows:
        cells: list[Any] = []
        for quantity in kept:
            value = row.get(quantity)
            unit = _unit(quantity, style)
            if value is None:
                cells.append("")
            elif quantity == "analyte":
                cells.append(_written_species(value, style))
            elif isinstance(value, datetime | str):
                cells.append(value)
            elif quantity in FLOWS:
                assert day is not None
                assert unit is not None
                cells.append(_rounded(quantity, flow_in_unit(value, unit, day, holds[row["run"]]), style))
            else:
                cells.append(_rounded(quantity, in_unit(float(value), unit), style))
        grid.append(cells)
    for head, cell in style.extra_columns.get(name, {}).items():
        grid[0].append(head)
        for cells in grid[1:]:
            cells.append(cell)
    return grid


def _rounded(quantity: str, value: float, style: Style) -> float:
    if quantity in style.decimals:
        return round(value, style.decimals[quantity])
    if quantity in style.digits:
        return float(f"{value:.{style.digits[quantity]}g}")
    return value


def _columns(columns: Mapping[str, np.ndarray], style: Style) -> list[list[Any]]:
    units = [_unit(quantity, style) for quantity in columns]
    written = []
    for (quantity, values), unit in zip(columns.items(), units, strict=True):
        scaled = values / UNITS[unit] if unit is not None else values
        written.append([_rounded(quantity, value, style) for value in scaled.tolist()])
    return [
        [_head(quantity, style) for quantity in columns],
        *(list(row) for row in zip(*written, strict=True)),
    ]


def _text(cell: Any, dialect: Dialect) -> str:
    if isinstance(cell, datetime):
        return cell.isoformat()
    if isinstance(cell, float):
        whole = cell.is_integer() and abs(cell) < 1e15
        return str(int(cell)) if whole else repr(cell).replace(".", dialect.decimal)
    text = str(cell)
    return f'"{text}"' if dialect.quote or dialect.separator in text else text


def write_text(path: Path, grid: Sequence[Sequence[Any]], dialect: Dialect) -> None:
    """Write a grid as text in a dialect."""
    extra = 2 * dialect.separator if dialect.trailing_blanks else ""
    lines = list(dialect.preamble)
    lines += [dialect.separator.join(_text(cell, dialect) for cell in row) + extra for row in grid]
    if dialect.trailing_blanks:
        lines += [dialect.separator * (len(grid[0]) + 1)] * 3
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes((dialect.newline.join(lines) + dialect.newline).encode(dialect.encoding))


def _write_workbook(path: Path, grids: Mapping[str, Sequence[Sequence[Any]]]) -> None:
    from openpyxl import Workbook

    book = Workbook()
    book.remove(book.active)
    for name, grid in grids.items():
        sheet = book.create_sheet(name)
        for row in grid:
            sheet.append([None if cell == "" else cell for cell in row])
        for cell in (one for row in sheet.iter_rows() for one in row if one.data_type == "f"):
            cell.data_type = (
                "s"  # a name may begin with "=": whoever types it tells the program that it is text
            )
    buffer = io.BytesIO()
    book.save(buffer)
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes(_without_clock(buffer.getvalue()))


def _without_clock(workbook: bytes) -> bytes:
    """The same workbook with one fixed moment wherever the time of writing stood."""
    buffer = io.BytesIO()
    with (
        zipfile.ZipFile(io.BytesIO(workbook)) as old,
        zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as new,
    ):
        for name in old.namelist():
            content = old.read(name)
            if name == "docProps/core.xml":
                content = re.sub(rb"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ", b"2043-01-01T00:00:00Z", content)
            new.writestr(zipfile.ZipInfo(name, (2043, 1, 1, 0, 0, 0)), content, zipfile.ZIP_DEFLATED)
    return buffer.getvalue()


def settings_text(day: DayTruth, calibrations: Sequence[str], style: Style) -> str:
    """The day's settings file."""
    lines = [
        *style.comment.splitlines(),
        "[day]",
        f'title = "{day.title}"',
        f"date = {day.day_date.isoformat()}",
    ]
    if calibrations:
        lines.append("calibrations = [" + ", ".join(f'"{name}"' for name in calibrations) + "]")
    lines += ["", "[reference]"]
    if day.reference_name is not None:
        lines.append(f'electrode = "{day.reference_name}"')
    lines.append(f'potential = "{day.reference_volt!r} V"')
    if day.reference_volt_per_kelvin:
        lines.append(f'"temperature coefficient" = "{1e3 * day.reference_volt_per_kelvin:.6g} mV/K"')
    lines += [
        "",
        "[gas]",
        f'outlet_flow = "{day.outlet_flow}"',
        f'standard_temperature = "{round(day.standard_temperature_kelvin - 273.15, 9):g} degC"',
        f'standard_pressure = "{day.standard_pressure_pascal / 1000!r} kPa"',
        f'meter_gas = "{"wet" if day.meter_wet else "dry"}"',
        f'current_window = "{day.current_window_second!r} s"',
        f'dead_time = "{day.dead_time_second!r} s"',
        f"feed_CO2 = {day.feed_co2!r}",
    ]
    if day.tracer is not None:
        lines.append(f'tracer = "{day.tracer}"')
    if day.specific_capacitance is not None or day.smooth_reference is not None:
        lines += ["", "[surface]"]
        if day.specific_capacitance is not None:
            lines.append(f'specific_capacitance = "{day.specific_capacitance * 100:.12g} uF/cm^2"')
        if day.smooth_reference is not None:
            lines.append(f'smooth_reference = "{day.smooth_reference}"')
    for error in day.errors:
        lines += ["", "[[uncertainty]]", f'quantity = "{error.quantity}"']
        if error.relative is not None:
            lines.append(f'standard = "{100 * error.relative:.12g} %"')
        else:
            assert error.absolute is not None
            scale = 1.0 if error.unit in (None, "K") else UNITS[error.unit]
            written = f"{error.absolute / scale:.12g} {error.unit or ''}".strip()
            lines.append(f'standard = "{written}"')
        lines.append(f'shared = "{error.shared}"')
    if style.settings:
        lines += ["", *style.settings.splitlines()]
    return "\n".join(lines) + "\n"
