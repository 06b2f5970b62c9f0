"""day.toml: what holds for the day, the defaults of runs, species of its own, how traces are read."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from datetime import date, datetime
from pathlib import PurePosixPath
from typing import TYPE_CHECKING, Any

from coulombook.balance.readings import DaySettings, Declared, OutletFlow
from coulombook.findings import Findings
from coulombook.intake import schema
from coulombook.intake.clock import CLOCK, DAY_FIRST, ELAPSED, MONTH_FIRST
from coulombook.intake.files import did_you_mean
from coulombook.intake.schema import Column, Content
from coulombook.intake.tables import Default, instant_of, unit_conversion
from coulombook.intake.toml_text import Section, Settings, fold, section, shown
from coulombook.species import Species, SpeciesTable, parse_formula
from coulombook.units import UnitError, conversion, is_of_ordinary_size, parse_head, parse_quantity

if TYPE_CHECKING:
    from coulombook.cell.specific_capacitance import SpecificCapacitance

_SECTIONS = (
    "day", "reference", "defaults", "gas", "liquid", "surface", "balance", "kinetics", "read", "uncertainty", "species",
)  # fmt: skip

# Keys of day.toml that an [[uncertainty]] may name, with their dimensions.
_UNCERTAIN_KEYS: Mapping[str, str] = {
    "potential": "potential",
    "temperature coefficient": "potential per temperature",
    "standard temperature": "temperature",
    "standard pressure": "pressure",
    "current window": "time",
    "dead time": "time",
    "feed co2": "fraction",
    "specific capacitance": "capacitance per area",
}
_UNCERTAIN_SCHEMAS = (*schema.DAY_TABLES.values(), schema.TRACE)
_SHARED = ("day", "run", "reading")


@dataclass(frozen=True, slots=True)
class TraceOptions:
    """[read.traces]: what cannot be guessed.

    ``columns`` maps a quantity of the trace (t, E, I, j, U in small letters) to the head as written in the file and
    the unit given with the key, if any.
    """

    columns: Mapping[str, tuple[str, str | None]]
    separator: str | None = None
    decimal: str | None = None
    skip: int | None = None
    time: str | None = None  # "elapsed" or "clock": what hours, minutes and seconds count from
    dates: str | None = None  # "day first" or "month first", where the year stands last
    clock_put_forward: bool = False  # a step of an hour is the beginning of summer time
    files: Mapping[str, TraceOptions] = field(default_factory=dict)  # of single files, complete, by path

    def of(self, name: str) -> TraceOptions:
        """The options of one file, by its path relative to the day folder."""
        return self.files.get(PurePosixPath(name).as_posix(), self)


@dataclass(frozen=True, slots=True)
class DayFile:
    """All of day.toml. ``declared_flow_kinds`` has one entry per declared uncertainty: the kind of a flow, or None."""

    settings: DaySettings
    species: SpeciesTable
    defaults: Mapping[str, Default]
    traces: TraceOptions
    declared_flow_kinds: tuple[str | None, ...]
    source: Settings


def read_day_settings(source: Settings, species: SpeciesTable, findings: Findings) -> DayFile:
    """Typed settings of a day; every fault goes to ``findings``, and the defaults stand for what is at fault."""
    _report_unknown_sections(source, findings)
    table = _species(source, species, findings)
    values = DaySettings()
    values = _day(section(source, "day", findings), values)
    values = _reference(section(source, "reference", findings), values)
    values = _gas(section(source, "gas", findings), values, table)
    values = _liquid(section(source, "liquid", findings), values)
    values = _surface(section(source, "surface", findings), values)
    values = _balance(section(source, "balance", findings), values)
    values = _kinetics(section(source, "kinetics", findings), values)
    declared, kinds = _declared(source, findings)
    return DayFile(
        replace(values, declared=declared),
        table,
        _defaults(section(source, "defaults", findings)),
        _trace_options(source, findings),
        kinds,
        source,
    )


def _report_unknown_sections(source: Settings, findings: Findings) -> None:
    for name in source.content:
        if fold(name) not in _SECTIONS:
            is_section = isinstance(source.content[name], dict | list)
            findings.add(
                "unknown-key",
                source.where(name) if is_section else source.where("", name),
                "the section is not known" if is_section else "the key stands in no section",
                f"correct or delete it{did_you_mean(name, _SECTIONS)}",
                found=f"[{name}]" if is_section else f"'{name}'",
                expected=", ".join(f"[{one}]" for one in _SECTIONS),
            )


def _day(part: Section, values: DaySettings) -> DaySettings:
    title = part.text("title")
    day = date_of(part, "date")
    calibrations = part.texts("calibrations", "a list of names, such as ['gc-2043-04']")
    part.report_unknown()
    seen: list[str] = []
    for name in calibrations or ():
        if name in seen:
            part.fault("duplicate", "calibrations", "a calibration is named twice", name, "each name once")
        else:
            seen.append(name)
    return replace(values, title=title or "", date=day, calibrations=tuple(seen))


def date_of(part: Section, key: str) -> date | None:
    """A date: as TOML writes it, or as text of ISO 8601."""
    value = part.value(key)
    if value is None:
        return None
    if isinstance(value, datetime):
        return value.date()
    if isinstance(value, date):
        return value
    if isinstance(value, str):
        try:
            return date.fromisoformat(value.strip())
        except ValueError:
            pass
    part.fault("not-a-time", key, "the value must be a date", value, "a date such as 2043-05-18")
    return None


def _reference(part: Section, values: DaySettings) -> DaySettings:
    from coulombook.cell.potential import find_reference, reference_names

    name = part.text("electrode", "the name of a reference electrode")
    potential = part.quantity("potential", "potential", "0.210 V")
    coefficient = part.quantity("temperature coefficient", "potential per temperature", "-0.73 mV/K")
    part.report_unknown()
    known = find_reference(name) if name is not None else None
    if name is not None and known is None and not part.has("potential"):
        part.findings.add(
            "unknown-name",
            part.where("electrode"),
            "the reference electrode is not in the table",
            "write a name of the table, or give the potential against SHE at 25 degC as the key 'potential'"
            + did_you_mean(name, reference_names()),
            found=f"'{name}'",
            expected=", ".join(f"'{one}'" for one in reference_names()),
        )
    if name is None and not part.has("potential") and not part.has("electrode"):
        part.findings.add(
            "missing-value",
            part.where(),
            "the reference electrode is not given",
            "add the key 'electrode', or the key 'potential' with the potential against SHE at 25 degC",
            found="nothing",
            expected="[reference] with electrode = 'Ag/AgCl, 3 mol/L KCl' or potential = '0.210 V'",
        )
    if potential is None:
        potential = known.potential_volt if known is not None else 0.0
    if coefficient is None:
        coefficient = known.coefficient_volt_per_kelvin if known is not None else 0.0
    return replace(
        values,
        reference_name=known.name if known is not None else name,
        reference_volt=potential,
        reference_volt_per_kelvin=coefficient,
    )


def _gas(part: Section, values: DaySettings, species: SpeciesTable) -> DaySettings:
    outlet = part.choice("outlet_flow", [one.value for one in OutletFlow])
    temperature = _positive(part, "standard_temperature", "temperature", "0 degC")
    pressure = _positive(part, "standard_pressure", "pressure", "101.325 kPa")
    meter = part.choice("meter_gas", ["dry", "wet"])
    window = _positive(part, "current_window", "time", "120 s")
    dead_time = part.quantity("dead_time", "time", "0 s")
    if dead_time is not None and dead_time < 0:
        part.fault(
            "not-allowed", "dead_time", "the value is not possible", part.value("dead_time"), "0 s or more"
        )
        dead_time = None
    feed = part.share("feed_CO2", "a mole fraction above 0, at most 1")
    if feed == 0:
        part.fault(
            "not-allowed", "feed_CO2", "the value is not possible", feed, "a mole fraction above 0, at most 1"
        )
        feed = None
    text = part.text("tracer", "the name of a gas, such as 'nitrogen'")
    part.report_unknown()
    tracer = None
    if text is not None:
        found = species.find(text)
        if found is None:
            part.findings.add(
                "unknown-species",
                part.where("tracer"),
                "the tracer is not in the table of species",
                f"correct the name, or add a section [species.{text}]{did_you_mean(text, species.names())}",
                found=f"'{text}'",
                expected="a species by name, formula or alias",
            )
        else:
            tracer = found.name
    elif outlet == OutletFlow.TRACER:
        part.findings.add(
            "missing-value",
            part.where(),
            "outlet_flow = 'tracer' needs the tracer's name",
            "add the key 'tracer'",
            found="nothing",
            expected="tracer = 'nitrogen', or another gas that the cell does not make",
        )
    return replace(
        values,
        outlet_flow=OutletFlow(outlet) if outlet else values.outlet_flow,
        standard_temperature_kelvin=_or(temperature, values.standard_temperature_kelvin),
        standard_pressure_pascal=_or(pressure, values.standard_pressure_pascal),
        meter_gas_wet=meter == "wet",
        current_window_second=_or(window, values.current_window_second),
        dead_time_second=_or(dead_time, values.dead_time_second),
        tracer=tracer,
        feed_co2=_or(feed, values.feed_co2),
    )


def _or(value: float | None, otherwise: float) -> float:
    return otherwise if value is None else value


def _positive(part: Section, key: str, dimension: str, example: str) -> float | None:
    value = part.quantity(key, dimension, example)
    if value is not None and not value > 0:
        part.fault("not-allowed", key, "the value is not possible", part.value(key), "a value above zero")
        return None
    return value


def _liquid(part: Section, values: DaySettings) -> DaySettings:
    combine = part.choice("combine_signals", ["weighted", "mean"])
    part.report_unknown()
    return replace(values, weighted_signals=combine != "mean")


def _surface(part: Section, values: DaySettings) -> DaySettings:
    specific = _positive(part, "specific_capacitance", "capacitance per area", "28 uF/cm^2")
    smooth = part.text("smooth_reference", "the name of an electrode of scans")
    material = part.text("material", "a material of the shipped table, such as 'copper'")
    electrolyte = part.text("electrolyte", "an electrolyte, such as '0.1 mol/L KHCO3'")
    part.report_unknown()
    given = [key for key in ("specific_capacitance", "smooth_reference", "material") if part.has(key)]
    if len(given) > 1:
        part.findings.add(
            "not-allowed",
            part.where(given[-1]),
            "two references of roughness are given",
            "delete one of them",
            found=" and ".join(given),
            expected="one of them",
        )
    shipped = _of_table(part, material, electrolyte)
    if shipped is not None and specific is None:
        return replace(
            values,
            specific_capacitance_farad_per_m2=shipped.farad_per_m2,
            u_specific_capacitance=shipped.relative_uncertainty,
            specific_capacitance_source=f"{shipped.material} in {shipped.electrolyte}, {shipped.source}",
            smooth_reference=smooth,
        )
    return replace(values, specific_capacitance_farad_per_m2=specific, smooth_reference=smooth)


def _of_table(part: Section, material: str | None, electrolyte: str | None) -> SpecificCapacitance | None:
    """The value of the shipped table for the day's material and electrolyte; None without them, or with a fault."""
    from coulombook.cell.specific_capacitance import (
        find_electrolyte,
        find_material,
        known_electrolytes,
        known_materials,
        specific_capacitance,
    )

    if not part.has("material") and not part.has("electrolyte"):
        return None
    for key, other in (("material", "electrolyte"), ("electrolyte", "material")):
        if not part.has(key):
            part.findings.add("missing-value", part.where(other), f"'{other}' is given without '{key}'",
                              f"add the key '{key}'", found="nothing", expected="both, or neither")  # fmt: skip
    if material is None or electrolyte is None:
        return None
    own, kind = find_material(material), find_electrolyte(electrolyte)
    found = specific_capacitance(material, electrolyte)
    if found is None:
        key, text, known = (
            ("material", material, known_materials())
            if own is None
            else ("electrolyte", electrolyte, known_electrolytes(own))
        )
        part.findings.add(
            "unknown-name",
            part.where(key),
            f"the shipped table has no specific capacitance of this {key}"
            + (f" for {own}" if own is not None and kind is not None else ""),
            f"give specific_capacitance or smooth_reference{did_you_mean(text, known)}",
            found=f"'{text}'",
            expected=", ".join(f"'{one}'" for one in known),
        )
    return found


