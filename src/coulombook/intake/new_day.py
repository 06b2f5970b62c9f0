"""An empty day folder to fill in: commented settings, tables with their heads, places for the long files."""

from __future__ import annotations

from pathlib import Path

from coulombook.intake import schema
from coulombook.intake.schema import Schema

_DAY_TOML = """\
# What holds for the whole day. A line that starts with # is a comment: take the # away where you need the key.
# A quantity is written with its unit, in quotes. The tables are {tables}.

[day]
title = ""
# date = 2043-05-18
# Calibrations by the name of their folder, looked for in calibrations/ of this folder, then in --calibrations,
# then in ./calibrations
calibrations = []

[reference]
# The name of a reference electrode of the shipped table ...
# electrode = "Ag/AgCl, 3 mol/L KCl"
# ... or its potential against SHE at 25 degC, which wins over the table. One of the two is needed.
# potential = "0.210 V"
# "temperature coefficient" = "-0.73 mV/K"

[defaults]
# Any column of runs under its head; a cell of runs wins.
# "electrode area / cm^2" = 1.0
# pH = 6.8
# "temperature / degC" = 25
# "pressure / kPa" = 101.325
# "resistance / ohm" = 0

[gas]
# How the outlet flow is found: "inlet" (dilute products), "measured", "tracer" or "balance" (of carbon)
outlet_flow = "inlet"
# What sccm and slpm mean:
standard_temperature = "0 degC"
standard_pressure = "101.325 kPa"
# Is a measured outlet flow "dry" or "wet" (saturated with water vapour)?
meter_gas = "dry"
# The current before an injection that belongs to it, where no headspace is given:
current_window = "120 s"
# From the electrode to the sample loop:
dead_time = "0 s"
# tracer = "nitrogen"
# Mole fraction of CO2 in the inlet:
feed_CO2 = 1.0

[liquid]
# Several signals of one analyte: "weighted" by 1/u^2, or their "mean"
combine_signals = "weighted"

[surface]
# Capacitance of the smooth material, or an electrode of scans that counts as roughness 1:
# specific_capacitance = "28 uF/cm^2"
# smooth_reference = "polished-1"
# ... or the material and its electrolyte, for a value of the shipped table:
# material = "copper"
# electrolyte = "0.1 mol/L KHCO3"

[balance]
# Level of confidence of the verdict on the charge balance
level = 0.95
# Prior standard deviation of a share of the charge that nothing measures:
# unaccounted = "2 %"

# Only where the heads of the logs are not understood by themselves:
# [read.traces]
# columns = {{ t = "Time [s]", E = "Potential [V]", I = "Current [mA]" }}

# Standard uncertainties (k = 1) of columns or of the keys above, as many as you like. "shared" says how far one error
# reaches: "day" (a flow meter), "run" (a piece of electrode) or "reading" (an integration).
# [[uncertainty]]
# quantity = "inlet flow"
# standard = "1.0 %"
# shared = "day"

# A product that the shipped table of species lacks:
# [species.butanol]
# formula = "C4H10O"
# phase = "liquid"
"""

_OPTIONAL = ("gas", "vials", "liquid", "scans", "checks", "spectra")


def write_new_day(folder: Path, workbook: bool) -> tuple[Path, ...]:
    """Write an empty, commented day folder and return the files written.

    The tables are CSV files, or the sheets of day.xlsx. Raises FileExistsError when the folder is there and holds
    anything: nothing of the bench is ever overwritten.
    """
    folder = Path(folder)
    if folder.is_file() or (folder.is_dir() and any(folder.iterdir())):
        raise FileExistsError(
            f"{folder} is there already and is not empty; a new day needs an empty or new folder"
        )
    for name in ("traces", "scans", "calibrations"):
        (folder / name).mkdir(parents=True, exist_ok=True)
    settings = folder / "day.toml"
    where = "the sheets of day.xlsx" if workbook else "the CSV files beside this one"
    settings.write_text(_DAY_TOML.format(tables=where), encoding="utf-8")
    tables = [schema.RUNS, *(schema.DAY_TABLES[name] for name in _OPTIONAL)]
    if workbook:
        return settings, _write_workbook(folder / "day.xlsx", tables)
    return settings, *(_write_text(folder / f"{table.name}.csv", table) for table in tables)


def _heads(table: Schema) -> list[str]:
    # an empty cell takes the default, so that the optional columns may stay as they are
    return [column.head for column in table.columns]


def _write_text(path: Path, table: Schema) -> Path:
    path.write_text(",".join(_heads(table)) + "\n", encoding="utf-8")
    return path


def _write_workbook(path: Path, tables: list[Schema]) -> Path:
    import openpyxl
    from openpyxl.styles import Font

    book = openpyxl.Workbook()
    book.remove(book.active)
    for table in tables:
        sheet = book.create_sheet(table.name)
        sheet.append(_heads(table))
        sheet.freeze_panes = "A2"
        needed = {column.head for column in table.needed()}
        for cell in sheet[1]:
            cell.font = Font(bold=cell.value in needed)
            sheet.column_dimensions[cell.column_letter].width = max(10, len(str(cell.value)) + 2)
    book.save(path)
    return path
