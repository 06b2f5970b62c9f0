"""The time axis of a log: where its zero lies, that it increases, readings at one time, holes in it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import datetime, timedelta

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.readings import FloatArray
from coulombook.findings import Findings, Origin
from coulombook.intake import clock
from coulombook.intake.clock import Times
from coulombook.intake.limits import FARTHEST_START_SECOND, SHORTEST_STEP_SECOND
from coulombook.intake.settings import TraceOptions

# A hole is told of when it is this much longer than the mean step and takes this share of the log: common practice,
# no source. A straight line over less changes no charge by more than some parts in a thousand.
_HOLE_STEPS = 10.0
_HOLE_SHARE = 0.01
# A clock that shows one time for this many readings more than its mean has stopped
_STANDSTILL = 10
_NEAR_START_SECOND = (
    300.0  # a log begins within minutes of the time noted as its start: common practice, no source
)
_DAY_SECOND = 86_400.0


@dataclass(frozen=True, slots=True)
class Axis:
    """What the times of a file are judged with."""

    name: str  # of the file
    head: str  # of its column of times
    in_days: bool  # the unit of that column
    times: Times
    options: TraceOptions
    row_of: Callable[[int], int | None]  # row of a reading, looked for in the file if need be
    noted_row_of: Callable[[int], int | None]  # the same where it is known, else None
    started: datetime | None = None  # of the run


def from_zero(
    second: FloatArray, axis: Axis, first_stamp: datetime | None, findings: Findings
) -> FloatArray | None:
    """Times since the run's start, of a clock, of stamps or of serial dates; numbers are left as they are.

    None after a fault. ``first_stamp`` is that of a column of stamps, whose ``second`` count from it.
    """
    if axis.times is Times.STAMP:
        assert first_stamp is not None
        second = _without_jumps(second, axis, first_stamp.tzinfo is not None, findings)
        return _since_start(
            second, axis, first_stamp, f"date-times, the first {first_stamp.isoformat()}", findings
        )
    if axis.times is Times.CLOCK:
        return _of_clock(second, axis, findings)
    if axis.in_days and clock.FIRST_SERIAL_DAY <= second[0] / _DAY_SECOND <= clock.LAST_SERIAL_DAY:
        first = clock.SERIAL_ZERO + timedelta(seconds=float(second[0]))
        counted: FloatArray = second - second[0]
        return _since_start(
            counted, axis, first,
            f"serial dates, the first {first.isoformat(timespec='seconds')} if its spreadsheet counts from 1900",
            findings,
        )  # fmt: skip
    return second


def _since_start(
    second: FloatArray, axis: Axis, first: datetime, written: str, findings: Findings
) -> FloatArray | None:
    """Times since the run's ``started``, or since the first reading where that is not given."""
    where = Origin(axis.name, None, None, axis.head)
    if axis.started is None:
        findings.add("clock-read", where, f"the times are {written}; t = 0 was taken at the first reading",
                     "give `started` in runs if t = 0 is another moment")  # fmt: skip
        counted: FloatArray = second - second[0]
        return counted
    if (axis.started.tzinfo is None) != (first.tzinfo is None):
        findings.add(
            "not-a-time", where, "of the run's start and the log one has a time zone and one has none",
            "write both with time zone, or both without",
            found=f"'{first.isoformat()}' beside started '{axis.started.isoformat()}'",
            expected="a time zone everywhere or nowhere",
        )  # fmt: skip
        return None
    offset = (first - axis.started) / timedelta(seconds=1)
    if abs(offset) > FARTHEST_START_SECOND:
        findings.add(
            "not-a-time", where, "the log is not of the day its run was started",
            "correct `started` in runs, the trace it names, or the order of day and month: [read.traces] dates",
            found=f"a first reading at {first.isoformat(sep=' ', timespec='seconds')}",
            expected=f"one within a day of {axis.started.isoformat(sep=' ', timespec='seconds')}, when the run started",
        )  # fmt: skip
        return None
    findings.add(
        "clock-read", where, f"the times are {written}; t = 0 is the run's start, {offset:g} s before the first reading"
    )  # fmt: skip
    return second + offset


