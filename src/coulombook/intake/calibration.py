"""Calibration folders: calibration.toml and standards.csv become the standards of each curve."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from coulombook.balance.readings import Calibration, CurveOptions, FloatArray, StandardSet
from coulombook.findings import Findings
from coulombook.intake import schema
from coulombook.intake.files import (
    Folder,
    did_you_mean,
    is_folder,
    read_bytes,
    report_outside,
    unreadable,
)
from coulombook.intake.grid import grid_of_text
from coulombook.intake.limits import LARGEST_TABLE_BYTE
from coulombook.intake.settings import date_of
from coulombook.intake.tables import TypedTable, typed_table
from coulombook.intake.text import UnreadableText
from coulombook.intake.toml_text import Section, Settings, fold, read_settings, section
from coulombook.species import SpeciesTable

_FORMS = ("line", "line through zero", "quadratic")
_WEIGHTS = ("equal", "1/x", "1/x^2", "replicates", "both")
_LIMITS = ("ISO 11843-2", "ICH residual", "ICH blank", "Hubaux-Vos")

# channel (or signal) without regard to case, and trade name of the analyte
CurveKey = tuple[str, str]


def find_calibrations(
    names: Sequence[str],
    day: Folder,
    calibration_folders: Sequence[Path],
    species: SpeciesTable,
    where: str,
    findings: Findings,
) -> tuple[tuple[Calibration, ...], tuple[Folder, ...]]:
    """The calibrations a day names, and their folders with the files read.

    Each is looked for in the day's own folder ``calibrations``, then in ``calibration_folders`` in order.
    """
    calibrations: list[Calibration] = []
    folders: list[Folder] = []
    own = day.root / "calibrations"
    places = [own, *(place for place in calibration_folders if place.resolve() != own.resolve())]
    for name in names:
        folder = _locate(name, day, places, where, findings)
        if folder is None:
            continue
        folders.append(folder)
        one = read_calibration(folder, name, species, findings)
        if one is not None:
            calibrations.append(one)
    _report_double_curves(calibrations, findings)
    return tuple(calibrations), tuple(folders)


def _locate(name: str, day: Folder, places: Sequence[Path], where: str, findings: Findings) -> Folder | None:
    if not name.strip() or name in {".", ".."} or any(sign in name for sign in "/\\:\0"):
        report_outside(findings, where, name)
        return None
    for place in places:
        path = place / name
        if is_folder(path):
            # a folder of calibrations may itself be a link when it was named on purpose; the day's own may not
            root = day.root if place == places[0] else place
            if not Folder(root).holds(path):
                report_outside(findings, where, path.name)
                return None
            return Folder(path, f"calibrations/{name}")
    known: list[str] = []
    for place in places:
        if place.is_dir():
            known += sorted(one.name for one in place.iterdir() if one.is_dir())
    looked = " or ".join(
        "<day>/calibrations"
        if place == places[0]
        else str(place)
        if place.is_absolute()
        else f"./{place.as_posix()}"
        for place in places
    )
    findings.add(
        "missing-calibration",
        where,
        "the calibration cannot be found",
        f"add the folder to one of them, or correct the name{did_you_mean(name, known)}",
        found=f"'{name}'",
        expected=f"a folder '{name}' in {looked}",
    )
    return None


def read_calibration(
    folder: Folder, name: str, species: SpeciesTable, findings: Findings
) -> Calibration | None:
    """One calibration folder, or None after a fault."""
    settings = read_settings(
        folder,
        folder.root / "calibration.toml",
        findings,
        'add the file; the line kind = "gas" or kind = "liquid" is enough to begin with',
    )
    table_path = next(
        (path for suffix in (".csv", ".tsv") if (path := folder.root / f"standards{suffix}").exists()),
        folder.root / "standards.csv",
    )
    data = read_bytes(folder, table_path, LARGEST_TABLE_BYTE, findings)
    if settings is None:
        return None
    top = Section(settings, "", settings.content, findings)
    kind = top.choice("kind", ["gas", "liquid"])
    measured = date_of(top, "measured_on")
    until = date_of(top, "valid_until")
    top.value("curve")
    top.report_unknown()
    if not top.has("kind"):
        findings.add("missing-value", settings.file, "the calibration has no kind", "add the key 'kind' on top",
                     found="nothing", expected="kind = 'gas' or kind = 'liquid'")  # fmt: skip
    if kind is None or data is None:
        return None
    columns = schema.GAS_STANDARDS if kind == "gas" else schema.LIQUID_STANDARDS
    try:
        grid = grid_of_text(data, folder.name_of(table_path), columns.score)
    except UnreadableText as error:
        unreadable(findings, folder.name_of(table_path), error.found, error.expected)
        return None
    table = typed_table(grid, columns, findings)
    options, overrides = _options(settings, species, findings)
    standards = _standard_sets(name, kind, table, species, options, overrides, findings)
    standards = _with_borrowed(name, kind, settings, standards, overrides, findings)
    return Calibration(name, kind, measured, until, tuple(standards.values()), settings.origin(""))


def _options(
    settings: Settings, species: SpeciesTable, findings: Findings
) -> tuple[CurveOptions, dict[CurveKey, tuple[CurveOptions, str]]]:
    """The options for every curve, and those of single curves by key with their section's name."""
    whole = section(settings, "curve", findings)
    plain = {key: value for key, value in whole.content.items() if not isinstance(value, dict)}
    part = Section(settings, whole.name, plain, findings)
    general = _curve_options(part, CurveOptions())
    part.report_unknown()
    overrides: dict[CurveKey, tuple[CurveOptions, str]] = {}
    for written, content in whole.content.items():
        if not isinstance(content, dict):
            continue
        part = Section(settings, f"{whole.name}.{written}", content, findings)
        key = _curve_key(written, species, part, findings)
        options = _curve_options(part, general)
        text = part.text("like", "another curve, such as 'ethylene@FID'")
        part.report_unknown()
        if key is None:
            continue
        if text is not None:
            like = _curve_key(text, species, part, findings)
            if like is None:
                continue
            options = replace(options, like=f"{like[1]}@{like[0]}")
        if key in overrides:
            part.fault("duplicate", "", "the curve has two sections", written, "one section a curve")
        overrides[key] = options, part.name
    return general, overrides


