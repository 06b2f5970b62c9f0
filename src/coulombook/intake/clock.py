"""Times of day and date-times in place of seconds: how they are told from numbers, and how they become seconds.

A log's own clock shows the time of day, with all that befalls it: it runs past midnight, and is set back or forward
when summer time ends or begins. What is sure is put right and told; what may be a pause as well is left to the day's
settings.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta
from enum import StrEnum

import numpy as np

from coulombook.balance.readings import FloatArray

_CLOCK = re.compile(r"(\d{1,4}):(\d{2}):(\d{2}(?:[.,]\d{1,9})?)(?:\s*([AaPp])\.?[Mm]\.?)?", re.ASCII)
_TWO_PARTS = re.compile(r"\d{1,3}:\d{2}(?:[.,]\d+)?", re.ASCII)
_STAMP = re.compile(
    r"(?P<year>\d{4})[-/.](?P<month>\d{1,2})[-/.](?P<day>\d{1,2})[T ]\s*(?P<time>\d{1,2}:\d{2}.*)", re.ASCII
)
_SHORT_DATE = re.compile(
    r"(?P<one>\d{1,2})(?P<sign>[-/.])(?P<two>\d{1,2})(?P=sign)(?P<year>\d{4})[T ]\s*(?P<time>\d{1,2}:\d{2}.*)",
    re.ASCII,
)
_ZONE = re.compile(r"(?P<clock>.*?)\s*(?P<zone>Z|[+-]\d{2}(?::?\d{2})?)", re.ASCII)
_DAY_SECOND = 86_400.0
_HOUR_SECOND = 3_600.0
# A serial date below this was before 1954, when no log was kept; above it no elapsed time is, in days.
FIRST_SERIAL_DAY = 20_000.0
LAST_SERIAL_DAY = 2_958_465.0  # the last day of the year 9999
SERIAL_ZERO = datetime(1899, 12, 30)  # ECMA-376, the 1900 date system as it holds from March 1900 on

DAY_FIRST, MONTH_FIRST = "day first", "month first"
ELAPSED, CLOCK = "elapsed", "clock"


class Times(StrEnum):
    """How a column of times is written."""

    NUMBER = "numbers"
    CLOCK = "hours, minutes and seconds"
    STAMP = "date-times"


def kind_of(cells: Sequence[str]) -> Times:
    """How the first filled cells of a time column are written."""
    filled = [cell for cell in cells if cell][:5]
    if any(map(_CLOCK.fullmatch, filled)):
        return Times.CLOCK
    if any(_STAMP.fullmatch(cell) or _SHORT_DATE.fullmatch(cell) for cell in filled):
        return Times.STAMP
    return Times.NUMBER


def has_two_parts(cell: str) -> bool:
    """Whether a cell may be hours and minutes as well as minutes and seconds."""
    return bool(_TWO_PARTS.fullmatch(cell))


def clock_second(cell: str) -> float:
    """Seconds of a time of day or a count of hours, minutes and seconds; ValueError for anything else.

    >>> clock_second("09:30:00,5"), clock_second("1:00:00 PM"), clock_second("100:00:00")
    (34200.5, 46800.0, 360000.0)
    """
    parts = _CLOCK.fullmatch(cell.strip())
    if parts is None or int(parts[2]) > 59:
        raise ValueError(cell)
    hours, seconds = int(parts[1]), float(parts[3].replace(",", "."))
    if parts[4]:
        if not 1 <= hours <= 12:
            raise ValueError(cell)
        hours = hours % 12 + (12 if parts[4] in "pP" else 0)
    if seconds >= 61:  # a leap second is shown as 60
        raise ValueError(cell)
    return hours * _HOUR_SECOND + int(parts[2]) * 60.0 + seconds


def stamp_of(cell: str, dates: str | None) -> datetime:
    """The date-time of a stamp; ValueError for anything else, and for a date whose order nobody told.

    ``dates`` is the order of day and month where the year stands last. With points between them the day comes first
    everywhere.

    >>> stamp_of("18.05.2043 09:30:00", None).isoformat(), stamp_of("5/18/2043 9:30:00 PM", MONTH_FIRST).isoformat()
    ('2043-05-18T09:30:00', '2043-05-18T21:30:00')
    """
    text = cell.strip()
    parts = _STAMP.fullmatch(text)
    if parts is not None:
        year, month, day = int(parts["year"]), int(parts["month"]), int(parts["day"])
    else:
        parts = _SHORT_DATE.fullmatch(text)
        if parts is None:
            raise ValueError(cell)
        order = dates or (DAY_FIRST if parts["sign"] == "." else None)
        if order is None:
            raise ValueError(cell)
        one, two, year = int(parts["one"]), int(parts["two"]), int(parts["year"])
        month, day = (two, one) if order == DAY_FIRST else (one, two)
    clock, zone = parts["time"], ""
    with_zone = _ZONE.fullmatch(clock)
    if with_zone is not None:
        clock, zone = with_zone["clock"], with_zone["zone"]
    if clock.count(":") == 1:
        clock += ":00"
    second = clock_second(clock)
    if second >= _DAY_SECOND:
        raise ValueError(cell)
    midnight = datetime.fromisoformat(f"{year:04}-{month:02}-{day:02}T00:00:00{zone}")
    return midnight + timedelta(seconds=second)


class StampSecond:
    """From stamps to seconds since the first of them, which is kept; ValueError for what `stamp_of` does not read.

    A stamp with a time zone among stamps without one, or the other way round, is a ValueError too.
    """

    def __init__(self, dates: str | None) -> None:
        self.first: datetime | None = None
        self._dates = dates

    def __call__(self, cell: str) -> float:
        """Seconds of one cell."""
        stamp: datetime | None = None
        if cell[4:5] == "-" and len(cell) > 10:  # the usual form, ten times as fast
            try:
                stamp = datetime.fromisoformat(cell)
            except ValueError:
                stamp = None
        if stamp is None:
            stamp = stamp_of(cell, self._dates)
        if self.first is None:
            self.first = stamp
        if (stamp.tzinfo is None) != (self.first.tzinfo is None):
            raise ValueError(cell)
        return (stamp - self.first) / timedelta(seconds=1)


@dataclass(frozen=True, slots=True)
class Jumps:
    """What befell a clock: times it ran past midnight, was set back by an hour, and was set forward by one.

    ``forward`` are places of readings after a step of an hour more than usual, taken out only when told to.
    """

    midnights: int
    back: int
    forward: tuple[int, ...]


def without_jumps(
    second: FloatArray, times: Times, *, zoned: bool, taken_forward: bool
) -> tuple[FloatArray, Jumps]:
    """Times that run on where the clock jumped, and what was found.

    A step back by half a day and more is midnight (of a clock without dates); a step back by an hour less the usual
    step is the end of summer time. A step forward by an hour more than the usual step may be the beginning of summer
    time or a pause: it is taken out only with ``taken_forward``. ``zoned`` stamps have no jumps.
    """
    steps = np.diff(second)
    if zoned or not steps.size:
        return second, Jumps(0, 0, ())
    forward = steps[steps > 0]
    usual = float(np.median(forward)) if forward.size else 0.0
    near = max(2.0 * usual, 2.0)
    midnight = (steps < -_DAY_SECOND / 2) if times is Times.CLOCK else np.zeros(steps.shape, bool)
    shift = np.where(midnight, _DAY_SECOND, 0.0)
    steps = steps + shift
    back = np.abs(steps + _HOUR_SECOND - usual) <= near
    ahead = np.abs(steps - _HOUR_SECOND - usual) <= near
    if usual >= _HOUR_SECOND / 2:  # readings so far apart tell nothing of an hour
        back, ahead = np.zeros_like(back), np.zeros_like(ahead)
    shift = shift + np.where(back, _HOUR_SECOND, 0.0)
    if taken_forward:
        shift = shift - np.where(ahead, _HOUR_SECOND, 0.0)
    if not shift.any():
        return second, Jumps(0, 0, tuple((np.flatnonzero(ahead) + 1).tolist()))
    moved = second.copy()
    moved[1:] += np.cumsum(shift)
    return moved, Jumps(int(midnight.sum()), int(back.sum()), tuple((np.flatnonzero(ahead) + 1).tolist()))
