from __future__ import annotations

import math

from hypothesis import given
from hypothesis import strategies as st

from coulombook.prose.numbers import with_uncertainty
from coulombook.report.workbook.digits import digits_shown


def test_a_cell_shows_as_many_digits_as_the_uncertainty_allows() -> None:
    # 31.2(14), 0.7877(31), 1230(450): two digits of u (JCGM 100:2008, 7.2.6)
    assert digits_shown(31.2345, 1.3872) == "0.0"
    assert digits_shown(-0.78772, 0.0031) == "0.0000"
    assert digits_shown(1234.0, 450.0) == "0"


def test_an_uncertainty_that_rounds_up_to_the_next_power_loses_a_digit() -> None:
    # 0.0996 to two digits is 0.10
    assert digits_shown(1.0, 0.0996) == "0.00"
    assert digits_shown(1.0, 0.0994) == "0.000"


def test_small_numbers_are_shown_with_an_exponent() -> None:
    # 1.235(22)e-7
    assert digits_shown(1.23456e-7, 2.2e-9) == "0.000E+00"


def test_without_an_uncertainty_five_digits_are_shown() -> None:
    assert digits_shown(0.0123456, None) == "0.000000"
    assert digits_shown(123.456, 0.0) == "0.00"
    assert digits_shown(0.0, None) == "0"


def test_an_uncertainty_that_is_rounding_noise_does_not_ask_for_its_digits() -> None:
    assert digits_shown(12.3456789, 1e-12) == digits_shown(12.3456789, None).replace("0.000", "0.0000")


@given(
    st.floats(-1e6, 1e6).filter(lambda value: value == 0 or abs(value) > 1e-12),
    st.floats(1e-9, 1e4),
)
def test_a_cell_shows_the_digits_that_prose_shows(value: float, u: float) -> None:
    # the other place where two digits of u decide, worked out in decimal arithmetic
    said = with_uncertainty(value, u)
    shown = digits_shown(value, u)
    if "(" not in said:
        return  # an uncertainty that is noise; prose leaves it away
    mantissa = said.partition("(")[0]
    decimals = len(mantissa.partition(".")[2])
    edge = f"{u:.15e}".partition("e")[0]
    if math.isclose(float(edge), 9.95, rel_tol=1e-9) or "e" in said:
        return  # half of the last digit, where binary and decimal may part; exponents are counted from the larger
    if "E" not in shown:
        assert len(shown.partition(".")[2]) == decimals, said


@given(st.floats(), st.one_of(st.none(), st.floats()))
def test_any_number_has_a_format(value: float, u: float | None) -> None:
    shown = digits_shown(value, u)
    assert set(shown) <= set("0.E+")
    assert len(shown) < 320
