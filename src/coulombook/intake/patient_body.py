"""The body of an untidy log, row by row: what is no reading is passed over, odd numbers are told, faults are placed.

Memory is that of the numbers, whatever the size of the file: rows are looked at one by one and not kept.
"""

from __future__ import annotations

import codecs
import csv
import io
from array import array
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field, replace
from datetime import datetime
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.readings import FloatArray
from coulombook.findings import Findings, Origin
from coulombook.intake import text
from coulombook.intake.clock import StampSecond, Times, clock_second, has_two_parts
from coulombook.intake.files import unreadable
from coulombook.intake.layout import Layout, is_units, quantity_of, score_of
from coulombook.intake.limits import LARGEST_UNTIDY_LOG_BYTE, LONGEST_LINE, MOST_WORDY_ROWS
from coulombook.intake.numbers import (
    Habit,
    is_like_a_number,
    plain_number,
    tidy,
    votes_for_comma,
    written_number,
)
from coulombook.intake.schema import Schema
from coulombook.intake.settings import TraceOptions
from coulombook.intake.tables import quoted
from coulombook.units import LARGEST_NUMBER, UnitError, conversion

COMMENT_SIGNS = ("#", "%", "//")
_BLOCK = 1 << 20  # characters read at a time
_MOST_FAULTS = 10_000  # cells; nobody reads on, and each takes its time
_LONGEST_PREAMBLE = 500  # lines between the blocks of a log that was put together from several

Row = tuple[int, list[str]]


@dataclass(frozen=True, slots=True, eq=False)
class PatientlyRead:
    """Numbers by quantity, as written but for their units, the row of each, and the first of a column of stamps."""

    values: dict[str, FloatArray]  # (n,) each
    rows: NDArray[np.int64]  # (n,)
    first_stamp: datetime | None


@dataclass(slots=True)
class Told:
    """How often something was met, and where first."""

    first: int
    count: int = 1
    example: str = ""


@dataclass(slots=True, eq=False)
class Patient:
    """What came of the rows: numbers by quantity, the row of each, and what was met on the way."""

    values: dict[str, array[float]]
    rows: array[int]
    passed: Told | None = None  # lines that are no readings
    repeated: Told | None = None  # the heads once more
    habits: dict[tuple[str, Habit], Told] = field(default_factory=dict)
    unsure: dict[str, Told] = field(default_factory=dict)  # by sign: a single group that may be decimals
    sure_signs: set[str] = field(default_factory=set)
    faults: dict[str, Told] = field(default_factory=dict)  # by quantity
    overlong: Told | None = None
    other_heads: Told | None = None  # heads or units that are not those of the first block
    cut: Told | None = None  # a last line without its end
    too_wordy: bool = False  # more rows of words than a log has
    ended_early: bool = False  # after so many faults that nobody reads on
    first_stamp: datetime | None = None


def read_patiently(
    path: Path,
    name: str,
    layout: Layout,
    table: Schema,
    options: TraceOptions,
    report_empty: Callable[[], None],
    findings: Findings,
) -> PatientlyRead | None:
    """The columns as written; None after a fault.

    Raises OSError, and `text.UnreadableText` for what is no text.
    """
    if path.stat().st_size > LARGEST_UNTIDY_LOG_BYTE:
        unreadable(
            findings, name, f"{path.stat().st_size / 1e9:.1f} GB with cells or lines that are no plain numbers",
            f"at most {LARGEST_UNTIDY_LOG_BYTE / 1e9:.0f} GB, or heads with rows of plain numbers alone",
            "export the log with seconds and plain numbers, or in parts",
        )  # fmt: skip
        return None
    read = _Reader(path, layout, table, options).read()
    decimal = layout.decimal
    if options.decimal is None and (read.faults or read.habits) and layout.separator != ",":
        # the first rows may have held whole numbers only
        measured = [place for quantity, place in layout.columns.items() if quantity != "t"]
        votes = votes_for_comma(
            cells[place]
            for _, cells in numbered_rows(path, layout)
            for place in measured
            if place < len(cells) and is_like_a_number(cells[place])
        )
        decimal = decimal if not votes else "," if votes > 0 else "."
        if decimal != layout.decimal:
            layout = replace(layout, decimal=decimal)
            read = _Reader(path, layout, table, options).read()
    if _report_faults(read, layout, options.decimal is not None, name, findings):
        return None
    if not read.rows:
        report_empty()
        return None
    values = {quantity: np.frombuffer(numbers, dtype=np.float64) for quantity, numbers in read.values.items()}
    if _report_sizes(path, values, read, layout, name, findings):
        return None
    _note(read, layout, name, findings)
    rows = np.array(read.rows, dtype=np.int64)
    return PatientlyRead({quantity: one.copy() for quantity, one in values.items()}, rows, read.first_stamp)


