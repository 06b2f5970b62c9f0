"""How numbers look to people: the one module that rounds.

A value stands with its standard uncertainty in brackets, in units of the value's last digits: 31.2(14) means
31.2 with a standard uncertainty of 1.4 [1]_. Files keep full precision and do not come here.

References
----------
.. [1] JCGM 100:2008, Guide to the expression of uncertainty in measurement, 7.2.2 (the notation with
brackets) and
   7.2.6 (at most two digits of the uncertainty, the value rounded to agree with it).
"""

from __future__ import annotations

import math
from decimal import ROUND_HALF_EVEN, Decimal

ABSENT = "-"

# An uncertainty that asks for more digits is rounding noise of the arithmetic (an exact fit through exact
# points); no instrument of this trade tells the tenth digit.
_MOST_DIGITS = 9
_DIGITS_WITHOUT = 6  # of a value whose uncertainty is such noise
_PLAIN_DIGITS = 4
# Powers of ten within which a number is written out; beyond, with an exponent.
_WRITTEN_OUT = range(-4, 6)


def with_uncertainty(value: float | None, uncertainty: float | None) -> str:
    """A value rounded to two digits of its standard uncertainty, which follows in brackets.

    Parameters
    ----------
    value : float or None
        In any unit; None and NaN give `ABSENT`.
    uncertainty : float or None
        Standard uncertainty in the same unit; its sign does not matter. Where it is None, NaN, zero, or so small
        that the value would need more than nine digits, the value stands alone (see `plain`).

    Examples
    --------
    >>> with_uncertainty(31.2345, 1.3872), with_uncertainty(-0.78772, 0.0031)
    ('31.2(14)', '-0.7877(31)')
    >>> with_uncertainty(0.4, 1.37), with_uncertainty(1.23456e-7, 2.2e-9), with_uncertainty(1234.0, 450.0)
    ('0.4(14)', '1.235(22)e-7', '1230(450)')
    """
    if value is None or math.isnan(value):
        return ABSENT
    if uncertainty is None or math.isnan(uncertainty) or uncertainty == 0 or math.isinf(value):
        return plain(value)
    if math.isinf(uncertainty):
        return f"{plain(value)}(inf)"
    exact, spread = Decimal(repr(float(value))), abs(Decimal(repr(float(uncertainty))))
    place = _two_digits(spread)  # power of ten of the last digit shown
    if exact and exact.adjusted() - place >= _MOST_DIGITS:
        return plain(value, _DIGITS_WITHOUT)
    exact, spread = _rounded(exact, place), _rounded(spread, place)
    order = max(exact.adjusted() if exact else place, spread.adjusted())
    if order in _WRITTEN_OUT:
        if place >= 0:
            return f"{_fixed(exact, 0)}({_fixed(spread, 0)})"
        return f"{_fixed(exact, -place)}({int(spread.scaleb(-place))})"
    shown, digits = exact.scaleb(-order), int(spread.scaleb(-place))
    return f"{_fixed(shown, order - place)}({digits})e{order}"


def plain(value: float | None, digits: int = _PLAIN_DIGITS) -> str:
    """A number without uncertainty, to so many significant digits.

    >>> plain(36.0), plain(0.000012345), plain(-1234567.0), plain(None)
    ('36.00', '1.234e-5', '-1.235e6', '-')
    """
    if value is None or math.isnan(value):
        return ABSENT
    if math.isinf(value):
        return "inf" if value > 0 else "-inf"
    exact = Decimal(repr(float(value)))
    if not exact:
        return "0"
    exact = _rounded(exact, exact.adjusted() - digits + 1)
    order = exact.adjusted()  # after rounding: 9.9999 has become 10.00
    if order in _WRITTEN_OUT:
        return _fixed(exact, max(digits - 1 - order, 0))
    return f"{_fixed(exact.scaleb(-order), digits - 1)}e{order}"


def brief(value: float | None, digits: int = 6) -> str:
    """A number as people would type it: at most so many digits, without zeros that say nothing.

    >>> brief(5000.0), brief(0.02), brief(1e-5), brief(1.5e7), brief(0.0)
    ('5000', '0.02', '1e-5', '1.5e7', '0')
    """
    mantissa, exponential, exponent = plain(value, digits).partition("e")
    if "." in mantissa:
        mantissa = mantissa.rstrip("0").removesuffix(".")
    return mantissa + exponential + exponent


def fixed(value: float | None, decimals: int) -> str:
    """A number to so many decimals, for columns whose last digit is known beforehand.

    >>> fixed(-0.78772, 3), fixed(-0.0002, 3), fixed(None, 3)
    ('-0.788', '0.000', '-')
    """
    if value is None or math.isnan(value):
        return ABSENT
    if abs(value) >= 10 ** (_WRITTEN_OUT.stop + 1):
        return plain(value)
    return _fixed(Decimal(repr(float(value))), decimals)


def between(low: str, high: str) -> str:
    """Two formatted numbers as the ends of a range; one of them where they look the same.

    >>> between("95.1", "98.4"), between("95.1", "95.1"), between("-1.2", "-0.3")
    ('95.1-98.4', '95.1', '-1.2 to -0.3')
    """
    if low == high:
        return low
    # a dash beside a minus sign would read as a difference
    return f"{low} to {high}" if "-" in low + high else f"{low}-{high}"


def _two_digits(spread: Decimal) -> int:
    """Power of ten of the second significant digit, once rounded: 0.0996 becomes 0.10, not 0.100."""
    place = spread.adjusted() - 1
    return place if _rounded(spread, place).adjusted() == spread.adjusted() else place + 1


def _rounded(exact: Decimal, place: int) -> Decimal:
    return exact.quantize(Decimal(1).scaleb(place), rounding=ROUND_HALF_EVEN)


def _fixed(exact: Decimal, decimals: int) -> str:
    rounded = _rounded(exact, -decimals)
    # a value that rounds to nothing carries no sign
    return f"{rounded if rounded else abs(rounded):f}"
