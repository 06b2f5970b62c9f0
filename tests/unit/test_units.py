"""Heads, units and quantities at the edge."""

from __future__ import annotations

import sys

import pytest

from coulombook import units
from coulombook.units import (
    DIMENSIONS,
    UnitError,
    conversion,
    nearest,
    parse_head,
    parse_quantity,
    quantity_to_si,
)


def test_a_head_is_split_at_the_first_slash_between_blanks() -> None:
    assert parse_head("I / mA") == units.Head("i", "mA")
    assert parse_head("carbonate uptake / umol/s") == units.Head("carbonate uptake", "umol/s")
    assert parse_head("C2+/C1") == units.Head("c2+/c1", None)


def test_case_and_runs_of_blanks_of_a_head_do_not_matter() -> None:
    assert parse_head("  Peak\t AREA  /  pA  s ") == units.Head("peak area", "pA s")


@pytest.mark.parametrize(
    ("unit", "dimension", "factor"),
    [
        # SI prefixes and definitions (SI Brochure, 9th ed.): min 60 s, h 3600 s, L 1e-3 m^3, bar 1e5 Pa
        ("mA", "current", 1e-3),
        ("uA", "current", 1e-6),
        ("µA", "current", 1e-6),
        ("\N{GREEK SMALL LETTER MU}A", "current", 1e-6),
        ("cm^2", "area", 1e-4),
        ("cm²", "area", 1e-4),
        ("cm2", "area", 1e-4),
        ("mV s^-1", "scan rate", 1e-3),
        ("mV/s", "scan rate", 1e-3),
        ("mV s⁻¹", "scan rate", 1e-3),
        ("V min^-1", "scan rate", 1 / 60),
        ("ohm", "resistance", 1.0),
        ("Ω", "resistance", 1.0),
        ("kΩ", "resistance", 1e3),
        ("min", "time", 60.0),
        ("h", "time", 3600.0),
        ("d", "time", 86400.0),
        ("ppm", "fraction", 1e-6),
        ("ppb", "fraction", 1e-9),
        ("%", "fraction", 1e-2),
        ("umol/mol", "fraction", 1e-6),
        ("mA cm^-2", "current density", 10.0),
        ("mA cm-2", "current density", 10.0),
        ("mA/cm^2", "current density", 10.0),
        ("mA/(cm^2)", "current density", 10.0),
        ("uF/cm^2", "capacitance per area", 1e-2),
        ("mbar", "pressure", 100.0),
        ("torr", "pressure", 101325 / 760),
        ("mV/degC", "potential per temperature", 1e-3),
        ("mV/°C", "potential per temperature", 1e-3),
        ("umol/s", "molar rate", 1e-6),
        ("mmol h^-1", "molar rate", 1e-3 / 3600),
    ],
)
def test_the_units_of_the_bench_become_si(unit: str, dimension: str, factor: float) -> None:
    how = conversion(unit, dimension)
    assert how.factor == pytest.approx(factor, rel=1e-12)  # rounding of a few multiplications
    assert how.offset == 0.0


def test_a_temperature_keeps_its_offset_and_a_difference_does_not() -> None:
    assert quantity_to_si("25 degC", "temperature") == pytest.approx(298.15, rel=1e-15)
    assert quantity_to_si("77 degF", "temperature") == pytest.approx(298.15, rel=1e-12)
    assert quantity_to_si("0.5 degC", "temperature", difference=True) == 0.5
    assert quantity_to_si("0.5 K", "temperature") == 0.5


