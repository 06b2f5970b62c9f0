"""Times of day and date-times in place of seconds."""

from __future__ import annotations

from datetime import datetime

import numpy as np
import pytest

from coulombook.intake.clock import (
    DAY_FIRST,
    MONTH_FIRST,
    Jumps,
    StampSecond,
    Times,
    clock_second,
    kind_of,
    stamp_of,
    without_jumps,
)


@pytest.mark.parametrize(
    ("cell", "second"),
    [
        ("00:00:00", 0.0),
        ("9:30:00", 34200.0),
        ("09:30:00.25", 34200.25),
        ("09:30:00,25", 34200.25),
        ("25:00:01", 90001.0),
        ("12:00:00 AM", 0.0),
        ("12:30:00 pm", 45000.0),
        ("1:00:00 p.m.", 46800.0),
        ("23:59:60", 86400.0),
    ],
)
def test_clock_is_read_as_seconds(cell: str, second: float) -> None:
    assert clock_second(cell) == second


@pytest.mark.parametrize("cell", ["9:30", "09:60:00", "09:30:61", "13:00:00 PM", "0:00:00 AM", "x", "1.5"])
def test_what_is_no_clock_is_refused(cell: str) -> None:
    with pytest.raises(ValueError, match=r".*"):
        clock_second(cell)


@pytest.mark.parametrize(
    ("cell", "dates", "stamp"),
    [
        ("2043-05-18T09:30:00", None, "2043-05-18T09:30:00"),
        ("2043-05-18 09:30:00.5", None, "2043-05-18T09:30:00.500000"),
        ("2043/5/8 9:30:00", None, "2043-05-08T09:30:00"),
        ("18.05.2043 09:30:00,5", None, "2043-05-18T09:30:00.500000"),
        ("5/6/2043 9:30", DAY_FIRST, "2043-06-05T09:30:00"),
        ("5/6/2043 9:30:00 PM", MONTH_FIRST, "2043-05-06T21:30:00"),
        ("2043-05-18T09:30:00+02:00", None, "2043-05-18T09:30:00+02:00"),
    ],
)
def test_stamp_is_read_as_date_time(cell: str, dates: str | None, stamp: str) -> None:
    assert stamp_of(cell, dates) == datetime.fromisoformat(stamp)


@pytest.mark.parametrize(
    "cell", ["5/6/2043 9:30:00", "2043-05-18", "2043-13-01 09:30:00", "18-05-43 09:30:00", "x"]
)
def test_stamp_whose_date_cannot_be_told_is_refused(cell: str) -> None:
    with pytest.raises(ValueError, match=r".*"):
        stamp_of(cell, None)


def test_stamps_count_from_the_first_and_keep_their_digits() -> None:
    second = StampSecond(None)
    cells = ["2043-05-18T09:30:00.000001", "2043-05-18T09:30:00.000002", "2043-05-18 10:30:00,000001"]
    assert [second(cell) for cell in cells] == [0.0, 1e-6, 3600.0]
    assert second.first == datetime(2043, 5, 18, 9, 30, 0, 1)
    with pytest.raises(ValueError, match=r".*"):
        second("2043-05-18T09:30:00+02:00")  # a zone among stamps without one


def test_kind_of_times_is_told_by_the_first_cells() -> None:
    assert kind_of(["", "0", "0.5"]) is Times.NUMBER
    assert kind_of(["00:00:00", "00:00:01"]) is Times.CLOCK
    assert kind_of(["2043-05-18 09:30:00"]) is Times.STAMP
    assert kind_of([]) is Times.NUMBER


def test_clock_past_midnight_goes_on() -> None:
    second = np.array([86398.0, 86399.0, 0.0, 1.0])
    moved, jumps = without_jumps(second, Times.CLOCK, zoned=False, taken_forward=False)
    np.testing.assert_array_equal(moved, [86398.0, 86399.0, 86400.0, 86401.0])
    assert jumps == Jumps(1, 0, ())


def test_hour_set_back_is_put_right_and_an_hour_forward_only_when_told() -> None:
    # 02:59:58, 02:59:59, 02:00:00 (summer time ends), ...
    back = np.array([10798.0, 10799.0, 7200.0, 7201.0])
    moved, jumps = without_jumps(back, Times.STAMP, zoned=False, taken_forward=False)
    np.testing.assert_array_equal(moved, [10798.0, 10799.0, 10800.0, 10801.0])
    assert jumps == Jumps(0, 1, ())
    # 01:59:58, 01:59:59, 03:00:00 (summer time begins, or a pause)
    forward = np.array([7198.0, 7199.0, 10800.0, 10801.0])
    kept, jumps = without_jumps(forward, Times.STAMP, zoned=False, taken_forward=False)
    np.testing.assert_array_equal(kept, forward)
    assert jumps == Jumps(0, 0, (2,))
    moved, _ = without_jumps(forward, Times.STAMP, zoned=False, taken_forward=True)
    np.testing.assert_array_equal(moved, [7198.0, 7199.0, 7200.0, 7201.0])


def test_clock_that_goes_back_otherwise_is_left_as_it_is() -> None:
    second = np.array([0.0, 1.0, 0.5, 2.0])
    kept, jumps = without_jumps(second, Times.CLOCK, zoned=False, taken_forward=False)
    np.testing.assert_array_equal(kept, second)
    assert jumps == Jumps(0, 0, ())


def test_zoned_stamps_have_no_jumps() -> None:
    second = np.array([10798.0, 10799.0, 7200.0])
    kept, jumps = without_jumps(second, Times.STAMP, zoned=True, taken_forward=True)
    np.testing.assert_array_equal(kept, second)
    assert jumps == Jumps(0, 0, ())
