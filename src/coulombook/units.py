"""Units at the edges: heads `quantity / unit`, quantities with a unit as text, factors to SI.

This is the only place that knows pint. The everyday spellings of the bench stand in a small table of their own, so
that an ordinary day never pays for pint's registry (about 0.4 s); every entry of it is tested against pint.
"""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import pint

# What standard-volume units carry beside volume per time: it keeps them apart from actual volumes.
_STANDARD_GAS = "standard_gas"


@dataclass(frozen=True, slots=True)
class Dimension:
    """A kind of quantity, the SI unit its values are carried in, and units that would do, the usual one first."""

    name: str
    si: tuple[str, ...]  # "flow" may be written in any of several
    examples: tuple[str, ...]

    @property
    def expected(self) -> str:
        """What to write, for a message: `a unit of current, such as mA, uA or A`."""
        first, last = self.examples[:-1], self.examples[-1]
        listed = f"{', '.join(first)} or {last}" if first else last
        return f"a unit of {self.name}, such as {listed}"


_MOLAR = "mol/s"
_VOLUME_RATE = "m^3/s"
_STANDARD_RATE = f"{_STANDARD_GAS} m^3/s"
_FLOW_KIND = {_MOLAR: "molar", _STANDARD_RATE: "standard", _VOLUME_RATE: "actual"}

DIMENSIONS: dict[str, Dimension] = {
    one.name: one
    for one in (
        Dimension("time", ("s",), ("s", "min", "h")),
        Dimension("potential", ("V",), ("V", "mV")),
        Dimension("current", ("A",), ("mA", "uA", "A")),
        Dimension("current density", ("A/m^2",), ("mA cm^-2", "A m^-2")),
        Dimension("area", ("m^2",), ("cm^2", "mm^2", "m^2")),
        Dimension("temperature", ("K",), ("degC", "K")),
        Dimension("pressure", ("Pa",), ("kPa", "bar", "Pa")),
        Dimension("resistance", ("ohm",), ("ohm", "mohm")),
        Dimension("flow", (_STANDARD_RATE, _VOLUME_RATE, _MOLAR), ("sccm", "mL/min", "umol/s")),
        Dimension("volume", ("m^3",), ("mL", "uL", "L")),
        Dimension("amount", ("mol",), ("umol", "mmol", "mol")),
        Dimension("molar rate", (_MOLAR,), ("umol/s", "mol/s")),
        Dimension("scan rate", ("V/s",), ("mV s^-1", "V/s")),
        Dimension("fraction", ("1",), ("%", "ppm")),
        Dimension("potential per temperature", ("V/K",), ("mV/K", "V/K")),
        Dimension("capacitance per area", ("F/m^2",), ("uF/cm^2", "F/m^2")),
        Dimension("frequency", ("1/s",), ("Hz", "kHz")),
        Dimension("angle", ("1",), ("deg", "rad")),
    )
}