def numbered_rows(path: Path, layout: Layout) -> Iterator[Row]:
    """Every row below the heads that is not blank, with its number."""
    # strict: a quote that never closes would swallow every row below it
    reader = csv.reader(_lines(path, layout), delimiter=layout.separator, strict=True)
    number = layout.body_row
    try:
        for number, cells in enumerate(reader, layout.body_row + 1):  # the number is told of below
            tidied = [cell.strip() for cell in cells]
            if any(tidied):
                yield number, tidied
    except csv.Error as error:
        raise text.UnreadableText(
            f"{error} in row {number + 1}", "quotes that open and close around a cell"
        ) from None


def _lines(path: Path, layout: Layout) -> Iterator[str]:
    """The lines below the heads. A long file is never held as a whole."""
    encoding = _encoding(path, layout)
    left, row = "", 0
    with path.open(encoding=encoding, newline="") as stream:
        while True:
            try:
                block = stream.read(_BLOCK)
            except UnicodeDecodeError:
                raise text.UnreadableText("bytes that are no text", text.KNOWN_ENCODINGS) from None
            text.refuse_binary(block, row)
            lines = list(io.StringIO(left + block, newline=""))
            # a CR at the end of a block may be half of a CR LF
            left = lines.pop() if lines and block and not lines[-1].endswith("\n") else ""
            if len(left) > LONGEST_LINE or max(map(len, lines), default=0) > LONGEST_LINE:
                raise text.UnreadableText(
                    f"a line of more than {LONGEST_LINE} characters below row {row}",
                    f"lines of at most {LONGEST_LINE} characters",
                )
            below = max(layout.body_row - row, 0)
            row += len(lines)
            # a byte order mark within is the seam of two files
            yield from (line.removeprefix("\ufeff") for line in lines[below:])
            if not block:
                return


def _encoding(path: Path, layout: Layout) -> str:
    if layout.encoding == "utf-16":
        return "utf-16"
    decoder = codecs.getincrementaldecoder("utf-8")()
    with path.open("rb") as stream:
        try:
            while block := stream.read(_BLOCK):
                decoder.decode(block)
            decoder.decode(b"", final=True)
        except UnicodeDecodeError:
            return "cp1252"
    return "utf-8-sig"