def _kinetics(part: Section, values: DaySettings) -> DaySettings:
    onset = _positive(part, "onset", "current density", "0.1 mA cm^-2")
    part.report_unknown()
    return replace(
        values, onset_current_density_ampere_per_m2=_or(onset, values.onset_current_density_ampere_per_m2)
    )


def _balance(part: Section, values: DaySettings) -> DaySettings:
    level = part.share("level", "a value between 0 and 1, such as 0.95")
    if level in (0.0, 1.0):
        part.fault(
            "not-allowed",
            "level",
            "the value is not possible",
            level,
            "a value between 0 and 1, such as 0.95",
        )
        level = None
    unaccounted = part.share("unaccounted", "a share such as '2 %'")
    part.report_unknown()
    return replace(
        values, level_of_confidence=_or(level, values.level_of_confidence), unaccounted=unaccounted
    )


def _species(source: Settings, table: SpeciesTable, findings: Findings) -> SpeciesTable:
    whole = section(source, "species", findings)
    fresh: list[Species] = []
    for written, content in whole.content.items():
        name = " ".join(written.split())
        if not isinstance(content, dict):
            whole.fault(
                "not-allowed",
                written,
                "the name is that of a species",
                content,
                f"a section [species.{name}]",
            )
            continue
        part = Section(source, f"{whole.name}.{written}", content, findings)
        formula = part.text("formula", "a formula such as 'C4H10O'")
        phase = part.choice("phase", ["gas", "liquid"])
        aliases = part.texts("aliases")
        carrier = part.typed("carrier", bool, "true or false")
        part.report_unknown()
        for key in ("formula", "phase"):
            if not part.has(key) and not (key == "formula" and carrier):
                findings.add(
                    "missing-value",
                    part.where(),
                    f"the species has no {key}",
                    f"add the key '{key}'",
                    found="nothing",
                    expected="formula = 'C4H10O'"
                    if key == "formula"
                    else "phase = 'gas' or phase = 'liquid'",
                )
        composition = None
        if formula is not None:
            try:
                composition = parse_formula(formula)
            except ValueError as error:
                if not carrier:
                    part.fault(
                        "not-allowed", "formula", str(error), formula, "atoms of C, H and O, such as 'C4H10O'"
                    )
            else:
                if composition.electrons < 1 and not carrier:
                    part.fault(
                        "not-allowed",
                        "formula",
                        f"no reduction of CO2 gives it: {composition.electrons} electrons a molecule",
                        formula,
                        "a product that takes up electrons, or carrier = true",
                    )
        fresh.append(
            Species(name, formula or name, phase or "gas", aliases or (), bool(carrier), composition)
        )
    return table.extended(fresh) if fresh else table