# SI unit -> everyday spelling -> factor, or (factor, offset): SI value = factor x value + offset. Spellings are those
# that `_tidy` leaves behind. A speed-up only: what is missing here is read by pint.
_EVERYDAY: dict[str, dict[str, float | tuple[float, float]]] = {
    "s": {"s": 1.0, "ms": 1e-3, "min": 60.0, "h": 3600.0},
    "V": {"V": 1.0, "mV": 1e-3},
    "A": {"A": 1.0, "mA": 1e-3, "uA": 1e-6, "nA": 1e-9},
    "A/m^2": {"mA/cm^2": 10.0, "uA/cm^2": 1e-2, "A/cm^2": 1e4, "A/m^2": 1.0},
    "m^2": {"cm^2": 1e-4, "mm^2": 1e-6, "m^2": 1.0},
    "K": {"K": 1.0, "degC": (1.0, 273.15)},
    "Pa": {"Pa": 1.0, "hPa": 100.0, "kPa": 1e3, "MPa": 1e6, "bar": 1e5, "mbar": 100.0, "atm": 101325.0},
    "ohm": {"ohm": 1.0, "mohm": 1e-3, "kohm": 1e3},
    _STANDARD_RATE: {"sccm": 1e-6 / 60, "slpm": 1e-3 / 60, "slm": 1e-3 / 60},
    _VOLUME_RATE: {
        "mL/min": 1e-6 / 60, "ml/min": 1e-6 / 60, "mL/s": 1e-6, "mL/h": 1e-6 / 3600,
        "L/min": 1e-3 / 60, "L/h": 1e-3 / 3600, "cm^3/min": 1e-6 / 60,
    },
    "m^3": {"mL": 1e-6, "ml": 1e-6, "uL": 1e-9, "L": 1e-3, "cm^3": 1e-6, "m^3": 1.0},
    "mol": {"mol": 1.0, "mmol": 1e-3, "umol": 1e-6, "nmol": 1e-9},
    _MOLAR: {
        "mol/s": 1.0, "mmol/s": 1e-3, "umol/s": 1e-6, "nmol/s": 1e-9, "umol/min": 1e-6 / 60,
        "mmol/min": 1e-3 / 60, "mmol/h": 1e-3 / 3600,
    },
    "V/s": {"mV/s": 1e-3, "V/s": 1.0},
    "1": {"1": 1.0, "%": 1e-2, "percent": 1e-2, "ppm": 1e-6, "rad": 1.0, "deg": math.pi / 180.0},
    "V/K": {"mV/K": 1e-3, "V/K": 1.0, "mV/degC": 1e-3},
    "F/m^2": {"uF/cm^2": 1e-2, "mF/cm^2": 10.0, "F/m^2": 1.0},
    "1/s": {"Hz": 1.0, "kHz": 1e3, "MHz": 1e6, "mHz": 1e-3},
}  # fmt: skip

_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻", "0123456789-")
_SIGNS = str.maketrans(
    {
        "\N{MICRO SIGN}": "u",
        "\N{GREEK SMALL LETTER MU}": "u",
        "\N{OHM SIGN}": "ohm",
        "\N{GREEK CAPITAL LETTER OMEGA}": "ohm",
        "\N{DEGREE CELSIUS}": "degC",
        "\N{MIDDLE DOT}": " ",
        "\N{DOT OPERATOR}": " ",
        "\N{MINUS SIGN}": "-",
    }
)
_TERM = r"(?:1|[^\W\d]\w*(?:\^-?\d{1,2}(?:\.\d)?)?)"
_UNIT = re.compile(rf"\(?\s*{_TERM}(?:[\s*/()]+{_TERM})*\s*\)?")
_SYMBOLS = {one.casefold(): one for one in ("I", "E", "U", "pH", "T1", "CO2")}
_POWER = re.compile(r"(?<=[A-Za-z])(-?\d{1,2})(?!\w)")
_QUANTITY = re.compile(r"\s*([+\-−]?\s*(?:\d+\.?\d*|\.\d+)(?:[eE][+\-−]?\d+)?)\s*(.*?)\s*", re.DOTALL)
_LONGEST_UNIT = 60  # characters; no unit of the trade comes near


# In any unit of the trade a number is zero or between these; beyond them sums and ratios overflow.
LARGEST_NUMBER = 1e30
SMALLEST_NUMBER = 1e-60


def is_of_ordinary_size(number: float) -> bool:
    """Whether a number is zero or of a size that can be computed with; False for NaN and infinity.

    >>> is_of_ordinary_size(-6e23), is_of_ordinary_size(1e300), is_of_ordinary_size(float("nan"))
    (True, False, False)
    """
    return number == 0.0 or SMALLEST_NUMBER <= abs(number) <= LARGEST_NUMBER


class UnitError(ValueError):
    """A unit that cannot be used: ``kind`` is the kind of finding, the other fields its parts."""

    def __init__(self, kind: str, found: str, expected: str, suggestion: str | None) -> None:
        self.kind = kind
        self.found = found
        self.expected = expected
        self.suggestion = suggestion
        hint = f"; did you mean '{suggestion}'?" if suggestion else ""
        super().__init__(f"unit '{found}', expected {expected}{hint}")