class _Reader:
    """One passage through the rows."""

    def __init__(self, path: Path, layout: Layout, table: Schema, options: TraceOptions) -> None:
        self._path, self._layout, self._table, self._options = path, layout, table, options
        self._stamps = StampSecond(options.dates) if layout.times is Times.STAMP else None
        self._of_time = self._stamps or (clock_second if layout.times is Times.CLOCK else None)
        self._columns = list(layout.columns.items())
        self._heads = [_folded(head) for head in layout.heads]
        self._found = Patient({quantity: array("d") for quantity, _ in self._columns}, array("q"))
        self._of_words = 0  # rows of words that are no comments
        self._faulty = 0  # cells found to be faults
        self._pending: list[Row] = []  # rows that are no readings and may stand above heads to come

    def read(self) -> Patient:
        """Everything that can be told of the rows."""
        found, decimal = self._found, self._layout.decimal
        width = len(self._layout.heads)
        appends = [
            (found.values[quantity].append, place, quantity == "t") for quantity, place in self._columns
        ]
        of_time = self._of_time
        last: Row | None = None
        for number, cells in numbered_rows(self._path, self._layout):
            if last is not None:
                self._untidy(*last)
                last = None
                if self._faulty >= _MOST_FAULTS or self._of_words >= MOST_WORDY_ROWS:
                    found.ended_early = True
                    found.too_wordy = self._of_words >= MOST_WORDY_ROWS
                    break
            try:
                row = [
                    of_time(cells[place]) if is_time and of_time else plain_number(cells[place], decimal)
                    for _, place, is_time in appends
                ]
            except (ValueError, IndexError):
                last = number, cells
                continue
            if len(cells) > width and any(cells[width:]):
                found.overlong = _told(found.overlong, number, f"{len(cells)} cells")
            if self._pending:
                self._settle()
            for (append, _, _), value in zip(appends, row, strict=True):
                append(value)
            found.rows.append(number)
        if last is not None:
            if self._is_cut(last[1]):
                found.cut = Told(last[0], 1, quoted(self._layout.separator.join(last[1])))
            else:
                self._untidy(*last)
        self._settle()
        found.first_stamp = self._stamps.first if self._stamps else None
        return found

    def _untidy(self, number: int, cells: list[str]) -> None:
        """A row that holds something else than plain numbers."""
        found, layout = self._found, self._layout
        read_cells = [cells[place] if place < len(cells) else "" for _, place in self._columns]
        first = next(filter(None, cells), "")
        if first.startswith(COMMENT_SIGNS):
            found.passed = _told(found.passed, number, first)
            return
        if not any(map(is_like_a_number, read_cells)):
            self._words(number, cells, first)
            return
        row = [
            self._number(quantity, cell)
            for (quantity, _), cell in zip(self._columns, read_cells, strict=True)
        ]
        if any(one is None for one in row) or (
            len(cells) > len(layout.heads) and any(cells[len(layout.heads) :])
        ):
            self._pending.append((number, cells))
            if len(self._pending) > 2 * _LONGEST_PREAMBLE:
                self._settle(keep=_LONGEST_PREAMBLE)
            return
        self._settle()
        for (quantity, _), cell, one in zip(self._columns, read_cells, row, strict=True):
            assert one is not None
            value, habit, sign, sure = one
            found.values[quantity].append(value)
            if habit is not None:
                key = quantity, habit
                found.habits[key] = _told(found.habits.get(key), number, cell)
            if habit is Habit.THOUSANDS:
                if sure:
                    found.sure_signs.add(sign)
                else:
                    found.unsure[quantity] = _told(found.unsure.get(quantity), number, cell)
        found.rows.append(number)

    def _words(self, number: int, cells: list[str], first: str) -> None:
        """A row of words: the heads or units once more, others than those, or a remark."""
        found, layout = self._found, self._layout
        self._of_words += 1
        if self._are_heads(cells):
            found.repeated = _told(found.repeated, number)
            # what stands between a block's end and the next heads is that block's own preamble
            for above, _ in self._pending[-_LONGEST_PREAMBLE:]:
                found.passed = _told(found.passed, above)
            self._pending = self._pending[:-_LONGEST_PREAMBLE]
        elif layout.units and [*cells] == [*layout.units][: len(cells)]:
            found.repeated = _told(found.repeated, number)
        elif score_of(cells, self._table, self._options) == 1 or is_units(cells, layout.columns, self._table):
            found.other_heads = _told(found.other_heads, number, layout.separator.join(cells))
        else:
            found.passed = _told(found.passed, number, first)

    def _number(self, quantity: str, cell: str) -> tuple[float, Habit | None, str, bool] | None:
        """Value of a cell, how it was written, the sign between thousands, and whether that is sure."""
        decimal = self._layout.decimal
        if quantity == "t" and self._of_time is not None:
            try:
                return self._of_time(cell), None, "", True
            except ValueError:
                return None
        try:
            return plain_number(tidy(cell), decimal), None, "", True
        except ValueError:
            pass
        written = written_number(cell, decimal)
        if written is None:
            return None
        if written.habit is not Habit.UNIT:
            return written.number, written.habit, written.sign, written.sure
        dimension = self._table.by_quantity[quantity].dimension
        if dimension is None:
            return None
        try:
            factor = conversion(written.unit, dimension).factor / self._layout.factors[quantity]
        except UnitError:
            return None
        return written.number * factor, written.habit, "", True

    def _settle(self, keep: int = 0) -> None:
        """Take rows that turned out to be no preamble for the faults they are."""
        found, width = self._found, len(self._layout.heads)
        rows = self._pending[: len(self._pending) - keep]
        self._pending = self._pending[len(self._pending) - keep :]
        for number, cells in rows:
            if len(cells) > width and any(cells[width:]):
                found.overlong = _told(found.overlong, number, f"{len(cells)} cells")
                continue
            for quantity, place in self._columns:
                cell = cells[place] if place < len(cells) else ""
                if self._number(quantity, cell) is None:
                    self._faulty += 1
                    found.faults[quantity] = _told(found.faults.get(quantity), number, cell)

    def _are_heads(self, cells: Sequence[str]) -> bool:
        """Whether a row repeats the heads, or those of the columns that are read at their places."""
        if score_of(cells, self._table, self._options) < 1:
            return False
        return all(
            place < len(cells)
            and quantity_of(cells[place], self._table, self._options) == quantity
            and _folded(cells[place]) == self._heads[place]
            for quantity, place in self._columns
        )

    def _is_cut(self, cells: list[str]) -> bool:
        """Whether the last row was cut short: the file ends in the middle of it, all but its last cells whole."""
        places = sorted(place for _, place in self._columns)
        if _ends_with_line_end(self._path, self._layout) or len(cells) > len(self._layout.heads):
            return False
        whole = [self._number(quantity, cells[place]) is not None for quantity, place in self._columns
                 if place < len(cells) - 1]  # fmt: skip
        # the last cell there is may be cut within, the ones behind it are missing
        return all(whole) and len(cells) - 1 <= places[-1] and bool(self._found.rows)