def _defaults(part: Section) -> dict[str, Default]:
    defaults: dict[str, Default] = {}
    for key, value in part.content.items():
        head = parse_head(key.replace("_", " "))
        column = schema.RUNS.by_name.get(head.quantity)
        if column is None or column.quantity == "run":
            heads = [one.head for one in schema.RUNS.columns if one.quantity != "run"]
            names = [*heads, *(one.quantity for one in schema.RUNS.columns if one.quantity != "run")]
            part.findings.add(
                "unknown-key",
                part.settings.where(part.name, key),
                "the key is no column of runs",
                f"correct or delete the key{did_you_mean(key, names)}",
                found=f"'{key}'",
                expected="a head of runs, such as 'electrode area / cm^2'",
            )
            continue
        default = _default_of(part, key, head.unit, column, value)
        if default is not None:
            defaults[column.quantity] = default
    return defaults


def _default_of(part: Section, key: str, unit: str | None, column: Column, value: Any) -> Default | None:
    if column.content is Content.NUMBER:
        return _default_number(part, key, unit, column, value)
    if column.content is Content.INSTANT:
        instant = instant_of(value)
        if instant is None:
            part.fault("not-a-time", key, "the value must be a date and a time of day", value, "a date-time")
            return None
        return Default(instant)
    if not isinstance(value, str):
        part.fault("not-allowed", key, "the value has the wrong type", value, "text in quotes")
        return None
    return Default(value.strip())


