"""day.toml: values, defaults, faults."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date

import pytest
from tests.unit.intake.conftest import MINIATURE, Opened

from coulombook.balance.readings import Declared, FlowKind, OutletFlow
from coulombook.cell.potential import find_reference

Open = Callable[..., Opened]
WITH_REFERENCE = '[reference]\npotential = "0.210 V"\n'


def _day(open_changed: Open, toml: str, **changes: str) -> Opened:
    return open_changed({"day.toml": toml, **changes, "gas.csv": None, "vials.csv": None, "liquid.csv": None})


def test_every_key_of_the_contract_is_read(open_changed: Open) -> None:
    toml = """
[day]
title = "Annealed mesh against silver foam"
date = 2043-05-18
[reference]
electrode = "Ag/AgCl, 3 mol/L KCl"
potential = "0.210 V"
"temperature coefficient" = "-0.73 mV/K"
[gas]
outlet_flow = "tracer"
standard_temperature = "25 degC"
standard_pressure = "1 bar"
meter_gas = "wet"
current_window = "2 min"
dead_time = "10 s"
tracer = "N2"
feed_CO2 = "90 %"
[liquid]
combine_signals = "mean"
[surface]
specific_capacitance = "28 uF/cm^2"
[balance]
level = 0.9
unaccounted = "2 %"
"""
    opened = _day(open_changed, toml)
    assert opened.source.day is not None, list(opened.findings)
    settings = opened.source.day.settings
    assert settings.title == "Annealed mesh against silver foam"
    assert settings.date == date(2043, 5, 18)
    assert settings.reference_name == "Ag/AgCl, 3 mol/L KCl"
    assert settings.reference_volt == 0.210
    assert settings.reference_volt_per_kelvin == pytest.approx(-7.3e-4)
    assert settings.outlet_flow is OutletFlow.TRACER
    assert settings.standard_temperature_kelvin == pytest.approx(298.15)
    assert settings.standard_pressure_pascal == 1e5
    assert settings.meter_gas_wet
    assert (settings.current_window_second, settings.dead_time_second) == (120.0, 10.0)
    assert settings.tracer == "nitrogen"
    assert settings.feed_co2 == pytest.approx(0.9)
    assert not settings.weighted_signals
    assert settings.specific_capacitance_farad_per_m2 == pytest.approx(0.28)
    assert (settings.level_of_confidence, settings.unaccounted) == (0.9, pytest.approx(0.02))


def test_a_named_reference_takes_its_potential_from_the_table(open_changed: Open) -> None:
    opened = _day(open_changed, '[reference]\nelectrode = "Ag/AgCl, 3 mol/L KCl"\n')
    known = find_reference("Ag/AgCl, 3 mol/L KCl")
    assert known is not None
    assert opened.source.day is not None
    assert opened.source.day.settings.reference_volt == known.potential_volt
    assert opened.source.day.settings.reference_volt_per_kelvin == known.coefficient_volt_per_kelvin


def test_no_reference_and_an_unknown_one_are_faults(open_changed: Open) -> None:
    assert "[reference]" in _day(open_changed, "[day]\n").one("missing-value").where
    fault = _day(open_changed, '[reference]\nelectrode = "Ag/AgCl, 3 mol/L KC"\n').one("unknown-name")
    assert "did you mean 'Ag/AgCl, 3 mol/L KCl'" in fault.mend


def test_keys_may_be_written_with_blank_or_underscore(open_changed: Open) -> None:
    opened = _day(
        open_changed,
        WITH_REFERENCE + '[gas]\n"Dead Time" = "5 s"\n[surface]\n"specific capacitance" = "1 F/m^2"\n',
    )
    assert opened.source.day is not None
    assert opened.source.day.settings.dead_time_second == 5.0
    assert opened.source.day.settings.specific_capacitance_farad_per_m2 == 1.0


@pytest.mark.parametrize(
    ("toml", "kind", "where", "mend"),
    [
        ('[gas]\noutlet_flwo = "inlet"\n', "unknown-key", "row 4, [gas], key 'outlet_flwo'", "'outlet_flow'"),
        ("[gsa]\n", "unknown-key", "row 3, [gsa]", "'gas'"),
        ('[gas]\noutlet_flow = "inlett"\n', "not-allowed", "key 'outlet_flow'", "'inlet'"),
        ("[gas]\ndead_time = 5\n", "not-allowed", "key 'dead_time'", "correct the value"),
        ('[gas]\ndead_time = "5 V"\n', "wrong-dimension", "key 'dead_time'", "correct the unit"),
        ('[gas]\ndead_time = "5 snd"\n', "unknown-unit", "key 'dead_time'", "correct the unit"),
        ('[gas]\ndead_time = "soon"\n', "not-a-number", "key 'dead_time'", "correct the value"),
        ('[gas]\ncurrent_window = "0 s"\n', "not-allowed", "key 'current_window'", "correct the value"),
        ("[gas]\nfeed_CO2 = 2\n", "not-allowed", "key 'feed_CO2'", "correct the value"),
        ("[gas]\nfeed_CO2 = nan\n", "not-allowed", "key 'feed_CO2'", "correct the value"),
        ('[gas]\ntracer = "nitrogn"\n', "unknown-species", "key 'tracer'", "'nitrogen'"),
        ('[gas]\noutlet_flow = "tracer"\n', "missing-value", "[gas]", "'tracer'"),
        ('[day]\ndate = "yesterday"\n', "not-a-time", "key 'date'", "correct the value"),
        ('[day]\ncalibrations = "gc"\n', "not-allowed", "key 'calibrations'", "correct the value"),
        ('[day]\ncalibrations = ["../gc"]\n', "outside-folder", "key 'calibrations'", "copy"),
        ("[balance]\nlevel = 1.0\n", "not-allowed", "key 'level'", "correct the value"),
        ("[read.traces]\nskip = -1\n", "not-allowed", "key 'skip'", "correct the value"),
        ('[read.traces]\ncolumns = { Q = "x" }\n', "unknown-key", "key 'columns'", "delete"),
        ('[read.traces]\nsepartor = ";"\n', "unknown-key", "key 'separtor'", "'separator'"),
        ('[surface]\nsmooth_reference = "p1"\n', "unknown-name", "key 'smooth_reference'", "scans"),
        ('[species.x]\nformula = "C4N"\nphase = "gas"\n', "not-allowed", "key 'formula'", "correct the value"),
        ('[species.x]\nformula = "CO2"\nphase = "gas"\n', "not-allowed", "key 'formula'", "correct the value"),
        ('[species.x]\nformula = "C4H8"\n', "missing-value", "[species.x]", "'phase'"),
        ('[defaults]\n"pH " = "acid"\n', "not-a-number", "[defaults]", "correct the value"),
        ('[defaults]\n"electrode aera / cm^2" = 1\n', "unknown-key", "[defaults]", "'electrode area / cm^2'"),
        ('[defaults]\n"headspace / cm" = 1\n', "wrong-dimension", "[defaults]", "'headspace / mL'"),
        ('[defaults]\n"headspace / mL" = inf\n', "not-allowed", "[defaults]", "correct the value"),
        ("stray = 1\n", "unknown-key", "", "delete"),
        ("day = 1\n", "not-allowed", "key 'day'", "[day]"),
    ],
)  # fmt: skip
def test_a_fault_names_its_row_and_what_would_do(
    open_changed: Open, toml: str, kind: str, where: str, mend: str
) -> None:
    top = toml.startswith(("stray", "day"))
    opened = _day(open_changed, toml + WITH_REFERENCE if top else WITH_REFERENCE + toml)
    fault = opened.one(kind)
    assert fault.where.startswith("day.toml")
    assert where in fault.where
    assert mend in fault.mend
    assert opened.source.day is None


@pytest.mark.parametrize(
    ("content", "found"),
    [
        (b"[day]\ntitle = = 3\n", "'title = = 3'"),
        (b"[day\n", "'[day'"),
        (b"\xff\xfe\x00", "no utf-8"),
        (b"a = " + b"[" * 5000 + b"]" * 5000, "nested too deeply"),
    ],
)
def test_settings_that_are_no_toml_are_a_fault_with_the_line(
    open_changed: Open, content: bytes, found: str
) -> None:
    opened = open_changed({"day.toml": content})
    fault = opened.one("broken-settings")
    assert found in fault.found.lower()
    assert fault.where.startswith("day.toml")


def test_a_byte_order_mark_before_the_settings_does_no_harm(open_changed: Open) -> None:
    assert open_changed({"day.toml": b"\xef\xbb\xbf" + MINIATURE["day.toml"].encode()}).source.day is not None


def test_defaults_stand_for_columns_of_runs(open_changed: Open) -> None:
    toml = WITH_REFERENCE + (
        '[defaults]\n"electrode area / cm^2" = 2\npH = 7\n"inlet flow" = "20 sccm"\n'
        'catalyst = "foil"\n"temperature / K" = 300\n'
    )
    opened = _day(open_changed, toml, **{"runs.csv": "run,electrode\na1,m1\n"})
    assert opened.source.day is not None, list(opened.findings)
    (run,) = opened.source.day.runs
    assert (run.electrode_area_m2, run.pH, run.catalyst) == (pytest.approx(2e-4), 7.0, "foil")
    assert run.temperature_kelvin == 300.0
    assert run.inlet_flow is not None
    assert run.inlet_flow.kind is FlowKind.STANDARD
    # what day.toml says is no assumption; what nothing says is
    assert [one.text.split()[1] for one in opened.findings if one.kind == "assumed-default"] == ["pressure"]
    assert "0 ohm" in opened.one("resistance-missing").text


def _declared(open_changed: Open, entry: str) -> Opened:
    return _day(open_changed, WITH_REFERENCE + f"[[uncertainty]]\n{entry}\n")


@pytest.mark.parametrize(
    ("quantity", "standard", "relative", "absolute"),
    [
        ("inlet flow", '"1.0 %"', 0.01, None),
        ("Inlet_Flow", '"0.6 sccm"', None, 1e-8),
        ("temperature", '"0.5 degC"', None, 0.5),
        ("temperature coefficient", '"0.1 mV/K"', None, 1e-4),
        ("pH", '"0.05"', None, 0.05),
        ("pH", "0.05", None, 0.05),
        ("peak area", '"3"', None, 3.0),
        ("peak area", '"3 pA s"', None, 3.0),
        ("mole fraction", '"5 ppm"', None, 5e-6),
        ("feed_CO2", '"0.1 %"', 0.001, None),
        ("specific capacitance", '"2 uF/cm^2"', None, 0.02),
        ("potential", '"5 mV"', None, 0.005),
        ("E", '"1 mV"', None, 0.001),
        ("current", '"0.1 mA"', None, 1e-4),
    ],
)
def test_a_declared_uncertainty_is_relative_in_percent_and_else_absolute_in_si(
    open_changed: Open, quantity: str, standard: str, relative: float | None, absolute: float | None
) -> None:
    opened = _declared(open_changed, f'quantity = "{quantity}"\nstandard = {standard}\nshared = "run"')
    assert opened.source.day is not None, list(opened.findings)
    (one,) = opened.source.day.settings.declared
    called = {"current": "i"}.get(quantity, quantity.casefold().replace("_", " "))
    assert isinstance(one, Declared)
    assert (one.quantity, one.shared) == (called, "run")
    assert one.relative == (None if relative is None else pytest.approx(relative))
    assert one.absolute == (None if absolute is None else pytest.approx(absolute))
    assert one.origin.row == 5


@pytest.mark.parametrize(
    ("entry", "kind", "mend"),
    [
        ('quantity = "inlet flwo"\nstandard = "1 %"\nshared = "day"', "unknown-name", "'inlet flow'"),
        ('quantity = "catalyst"\nstandard = "1 %"\nshared = "day"', "unknown-name", "correct"),
        ('quantity = "pH"\nstandard = "1 %"\nshared = "dai"', "not-allowed", "'day'"),
        ('quantity = "pH"\nstandard = "1 %"', "missing-value", "'shared'"),
        ('quantity = "resistance"\nstandard = "1 V"\nshared = "day"', "wrong-dimension", "unit"),
        ('quantity = "resistance"\nstandard = "1"\nshared = "day"', "unknown-unit", "unit"),
        ('quantity = "resistance"\nstandard = 1\nshared = "day"', "not-a-number", "correct"),
        ('quantity = "pH"\nstandard = "-1 %"\nshared = "day"', "not-allowed", "correct"),
        ('quantity = "pH"\nstandrad = "1 %"\nstandard = "1 %"\nshared = "day"', "unknown-key", "delete"),
        (
            'quantity = "inlet flow"\nstandard = "1 mL/min"\nshared = "day"',
            "wrong-dimension",
            "unit of the column",
        ),
    ],
)
def test_a_declared_uncertainty_that_cannot_be_used_is_a_fault(
    open_changed: Open, entry: str, kind: str, mend: str
) -> None:
    assert mend in _declared(open_changed, entry).one(kind).mend


def test_one_quantity_may_have_a_shared_and_an_own_part_but_none_twice(open_changed: Open) -> None:
    first = 'quantity = "pH"\nstandard = 0.1\nshared = "{}"\n'
    two = first + '[[uncertainty]]\nquantity = "ph"\nstandard = 0.2\nshared = "{}"'
    assert _declared(open_changed, two.format("day", "run")).source.day is not None
    assert _declared(open_changed, two.format("day", "day")).one("duplicate").found == "'ph'"


def test_a_species_of_the_day_is_known_in_its_tables(open_changed: Open) -> None:
    species = '[species.butanol]\nformula = "C4H10O"\nphase = "liquid"\naliases = ["BuOH"]\n'
    opened = open_changed(
        {
            "day.toml": MINIATURE["day.toml"] + species,
            "liquid.csv": MINIATURE["liquid.csv"] + "v1,buoh,CH3,3,10\n",
        }
    )
    assert opened.source.day is not None
    assert opened.source.day.signals[-1].analyte == "butanol"
    assert opened.source.day.species["butanol"].electrons == 24  # 4 x 4 + 10 - 2