def _of_clock(second: FloatArray, axis: Axis, findings: Findings) -> FloatArray | None:
    """Times of a column of hours, minutes and seconds: counted from the start, or the time of day."""
    where = Origin(axis.name, None, None, axis.head)
    said, started = axis.options.time, axis.started
    of_day = None if started is None else _second_of_day(started)
    first, largest = float(second[0]), float(second.max())
    if said == clock.ELAPSED or (said is None and (first < 1.0 or largest >= _DAY_SECOND)):
        findings.add("clock-read", where, "the times are hours, minutes and seconds counted from the start; they were "
                     "taken in seconds", "if they are times of day: [read.traces] time = 'clock'")  # fmt: skip
        return second
    near = of_day is not None and abs(_wrapped(first - of_day)) <= _NEAR_START_SECOND
    if said is None and not near:
        findings.add(
            "not-a-time", where, "the times may be counted from the start, or be times of day",
            "say which: [read.traces] time = 'elapsed' or time = 'clock' in day.toml",
            found=f"a first reading at {_shown(first)}",
            expected="a first reading at 00:00:00 (counted), or within minutes of the run's `started` (of day)",
        )  # fmt: skip
        return None
    second = _without_jumps(second, axis, False, findings)
    if of_day is None:
        findings.add("clock-read", where, f"the times are times of day, the first {_shown(first)}; t = 0 was taken at "
                     "the first reading", "give `started` in runs if t = 0 is another moment")  # fmt: skip
        return second - first
    offset = _wrapped(first - of_day)
    findings.add("clock-read", where, f"the times are times of day, the first {_shown(first)}; t = 0 is the run's "
                 f"start, {offset:g} s before")  # fmt: skip
    return second - first + offset


def _without_jumps(second: FloatArray, axis: Axis, zoned: bool, findings: Findings) -> FloatArray:
    moved, jumps = clock.without_jumps(
        second, axis.times, zoned=zoned, taken_forward=axis.options.clock_put_forward
    )
    where = Origin(axis.name, None, None, axis.head)
    if jumps.midnights:
        findings.add(
            "clock-jump", where, f"the clock ran past midnight {_times(jumps.midnights)}; the time goes on"
        )
    if jumps.back:
        findings.add(
            "clock-jump", where,
            f"the clock was set back by an hour {_times(jumps.back)} (end of summer time); the time goes on",
        )  # fmt: skip
    for place in jumps.forward[:10]:
        at = Origin(axis.name, None, axis.noted_row_of(place), axis.head)
        if axis.options.clock_put_forward:
            findings.add("clock-jump", at, "the clock was put forward by an hour; the hour was taken out, as day.toml "
                         "says")  # fmt: skip
        else:
            findings.add(
                "log-gap", at, "between this reading and the one above lies an hour more than usual: a pause, or a "
                "clock put forward for summer time",
                "if the clock was put forward: [read.traces] clock_put_forward = true in day.toml",
            )  # fmt: skip
    return moved


def increasing(values: dict[str, FloatArray], axis: Axis, findings: Findings) -> dict[str, FloatArray] | None:
    """The readings, those at one time made one; None after a fault: a time that goes back, stands or hardly moves."""
    time = values["t"]
    steps = np.diff(time)
    if not steps.size:
        return values
    least = float(steps.min())
    if least >= SHORTEST_STEP_SECOND:
        return values
    wrong = np.flatnonzero(steps < 0)
    if wrong.size:
        _report_step(axis, time, wrong, "the time goes back", "keep one log a file; delete rows logged twice",
                     "a time later than that of the row above", findings)  # fmt: skip
        return None
    wrong = np.flatnonzero((steps > 0) & (steps < SHORTEST_STEP_SECOND))
    if wrong.size:
        _report_step(axis, time, wrong, "the time hardly moves", "correct the unit of the column of times",
                     f"steps of {SHORTEST_STEP_SECOND:g} s and more", findings)  # fmt: skip
        return None
    return _merged(values, steps > 0, axis, findings)