@pytest.mark.parametrize(
    ("unit", "kind", "factor"),
    [
        ("sccm", "standard", 1e-6 / 60),
        ("SCCM", "standard", 1e-6 / 60),
        ("slpm", "standard", 1e-3 / 60),
        ("slm", "standard", 1e-3 / 60),
        ("mslpm", "standard", 1e-6 / 60),
        ("mL/min", "actual", 1e-6 / 60),
        ("mL min^-1", "actual", 1e-6 / 60),
        ("m^3/h", "actual", 1 / 3600),
        ("umol/s", "molar", 1e-6),
        ("kmol/d", "molar", 1e3 / 86400),
    ],
)
def test_a_flow_tells_standard_from_actual_volume_and_amount(unit: str, kind: str, factor: float) -> None:
    how = conversion(unit, "flow")
    assert how.flow_kind == kind
    assert how.factor == pytest.approx(factor, rel=1e-12)


def test_a_standard_volume_rate_is_no_molar_rate_and_no_power() -> None:
    for dimension in ("molar rate", "current"):
        with pytest.raises(UnitError) as caught:
            conversion("sccm", dimension)
        assert caught.value.kind == "wrong-dimension"


def test_an_unknown_unit_says_what_would_do_and_the_nearest() -> None:
    with pytest.raises(UnitError, match="sccm, mL/min or umol/s; did you mean 'sccm'") as caught:
        conversion("sccn", "flow")
    assert caught.value.kind == "unknown-unit"
    with pytest.raises(UnitError, match="did you mean 'kPa'"):
        conversion("kpa", "pressure")


@pytest.mark.parametrize(
    "text",
    [
        "",
        "9^9^9^9",
        "m^9^9^9^9",
        "2 m",
        "__import__",
        "x" * 1000,
        "m s)(",
        "dBm",
        "mA;",
        "mm^999999999",
        "'a'",
    ],
)
def test_text_that_is_no_unit_is_refused_at_once(text: str) -> None:
    with pytest.raises(UnitError) as caught:
        conversion(text, "time")
    assert caught.value.kind == "unknown-unit"


def test_every_everyday_spelling_agrees_with_pint() -> None:
    for si, spellings in units._EVERYDAY.items():
        for text, entry in spellings.items():
            factor, offset = entry if isinstance(entry, tuple) else (entry, 0.0)
            through = units._through_pint(text)
            assert through is not None, text
            assert through[0] == si, text
            assert through[1:] == pytest.approx((factor, offset), rel=1e-12), text


def test_every_dimension_shows_units_that_would_do() -> None:
    for dimension in DIMENSIONS.values():
        for example in dimension.examples:
            conversion(example, dimension.name)


def test_a_quantity_is_a_number_with_a_decimal_point_and_a_unit() -> None:
    assert parse_quantity(" 28 uF/cm^2 ") == units.ParsedQuantity(28.0, "uF/cm^2")
    assert parse_quantity("\N{MINUS SIGN}5e-3 V") == units.ParsedQuantity(-0.005, "V")
    assert parse_quantity(".5") == units.ParsedQuantity(0.5, "")
    assert quantity_to_si("28 uF/cm^2", "capacitance per area") == pytest.approx(0.28, rel=1e-15)
    assert quantity_to_si("-0.73 mV/K", "potential per temperature") == pytest.approx(-7.3e-4, rel=1e-15)


@pytest.mark.parametrize("text", ["", "V", "1,5 V", "1.5.5 V", "1 000 s", "nan V", "inf s", "1e999 V"])
def test_text_that_is_no_quantity_is_refused(text: str) -> None:
    with pytest.raises(ValueError, match=r"no number with a unit|too large"):
        parse_quantity(text)


def test_the_nearest_name_minds_no_case() -> None:
    assert nearest("OUTLET flwo", ["inlet flow", "outlet flow"]) == "outlet flow"
    assert nearest("xyz", ["inlet flow"]) is None


def test_everyday_units_never_build_the_registry() -> None:
    import subprocess

    code = (
        "import sys; from coulombook.units import conversion, quantity_to_si; conversion('mL min^-1', 'flow'); "
        "conversion('mA cm-2', 'current density'); quantity_to_si('28 uF/cm^2', 'capacitance per area'); "
        "sys.exit('pint' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
