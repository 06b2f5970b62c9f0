"""How a long table is written, as its first lines say: encoding, separator, heads, units, kind of its times."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

from coulombook.findings import Findings, Origin
from coulombook.intake import clock, text
from coulombook.intake.clock import Times
from coulombook.intake.files import unreadable
from coulombook.intake.limits import (
    FIRST_LOOK_BYTE,
    LARGEST_LOG_BYTE,
    LONGEST_LINE,
    LONGEST_PREAMBLE_BYTE,
    MOST_COLUMNS,
)
from coulombook.intake.lookalikes import lookalike, plain
from coulombook.intake.numbers import Habit, is_like_a_number, votes_for_comma, written_number
from coulombook.intake.schema import Column, Schema
from coulombook.intake.settings import TraceOptions
from coulombook.intake.tables import quoted, shortened, unit_conversion
from coulombook.units import UnitError, conversion, nearest, parse_head

_BRACKET_UNIT = re.compile(r"(.*?)\s*[\[(]\s*([^\[\]()]*?)\s*[\])]")
_BRACKETS = re.compile(r"[\[(]\s*([^\[\]()]*?)\s*[\])]")
_FORM_OF_TIMES = re.compile(r"[a-zA-Z:./,\- ]{2,30}")  # "hh:mm:ss" where the other columns have their unit
_SAMPLE = 200  # rows below the heads that are looked at before the body is read


@dataclass(frozen=True, slots=True)
class Layout:
    """How a long table is written: what its first lines say."""

    encoding: str  # "utf-8" also stands for Windows-1252: only numbers are read from the body
    separator: str
    decimal: str
    head_row: int  # as the spreadsheet counts
    units_row: int | None  # a row of units under the heads
    above: int  # lines above the last of these two that are not blank
    quotes: bool  # whether cells of the body may stand in quotes
    heads: tuple[str, ...]
    columns: Mapping[str, int]  # quantity -> place of its column
    factors: Mapping[str, float]  # quantity -> factor to SI
    units: tuple[str, ...]  # cells of the row of units
    width: int  # cells in a row, blank ones at the end with them
    times: Times
    careful: bool  # only the patient reader tells the rows apart rightly
    lone_returns: bool  # lines that end in CR alone, which pandas miscounts when it skips them

    @property
    def body_row(self) -> int:
        """The row that the readings stand below."""
        return self.units_row or self.head_row

    def head_of(self, quantity: str) -> str:
        """The head of a column as written, for a message."""
        return shortened(self.heads[self.columns[quantity]])


def layout_of(
    path: Path, size: int, name: str, table: Schema, options: TraceOptions, findings: Findings
) -> Layout | None:
    """How a file is written, from its first bytes; None after a fault.

    Raises OSError, and `text.UnreadableText` when the bytes are no text.
    """
    if size > LARGEST_LOG_BYTE:
        unreadable(
            findings, name, f"{size / 1e9:.0f} GB", f"a file of at most {LARGEST_LOG_BYTE / 1e9:.0f} GB"
        )
        return None
    take = FIRST_LOOK_BYTE
    while True:
        with path.open("rb") as stream:
            data = stream.read(take)
        lines, encoding = _first_lines(data, cut=take < size)
        found = _find_heads(lines, table, options)
        complete = found is not None and found[2]
        if complete or take >= min(size, LONGEST_PREAMBLE_BYTE):
            break
        take *= 8
    if found is None or not complete:
        _report_no_heads(findings, name, lines, found, table, options)
        return None
    return _layout_below(lines, encoding, found[0], found[1], name, table, options, findings)


def _layout_below(
    lines: Sequence[str],
    encoding: str,
    place: int,
    separator: str,
    name: str,
    table: Schema,
    options: TraceOptions,
    findings: Findings,
) -> Layout | None:
    heads = text.split_line(lines[place], separator)
    if len(heads) > MOST_COLUMNS:
        unreadable(
            findings, Origin(name, None, place + 1), f"{len(heads)} heads", f"at most {MOST_COLUMNS} columns",
            "keep the columns that are needed",
        )  # fmt: skip
        return None
    columns = _columns(heads, table, options, name, place + 1, findings)
    if columns is None:
        return None
    numbered = [(number, line) for number, line in enumerate(lines[place + 1 :], place + 2) if line.strip()]
    sample = [(number, text.split_line(line, separator)) for number, line in numbered[: _SAMPLE + 1]]
    units_row: int | None = None
    units: tuple[str, ...] = ()
    if sample and is_units(sample[0][1], columns, table):
        units_row, units = sample[0][0], tuple(sample[0][1])
        sample, numbered = sample[1:], numbered[1:]
    below = [line for _, line in numbered[:_SAMPLE]]
    cells = [row for _, row in sample[:_SAMPLE]]
    time_cells = [row[columns["t"]] for row in cells if "t" in columns and columns["t"] < len(row)]
    times = clock.kind_of(time_cells)
    factors = _factors(heads, units, columns, cells, times, name, place + 1, table, options, findings)
    if factors is None:
        return None
    measured = [column for quantity, column in columns.items() if quantity != "t" or times is Times.NUMBER]
    used = [row[column] for row in cells for column in measured if column < len(row)]
    quotes = any('"' in line for line in below)
    decimal = options.decimal or ("," if votes_for_comma(filter(is_like_a_number, used)) > 0 else ".")
    if separator == "," and decimal == "," and not quotes:
        decimal = "."
    # a stray quote in the free text would make a fast reader that minds quotes swallow rows
    careful = (quotes and any('"' in line for line in lines[:place])) or times is not Times.NUMBER
    # a decimal comma between commas would shift every number unseen
    careful |= any(any(row[len(heads) :]) for row in cells)
    body_row = units_row or place + 1
    # a tab is no blank where it parts the cells
    above = sum(bool(line.strip("\r\n \t".replace(separator, ""))) for line in lines[: body_row - 1])
    return Layout(
        encoding,
        separator,
        decimal,
        place + 1,
        units_row,
        above,
        quotes,
        tuple(heads),
        columns,
        factors,
        units,
        max(map(len, [heads, *cells])),
        times,
        careful,
        any(line.endswith("\r") for line in lines[: body_row + 1]),
    )


def _first_lines(data: bytes, *, cut: bool) -> tuple[list[str], str]:
    """The whole lines at the start of a file and its encoding; ``cut`` says that the file goes on."""
    encoding = text.encoding_of(data)
    if encoding == "utf-16" and len(data) % 2:
        data = data[:-1]
    if encoding == "utf-8-sig" and cut:
        # the cut may fall inside a character; an ASCII line end is never part of one
        data = data[: max(data.rfind(b"\n"), data.rfind(b"\r")) + 1] or data
    lines = text.lines_of(text.decode(data))
    if cut and lines and not lines[-1].endswith(("\n", "\r")):
        if len(lines) == 1:
            raise text.UnreadableText(
                f"a line of more than {len(lines[0]) - 1} characters in row 1",
                f"lines of at most {LONGEST_LINE} characters",
            )
        lines.pop()
    return lines, "utf-16" if encoding == "utf-16" else "utf-8"


# --- heads ---


def _find_heads(lines: Sequence[str], table: Schema, options: TraceOptions) -> tuple[int, str, bool] | None:
    """Place of the heads, separator, and whether every needed column is there; None when no line is like heads."""
    separators = (options.separator,) if options.separator else text.SEPARATORS
    candidates: Iterator[tuple[int, str]] = enumerate(lines)
    if options.skip is not None and options.skip < len(lines):
        candidates = iter([(options.skip, lines[options.skip])])
    best: tuple[float, int, str] | None = None
    for place, line in candidates:
        for separator in separators:
            if separator in line:
                value = score_of(text.split_line(line, separator)[: MOST_COLUMNS + 1], table, options)
                if value > 0 and (best is None or value > best[0]):
                    best = value, place, separator
        if best is not None and best[0] >= 1:
            break
    return None if best is None else (best[1], best[2], best[0] >= 1)


def score_of(cells: Sequence[str], table: Schema, options: TraceOptions) -> float:
    """How well cells serve as heads: 1 when every needed quantity is there, 0 when none is."""
    # most lines that are no heads are numbers, which no head is
    known = {
        quantity
        for cell in cells
        if (options.columns or not is_like_a_number(cell)) and (quantity := quantity_of(cell, table, options))
    }
    if not known:
        return 0.0
    needed = {column.quantity for column in table.needed()}
    if needed <= known and ("i" not in table.by_quantity or known & {"i", "j"}):
        return 1.0
    return len(known) / (len(table.columns) + 1)


def quantity_of(head: str, table: Schema, options: TraceOptions) -> str | None:
    """The quantity a head stands for: as day.toml maps it, else as the contract names it."""
    folded = " ".join(head.split())
    for quantity, (mapped, _) in options.columns.items():
        if folded.casefold() == mapped.casefold():
            return quantity if quantity in table.by_quantity else None
    column = table.by_name.get(parse_head(folded).quantity)
    return None if column is None else column.quantity


def _columns(
    heads: Sequence[str], table: Schema, options: TraceOptions, name: str, row: int, findings: Findings
) -> dict[str, int] | None:
    columns: dict[str, int] = {}
    mapped = {quantity for quantity, (head, _) in options.columns.items() if head.casefold() in
              {" ".join(one.split()).casefold() for one in heads}}  # fmt: skip
    for place, head in enumerate(heads):
        quantity = quantity_of(head, table, options)
        if quantity is None:
            continue
        is_mapped = " ".join(head.split()).casefold() in {
            one.casefold() for one, _ in options.columns.values()
        }
        if quantity in mapped and not is_mapped:
            continue  # day.toml says which of the two it is
        if quantity in columns:
            findings.add(
                "repeated-column",
                Origin(name, None, row, shortened(head)),
                "two columns carry the same quantity",
                "say which one counts: [read.traces] columns in day.toml",
                found=f"'{heads[columns[quantity]]}' and '{head}'",
                expected=f"one column '{table.by_quantity[quantity].head}'",
            )
            return None
        columns[quantity] = place
    if "i" in columns:
        columns.pop("j", None)
    return columns


# --- units ---


def _unit_in(cell: str) -> str:
    """The unit that a cell of a row of units holds, its brackets taken off."""
    bracket = _BRACKETS.fullmatch(cell)
    return bracket[1] if bracket else cell


@lru_cache(maxsize=1024)
def _measures(unit: str, dimension: str) -> bool:
    """Whether a unit is one of a dimension."""
    try:
        conversion(unit, dimension)
    except UnitError:
        return False
    return True


def is_units(cells: Sequence[str], columns: Mapping[str, int], table: Schema) -> bool:
    """Whether a row under the heads is one of units: each column read has one that its quantity may have."""
    found = 0
    for quantity, place in columns.items():
        cell = cells[place] if place < len(cells) else ""
        dimension = table.by_quantity[quantity].dimension
        if dimension is None:
            if is_like_a_number(cell):
                return False
            continue
        if not _measures(_unit_in(cell), dimension):
            # a clock has a form in place of a unit
            if quantity == "t" and _FORM_OF_TIMES.fullmatch(cell):
                continue
            return False
        found += 1
    return found > 0


def _factors(
    heads: Sequence[str],
    units: Sequence[str],
    columns: Mapping[str, int],
    cells: Sequence[Sequence[str]],
    times: Times,
    name: str,
    head_row: int,
    table: Schema,
    options: TraceOptions,
    findings: Findings,
) -> dict[str, float] | None:
    """Factor to SI of every column read; None after a fault."""
    factors: dict[str, float] = {}
    for quantity, place in columns.items():
        column, head = table.by_quantity[quantity], heads[place]
        unit = _unit_of(head, quantity, options)
        below = _unit_in(units[place]) if place < len(units) else None
        if quantity == "t" and times is not Times.NUMBER:
            factors[quantity] = 1.0
            continue
        if unit is None and below is None and column.dimension is not None:
            column_cells = [row[place] for row in cells if place < len(row) and row[place]]
            if column_cells and all(map(_carries_unit, column_cells)):
                factors[quantity] = 1.0  # each cell brings its own
                continue
        try:
            factor = _factor(column, unit if unit is not None else below)
            if unit is not None and below is not None and _factor(column, below) != factor:
                raise UnitError("unknown-unit", f"{unit}' and '{below}", "one unit for a column", None)
            factors[quantity] = factor
        except UnitError as error:
            hint = f"; did you mean '{error.suggestion}'?" if error.suggestion else ""
            deceit = lookalike(unit or "")
            found = error.found or unit
            findings.add(
                error.kind,
                Origin(name, None, head_row, shortened(head)),
                "the unit measures something else" if error.kind == "wrong-dimension" else "the unit is not known"
                if unit else "the head gives no unit",
                f"write the head as '{column.head}', or map it in day.toml: "
                f"[read.traces] columns = {{ \"{column.head}\" = \"{shortened(head)}\" }}{hint}"
                + (f"; {deceit}" if deceit else ""),
                found=f"unit {quoted(found)}" if found else "no unit in the head",
                expected=error.expected,
            )  # fmt: skip
    return factors if len(factors) == len(columns) else None


def _factor(column: Column, unit: str | None) -> float:
    if column.dimension is None:
        return unit_conversion(column, unit).factor
    if unit is None:
        raise UnitError("unknown-unit", "", f"the head '{column.head}'", None)
    return conversion(unit, column.dimension).factor


def _carries_unit(cell: str) -> bool:
    written = written_number(cell, ".") or written_number(cell, ",")
    return written is not None and written.habit is Habit.UNIT


def _unit_of(head: str, quantity: str, options: TraceOptions) -> str | None:
    """The unit of a column: that of its key in day.toml, after the slash of its head, or in brackets."""
    folded = " ".join(head.split())
    mapped = options.columns.get(quantity)
    if mapped is not None and mapped[0].casefold() == folded.casefold():
        if mapped[1] is not None:
            return mapped[1]
        bracket = _BRACKET_UNIT.fullmatch(folded)
        if bracket:
            return bracket[2]
    return parse_head(folded).unit


# --- faults of the heads ---


def _report_no_heads(
    findings: Findings,
    name: str,
    lines: Sequence[str],
    found: tuple[int, str, bool] | None,
    table: Schema,
    options: TraceOptions,
) -> None:
    if found is None:
        shown = next((line.strip() for line in lines if line.strip()), "")
        deceit = next(
            (line for line in lines[:_SAMPLE] if not line.isascii() and _find_heads([plain(line)], table, options)),
            None,
        )  # fmt: skip
        findings.add(
            "missing-column",
            name,
            "no line of the file is a line of heads",
            "write the heads as expected, or map them in day.toml: [read.traces] columns"
            + (f"; in '{shortened(deceit.strip())}' {lookalike(deceit)}" if deceit else ""),
            found=quoted(deceit.strip() if deceit else shown),
            expected=", ".join(f"'{column.head}'" for column in table.columns[:3]),
        )
        return
    place, separator, _ = found
    heads = [head for head in text.split_line(lines[place], separator) if head]
    if len(heads) > MOST_COLUMNS:
        unreadable(findings, Origin(name, None, place + 1), f"{len(heads)} heads",
                   f"at most {MOST_COLUMNS} columns", "keep the columns that are needed")  # fmt: skip
        return
    known = {quantity_of(head, table, options) for head in heads}
    missing = [column for column in table.needed() if column.quantity not in known]
    if "i" in table.by_quantity and not known & {"i", "j"}:
        missing.append(table.by_quantity["i"])
    unknown = [head for head in heads if quantity_of(head, table, options) is None]
    for column in missing:
        deceiving = next(
            (h for h in unknown if quantity_of(plain(h), table, options) == column.quantity), None
        )
        near = _meant(column, unknown)
        findings.add(
            "missing-column",
            Origin(name, None, place + 1),
            f"the file has no column '{column.head}'",
            f"type the head '{deceiving}' anew: {lookalike(deceiving)}" if deceiving
            else f"write the head '{near}' as '{column.head}'" if near
            else "add the column, or map its head in day.toml: [read.traces] columns",
            found=", ".join(f"'{head}'" for head in heads)[:300],
            expected=f"'{column.head}'",
        )  # fmt: skip


def _meant(column: Column, heads: Sequence[str]) -> str | None:
    """The head that may be meant by a column: its words are near a name of the column, or begin with its symbol."""
    for head in heads:
        # "I/mA", "I [mA]" and "I (mA)" are how heads come from instruments
        words = re.split(r"\s*[/\[(]", head, maxsplit=1)[0].casefold()
        names = [column.quantity, *column.synonyms]
        if nearest(words, names) or (len(words) <= 3 and words.startswith(column.quantity)):
            return head
    return None