def _curve_options(part: Section, otherwise: CurveOptions) -> CurveOptions:
    form = part.choice("form", _FORMS)
    weights = part.choice("weights", _WEIGHTS)
    limits = part.choice("limits", _LIMITS)
    return CurveOptions(form or otherwise.form, weights or otherwise.weights, limits or otherwise.limits)


def _curve_key(text: str, species: SpeciesTable, part: Section, findings: Findings) -> CurveKey | None:
    analyte, at, channel = text.rpartition("@")
    if not at or not analyte.strip() or not channel.strip():
        findings.add(
            "unknown-key",
            part.where(),
            "the curve's name lacks a part",
            "write analyte and channel with '@' between them, in quotes",
            found=f"'{text}'",
            expected="a curve such as 'ethylene@FID' (liquid: 'formate@CH')",
        )
        return None
    found = species.find(analyte)
    if found is None:
        _report_species(findings, part.where(), analyte, species)
        return None
    return " ".join(channel.split()).casefold(), found.name


def _report_species(findings: Findings, where: object, analyte: str, species: SpeciesTable) -> None:
    findings.add(
        "unknown-species",
        where,
        "the analyte is not in the table of species",
        f"correct the name, or add a section [species.{analyte}] to day.toml{did_you_mean(analyte, species.names())}",
        found=f"'{analyte}'",
        expected="a species by name, formula or alias",
    )


def _standard_sets(
    name: str,
    kind: str,
    table: TypedTable,
    species: SpeciesTable,
    general: CurveOptions,
    overrides: Mapping[CurveKey, tuple[CurveOptions, str]],
    findings: Findings,
) -> dict[CurveKey, StandardSet]:
    gas = kind == "gas"
    channels = table.words("channel" if gas else "signal")
    analytes = table.words("analyte")
    x = table.numbers("mole fraction" if gas else "amount ratio")
    y = table.numbers("peak area" if gas else "integral ratio")
    u_quantity = "u(mole fraction)" if gas else "u(amount ratio)"
    u_x = table.numbers(u_quantity)
    parents = table.words("parent") if gas else [""] * len(table)
    u_parents = table.numbers("u(parent)") if gas else [None] * len(table)
    if not len(table) and not (table.schema.needed() and len(table.heads) < 1):
        findings.add("missing-value", table.table_origin, "the table of standards has no rows", "add the standards",
                     found="heads alone", expected="a row for each standard")  # fmt: skip
    rows: dict[CurveKey, list[int]] = {}
    spelling: dict[CurveKey, str] = {}
    for place, analyte in enumerate(analytes):
        if not analyte:
            continue
        found = species.find(analyte)
        if found is None:
            _report_species(findings, table.where(place, "analyte"), analyte, species)
            continue
        if place in table.broken:
            continue
        channel = " ".join(channels[place].split())
        key = channel.casefold(), found.name
        rows.setdefault(key, []).append(place)
        spelling.setdefault(key, channel)
    sets: dict[CurveKey, StandardSet] = {}
    for key, places in rows.items():
        given = [place for place in places if u_x[place] is not None]
        if given and len(given) < len(places):
            missing = next(place for place in places if u_x[place] is None)
            findings.add(
                "missing-value",
                table.where(missing, u_quantity),
                "the cell is empty while other standards of the curve give their uncertainty",
                "fill in the uncertainty of every standard of a curve, or of none",
                found="nothing",
                expected="a number",
            )
        named = any(parents[place] for place in places)
        sets[key] = StandardSet(
            name,
            kind,
            spelling[key],
            key[1],
            overrides[key][0] if key in overrides else general,
            _array([x[place] for place in places]),
            _array([y[place] for place in places]),
            _array([u_x[place] for place in places]) if given else None,
            tuple(parents[place] for place in places) if named else None,
            _array([u_parents[place] or 0.0 for place in places]) if named else None,
            tuple(table.row_origin(place) for place in places),
        )
    _check_parents(table, parents, u_parents, findings)
    return sets


