"""Numbers as instruments write them: which sign parts decimals, which parts thousands, a unit behind them."""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from enum import StrEnum

_BLANKS = " \N{NO-BREAK SPACE}\N{NARROW NO-BREAK SPACE}\N{THIN SPACE}"
_APOSTROPHES = "'\N{RIGHT SINGLE QUOTATION MARK}"
_GROUPED = re.compile(
    rf"[+-]?\d{{1,3}}(?P<sign>[.,{_BLANKS}{_APOSTROPHES}])\d{{3}}(?:(?P=sign)\d{{3}})*(?P<rest>[.,]\d*)?",
    re.ASCII,
)
_EXPONENT = re.compile(r"[+-]?\d[.,]\d+[eE][+-]?\d{1,3}", re.ASCII)
_WITH_UNIT = re.compile(r"([+-]?[0-9.,]*[0-9][0-9.,]*(?:[eE][+-]?[0-9]{1,3})?)\s*([^\W\d_]\D*)")
_LONGEST = 60  # signs; no number of an instrument comes near, and patterns would take their time
_LIKE_A_NUMBER = re.compile(r"[+-]?[.,]?\d", re.ASCII)


class Habit(StrEnum):
    """How a number was written that is no plain one."""

    THOUSANDS = "thousands parted"
    EXPONENT = "the other decimal sign before an exponent"
    UNIT = "the unit in the cell"


@dataclass(frozen=True, slots=True)
class Written:
    """A number that is no plain one. ``sure`` is False where the sign between thousands may be a decimal sign."""

    number: float
    habit: Habit
    sign: str = ""
    unit: str = ""
    sure: bool = True


def tidy(text: str) -> str:
    """A cell without blanks around it and with the minus sign that programs know."""
    return text.strip().replace("\N{MINUS SIGN}", "-").replace("\N{EN DASH}", "-")


def is_like_a_number(text: str) -> bool:
    """Whether a cell begins as a number does."""
    return bool(_LIKE_A_NUMBER.match(tidy(text)))


def plain_number(cell: str, decimal: str) -> float:
    """The number of a cell of digits, sign, one decimal sign and exponent; ValueError for any other."""
    if decimal == ",":
        if "." in cell:
            raise ValueError(cell)
        cell = cell.replace(",", ".")
    if "_" in cell:  # Python reads "1_000" as a number; no instrument writes so
        raise ValueError(cell)
    return float(cell)


def written_number(cell: str, decimal: str) -> Written | None:
    """The number of a cell that is no plain one, where it can be told.

    >>> written_number("1.234,5", ","), written_number("1.234E-05", ",").number
    (Written(number=1234.5, habit=<Habit.THOUSANDS: 'thousands parted'>, sign='.', unit='', sure=True), 1.234e-05)
    >>> written_number("1.234", ",").sure
    False
    """
    text = tidy(cell)
    if len(text) > _LONGEST:
        return None
    grouped = _GROUPED.fullmatch(text)
    if grouped is not None and grouped["sign"] != decimal and (grouped["rest"] or decimal)[0] == decimal:
        sign = grouped["sign"]
        number = plain_number(text.replace(sign, ""), decimal)
        # a point or comma before a single group of three may be a decimal sign, if nothing stands behind
        sure = sign not in ".," or text.count(sign) > 1 or grouped["rest"] is not None
        return Written(number, Habit.THOUSANDS, sign, "", sure)
    if _EXPONENT.fullmatch(text):
        # one digit before the sign and an exponent: no program parts thousands so
        return Written(float(text.replace(",", ".")), Habit.EXPONENT)
    with_unit = _WITH_UNIT.fullmatch(text)
    if with_unit is not None:
        try:
            return Written(plain_number(with_unit[1], decimal), Habit.UNIT, "", with_unit[2].strip())
        except ValueError:
            return None
    return None


def votes_for_comma(cells: Iterable[str]) -> int:
    """How many more cells have a decimal comma than a decimal point.

    Of two signs in a cell the last is the decimal one, and one that stands twice parts thousands. Cells with an
    exponent count where there are no others: before an exponent some programs write a point whatever the country.
    """
    plain = with_exponent = 0
    told = False
    for cell in cells:
        commas, points = cell.count(","), cell.count(".")
        if not commas and not points:
            continue
        if commas and points:
            vote = 1 if cell.rfind(",") > cell.rfind(".") else -1
        elif commas + points > 1:
            vote = -1 if commas else 1
        else:
            vote = 1 if commas else -1
        if "e" in cell or "E" in cell:
            with_exponent += vote
        else:
            plain, told = plain + vote, True
    return plain if told else with_exponent