@dataclass(frozen=True, slots=True)
class Conversion:
    """How a unit becomes SI: factor x value + offset.

    ``flow_kind`` is "molar", "standard" or "actual" when the dimension is a flow, else None.
    """

    factor: float
    offset: float = 0.0
    flow_kind: str | None = None


@dataclass(frozen=True, slots=True)
class Head:
    """A table head: the quantity in small letters, and the unit as written (None: a pure number or words)."""

    quantity: str
    unit: str | None


def parse_head(text: str) -> Head:
    """Quantity and unit of a head, split at the first slash between blanks.

    >>> parse_head("Peak  Area / pA s"), parse_head("pH")
    (Head(quantity='peak area', unit='pA s'), Head(quantity='ph', unit=None))
    """
    folded = " ".join(text.split())
    quantity, slash, unit = folded.partition(" / ")
    return Head(quantity.casefold(), unit if slash else None)


@cache
def conversion(unit: str, dimension: str) -> Conversion:
    """How values of ``unit`` become SI values of a dimension of `DIMENSIONS`.

    Raises `UnitError`: "unknown-unit" when nobody knows the unit, "wrong-dimension" when it measures something else.

    >>> conversion("mA", "current")
    Conversion(factor=0.001, offset=0.0, flow_kind=None)
    """
    wanted = DIMENSIONS[dimension]
    tidy = _tidy(unit)
    found = _everyday(tidy) or _through_pint(tidy)
    if found is None:
        raise UnitError("unknown-unit", unit, wanted.expected, _nearest_unit(tidy, wanted))
    si, factor, offset = found
    if si not in wanted.si:
        raise UnitError("wrong-dimension", unit, wanted.expected, None)
    return Conversion(factor, offset, _FLOW_KIND[si] if dimension == "flow" else None)


@dataclass(frozen=True, slots=True)
class ParsedQuantity:
    """A number and the unit text that follows it ("" for a pure number)."""

    number: float
    unit: str


def parse_quantity(text: str) -> ParsedQuantity:
    """Number and unit of a text such as ``28 uF/cm^2``.

    Raises ValueError when the text does not start with a finite number with a decimal point.

    >>> parse_quantity("-0.73 mV/K")
    ParsedQuantity(number=-0.73, unit='mV/K')
    """
    match = _QUANTITY.fullmatch(text)
    if match is None or match[2][:1] in {",", "."} or match[2][:1].isdigit():
        raise ValueError(f"'{text}' is no number with a unit")
    number = float(match[1].replace("−", "-").replace(" ", ""))
    if not is_of_ordinary_size(number):
        raise ValueError(f"'{text}' is too large or too small a number")
    return ParsedQuantity(number, match[2])


def quantity_to_si(text: str, dimension: str, *, difference: bool = False) -> float:
    """SI value of a quantity written with its unit, as in ``28 uF/cm^2``.

    ``difference`` says that the text is a step or an uncertainty, for which 1 degC is 1 K. Raises ValueError when the
    text is no number, `UnitError` when the unit will not do.

    >>> quantity_to_si("28 uF/cm^2", "capacitance per area"), quantity_to_si("0 degC", "temperature")
    (0.28, 273.15)
    """
    parsed = parse_quantity(text)
    how = conversion(parsed.unit or "1", dimension)
    return parsed.number * how.factor + (0.0 if difference else how.offset)


def written(quantity: str) -> str:
    """A quantity as people write it: its symbols in their own case, where heads are matched without regard to it."""
    return " ".join(_SYMBOLS.get(word, word) for word in quantity.split())


def nearest(text: str, known: Sequence[str], cutoff: float = 0.6) -> str | None:
    """The entry of ``known`` most like ``text``, without regard to case, or None."""
    by_key: dict[str, str] = {}
    for one in known:
        by_key.setdefault(one.casefold(), one)
    close = difflib.get_close_matches(text.casefold(), list(by_key), n=1, cutoff=cutoff)
    return by_key[close[0]] if close else None


