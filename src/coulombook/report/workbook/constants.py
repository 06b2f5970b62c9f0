"""The sheet of constants: of nature, and of the day."""

from __future__ import annotations

from statistics import NormalDist
from typing import NamedTuple

from coulombook.amounts.water import SATURATION_COEFFICIENTS
from coulombook.balance.readings import OutletFlow
from coulombook.book import Cell
from coulombook.constants import FARADAY_CONSTANT, GAS_CONSTANT
from coulombook.report.workbook.cells import FIRST_ROW, Column, Kind, Sheet
from coulombook.report.workbook.place import KPA, MICROFARAD_PER_CM2, Account
from coulombook.species import oxygen_potential_rhe_volt

SHEET = "constants"


class _Constant(NamedTuple):
    name: str
    quantity: str
    value: Cell
    unit: str
    source: str
    kind: Kind = Kind.ENTERED
    formula: str | None = None


def constants_sheet(account: Account) -> Sheet:
    """One row per constant; each value is a cell with a name, by which the formulas call it."""
    rows = [*_of_nature(), *_of_the_day(account), *_of_water(account)]
    sheet = Sheet(
        SHEET, "Constants", "Numbers that hold for every run; formulas call them by name.", len(rows)
    )
    sheet.text("name", [one.name for one in rows], "as formulas call it")
    sheet.text("quantity", [one.quantity for one in rows])
    letter = sheet.add(
        Column(
            "value",
            Kind.FORMULA,
            [one.value for one in rows],
            "in the unit beside it",
            [one.formula for one in rows],
            kinds=[one.kind for one in rows],
            exact=True,
        )
    )
    sheet.text("unit", [one.unit for one in rows])
    sheet.text("from", [one.source for one in rows], "where it comes from", wide=True)
    sheet.names.update(
        (one.name, f"${letter}${FIRST_ROW + number}") for number, one in enumerate(rows) if one.name
    )
    return sheet


def _of_nature() -> list[_Constant]:
    si = "SI Brochure, 9th ed., 2019: exact"
    return [
        _Constant("Faraday_constant", "Faraday constant F", FARADAY_CONSTANT, "C/mol", si, Kind.COMPUTED),
        _Constant("gas_constant", "molar gas constant R", GAS_CONSTANT, "J/(mol K)", si, Kind.COMPUTED),
    ]


def _of_the_day(account: Account) -> list[_Constant]:
    settings = account.settled.plan.settings
    day = "day.toml, or its default"
    level = settings.level_of_confidence
    rows = [
        _Constant(
            "standard_temperature",
            "temperature of a standard volume",
            settings.standard_temperature_kelvin,
            "K",
            day,
        ),
        _Constant(
            "standard_pressure",
            "pressure of a standard volume",
            settings.standard_pressure_pascal * KPA,
            "kPa",
            day,
        ),
        _Constant("feed_CO2", "mole fraction of CO2 in the feed", settings.feed_co2, "", day),
        _Constant(
            "reference_potential",
            "reference electrode against SHE at 25 degC" + _named(settings.reference_name),
            settings.reference_volt,
            "V",
            day,
        ),
        _Constant(
            "reference_coefficient",
            "its change with temperature",
            settings.reference_volt_per_kelvin,
            "V/K",
            day,
        ),
        _Constant(
            "oxygen_potential",
            "O2/H2O at equilibrium, vs RHE",
            oxygen_potential_rhe_volt(),
            "V",
            "Gibbs energies of the shipped species",
            Kind.COMPUTED,
        ),
        _Constant("level_of_confidence", "level of confidence", level, "", day),
        _Constant(
            "coverage_factor",
            "two-sided normal quantile of that level",
            NormalDist().inv_cdf(0.5 + level / 2),
            "",
            "from the level",
            Kind.FORMULA,
            "=NORMSINV(0.5+level_of_confidence/2)",
        ),
        _Constant(
            "unaccounted",
            "share that nothing measures, prior standard deviation",
            settings.unaccounted or 0.0,
            "",
            day,
        ),
        _Constant(
            "",
            "outlet flow found by",
            str(settings.outlet_flow),
            "",
            day,
            Kind.TEXT,
        ),
    ]
    capacitance = settings.specific_capacitance_farad_per_m2
    if capacitance is not None:
        rows.append(
            _Constant(
                "specific_capacitance",
                "specific capacitance of a smooth surface",
                capacitance * MICROFARAD_PER_CM2,
                "uF/cm^2",
                settings.specific_capacitance_source or day,
            )
        )
    return rows


def _of_water(account: Account) -> list[_Constant]:
    settings = account.settled.plan.settings
    if settings.outlet_flow is not OutletFlow.MEASURED or not settings.meter_gas_wet:
        return []
    return [
        _Constant(
            f"water_n{number}",
            f"vapour pressure of water, n{number}",
            value,
            "",
            "IAPWS R7-97(2012), table 34",
            Kind.COMPUTED,
        )
        for number, value in enumerate(SATURATION_COEFFICIENTS)
        if number
    ]


def _named(name: str | None) -> str:
    return f", {name}" if name else ""
