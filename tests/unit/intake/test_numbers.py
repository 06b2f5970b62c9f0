"""Numbers that are no plain ones."""

from __future__ import annotations

import time

import pytest

from coulombook.intake.numbers import Habit, plain_number, votes_for_comma, written_number


@pytest.mark.parametrize(
    ("cell", "decimal", "number", "habit", "sure"),
    [
        ("1,234.5", ".", 1234.5, Habit.THOUSANDS, True),
        ("1.234,5", ",", 1234.5, Habit.THOUSANDS, True),
        ("-12.345.678", ",", -12345678.0, Habit.THOUSANDS, True),
        ("1'234.5", ".", 1234.5, Habit.THOUSANDS, True),
        ("1’234", ".", 1234.0, Habit.THOUSANDS, True),
        ("1 234,5", ",", 1234.5, Habit.THOUSANDS, True),
        ("1\N{NARROW NO-BREAK SPACE}234\N{NARROW NO-BREAK SPACE}567", ".", 1234567.0, Habit.THOUSANDS, True),
        # one group and nothing behind it: thousands or decimals
        ("1.234", ",", 1234.0, Habit.THOUSANDS, False),
        ("1,234", ".", 1234.0, Habit.THOUSANDS, False),
        ("1.234E-05", ",", 1.234e-5, Habit.EXPONENT, True),
        ("-1,234e+05", ".", -1.234e5, Habit.EXPONENT, True),
        ("\N{MINUS SIGN}1.5 mA", ".", -1.5, Habit.UNIT, True),
        ("950µA", ".", 950.0, Habit.UNIT, True),
    ],
)
def test_number_is_read_as_it_is_meant(
    cell: str, decimal: str, number: float, habit: Habit, sure: bool
) -> None:
    written = written_number(cell, decimal)
    assert written is not None
    assert (written.number, written.habit, written.sure) == (number, habit, sure)


@pytest.mark.parametrize(
    ("cell", "decimal"),
    [
        ("1.234,5", "."),  # the decimal sign stands first
        ("1,2345.6", "."),  # no groups of three
        ("1234,567.8", "."),
        ("1,234 567", "."),  # two signs between thousands
        ("12.34E-05", ","),  # two digits before the sign: may part thousands
        ("overload", "."),
        ("", "."),
        ("1" * 5000 + "x", "."),
    ],
)
def test_what_cannot_be_told_is_no_number(cell: str, decimal: str) -> None:
    assert written_number(cell, decimal) is None


@pytest.mark.parametrize("cell", ["1_000", "1,5", "x", "", "--1"])
def test_plain_number_is_nothing_but_one(cell: str) -> None:
    with pytest.raises(ValueError, match=r".*"):
        plain_number(cell, ".")


@pytest.mark.parametrize(
    ("cells", "comma"),
    [
        (["1,5", "2"], True),
        (["1.5", "2"], False),
        (["1.234,5", "-1"], True),
        (["1,234.5", "1,234"], False),
        (["1,234,567"], False),  # a sign that stands twice parts thousands
        (["1,5", "1.2E-05", "1.2E-05"], True),  # before an exponent the country does not matter
        (["1,2E-05"], True),
        (["1", "2"], False),
    ],
)
def test_decimal_sign_is_voted_for(cells: list[str], comma: bool) -> None:
    assert (votes_for_comma(cells) > 0) is comma


def test_long_cells_cost_no_time() -> None:
    start = time.perf_counter()
    for _ in range(100):
        assert written_number("1" * 60_000, ".") is None
    assert time.perf_counter() - start < 5.0  # a pattern that backtracks takes minutes
