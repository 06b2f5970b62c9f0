"""Numbers and names as the page sets them."""

from __future__ import annotations

import pytest

from coulombook.report.page.words import (
    bare,
    counted,
    listed,
    measured,
    number_of,
    parted,
    sentence,
    to_decimals,
)


def test_numbers_carry_a_real_minus_and_a_raised_power() -> None:
    assert measured(-0.78772, 0.0031) == "−0.7877(31)"
    assert measured(1.23456e-7, 2.2e-9) == "1.235(22)×10⁻⁷"
    assert bare(-1234567.0) == "−1.235×10⁶"
    assert to_decimals(-0.0002, 3) == "0.000"


def test_what_is_absent_is_a_dash() -> None:
    assert measured(None, 0.1) == bare(None) == to_decimals(float("nan"), 1) == "–"


@pytest.mark.parametrize(
    ("head", "expected"),
    [
        ("u(j real) / mA cm^-2", ("u(j real)", "mA cm⁻²")),
        ("outlet flow / umol/s", ("outlet flow", "µmol/s")),
        ("resistance / ohm", ("resistance", "Ω")),
        ("C2+/C1 molar", ("C2+/C1 molar", "")),
    ],
)
def test_a_head_parts_into_quantity_and_unit(head: str, expected: tuple[str, str]) -> None:
    assert parted(head) == expected


def test_numbers_of_a_sentence_are_set_but_names_are_not() -> None:
    assert (
        sentence("level -1.36 V, run m1-4, p < 1e-6, 95-98 %")
        == "level −1.36 V, run m1-4, p < 1×10⁻⁶, 95-98 %"
    )


def test_things_are_listed_and_counted_as_one_says_them() -> None:
    assert [listed(["a"] * n) for n in range(4)] == ["", "a", "a and a", "a, a and a"]
    assert (counted(1, "run"), counted(0, "run")) == ("1 run", "0 runs")


def test_only_numbers_are_numbers() -> None:
    assert [number_of(one) for one in (1, 2.5, "3", None)] == [1.0, 2.5, None, None]
