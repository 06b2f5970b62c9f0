"""A day folder opened: every table read, every fault gathered, the long files left for later."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import partial
from pathlib import Path

from coulombook.balance.readings import (
    Calibration,
    Check,
    Day,
    Peak,
    Run,
    Scan,
    Signal,
    Spectrum,
    SpectrumRecord,
    Trace,
    Voltammogram,
)
from coulombook.balance.spectra_used import spectra_of_run
from coulombook.findings import DayFaults, Findings
from coulombook.intake import crosschecks, records, schema
from coulombook.intake.calibration import find_calibrations
from coulombook.intake.files import (
    Folder,
    did_you_mean,
    is_file,
    is_folder,
    read_bytes,
    report_outside,
    unreadable,
)
from coulombook.intake.grid import Grid, grid_of_rows, grid_of_text
from coulombook.intake.limits import LARGEST_TABLE_BYTE, MOST_ADVICE
from coulombook.intake.settings import DayFile, TraceOptions, read_day_settings
from coulombook.intake.table_habits import with_look
from coulombook.intake.tables import TypedTable, typed_table
from coulombook.intake.text import UnreadableText
from coulombook.intake.toml_text import read_settings
from coulombook.intake.traces import read_spectrum, read_trace, read_voltammogram
from coulombook.intake.workbook import read_sheets
from coulombook.species import SpeciesTable, load_species

WORKBOOK = "day.xlsx"
_TABLE_SUFFIXES = (".csv", ".tsv")
_TRACE_SUFFIXES = (".csv", ".tsv", ".txt")
_TABLES = tuple(schema.DAY_TABLES)


@dataclass(frozen=True, slots=True, eq=False)
class DaySource:
    """An opened day folder.

    ``day`` is None when the tables have faults. `trace` and `voltammogram` read their file anew at each call, keep
    nothing, and may be called from several threads.
    """

    day: Day | None
    files: tuple[Path, ...]  # every input of the day, traces and voltammograms with it
    _folder: Folder
    _calibration_folders: tuple[Folder, ...]
    _options: TraceOptions
    _long_byte: int  # size of all traces and voltammograms together

    def trace(self, run: Run, findings: Findings | None = None) -> Trace:
        """The potentiostat log of a run, in SI. Raises `DayFaults` with every fault of the file;
        what is milder goes to ``findings``.
        """
        own = Findings()
        read = read_trace(
            self._folder,
            self._folder.root / run.trace,
            run.electrode_area_m2,
            self._options.of(run.trace),
            own,
            self._long_byte,
            started=run.started,
            window=(run.start_second, run.stop_second),
        )
        if read is None:
            raise DayFaults(tuple(own))
        if findings is not None:
            findings.extend(own)
        return read

    def voltammogram(self, scan: Scan, findings: Findings | None = None) -> Voltammogram:
        """The voltammogram of a row of ``scans``, in SI. Raises `DayFaults` with every fault of the file;
        what is milder goes to ``findings``.
        """
        own = Findings()
        read = read_voltammogram(
            self._folder,
            self._folder.root / scan.file,
            scan.electrode_area_m2,
            self._options.of(scan.file),
            own,
            self._long_byte,
        )
        if read is None:
            raise DayFaults(tuple(own))
        if findings is not None:
            findings.extend(own)
        return read

    def spectrum(self, spectrum: Spectrum, findings: Findings | None = None) -> SpectrumRecord:
        """The impedance spectrum of a row of ``spectra``, in SI. Raises `DayFaults` with every fault of the file;
        what is milder goes to ``findings``.
        """
        own = Findings()
        read = read_spectrum(
            self._folder,
            self._folder.root / spectrum.file,
            self._options.of(spectrum.file),
            own,
            self._long_byte,
        )
        if read is None:
            raise DayFaults(tuple(own))
        if findings is not None:
            findings.extend(own)
        return read

    def label(self, path: Path) -> str:
        """The name of an input file: relative to the day folder, or ``calibrations/<name>/...``."""
        for folder in self._calibration_folders:
            if path.is_relative_to(folder.root):
                return folder.name_of(path)
        return self._folder.name_of(path)


def open_day(
    folder: Path,
    calibration_folders: Sequence[Path],
    findings: Findings,
    species: SpeciesTable | None = None,
) -> DaySource:
    """Read every table of a day folder; traces and voltammograms are looked for and left on disk.

    Parameters
    ----------
    folder : Path
        The day folder.
    calibration_folders : sequence of Path
        Where calibrations are looked for after ``<day>/calibrations``, in order.
    findings : Findings
        Takes every fault and every milder finding.
    species : SpeciesTable, optional
        The species known beforehand; default: the shipped table.
    """
    home = Folder(Path(folder))
    known = species or load_species()
    if not home.root.is_dir():
        findings.add("missing-file", str(folder), "there is no such day folder", "correct the path",
                     found="nothing there", expected="a folder with day.toml, runs.csv and traces")  # fmt: skip
        return DaySource(None, (), home, (), TraceOptions({}), 0)
    before = len(findings.stops)
    file = _settings(home, known, findings)
    tables, table_names = _tables(home, file, findings)
    day, calibrations, long_files = _day(
        home, file, tables, table_names, calibration_folders, known, findings
    )
    files = tuple(
        dict.fromkeys([*home.read, *(path for one in calibrations for path in one.read), *long_files])
    )
    options = file.traces if file else TraceOptions({})
    whole = day if len(findings.stops) == before else None
    long_byte = sum(path.stat().st_size for path in long_files)
    return DaySource(whole, files, home, calibrations, options, long_byte)


def _settings(home: Folder, species: SpeciesTable, findings: Findings) -> DayFile | None:
    path = home.root / "day.toml"
    if not path.exists() and not path.is_symlink():
        findings.add(
            "missing-file",
            "day.toml",
            "the day folder has no day.toml",
            "add it; `coulombook new` writes one to fill in",
            found="nothing there",
            expected="the settings of the day",
        )
        return None
    source = read_settings(home, path, findings)
    return None if source is None else read_day_settings(source, species, findings)


# --- finding and reading the tables ---


def _tables(
    home: Folder, file: DayFile | None, findings: Findings
) -> tuple[dict[str, TypedTable], frozenset[str]]:
    """The tables that could be read, and the names of all that are there."""
    defaults = file.defaults if file else {}
    files = _table_files(home, findings)
    read = _sheet_grids(home, defaults, findings)
    sheets = read or {}
    tables: dict[str, TypedTable] = {}
    for name, columns in schema.DAY_TABLES.items():
        given = defaults if name == "runs" else {}
        paths = files.get(name, [])
        if len(paths) + (name in sheets) > 1:
            places = [home.name_of(path) for path in paths] + (
                [f"{WORKBOOK}, sheet '{name}'"] if name in sheets else []
            )
            findings.add("two-sources", places[0], f"the table {name} is there more than once", "delete one of them",
                         found=" and ".join(places), expected="one file or one sheet")  # fmt: skip
        if paths:
            grid = _text_grid(home, paths[0], partial(columns.score, given=frozenset(given)), findings)
        else:
            grid = sheets.get(name)
        if grid is not None:
            tables[name] = typed_table(grid, columns, findings, given)
    # a workbook that cannot be read may hold any table, and none must be called missing
    there = frozenset(files) | (frozenset(sheets) if read is not None else frozenset(schema.DAY_TABLES))
    return tables, there


def _table_files(home: Folder, findings: Findings) -> dict[str, list[Path]]:
    files: dict[str, list[Path]] = {}
    for path in sorted(home.root.iterdir()):
        suffix, stem = path.suffix.casefold(), path.stem.casefold()
        if suffix not in _TABLE_SUFFIXES or path.is_dir():
            continue
        if stem in _TABLES:
            files.setdefault(stem, []).append(path)
        else:
            _report_unread(findings, home.name_of(path), path.stem)
    return files


def _report_unread(findings: Findings, place: str, name: str) -> None:
    hint = did_you_mean(name, _TABLES).removeprefix("; ")
    findings.add("unread-table", place, f"'{name}' is no table of a day; it was left unread", hint)


def _text_grid(home: Folder, path: Path, score: Callable[..., float], findings: Findings) -> Grid | None:
    data = read_bytes(home, path, LARGEST_TABLE_BYTE, findings)
    if data is None:
        return None
    try:
        return grid_of_text(data, home.name_of(path), score)
    except UnreadableText as error:
        unreadable(findings, home.name_of(path), error.found, error.expected)
        return None


def _sheet_grids(home: Folder, defaults: Mapping[str, object], findings: Findings) -> dict[str, Grid] | None:
    """The tables among the sheets of day.xlsx; None when it is there and cannot be read."""
    path = home.root / WORKBOOK
    if not path.exists() and not path.is_symlink():
        return {}
    data = read_bytes(home, path, LARGEST_TABLE_BYTE, findings)
    if data is None:
        return None
    sheets = read_sheets(data, WORKBOOK, lambda name: name.strip().casefold() in _TABLES, findings)
    if sheets is None:
        return None
    for name in sheets.unread:
        _report_unread(findings, f"{WORKBOOK}, sheet '{name}'", name)
    grids: dict[str, Grid] = {}
    for title, rows in sheets.rows.items():
        name = title.strip().casefold()
        columns = schema.DAY_TABLES.get(name)
        if columns is None:
            continue
        given = frozenset(defaults) if name == "runs" else frozenset[str]()
        try:
            grid = grid_of_rows(rows, WORKBOOK, title, partial(columns.score, given=given), sheets.epoch)
        except UnreadableText as error:
            unreadable(findings, f"{WORKBOOK}, sheet '{title}'", error.found, error.expected)
            continue
        # a sheet with heads alone, as the empty workbook has it, is no table
        if grid is not None and (grid.rows or name == "runs"):
            grids[name] = with_look(grid, sheets.looks[title], findings)
    return grids


# --- putting the day together ---


class Spelling:
    """One spelling for words that differ only in case and blanks: the first seen."""

    def __init__(self, first: Iterable[str] = ()) -> None:
        self._seen: dict[str, str] = {}
        for text in first:
            self(text)

    def __call__(self, text: str) -> str:
        """The spelling to use for ``text``."""
        tidy = " ".join(text.split())
        return self._seen.setdefault(tidy.casefold(), tidy)


def _day(
    home: Folder,
    file: DayFile | None,
    tables: Mapping[str, TypedTable],
    there: frozenset[str],
    calibration_folders: Sequence[Path],
    known: SpeciesTable,
    findings: Findings,
) -> tuple[Day | None, tuple[Folder, ...], list[Path]]:
    species = file.species if file else known
    names = records.Names(species, findings)
    calibrations: tuple[Calibration, ...] = ()
    folders: tuple[Folder, ...] = ()
    if file is not None:
        calibrations, folders = find_calibrations(
            file.settings.calibrations,
            home,
            calibration_folders,
            species,
            file.source.where("day", "calibrations"),
            findings,
        )
    _report_missing_tables(there, findings)
    channel_of = Spelling(one.channel for c in calibrations if c.kind == "gas" for one in c.standards)
    signal_of = Spelling(one.channel for c in calibrations if c.kind == "liquid" for one in c.standards)
    long_files: list[Path] = []

    run_table, gas, vial_table = tables.get("runs"), tables.get("gas"), tables.get("vials")
    liquid, scan_table, check_table = tables.get("liquid"), tables.get("scans"), tables.get("checks")
    spectrum_table = tables.get("spectra")
    runs = (
        ()
        if run_table is None
        else records.runs(run_table, _trace_names(home, run_table, long_files, findings))
    )
    peaks = () if gas is None else records.peaks(gas, names, channel_of)
    vials = () if vial_table is None else records.vials(vial_table, names, findings)
    signals = _signals(liquid, vial_table, names, signal_of)
    scans = () if scan_table is None else records.scans(scan_table)
    checks = () if check_table is None else records.checks(check_table, names, channel_of)
    spectra = () if spectrum_table is None else records.spectra(spectrum_table, findings)

    if run_table is not None:
        crosschecks.unique_words(run_table, ("run",), "the run", findings)
    _check_names(tables, findings)
    if scan_table is not None:
        _scan_files(home, scan_table, "voltammogram", long_files, findings)
    if spectrum_table is not None:
        _scan_files(home, spectrum_table, "spectrum", long_files, findings)
    if vial_table is not None and liquid is not None:
        broken = frozenset(liquid.words("vial")[place] for place in liquid.broken)
        needed = {"vial", "analyte", "protons", "integral"}
        if needed <= liquid.heads.keys() and not needed & liquid.unread:
            crosschecks.standards(vials, signals, broken, findings)
        crosschecks.relaxation(signals, findings)
    _check_doubles(peaks, signals, scans, checks, findings)
    crosschecks.windows(runs, scans, findings)
    if run_table is not None:
        crosschecks.starting_times(runs, peaks, checks, run_table, findings)
    if file is not None and run_table is not None:
        _check_settings(
            file, run_table, runs, peaks, scans, "scans" in there, spectra, calibrations, findings
        )
    if file is None or run_table is None:
        return None, folders, long_files
    crosschecks.logs_with_options(file, [home.name_of(path) for path in long_files], findings)
    carried = {name: dict(table.carried) for name, table in tables.items() if table.carried}
    settings = replace(file.settings, title=file.settings.title or home.root.resolve().name)
    day = Day(home.root.resolve().name, settings, species, runs, peaks, vials, signals, scans, checks,
              calibrations, carried, spectra)  # fmt: skip
    return day, folders, long_files


def _report_missing_tables(there: frozenset[str], findings: Findings) -> None:
    if "runs" not in there:
        findings.add("missing-file", "runs.csv", "the day has no table of runs",
                     f"add runs.csv, or a sheet 'runs' in {WORKBOOK}", found="nothing there",
                     expected="a table with a row for each hold")  # fmt: skip
    for one, other in (("vials", "liquid"), ("liquid", "vials")):
        if one in there and other not in there:
            findings.add("missing-file", f"{other}.csv", f"the table {one} is there, but not the table {other}",
                         f"add {other}.csv, or take {one} away", found="nothing there",
                         expected=f"the table {other}")  # fmt: skip


def _signals(
    liquid: TypedTable | None,
    vial_table: TypedTable | None,
    names: records.Names,
    signal_of: Callable[[str], str],
) -> tuple[Signal, ...]:
    if liquid is None:
        return ()
    standards: dict[str, str] = {}
    if vial_table is not None:
        # from the table, not the records: a vial with a fault elsewhere still names its standard
        for vial, text in zip(vial_table.words("vial"), vial_table.words("standard"), strict=True):
            if text:
                standards[vial] = names.standard(text)
    return records.signals(liquid, standards, names, signal_of)


def _check_names(tables: Mapping[str, TypedTable], findings: Findings) -> None:
    """Names used in one table and defined in another, and things entered twice."""
    runs, vials = tables.get("runs"), tables.get("vials")
    gas, liquid = tables.get("gas"), tables.get("liquid")
    run_names = [name for name in runs.words("run") if name] if runs is not None else []
    for table in (gas, vials, tables.get("spectra")):
        if table is not None and runs is not None and "run" in runs.heads:
            crosschecks.known_names(table, "run", run_names, "run", "runs", findings)
    spectra, scans = tables.get("spectra"), tables.get("scans")
    if spectra is not None and runs is not None and "electrode" in runs.heads:
        electrodes = [
            name for one in (runs, scans) if one is not None for name in one.words("electrode") if name
        ]
        known = list(dict.fromkeys(electrodes))
        crosschecks.known_names(spectra, "electrode", known, "electrode", "runs or scans", findings)
    if vials is not None:
        crosschecks.unique_words(vials, ("vial",), "the vial", findings)
        if liquid is not None:
            names = [name for name in vials.words("vial") if name]
            if "vial" in vials.heads:
                crosschecks.known_names(liquid, "vial", names, "vial", "vials", findings)


def _check_doubles(
    peaks: Sequence[Peak],
    signals: Sequence[Signal],
    scans: Sequence[Scan],
    checks: Sequence[Check],
    findings: Findings,
) -> None:
    used = [one for one in peaks if one.used]
    crosschecks.unique_records(
        used, lambda one: (one.run, one.injection, one.channel, one.analyte), "analyte", "the peak", findings
    )
    crosschecks.unique_records(
        signals, lambda one: (one.vial, one.analyte, one.signal), "analyte", "the signal", findings
    )
    crosschecks.unique_records(
        scans,
        lambda one: (one.file, "" if one.cycle is None else f"cycle {one.cycle:g}"),
        "file",
        "the scan",
        findings,
    )
    crosschecks.unique_records(
        checks, lambda one: (one.at.isoformat(), one.channel, one.analyte), "analyte", "the check", findings
    )


def _check_settings(
    file: DayFile,
    run_table: TypedTable,
    runs: Sequence[Run],
    peaks: Sequence[Peak],
    scans: Sequence[Scan],
    has_scans: bool,
    spectra: Sequence[Spectrum],
    calibrations: Sequence[Calibration],
    findings: Findings,
) -> None:
    settings = file.settings
    if not len(run_table) and "run" in run_table.heads:
        findings.add("missing-value", run_table.table_origin, "the table of runs has no rows",
                     "add a row for each hold", found="heads alone", expected="at least one run")  # fmt: skip
    crosschecks.flows(settings, runs, peaks, run_table, findings)
    crosschecks.smooth_reference(settings, scans, file, has_scans, findings)
    crosschecks.declared_flow_kinds(settings.declared, file.declared_flow_kinds, runs, findings)
    told = {run.name for run in runs if spectra_of_run(spectra, run.name, run.electrode)}
    crosschecks.assumed(run_table, file.defaults, settings, told, findings)
    crosschecks.expiry(calibrations, settings, runs, findings)


# --- the long files ---


def _trace_names(home: Folder, table: TypedTable, long_files: list[Path], findings: Findings) -> list[str]:
    """The path of every run's trace relative to the day folder, each looked for."""
    names: list[str] = []
    for place, (run, given) in enumerate(zip(table.words("run"), table.words("trace"), strict=True)):
        text = (given or f"traces/{run}.csv").replace("\\", "/")
        names.append(text)
        if (not run and not given) or findings.is_full("missing-file"):
            continue
        path = home.inside(text)
        if path is not None and not given and not is_file(path):
            others = [home.inside(f"traces/{run}{suffix}") for suffix in _TRACE_SUFFIXES]
            path = next((one for one in others if one is not None and is_file(one)), path)
            names[-1] = home.name_of(path)
        _look_for(home, path, text, table, place, "trace", f"run '{run}' has no trace", long_files, findings)
    return names


def _scan_files(
    home: Folder, table: TypedTable, kind: str, long_files: list[Path], findings: Findings
) -> None:
    for place, given in enumerate(table.words("file")):
        if given and not findings.is_full("missing-file"):
            path = home.inside(given)
            _look_for(home, path, given, table, place, "file", f"the row has no {kind}", long_files, findings)


def _look_for(
    home: Folder,
    path: Path | None,
    text: str,
    table: TypedTable,
    place: int,
    quantity: str,
    what: str,
    long_files: list[Path],
    findings: Findings,
) -> None:
    where = table.where(place, quantity)
    if path is None:
        report_outside(findings, where, text)
    elif not is_file(path):
        near = ""
        few = findings.kept("missing-file") < MOST_ADVICE
        if few and is_folder(path.parent) and home.holds(path.parent):
            near = did_you_mean(path.name, sorted(one.name for one in path.parent.iterdir()))
        findings.add("missing-file", where, what,
                     f"add the file, or correct its name{near}", found=f"no file '{text}'",
                     expected=f"a file '{text}' in the day folder")  # fmt: skip
    else:
        long_files.append(path)