def _default_number(part: Section, key: str, unit: str | None, column: Column, value: Any) -> Default | None:
    expected = column.range.text if column.range else "a number"
    number: float
    if isinstance(value, str) and unit is None:
        # the unit may stand with the value instead of with the head
        try:
            parsed = parse_quantity(value)
        except ValueError:
            part.fault("not-a-number", key, "the value must be a number", value, expected)
            return None
        number, unit = parsed.number, parsed.unit or None
    elif isinstance(value, int | float) and not isinstance(value, bool):
        number = float(value)
    else:
        part.fault("not-a-number", key, "the value must be a number", value, expected)
        return None
    try:
        how = unit_conversion(column, unit)
    except UnitError as error:
        part.findings.add(
            error.kind,
            part.settings.where(part.name, key),
            "the unit measures something else"
            if error.kind == "wrong-dimension"
            else "the unit is not known",
            f"write the key as '{column.head}'"
            + (f"; did you mean '{error.suggestion}'?" if error.suggestion else ""),
            found=f"unit '{unit}'" if unit else "no unit",
            expected=error.expected,
        )
        return None
    number = number * how.factor + how.offset
    # the range test also turns away NaN and infinity, which TOML can write
    if not is_of_ordinary_size(number) or (column.range and not column.range.holds(number)):
        part.fault("not-allowed", key, "the value is not possible", value, expected)
        return None
    return Default(number, how.flow_kind)


