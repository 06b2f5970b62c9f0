"""Expected texts are rounded by hand to two digits of the uncertainty (JCGM 100:2008, 7.2.6)."""

from __future__ import annotations

import math
from decimal import Decimal

import pytest
from hypothesis import given
from hypothesis import strategies as st

from coulombook.prose.numbers import ABSENT, between, brief, fixed, plain, with_uncertainty


@pytest.mark.parametrize(
    ("value", "u", "text"),
    [
        (31.2345, 1.3872, "31.2(14)"),
        (14.349, 0.0523, "14.349(52)"),
        (-0.78772, 0.0031, "-0.7877(31)"),
        (36.0, 0.18, "36.00(18)"),
        (105.4, 12.3, "105(12)"),
        # JCGM 100, 7.2.2: m_s = 100.021 47 g with u = 0.35 mg
        (100.02147, 0.00035, "100.02147(35)"),
    ],
)
def test_value_is_rounded_to_two_digits_of_its_uncertainty(value: float, u: float, text: str) -> None:
    assert with_uncertainty(value, u) == text


def test_uncertainty_that_rounds_up_a_decade_keeps_two_digits() -> None:
    # 0.0996 to two digits is 0.10, not 0.100
    assert with_uncertainty(1.23456, 0.0996) == "1.23(10)"
    assert with_uncertainty(1.23456, 0.0994) == "1.235(99)"
    assert with_uncertainty(57.3, 9.96) == "57(10)"


def test_uncertainty_above_the_value_leaves_the_value_as_rounded() -> None:
    assert with_uncertainty(0.4, 1.37) == "0.4(14)"
    assert with_uncertainty(0.02, 1.37) == "0.0(14)"
    assert with_uncertainty(3.0, 45.0) == "3(45)"


def test_a_value_that_rounds_to_nothing_carries_no_sign() -> None:
    assert with_uncertainty(-0.02, 1.37) == "0.0(14)"
    assert fixed(-0.0002, 3) == "0.000"
    assert plain(-0.0) == "0"


def test_an_uncertainty_beyond_the_units_is_written_in_units() -> None:
    assert with_uncertainty(1234.0, 450.0) == "1230(450)"
    assert with_uncertainty(98765.0, 4321.0) == "98800(4300)"


def test_large_and_small_numbers_carry_an_exponent() -> None:
    assert with_uncertainty(1.23456e-7, 2.2e-9) == "1.235(22)e-7"
    assert with_uncertainty(-6.02214e23, 1.5e20) == "-6.0221(15)e23"
    assert with_uncertainty(2.0e-9, 3.0e-7) == "0.0(30)e-7"
    assert plain(1.234567e-5) == "1.235e-5"
    assert plain(1234567.0) == "1.235e6"
    assert plain(999999.9) == "1.000e6"


@pytest.mark.parametrize("u", [None, 0.0, math.nan])
def test_a_value_without_uncertainty_stands_alone(u: float | None) -> None:
    assert with_uncertainty(36.0, u) == "36.00"


def test_an_uncertainty_below_the_rounding_of_the_arithmetic_is_not_shown() -> None:
    assert with_uncertainty(14.349012345, 2.1e-15) == "14.3490"


def test_numbers_that_are_none_or_not_finite_are_named() -> None:
    assert with_uncertainty(None, 1.0) == ABSENT
    assert with_uncertainty(math.nan, 1.0) == ABSENT
    assert with_uncertainty(math.inf, 1.0) == "inf"
    assert with_uncertainty(-math.inf, None) == "-inf"
    assert with_uncertainty(12.0, math.inf) == "12.00(inf)"
    assert (plain(None), fixed(None, 2), plain(math.inf), fixed(-math.inf, 1)) == ("-", "-", "inf", "-inf")


def test_fixed_gives_up_its_decimals_for_a_number_too_long_to_write_out() -> None:
    assert fixed(1.5e300, 3) == "1.500e300"


def test_a_range_with_a_minus_sign_is_spelled_out() -> None:
    assert between("95.1", "98.4") == "95.1-98.4"
    assert between("-1.2", "0.3") == "-1.2 to 0.3"


@given(
    st.floats(allow_nan=False, allow_infinity=False),
    st.floats(min_value=1e-300, max_value=1e300, allow_nan=False),
)
def test_what_is_shown_is_within_half_a_digit_of_what_was_given(value: float, u: float) -> None:
    text = with_uncertainty(value, u)
    number, _, rest = text.partition("(")
    digits, _, exponent = rest.partition(")")
    if not rest:
        number, _, exponent = text.partition("e")
        # no uncertainty is shown where it would need more than nine digits: six remain
        assert float(text) == pytest.approx(value, rel=0.5e-5)
        return
    power = int(exponent[1:] or 0)
    # the place of the last digit shown
    place = Decimal(1).scaleb(power - len(number.partition(".")[2]))
    shown_u = Decimal(digits) * place
    # half of the last of two digits is at most 5 % of the uncertainty
    assert abs(shown_u - Decimal(u)) <= Decimal(u) * Decimal("0.0501")
    assert abs(Decimal(number).scaleb(power) - Decimal(value)) <= Decimal(u) * Decimal("0.0501")
    assert len(digits.strip("0")) <= 2


def test_a_brief_number_keeps_its_value_and_drops_empty_zeros() -> None:
    assert [brief(one) for one in (100.0, 120000.0, -0.5, 2.5e-7, 1e9)] == [
        "100",
        "120000",
        "-0.5",
        "2.5e-7",
        "1e9",
    ]
    assert brief(None) == "-"
    assert brief(1234.5678, 3) == "1230"