def _ends_with_line_end(path: Path, layout: Layout) -> bool:
    with path.open("rb") as stream:
        stream.seek(max(path.stat().st_size - 2, 0))
        return stream.read().strip(b"\0")[-1:] in (b"\n", b"\r")


def _folded(cell: str) -> str:
    return " ".join(cell.split()).casefold()


def _told(before: Told | None, number: int, example: str = "") -> Told:
    if before is None:
        return Told(number, 1, example)
    before.count += 1
    return before


# --- what is told ---


def _report_faults(
    read: Patient, layout: Layout, decimal_is_told: bool, name: str, findings: Findings
) -> bool:
    """Fault rows with more cells than heads and cells that are no numbers; whether there is one."""
    if read.overlong is not None:
        more = f"; {_rows(read.overlong.count - 1, 'more row')} so" if read.overlong.count > 1 else ""
        findings.add(
            "unreadable-file",
            Origin(name, None, read.overlong.first),
            "the row has more cells than there are heads",
            "write decimals with a point, or put semicolons between the cells",
            found=f"{read.overlong.example}{more}",
            expected=f"{len(layout.heads)} cells",
        )
        return True
    if read.too_wordy and read.passed is not None:
        findings.add(
            "unreadable-file",
            Origin(name, None, read.passed.first),
            "the file holds more lines of words than a log does",
            "begin remarks with '#', or export the readings alone",
            found=f"{MOST_WORDY_ROWS} lines and more, the first {quoted(read.passed.example)}",
            expected=f"fewer than {MOST_WORDY_ROWS} lines that are no readings",
        )
        return True
    if read.other_heads is not None:
        findings.add(
            "unreadable-file",
            Origin(name, None, read.other_heads.first),
            "the heads or units change within the file",
            "keep one log a file, or give its blocks the same columns",
            found=quoted(read.other_heads.example),
            expected=quoted(layout.separator.join(layout.heads)) + " throughout",
        )
        return True
    unsure = {} if decimal_is_told else {
        quantity: told for quantity, told in read.unsure.items()
        if not read.sure_signs.intersection(told.example)
    }  # fmt: skip
    for quantity in layout.columns:
        told = read.faults.get(quantity)
        doubt = unsure.get(quantity)
        if told is not None:
            _report_cell(told, quantity, layout, name, "at least " if read.ended_early else "", findings)
        elif doubt is not None:
            _report_unsure(doubt, quantity, layout, name, findings)
    return bool(read.faults or unsure)


def _report_cell(
    told: Told, quantity: str, layout: Layout, name: str, at_least: str, findings: Findings
) -> None:
    more = f"; {at_least}{told.count - 1} more cells of the column are so" if told.count > 1 else ""
    where = Origin(name, None, told.first, layout.heads[layout.columns[quantity]])
    found = (quoted(told.example) if told.example else "nothing") + more
    if quantity == "t" and (layout.times is not Times.NUMBER or has_two_parts(told.example)):
        findings.add(
            "not-a-time",
            where,
            "the cell must hold a time like those above it" if layout.times is not Times.NUMBER
            else "the time may be hours and minutes, or minutes and seconds",
            "write seconds, or hours, minutes and seconds, or a date-time with the year first; for dates in another "
            "order: [read.traces] dates in day.toml",
            found=found,
            expected="a date-time such as 2043-05-18T09:30:00, in the whole column with time zone or without"
            if layout.times is Times.STAMP
            else "a time such as 00:30:00",
        )  # fmt: skip
        return
    sign = "comma" if layout.decimal == "," else "point"
    findings.add(
        "not-a-number",
        where,
        "the cell must hold a number",
        "correct the cell, or delete the row; text below the last reading goes too",
        found=found,
        expected=f"a finite number with a decimal {sign}",
    )