_FILE_NAME = re.compile(r".*[./\\].*", re.DOTALL)  # of a log; no key has a point or slash


def _trace_options(source: Settings, findings: Findings) -> TraceOptions:
    whole = section(source, "read", findings)
    content = whole.value("traces")
    whole.report_unknown()
    if content is not None and not isinstance(content, dict):
        whole.fault(
            "not-allowed", "traces", "the name is that of a section", content, "a section [read.traces]"
        )
        content = None
    content = content or {}
    of_files = {
        key: value for key, value in content.items() if isinstance(value, dict) and _FILE_NAME.fullmatch(key)
    }
    shared = {key: value for key, value in content.items() if key not in of_files}
    section_name = f"{whole.name}.traces"
    common = _options_of(Section(source, section_name, shared, findings), TraceOptions({}))
    files = {
        PurePosixPath(key.strip().replace("\\", "/")).as_posix(): _options_of(
            Section(source, f"{section_name}.{key}", value, findings), common
        )
        for key, value in of_files.items()
    }
    return replace(common, files=files)


def _options_of(part: Section, otherwise: TraceOptions) -> TraceOptions:
    """The options of a section; what it leaves open is as ``otherwise``."""
    names = {"comma": ",", "semicolon": ";", "tab": "\t", "blank": " "}
    separator = part.text("separator", "',' or ';' or 'tab'")
    if separator is not None:
        separator = names.get(separator.strip().casefold(), separator)
        if separator not in names.values():
            part.fault(
                "not-allowed",
                "separator",
                "the separator is not known",
                separator,
                "',' or ';' or 'tab' or 'blank'",
            )
            separator = None
    separator = separator or otherwise.separator
    decimal = part.choice("decimal", [".", ",", "point", "comma"])
    decimal = {"point": ".", "comma": ","}.get(decimal or "", decimal) or otherwise.decimal
    if decimal is not None and decimal == separator:
        part.fault(
            "not-allowed", "decimal", "the decimal sign is the separator as well", decimal, "another sign"
        )
        decimal = None
    skip = part.typed("skip", int, "the number of lines above the heads")
    if skip is not None and skip < 0:
        part.fault(
            "not-allowed", "skip", "the value is not possible", skip, "the number of lines above the heads"
        )
        skip = None
    columns = part.typed("columns", dict, "columns = { t = 'Time', E = 'Potential', I = 'Current' }")
    time = part.choice("time", [ELAPSED, CLOCK])
    dates = part.choice("dates", [DAY_FIRST, MONTH_FIRST])
    forward = part.typed("clock_put_forward", bool, "true or false")
    part.report_unknown()
    return TraceOptions(
        {**otherwise.columns, **_trace_columns(part, columns or {})},
        separator,
        decimal,
        otherwise.skip if skip is None else skip,
        time or otherwise.time,
        dates or otherwise.dates,
        otherwise.clock_put_forward if forward is None else forward,
    )


def _trace_columns(part: Section, columns: Mapping[str, Any]) -> dict[str, tuple[str, str | None]]:
    mapped: dict[str, tuple[str, str | None]] = {}
    for key, text in columns.items():
        head = parse_head(key)
        column = schema.TRACE.by_name.get(head.quantity)
        if column is None:
            part.findings.add(
                "unknown-key",
                part.where("columns"),
                "the key is no column of a trace",
                f"correct or delete the key{did_you_mean(key, list(schema.TRACE.by_name))}",
                found=f"'{key}'",
                expected="t, E, I, j or U",
            )
        elif not isinstance(text, str) or not text.strip():
            part.fault(
                "not-allowed",
                "columns",
                f"the head of '{key}' must be text",
                text,
                "the head as it stands in the file",
            )
        else:
            mapped[column.quantity] = (" ".join(text.split()), head.unit)
    return mapped


def numeric_columns() -> dict[str, Column]:
    """Every numeric column of the tables and of a trace, by quantity."""
    return {
        column.quantity: column
        for table in _UNCERTAIN_SCHEMAS
        for column in table.columns
        if column.content is Content.NUMBER
    }


