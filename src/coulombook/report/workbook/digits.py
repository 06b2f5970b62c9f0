"""How many digits of a number a cell shows: two digits of its standard uncertainty, as everywhere.

Nothing is rounded here: a cell keeps every digit, the format hides those that say nothing.
"""

from __future__ import annotations

import math
from functools import lru_cache

# as in `coulombook.prose.numbers`: more digits than that are noise of the arithmetic
_MOST_DIGITS = 9
_DIGITS_WITHOUT = 5  # of a value whose uncertainty is not known
_WRITTEN_OUT = range(-4, 6)  # powers of ten within which a number is written out
GENERAL = "General"
_LEAST = 1e-290  # below, powers of ten leave the range of numbers


def digits_shown(value: float, uncertainty: float | None) -> str:
    """Number format of a value with its standard uncertainty, or with five digits where none is known.

    >>> digits_shown(31.2345, 1.3872), digits_shown(-0.78772, 0.0031), digits_shown(1234.0, 450.0)
    ('0.0', '0.0000', '0')
    >>> digits_shown(1.23456e-7, 2.2e-9), digits_shown(0.0123, None), digits_shown(0.0, None)
    ('0.000E+00', '0.000000', '0')
    """
    if not uncertainty or not math.isfinite(uncertainty) or not math.isfinite(value):
        return _significant(value, _DIGITS_WITHOUT)
    spread = abs(uncertainty)
    if not _LEAST < spread < 1.0 / _LEAST:
        return _significant(value, _DIGITS_WITHOUT)
    place = _order(spread) - 1  # power of ten of the last digit shown
    if round(spread / 10.0**place) >= 100:
        place += 1  # 0.0996 shows as 0.10
    order = _order(value) if value else place
    if not value and place not in _WRITTEN_OUT:
        return "0"
    if order - place >= _MOST_DIGITS:
        return _significant(value, _DIGITS_WITHOUT + 1)
    order = max(order, _order(spread))
    return _written(order, order - place + 1)


def _significant(value: float, digits: int) -> str:
    if not value or not math.isfinite(value):
        return "0"
    return _written(_order(value), digits)


@lru_cache(maxsize=1024)
def _written(order: int, digits: int) -> str:
    """Format with so many significant digits for numbers of one power of ten."""
    if order in _WRITTEN_OUT:
        decimals = max(digits - 1 - order, 0)
        return "0." + "0" * decimals if decimals else "0"
    decimals = max(digits - 1, 0)
    return ("0." + "0" * decimals if decimals else "0") + "E+00"


def _order(value: float) -> int:
    return math.floor(math.log10(abs(value)))
