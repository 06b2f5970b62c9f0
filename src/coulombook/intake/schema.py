"""The tables of a day and of a calibration: which columns, under which names, in which units, within which range."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from enum import StrEnum
from functools import cached_property

from coulombook.intake.grid import Cell
from coulombook.units import parse_head


class Content(StrEnum):
    """What the cells of a column hold."""

    WORDS = "words"
    NUMBER = "number"
    INSTANT = "date and time"
    YES_NO = "yes or no"


@dataclass(frozen=True, slots=True)
class Range:
    """What values are possible, in SI; ``text`` says it in words."""

    text: str
    low: float = float("-inf")
    high: float = float("inf")
    open_low: bool = False  # the lowest value itself is impossible

    def holds(self, value: float) -> bool:
        """Whether a value is possible."""
        return (value > self.low if self.open_low else value >= self.low) and value <= self.high


ABOVE_ZERO = Range("a number above zero", 0.0, open_low=True)
ZERO_OR_MORE = Range("zero or a number above zero", 0.0)
SHARE = Range("a value from 0 to 1 (0 to 100 %)", 0.0, 1.0)
# common practice, no source: water-based electrolytes; catches degC written under K and the other way round
ELECTROLYTE_TEMPERATURE = Range("a temperature from 200 K to 500 K", 200.0, 500.0)
# concentrated acid and alkali go a little beyond 0 to 14
PH = Range("a pH from -2 to 16", -2.0, 16.0)


@dataclass(frozen=True, slots=True)
class Column:
    """One column.

    ``head`` is the head the contract gives it, ``quantity / unit``. ``dimension`` is None for words, pure numbers and
    raw detector readings; a raw reading takes any unit, none is converted.
    """

    head: str
    content: Content = Content.WORDS
    dimension: str | None = None
    needed: bool = False
    range: Range | None = None
    synonyms: tuple[str, ...] = ()
    raw: bool = False

    @property
    def quantity(self) -> str:
        """The quantity in small letters, as records and [[uncertainty]] name it."""
        return parse_head(self.head).quantity

    @property
    def unit(self) -> str | None:
        """The usual unit."""
        return parse_head(self.head).unit


def words(head: str, *, needed: bool = False, synonyms: tuple[str, ...] = ()) -> Column:
    """A column of words."""
    return Column(head, needed=needed, synonyms=synonyms)


def number(
    head: str,
    dimension: str | None = None,
    range: Range | None = None,
    *,
    needed: bool = False,
    synonyms: tuple[str, ...] = (),
    raw: bool = False,
) -> Column:
    """A column of numbers."""
    return Column(head, Content.NUMBER, dimension, needed, range, synonyms, raw)


@dataclass(frozen=True)
class Schema:
    """One table: its name and columns."""

    name: str
    columns: tuple[Column, ...]

    @cached_property
    def by_name(self) -> Mapping[str, Column]:
        """Columns by quantity and synonym, in small letters."""
        found: dict[str, Column] = {}
        for column in self.columns:
            for name in (column.quantity, *column.synonyms):
                found[name.casefold()] = column
        return found

    @cached_property
    def by_quantity(self) -> Mapping[str, Column]:
        """Columns by quantity."""
        return {column.quantity: column for column in self.columns}

    @property
    def heads(self) -> tuple[str, ...]:
        """Every head, for suggestions."""
        return tuple(column.head for column in self.columns)

    def needed(self, given: frozenset[str] = frozenset()) -> tuple[Column, ...]:
        """Columns a table cannot do without, the quantities ``given`` elsewhere left out."""
        return tuple(column for column in self.columns if column.needed and column.quantity not in given)

    def score(self, cells: Sequence[Cell], given: frozenset[str] = frozenset()) -> float:
        """How well cells serve as heads: 1 when every needed quantity is there, else less; 0 when none is known."""
        known = {
            column.quantity
            for cell in cells
            if isinstance(cell, str) and (column := self.by_name.get(parse_head(cell).quantity))
        }
        if not known:
            return 0.0
        if all(column.quantity in known for column in self.needed(given)):
            return 1.0
        return len(known) / (len(self.columns) + 1)


_USE = Column("use", Content.YES_NO)

RUNS = Schema(
    "runs",
    (
        words("run", needed=True),
        words("catalyst", needed=True),
        words("electrode", needed=True),
        words("level"),
        number("set potential / V", "potential"),
        number("set current / mA", "current"),
        Column("started", Content.INSTANT),
        words("trace"),
        number("start / s", "time"),
        number("stop / s", "time"),
        number("electrode area / cm^2", "area", ABOVE_ZERO, needed=True, synonyms=("geometric area",)),
        number("pH", None, PH, needed=True),
        number("temperature / degC", "temperature", ELECTROLYTE_TEMPERATURE),
        number("pressure / kPa", "pressure", ABOVE_ZERO),
        number("resistance / ohm", "resistance", ZERO_OR_MORE, synonyms=("solution resistance",)),
        number("compensated", None, SHARE),
        number("inlet flow / sccm", "flow", ABOVE_ZERO),
        number("outlet flow / sccm", "flow", ABOVE_ZERO),
        number("tracer flow / sccm", "flow", ABOVE_ZERO),
        number("headspace / mL", "volume", ABOVE_ZERO, synonyms=("headspace volume",)),
        number("carbonate uptake / umol/s", "molar rate", ZERO_OR_MORE),
        words("note", synonyms=("notes", "remark")),
    ),
)
GAS = Schema(
    "gas",
    (
        words("run", needed=True),
        words("injection", needed=True),
        number("time / s", "time", needed=True),
        words("channel", needed=True),
        words("analyte", needed=True),
        number("peak area / pA s", None, ZERO_OR_MORE, needed=True, raw=True, synonyms=("area",)),
        _USE,
    ),
)
VIALS = Schema(
    "vials",
    (
        words("vial", needed=True),
        words("run"),
        words("compartment", needed=True),
        number("time / s", "time"),
        number("compartment volume / mL", "volume", ABOVE_ZERO),
        number("aliquot / mL", "volume", ABOVE_ZERO, needed=True),
        words("standard", needed=True, synonyms=("internal standard",)),
        number("standard amount / umol", "amount", ABOVE_ZERO, needed=True),
        words("role"),
        _USE,
    ),
)
LIQUID = Schema(
    "liquid",
    (
        words("vial", needed=True),
        words("analyte", needed=True),
        words("signal"),
        number("protons", None, ABOVE_ZERO, needed=True),
        number("integral", needed=True, raw=True),
        number("T1 / s", "time", ABOVE_ZERO, synonyms=("relaxation time",)),
        number("repetition time / s", "time", ABOVE_ZERO),
        number("flip angle / deg", "angle", ABOVE_ZERO),
    ),
)
SCANS = Schema(
    "scans",
    (
        words("electrode", needed=True),
        words("file", needed=True),
        number("scan rate / mV s^-1", "scan rate", ABOVE_ZERO, needed=True),
        number("electrode area / cm^2", "area", ABOVE_ZERO, needed=True, synonyms=("geometric area",)),
        number("cycle"),
        number("window low / V", "potential"),
        number("window high / V", "potential"),
        words("purpose"),
    ),
)
CHECKS = Schema(
    "checks",
    (
        Column("at", Content.INSTANT, needed=True),
        words("channel", needed=True),
        words("analyte", needed=True),
        number("mole fraction / ppm", "fraction", Range("a mole fraction above 0, at most 1", 0.0, 1.0, True),
               needed=True),
        number("peak area / pA s", None, ABOVE_ZERO, needed=True, raw=True, synonyms=("area",)),
    ),
)  # fmt: skip
SPECTRA = Schema(
    "spectra",
    (
        words("run"),
        words("electrode"),
        words("file", needed=True),
        words("purpose"),
    ),
)
DAY_TABLES: Mapping[str, Schema] = {
    one.name: one for one in (RUNS, GAS, VIALS, LIQUID, SCANS, CHECKS, SPECTRA)
}

GAS_STANDARDS = Schema(
    "standards",
    (
        words("channel", needed=True),
        words("analyte", needed=True),
        number("mole fraction / ppm", "fraction", SHARE, needed=True),
        number("u(mole fraction) / ppm", "fraction", ZERO_OR_MORE),
        number("peak area / pA s", None, ZERO_OR_MORE, needed=True, raw=True, synonyms=("area",)),
        words("parent"),
        number("u(parent) / %", "fraction", ZERO_OR_MORE),
    ),
)
LIQUID_STANDARDS = Schema(
    "standards",
    (
        words("analyte", needed=True),
        words("signal", needed=True),
        number("amount ratio", None, ZERO_OR_MORE, needed=True),
        number("u(amount ratio)", None, ZERO_OR_MORE),
        number("integral ratio", None, needed=True),
    ),
)

# E before I before j: the order in which records name them
TRACE = Schema(
    "trace",
    (
        number("t / s", "time", needed=True, synonyms=("time",)),
        number("E / V", "potential", needed=True, synonyms=("potential",)),
        number("I / mA", "current", synonyms=("current",)),
        number("j / mA cm^-2", "current density", synonyms=("current density",)),
        number("U / V", "potential", synonyms=("cell voltage",)),
    ),
)
VOLTAMMOGRAM = Schema(
    "voltammogram",
    (
        number("E / V", "potential", needed=True, synonyms=("potential",)),
        number("I / mA", "current", synonyms=("current",)),
        number("j / mA cm^-2", "current density", synonyms=("current density",)),
        number("t / s", "time", synonyms=("time",)),
        number("cycle"),
    ),
)
SPECTRUM = Schema(
    "spectrum",
    (
        number("f / Hz", "frequency", needed=True, synonyms=("frequency",)),
        number("Zre / ohm", "resistance", needed=True, synonyms=("real part",)),
        number("Zim / ohm", "resistance", needed=True, synonyms=("imaginary part",)),
    ),
)