def _declared(source: Settings, findings: Findings) -> tuple[tuple[Declared, ...], tuple[str | None, ...]]:
    entries: Any = next((value for key, value in source.content.items() if fold(key) == "uncertainty"), [])
    if isinstance(entries, dict):
        entries = [entries]
    if not isinstance(entries, list) or not all(isinstance(one, dict) for one in entries):
        findings.add(
            "not-allowed",
            source.where("", "uncertainty"),
            "the name is that of a section",
            "write each declared uncertainty as a section [[uncertainty]]",
            found=shown(entries),
            expected="sections [[uncertainty]]",
        )
        return (), ()
    declared: list[Declared] = []
    kinds: list[str | None] = []
    for place, content in enumerate(entries, 1):
        part = Section(source, f"uncertainty#{place}", content, findings)
        read = _declared_one(part)
        part.report_unknown()
        if read is None:
            continue
        one, kind = read
        if any(one.quantity == other.quantity and one.shared == other.shared for other in declared):
            part.fault("duplicate", "quantity", "the uncertainty is declared twice", one.quantity,
                       f"'{one.quantity}' shared by the {one.shared} once")  # fmt: skip
            continue
        declared.append(one)
        kinds.append(kind)
    return tuple(declared), tuple(kinds)


def _declared_one(part: Section) -> tuple[Declared, str | None] | None:
    name = part.text("quantity", "the name of a column or key")
    standard = part.value("standard")
    shared = part.choice("shared", _SHARED)
    for key, expected in (
        ("quantity", "a numeric column of the tables, or a key of day.toml"),
        ("standard", "'1.0 %', or a value with its unit"),
        ("shared", "'day', 'run' or 'reading'"),
    ):
        if not part.has(key):
            part.findings.add("missing-value", part.where(), f"the entry has no key '{key}'", f"add the key '{key}'",
                              found="nothing", expected=expected)  # fmt: skip
    if name is None or standard is None or shared is None:
        return None
    columns = numeric_columns()
    quantity = fold(parse_head(name).quantity)
    synonym = next(
        (table.by_name[quantity] for table in _UNCERTAIN_SCHEMAS if quantity in table.by_name), None
    )
    column = columns.get(quantity)
    # "potential" is the reference's: its key comes before the long name of a trace's column
    if column is None and quantity not in _UNCERTAIN_KEYS and synonym is not None:
        column = columns.get(synonym.quantity)
    if column is None and quantity not in _UNCERTAIN_KEYS:
        part.fault(
            "unknown-name",
            "quantity",
            "the quantity is no numeric column and no key",
            name,
            "a numeric column of the tables, or a key of day.toml",
            did_you_mean(quantity, [*columns, *_UNCERTAIN_KEYS]),
        )
        return None
    raw = column is not None and column.raw
    dimension = _UNCERTAIN_KEYS[quantity] if column is None else (column.dimension or "fraction")
    size = _size(part, standard, dimension, raw=raw, unit_needed=dimension != "fraction" and not raw)
    if size is None:
        return None
    relative, absolute, kind = size
    called = quantity if column is None else column.quantity
    return Declared(called, relative, absolute, shared, part.origin("standard")), kind


def _size(
    part: Section, standard: Any, dimension: str, *, raw: bool, unit_needed: bool
) -> tuple[float | None, float | None, str | None] | None:
    """Relative size, absolute size in SI and kind of flow of a declared uncertainty; None after a fault."""
    expected = "zero or a number above zero, with '%' (relative) or with a unit (absolute), such as '1.0 %'"
    if isinstance(standard, int | float) and not isinstance(standard, bool) and not unit_needed:
        number, unit = float(standard), ""
    else:
        try:
            parsed = parse_quantity(standard) if isinstance(standard, str) else None
        except ValueError:
            parsed = None
        if parsed is None:
            part.fault(
                "not-a-number", "standard", "the standard uncertainty cannot be read", standard, expected
            )
            return None
        number, unit = parsed.number, parsed.unit
    if not (number >= 0 and is_of_ordinary_size(number)):
        part.fault("not-allowed", "standard", "a standard uncertainty is not negative", standard, expected)
        return None
    if unit == "%":
        return number / 100, None, None
    if raw:
        return None, number, None  # detector units are never converted
    if not unit and not unit_needed:
        return None, number, None
    try:
        how = conversion(unit, dimension)
    except UnitError as error:
        part.unit_fault("standard", standard, error)
        return None
    # an uncertainty is a difference: 0.5 degC is 0.5 K
    return None, number * how.factor, how.flow_kind