def _report_unsure(told: Told, quantity: str, layout: Layout, name: str, findings: Findings) -> None:
    more = f"; {told.count - 1} more cells of the column are so" if told.count > 1 else ""
    findings.add(
        "not-a-number",
        Origin(name, None, told.first, layout.heads[layout.columns[quantity]]),
        "the sign may part decimals or thousands",
        "write one decimal sign throughout and no sign between thousands, or say which it is: [read.traces] decimal "
        "in day.toml",
        found=f"{quoted(told.example)}{more}",
        expected=f"a finite number with a decimal {'comma' if layout.decimal == ',' else 'point'}",
    )


def _report_sizes(
    path: Path, values: dict[str, FloatArray], read: Patient, layout: Layout, name: str, findings: Findings
) -> bool:
    """Fault numbers that are infinite, undefined or of no size that a cell has; whether there is one."""
    wrong = {
        quantity: places
        for quantity, numbers in values.items()
        if (places := np.flatnonzero(~(np.abs(numbers) <= LARGEST_NUMBER))).size
    }
    for quantity, places in wrong.items():
        first = int(places[0])
        row, place = read.rows[first], layout.columns[quantity]
        cell = next(cells[place] for number, cells in numbered_rows(path, layout) if number == row)
        more = f"; {places.size - 1} more cells of the column are so" if places.size > 1 else ""
        sign = "comma" if layout.decimal == "," else "point"
        is_finite = bool(np.isfinite(values[quantity][first]))
        findings.add(
            "not-a-number",
            Origin(name, None, row, layout.heads[place]),
            "the cell must hold a number",
            "correct the cell, or delete the row; text below the last reading goes too",
            found=quoted(cell) + more,
            expected=f"a finite number with a decimal {sign}"
            + (f", of a size up to {LARGEST_NUMBER:g}" if is_finite else ""),
        )
    return bool(wrong)


def _rows(count: int, what: str = "row") -> str:
    return f"{count} {what}{'s are' if count != 1 else ' is'}"


def _note(read: Patient, layout: Layout, name: str, findings: Findings) -> None:
    """Tell everything that was interpreted."""
    if read.passed is not None:
        shown = f", {quoted(read.passed.example)}" if read.passed.example else ""
        findings.add(
            "lines-passed-over",
            Origin(name, None, read.passed.first),
            f"{_rows(read.passed.count, 'line')} no reading and passed over (the first{shown}, in row "
            f"{read.passed.first})",
        )
    if read.repeated is not None:
        findings.add(
            "lines-passed-over",
            Origin(name, None, read.repeated.first),
            f"the heads are repeated in {_plural(read.repeated.count, 'line')}; the log was read as one",
            "check that its blocks follow one another on one time axis",
        )
    for (quantity, habit), told in read.habits.items():
        cells = _plural(told.count, "cell")
        findings.add(
            "numbers-interpreted",
            Origin(name, None, told.first, layout.head_of(quantity)),
            f"{cells} with {habit}, such as {quoted(told.example)}: read as {_read_as(habit)}",
            "check one of them" if habit is Habit.THOUSANDS else "",
        )
    if read.cut is not None:
        findings.add(
            "last-line-cut",
            Origin(name, None, read.cut.first),
            f"the file ends within its last line, {read.cut.example}; the line was left out",
            "check that nothing else is missing at the end",
        )


def _plural(count: int, what: str) -> str:
    return f"{count} {what}{'s' if count != 1 else ''}"


def _read_as(habit: Habit) -> str:
    return {
        Habit.THOUSANDS: "one number, the sign between thousands left out",
        Habit.EXPONENT: "a decimal sign",
        Habit.UNIT: "a quantity of that unit",
    }[habit]