def _report_step(
    axis: Axis,
    time: FloatArray,
    wrong: NDArray[np.intp],
    what: str,
    mend: str,
    expected: str,
    findings: Findings,
) -> None:
    first = int(wrong[0])
    more = f"; {wrong.size - 1} more rows are so" if wrong.size > 1 else ""
    findings.add(
        "broken-trace",
        Origin(axis.name, None, axis.row_of(first + 1), axis.head),
        what,
        mend,
        found=f"{_digits(time[first + 1], time[first])} s after {_digits(time[first], time[first + 1])} s{more}",
        expected=expected,
    )


def _merged(
    values: dict[str, FloatArray], moves: NDArray[np.bool_], axis: Axis, findings: Findings
) -> dict[str, FloatArray] | None:
    """Means of the readings that share a time."""
    starts = np.concatenate(([0], np.flatnonzero(moves) + 1))
    counts = np.diff(np.append(starts, moves.size + 1))
    if counts.max() > _STANDSTILL * max(1.0, float(np.median(counts))) or starts.size < 2:
        longest = int(np.argmax(counts))
        findings.add(
            "broken-trace",
            Origin(axis.name, None, axis.row_of(int(starts[longest]) + 1), axis.head),
            "the time stands still",
            "delete the rows logged while it stood, or put in the log with its true times",
            found=f"{counts[longest]} readings at {values['t'][starts[longest]]:.10g} s",
            expected="a time later than that of the row above",
        )
        return None
    merged = {quantity: np.add.reduceat(array, starts) / counts for quantity, array in values.items()}
    merged["t"] = values["t"][starts]
    repeated = np.flatnonzero(~moves)
    same = all(bool((np.diff(array)[repeated] == 0).all()) for array in values.values())
    first = int(repeated[0]) + 1
    count = f"{repeated.size} reading{'s' if repeated.size > 1 else ''}"
    findings.add(
        "times-repeated",
        Origin(axis.name, None, axis.noted_row_of(first), axis.head),
        f"{count} at the time of the reading above (the first at {values['t'][first]:.10g} s): "
        + ("the same once more, counted once" if same else "the mean was taken of all at one time"),
        "" if same else "log with more digits of the time",
    )
    return merged


def report_holes(
    time: FloatArray, axis: Axis, window: tuple[float | None, float | None], findings: Findings
) -> None:
    """Warn of times without readings inside a run's window: a straight line stands in for them."""
    duration = float(time[-1] - time[0])
    limit = max(_HOLE_STEPS * duration / (time.size - 1), _HOLE_SHARE * duration)
    steps = np.diff(time)
    if steps.max() <= limit:
        return
    start = -np.inf if window[0] is None else window[0]
    stop = np.inf if window[1] is None else window[1]
    holes = [place for place in np.flatnonzero(steps > limit).tolist()
             if time[place + 1] > start and time[place] < stop]  # fmt: skip
    if not holes:
        return
    first = holes[0]
    more = f", and {len(holes) - 1} more" if len(holes) > 1 else ""
    missing = float(steps[holes].sum()) / duration
    findings.add(
        "log-gap",
        Origin(axis.name, None, axis.noted_row_of(first + 1), axis.head),
        f"no reading from {time[first]:.10g} s to {time[first + 1]:.10g} s{more} ({missing:.0%} of the log); a "
        "straight line was drawn between",
        "if the cell was off meanwhile, put in readings of 0 mA there",
    )


def _second_of_day(moment: datetime) -> float:
    return moment.hour * 3600.0 + moment.minute * 60.0 + moment.second + moment.microsecond * 1e-6


def _wrapped(second: float) -> float:
    """A difference of times of day, within half a day either way."""
    return (second + _DAY_SECOND / 2) % _DAY_SECOND - _DAY_SECOND / 2


def _shown(second: float) -> str:
    minutes, rest = divmod(second, 60.0)
    return f"{int(minutes // 60):02}:{int(minutes % 60):02}:{rest:02.0f}"


def _digits(one: float, other: float) -> str:
    """A time with digits enough to tell it from another."""
    return f"{one:.10g}" if one == other or f"{one:.10g}" != f"{other:.10g}" else f"{one:.17g}"


def _times(count: int) -> str:
    return "once" if count == 1 else f"{count} times"