def _tidy(unit: str) -> str:
    """One spelling for the ways a unit is typed: micro sign, ohm sign, degree sign, powers with or without caret."""
    text = " ".join(unit.translate(_SIGNS).translate(_SUPERSCRIPTS).split()).replace("**", "^")
    text = text.replace("°C", "degC").replace("° C", "degC").replace(" / ", "/")
    text = _POWER.sub(r"^\1", text)  # "mA cm-2" and "cm2" are written without a caret more often than with it
    if text.casefold() in {"sccm", "slpm", "slm"}:
        return text.casefold()
    return text


def _everyday(tidy: str) -> tuple[str, float, float] | None:
    # "mV s^-1" and "mV/s" are one entry
    key = re.sub(r"^(\w+)[ *]+(\w+)\^-(\d)$", r"\1/\2^\3", tidy).removesuffix("^1")
    for si, spellings in _EVERYDAY.items():
        if key in spellings:
            entry = spellings[key]
            return (si, *entry) if isinstance(entry, tuple) else (si, entry, 0.0)
    return None


def _nearest_unit(tidy: str, wanted: Dimension) -> str | None:
    spellings = [*wanted.examples, *(text for si in wanted.si for text in _EVERYDAY[si])]
    return nearest(tidy, spellings, cutoff=0.5)


@cache
def registry() -> pint.UnitRegistry[Any]:
    """The one pint registry, built on first use (about 0.4 s with pint's import)."""
    import pint

    # pint's own slpm is a power (pressure times volume rate); here a standard volume rate stays apart from both
    built: pint.UnitRegistry[Any] = pint.UnitRegistry(
        autoconvert_offset_to_baseunit=True, on_redefinition="ignore"
    )
    built.define(f"{_STANDARD_GAS} = [{_STANDARD_GAS}]")
    for name, volume in (("sccm", "cm**3"), ("slpm", "liter"), ("slm", "liter")):
        built.define(f"{name} = {_STANDARD_GAS} * {volume} / min")
    for name, value in (("ppb", 1e-9), ("ppmv", 1e-6), ("ppbv", 1e-9)):
        built.define(f"{name} = {value}")
    return built


@cache
def _through_pint(tidy: str) -> tuple[str, float, float] | None:
    """SI unit, factor and offset by pint, or None when it does not know the unit.

    A known unit of a dimension that no column has gets its base units as SI unit.
    """
    # Only names, signs and small powers reach pint: a number raised to a number could be made to fill the memory.
    if len(tidy) > _LONGEST_UNIT or not _UNIT.fullmatch(tidy.replace("%", "percent")):
        return None
    ureg = registry()
    try:
        unit = ureg.parse_units(tidy.replace("%", "percent"))
        offset = float(ureg.Quantity(0.0, unit).to_base_units().magnitude)
        step = ureg.Quantity(1.0, unit).to_base_units()
        twice = float(ureg.Quantity(2.0, unit).to_base_units().magnitude)
    except Exception:  # pint raises a zoo of errors for text it cannot read; all mean the same here
        return None
    factor = float(step.magnitude) - offset
    if abs(twice - 2 * factor - offset) > 1e-9 * abs(twice):
        return None  # a logarithmic unit is no factor
    if offset == 0.0:
        factor = float(step.magnitude)
    for si in _EVERYDAY:
        if step.is_compatible_with(_pint_si(si)):
            return si, factor * _base_factor(si), offset * _base_factor(si)
    return str(step.units), factor, offset


def _pint_si(si: str) -> Any:
    return registry().Unit("dimensionless" if si == "1" else si)


@cache
def _base_factor(si: str) -> float:
    """How many of ``si`` make one of pint's base units of that dimension: 1 for SI base units."""
    return float(registry().Quantity(1.0, _pint_si(si)).to_base_units().magnitude) ** -1