def _array(values: Sequence[float | None]) -> FloatArray:
    array = np.array([0.0 if one is None else one for one in values], dtype=float)
    array.setflags(write=False)
    return array


def _check_parents(
    table: TypedTable, parents: Sequence[str], u_parents: Sequence[float | None], findings: Findings
) -> None:
    """One cylinder has one uncertainty."""
    seen: dict[str, float | None] = {}
    for place, parent in enumerate(parents):
        if parent and seen.setdefault(parent, u_parents[place]) != u_parents[place]:
            findings.add(
                "not-allowed",
                table.where(place, "u(parent)"),
                f"the parent cylinder '{parent}' has two uncertainties",
                "give the same uncertainty wherever the cylinder is named",
                found=f"{(u_parents[place] or 0) * 100:g} %",
                expected=f"{(seen[parent] or 0) * 100:g} %, as above",
            )


def _with_borrowed(
    name: str,
    kind: str,
    settings: Settings,
    standards: dict[CurveKey, StandardSet],
    overrides: Mapping[CurveKey, tuple[CurveOptions, str]],
    findings: Findings,
) -> dict[CurveKey, StandardSet]:
    """The standards, and one set without points for every curve that takes another's."""
    whole = dict(standards)
    own = {f"{analyte}@{channel}": (channel, analyte) for channel, analyte in standards}
    for key, (options, part) in overrides.items():
        title = f"{key[1]}@{key[0]}"
        if options.like is None:
            if key not in standards:
                findings.add(
                    "unknown-name",
                    settings.where(part),
                    "the curve has no standards",
                    f"add its standards, or the key 'like'{did_you_mean(title, list(own))}",
                    found=f"'{title}'",
                    expected="a curve of standards.csv",
                )
        elif key in standards:
            findings.add(
                "not-allowed",
                settings.where(part, "like"),
                "the curve has standards of its own",
                "delete the key 'like', or the standards",
                found=f"like = '{options.like}'",
                expected="a curve without standards",
            )
        elif options.like not in own:
            findings.add(
                "unknown-name",
                settings.where(part, "like"),
                "the curve to be taken has no standards",
                f"name a curve of standards.csv{did_you_mean(options.like, list(own))}",
                found=f"'{options.like}'",
                expected=", ".join(f"'{one}'" for one in own)[:300],
            )
        else:
            source = standards[own[options.like]]
            empty = np.zeros(0)
            empty.setflags(write=False)
            whole[key] = StandardSet(
                name, kind, source.channel, key[1],
                replace(options, like=f"{source.analyte}@{source.channel}"),
                empty, empty, None, None, None, (),
            )  # fmt: skip
            if key[0] != own[options.like][0]:
                findings.add(
                    "not-allowed",
                    settings.where(part, "like"),
                    "the curve to be taken is one of another channel",
                    "name a curve of the same channel",
                    found=f"'{options.like}'",
                    expected=f"a curve '...@{key[0]}'",
                )
    return whole


def _report_double_curves(calibrations: Sequence[Calibration], findings: Findings) -> None:
    seen: dict[tuple[str, str, str], str] = {}
    for calibration in calibrations:
        for one in calibration.standards:
            key = calibration.kind, fold(one.channel), one.analyte
            first = seen.setdefault(key, calibration.name)
            if first != calibration.name:
                findings.add(
                    "duplicate",
                    str(calibration.origin),
                    f"{one.analyte} on {one.channel} is calibrated by two calibrations of the day",
                    "name only one of them in day.toml, or delete the curve from one",
                    found=f"'{first}' and '{calibration.name}'",
                    expected="one curve for each analyte and channel",
                )
