"""Numbers and names as the page sets them: the project's one way to round, in the signs of a printed page."""

from __future__ import annotations

import re
from collections.abc import Sequence

from coulombook.prose.numbers import ABSENT, fixed, plain, with_uncertainty

MINUS, DASH = "\N{MINUS SIGN}", "\N{EN DASH}"
JOINED = "\N{NO-BREAK SPACE}"  # between a number and its unit
_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_RANGE = re.compile(r"(?<=[\d)])-(?=\d)")
_EXPONENT = re.compile(r"e(-?\d+)$")
_POWER_OF_TEN = re.compile(r"(?<=\d)e(-?\d+)\b")
_NEGATIVE = re.compile(r"(?<![\w.-])-(?=\d)")
_POWER = re.compile(r"\^(-?\d+)")
_UNITS = {"umol": "µmol", "degC": "°C", "ohm": "Ω"}


def typeset(number: str) -> str:
    """A number of `prose.numbers` with a minus sign and a raised exponent.

    >>> typeset("-0.7337(19)"), typeset("1.235(22)e-7"), typeset("99.0-99.3"), typeset("-")
    ('−0.7337(19)', '1.235(22)×10⁻⁷', '99.0–99.3', '–')
    """
    if number == ABSENT:
        return DASH
    raised = _EXPONENT.sub(lambda found: "×10" + found[1].translate(_RAISED), number)
    return _RANGE.sub(DASH, raised).replace("-", MINUS)


def sentence(text: str) -> str:
    """A sentence with its numbers set for print.

    >>> sentence("p < 1e-6 at run m1-4, off by -4.1")
    'p < 1×10⁻⁶ at run m1-4, off by −4.1'
    """
    raised = _POWER_OF_TEN.sub(lambda found: "×10" + found[1].translate(_RAISED), text)
    return _NEGATIVE.sub(MINUS, raised)


def measured(value: float | None, u: float | None) -> str:
    """A value with its standard uncertainty in brackets."""
    return typeset(with_uncertainty(value, u))


def bare(value: float | None, digits: int = 4) -> str:
    """A value to so many digits."""
    return typeset(plain(value, digits))


def to_decimals(value: float | None, decimals: int) -> str:
    """A value to so many decimals."""
    return typeset(fixed(value, decimals))


def parted(head: str) -> tuple[str, str]:
    """Quantity and unit of a head, set for print.

    >>> parted("j / mA cm^-2"), parted("C2+/C1"), parted("amount / umol")
    (('j', 'mA cm⁻²'), ('C2+/C1', ''), ('amount', 'µmol'))
    """
    quantity, _, unit = head.partition(" / ")
    unit = _POWER.sub(lambda found: found[1].translate(_RAISED), unit)
    for plain_name, sign in _UNITS.items():
        unit = re.sub(rf"\b{plain_name}\b", sign, unit)
    return quantity, unit


def listed(words: Sequence[str]) -> str:
    """Words in a row.

    >>> listed(["a"]), listed(["a", "b"]), listed(["a", "b", "c"])
    ('a', 'a and b', 'a, b and c')
    """
    return " and ".join(part for part in (", ".join(words[:-1]), *words[-1:]) if part)


def counted(number: int, noun: str) -> str:
    """A number of things.

    >>> counted(1, "run"), counted(3, "run")
    ('1 run', '3 runs')
    """
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"


def number_of(cell: object) -> float | None:
    """A cell as a number; None for a text or an absent one."""
    return float(cell) if isinstance(cell, int | float) else None
