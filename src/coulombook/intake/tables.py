"""From cells to typed columns in SI, every fault of the table gathered on the way."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from datetime import date, datetime, timedelta

from coulombook.findings import Findings, Origin, RowOrigin
from coulombook.intake.clock import FIRST_SERIAL_DAY, LAST_SERIAL_DAY
from coulombook.intake.files import did_you_mean
from coulombook.intake.grid import Cell, FaultyCell, Grid, cell_text, is_blank
from coulombook.intake.lookalikes import lookalike, plain
from coulombook.intake.schema import Column, Content, Schema
from coulombook.intake.table_habits import tidied
from coulombook.units import (
    LARGEST_NUMBER,
    SMALLEST_NUMBER,
    Conversion,
    UnitError,
    conversion,
    is_of_ordinary_size,
    nearest,
    parse_head,
)

_NUMBER = re.compile(r"[+-]?(\d+([.,]\d*)?|[.,]\d+)([eE][+-]?\d+)?", re.ASCII)
_PLAIN = re.compile(r"[0-9+\-.,eE\n]*", re.ASCII)
_YES = frozenset(("yes", "y", "true", "1"))
_NO = frozenset(("no", "n", "false", "0"))
_LONGEST_QUOTE = 60  # characters of a cell shown in a message


@dataclass(frozen=True, slots=True)
class Default:
    """What stands for a cell that is not there: a value in SI or words, and the kind of a flow."""

    value: float | str | datetime
    flow_kind: str | None = None


@dataclass(slots=True, eq=False)
class TypedTable:
    """A table in typed columns; a quantity without a column is absent in every row.

    ``broken`` holds the places of rows with a fault: no record can be made of them, but their names count as known.
    """

    schema: Schema
    file: str
    sheet: str | None
    head_row: int
    row_numbers: tuple[int, ...]
    heads: Mapping[str, str]  # quantity -> head as written
    columns: dict[str, list[object]] = field(default_factory=dict)
    flow_kinds: dict[str, list[str | None]] = field(default_factory=dict)
    broken: set[int] = field(default_factory=set)
    unread: set[str] = field(default_factory=set)  # quantities whose head has a fault
    carried: dict[str, tuple[str, ...]] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.row_numbers)

    def words(self, quantity: str) -> list[str]:
        """The words of a column; "" where absent."""
        cells = self.columns.get(quantity)
        return [""] * len(self) if cells is None else [one if isinstance(one, str) else "" for one in cells]

    def numbers(self, quantity: str) -> list[float | None]:
        """The numbers of a column in SI; None where absent."""
        cells = self.columns.get(quantity)
        return (
            [None] * len(self)
            if cells is None
            else [one if isinstance(one, float) else None for one in cells]
        )

    def instants(self, quantity: str) -> list[datetime | None]:
        """The date-times of a column; None where absent."""
        cells = self.columns.get(quantity)
        return (
            [None] * len(self)
            if cells is None
            else [one if isinstance(one, datetime) else None for one in cells]
        )

    def yes_no(self, quantity: str, *, otherwise: bool) -> list[bool]:
        """The answers of a column; ``otherwise`` where absent."""
        cells = self.columns.get(quantity)
        return (
            [otherwise] * len(self)
            if cells is None
            else [one if isinstance(one, bool) else otherwise for one in cells]
        )

    def flow_kind(self, quantity: str) -> list[str | None]:
        """How the flows of a column were written, row by row."""
        return self.flow_kinds.get(quantity, [None] * len(self))

    def row_origin(self, place: int) -> RowOrigin:
        """The row of the record with index ``place``."""
        return RowOrigin(self.file, self.sheet, self.row_numbers[place], self.heads)

    def where(self, place: int, quantity: str) -> Origin:
        """The place of a cell, for a message."""
        return Origin(self.file, self.sheet, self.row_numbers[place], self.heads.get(quantity))

    @property
    def table_origin(self) -> Origin:
        """The place of the heads, for a message."""
        return Origin(self.file, self.sheet, self.head_row)


def typed_table(
    grid: Grid, schema: Schema, findings: Findings, defaults: Mapping[str, Default] | None = None
) -> TypedTable:
    """Typed columns of a grid, in SI.

    ``defaults`` (by quantity) stand for blank cells and absent columns. Faults go to ``findings``; the cells they are
    about read as absent.
    """
    defaults = defaults or {}
    grid = tidied(grid, schema, findings)
    places = _place_columns(grid, schema, findings)
    heads = {quantity: shortened(grid.heads[place]) for quantity, place in places.items()}
    table = TypedTable(schema, grid.file, grid.sheet, grid.head_row, grid.numbers, heads)
    _carry(grid, schema, places, table, findings)
    _report_overlong_rows(grid, findings)
    unused = _unused_rows(grid, schema, places, findings, table)
    decimal_comma = _decimal_comma(grid, schema, places)
    for column in schema.columns:
        quantity = column.quantity
        if quantity == "use":
            continue
        default = defaults.get(quantity)
        place = places.get(quantity)
        if place is None:
            if default is not None:
                table.columns[quantity] = [default.value] * len(table)
                table.flow_kinds[quantity] = [default.flow_kind] * len(table)
            elif column.needed:
                _report_missing_column(grid, schema, column, findings)
            continue
        cells = [row[place] if place < len(row) else None for row in grid.rows]
        _read_column(grid, column, grid.heads[place], cells, default, unused, decimal_comma, table, findings)
    if unused:
        rows = ", ".join(str(table.row_numbers[place]) for place in sorted(unused)[:10])
        many = len(unused) > 1
        findings.add(
            "left-out",
            Origin(table.file, table.sheet),
            f"{len(unused)} {'rows are' if many else 'row is'} marked unused ({'rows' if many else 'row'} {rows}"
            f"{', ...' if len(unused) > 10 else ''}) and left out",
        )
    return table


def _place_columns(grid: Grid, schema: Schema, findings: Findings) -> dict[str, int]:
    places: dict[str, int] = {}
    for place, head in enumerate(grid.heads):
        column = schema.by_name.get(parse_head(head).quantity)
        if column is None:
            continue
        if column.quantity in places:
            findings.add(
                "repeated-column",
                _head_place(grid, head),
                "two columns carry the same quantity",
                "delete or rename one of them",
                found=f"'{grid.heads[places[column.quantity]]}' and '{head}'",
                expected=f"one column '{column.head}'",
            )
            continue
        places[column.quantity] = place
    return places


def _head_place(grid: Grid, head: str) -> Origin:
    return Origin(grid.file, grid.sheet, grid.head_row, shortened(head))


def _carry(
    grid: Grid, schema: Schema, places: Mapping[str, int], table: TypedTable, findings: Findings
) -> None:
    taken = set(places.values())
    # suggestions come from columns that are not there already
    free = [column.head for column in schema.columns if column.quantity not in places]
    names = [*free, *(name for name, column in schema.by_name.items() if column.quantity not in places)]
    for place, head in enumerate(grid.heads):
        if place in taken or schema.by_name.get(parse_head(head).quantity) is not None:
            continue
        cells = tuple(cell_text(row[place]) if place < len(row) else "" for row in grid.rows)
        if not head and not any(cells):
            continue
        key = head or f"column {place + 1}"
        while key in table.carried:
            key += "'"
        table.carried[key] = cells
        deceit = lookalike(head) if parse_head(plain(head)).quantity in schema.by_name else None
        near = None if deceit else _nearest_head(head, names, schema)
        findings.add(
            "unread-column",
            _head_place(grid, key),
            "the column is not known; it is carried along unread",
            f"type the head anew: {deceit}"
            if deceit
            else f"if '{near}' is meant, write the head so"
            if near
            else "",
        )


def _nearest_head(head: str, names: Sequence[str], schema: Schema) -> str | None:
    """The head most like a given one, with or without its unit."""
    # "I/mA", "I [mA]" and "I (mA)" are how heads come from instruments
    quantity = re.split(r"\s*[/\[(]", head, maxsplit=1)[0] if head else ""
    for text in (parse_head(head).quantity, quantity.casefold()):
        near = nearest(text, names, cutoff=0.7) or _longer_name(text, names, schema)
        if near:
            column = schema.by_name.get(parse_head(near).quantity)
            return column.head if column else near
    return None


def _longer_name(text: str, names: Sequence[str], schema: Schema) -> str | None:
    """The one head whose words hold all words of ``text``, as "electrode area" does those of "area"."""
    words = set(text.split())
    longer = {
        column.head
        for name in names
        if (column := schema.by_name.get(parse_head(name).quantity)) and words <= set(column.quantity.split())
    }
    return longer.pop() if words and len(longer) == 1 else None


def _report_missing_column(grid: Grid, schema: Schema, column: Column, findings: Findings) -> None:
    unknown = [head for head in grid.heads if schema.by_name.get(parse_head(head).quantity) is None]
    close = next(
        (head for head in unknown if _nearest_head(head, [column.head, column.quantity], schema)), None
    )
    deceiving = next(
        (head for head in unknown if schema.by_name.get(parse_head(plain(head)).quantity) is column), None
    )
    findings.add(
        "missing-column",
        grid.head_origin,
        f"the table has no column '{column.head}'",
        f"type the head '{deceiving}' anew: {lookalike(deceiving)}"
        if deceiving
        else f"did you mean it by '{close}'? then write the head as '{column.head}'"
        if close
        else f"add the column '{column.head}'",
        found=", ".join(f"'{head}'" for head in grid.heads)[:300] or "no heads",
        expected=f"'{column.head}'",
    )


def _report_overlong_rows(grid: Grid, findings: Findings) -> None:
    width = len(grid.heads)
    if grid.sheet is not None:
        return  # a remark beside a sheet's table is common and harmless
    wrong = [
        place
        for place, row in enumerate(grid.rows)
        if len(row) > width and not all(map(is_blank, row[width:]))
    ]
    if wrong:
        more = f"; {len(wrong) - 1} more rows are so" if len(wrong) > 1 else ""
        findings.add(
            "unreadable-file",
            grid.origin(wrong[0]),
            "the row has more cells than there are heads",
            "write decimals with a point, or put semicolons between the cells",
            found=f"{len(grid.rows[wrong[0]])} cells{more}",
            expected=f"{width} cells",
        )


def _unused_rows(
    grid: Grid, schema: Schema, places: Mapping[str, int], findings: Findings, table: TypedTable
) -> frozenset[int]:
    """Places of rows marked as not to be used: what they lack is no fault."""
    column = schema.by_quantity.get("use")
    place = places.get("use")
    if column is None or place is None:
        return frozenset()
    cells = [row[place] if place < len(row) else None for row in grid.rows]
    answers: list[object] = []
    for row, cell in enumerate(cells):
        answer = _yes_or_no(cell)
        if answer is None and not is_blank(cell):
            _report_cell(findings, "not-allowed", table.where(row, "use"), "the answer is neither yes nor no", cell,
                         "yes or no", "write yes or no")  # fmt: skip
            table.broken.add(row)
        answers.append(answer)
    table.columns["use"] = answers
    return frozenset(row for row, answer in enumerate(answers) if answer is False)


def _yes_or_no(cell: Cell) -> bool | None:
    text = cell_text(cell).casefold()
    return True if text in _YES else False if text in _NO else None


def _read_column(
    grid: Grid,
    column: Column,
    head: str,
    cells: Sequence[Cell],
    default: Default | None,
    unused: frozenset[int],
    decimal_comma: bool,
    table: TypedTable,
    findings: Findings,
) -> None:
    quantity = column.quantity
    how = _conversion_of_head(grid, column, head, findings)
    values: list[object]
    if column.content is Content.NUMBER:
        values = _numbers(column, cells, unused, decimal_comma, table, findings)
        if grid.sheet is not None:
            _note_texts(column, cells, values, table, findings)
        if how is None:
            table.unread.add(quantity)
            values = [None] * len(cells)
        else:
            # a unit that is SI already leaves every digit as it is
            if how.factor != 1.0 or how.offset:
                values = [one * how.factor + how.offset if isinstance(one, float) else None for one in values]
            _check_range(column, cells, values, unused, table, findings)
    elif column.content is Content.INSTANT:
        values = _instants(column, cells, grid.epoch, unused, table, findings)
    else:
        values = [text or None for text in map(cell_text, cells)]
    kinds = [how.flow_kind if how else None] * len(cells)
    blank = [place for place, cell in enumerate(cells) if is_blank(cell)]
    told = {place for place in blank if isinstance(cells[place], FaultyCell)}
    table.broken |= told
    if default is not None:
        for place in blank:
            values[place] = default.value
            kinds[place] = default.flow_kind
    elif column.needed and how is not None:
        for place in blank:
            table.broken.add(place)
            if place not in unused and place not in told:
                findings.add(
                    "missing-value",
                    table.where(place, quantity),
                    "the cell is empty",
                    "fill in the cell, or delete the row",
                    found="nothing",
                    expected=_expected(column),
                )
    table.columns[quantity] = values
    if column.dimension == "flow":
        table.flow_kinds[quantity] = kinds


def _conversion_of_head(grid: Grid, column: Column, head: str, findings: Findings) -> Conversion | None:
    """How a column becomes SI; None after a fault."""
    unit = parse_head(head).unit
    try:
        return unit_conversion(column, unit)
    except UnitError as error:
        found = f"unit {quoted(unit)}" if unit is not None else "no unit in the head"
        mend = f"correct the unit in the head, as in '{column.head}'"
        deceit = lookalike(unit or "")
        if error.suggestion:
            mend += f"; did you mean '{error.suggestion}'?"
        mend += f"; {deceit}" if deceit else ""
        text = (
            "the unit measures something else"
            if error.kind == "wrong-dimension"
            else "the unit is not known"
            if unit is not None
            else "the head gives no unit"
        )
        findings.add(error.kind, _head_place(grid, head), text, mend, found=found, expected=error.expected)
        return None


def unit_conversion(column: Column, unit: str | None) -> Conversion:
    """How values of a column in ``unit`` (None: no unit given) become SI.

    Raises `UnitError` when the unit is missing, unknown, or measures something else.
    """
    if column.raw:
        return Conversion(1.0)
    if column.content is not Content.NUMBER:
        if unit is None:
            return Conversion(1.0)
        raise UnitError("unknown-unit", unit, f"no unit, for the column holds {column.content}", None)
    if column.dimension is None:
        return Conversion(1.0) if unit is None else conversion(unit, "fraction")
    if unit is None:
        raise UnitError("unknown-unit", "", f"the head '{column.head}'", None)
    return conversion(unit, column.dimension)


def _numbers(
    column: Column,
    cells: Sequence[Cell],
    unused: frozenset[int],
    decimal_comma: bool,
    table: TypedTable,
    findings: Findings,
) -> list[object]:
    """The numbers of a column as written, None for blanks and faults."""
    plain = _all_plain(cells, decimal_comma)
    if plain is not None:
        return plain
    values: list[object] = []
    for place, cell in enumerate(cells):
        if isinstance(cell, str):
            value = _number_of_text(cell, decimal_comma)
        elif isinstance(cell, float | int) and not isinstance(cell, bool):
            value = float(cell)
        else:
            value = None
        if value is not None and not is_of_ordinary_size(value):
            if math.isfinite(value):
                _report_size(column, cell, place, unused, table, findings)
                values.append(None)
                continue
            value = None
        if value is None and not is_blank(cell):
            table.broken.add(place)
            if place not in unused:
                sign = "comma" if decimal_comma else "point"
                is_text = isinstance(cell, str)
                _report_cell(
                    findings,
                    "not-a-number",
                    table.where(place, column.quantity),
                    "the cell must hold a number",
                    cell,
                    f"a finite number with a decimal {sign} and nothing else"
                    if is_text
                    else "a finite number",
                    "correct the cell; leave it blank where the value is not known"
                    if not column.needed
                    else "correct the cell, or delete the row",
                )
        values.append(value)
    return values


def _note_texts(
    column: Column, cells: Sequence[Cell], values: Sequence[object], table: TypedTable, findings: Findings
) -> None:
    """Tell of numbers that a workbook holds as text: its own formulas would not have counted them."""
    texts = [
        place
        for place, value in enumerate(values)
        if isinstance(value, float) and isinstance(cells[place], str)
    ]
    if texts:
        findings.add(
            "numbers-interpreted",
            table.where(texts[0], column.quantity),
            f"{len(texts)} cell{'s hold numbers' if len(texts) > 1 else ' holds a number'} as text, such as "
            f"{quoted(cell_text(cells[texts[0]]))}",
            "format the cells as numbers and enter them anew",
        )


def _report_size(
    column: Column, cell: Cell, place: int, unused: frozenset[int], table: TypedTable, findings: Findings
) -> None:
    table.broken.add(place)
    if place not in unused:
        _report_cell(
            findings,
            "not-allowed",
            table.where(place, column.quantity),
            "no quantity of the bench has this size",
            cell,
            f"zero, or a size from {SMALLEST_NUMBER:g} to {LARGEST_NUMBER:g}",
            "correct the value",
        )


def _decimal_comma(grid: Grid, schema: Schema, places: Mapping[str, int]) -> bool:
    """Whether most numbers of the table with a decimal sign write a comma; the others are faults, not thousands."""
    commas = points = 0
    for quantity, place in places.items():
        if schema.by_quantity[quantity].content is Content.NUMBER:
            texts = [cell for row in grid.rows if place < len(row) and isinstance(cell := row[place], str)]
            numbers = "\n".join(texts)
            if "," in numbers:
                numbers = "\n".join(cell for cell in texts if _NUMBER.fullmatch(cell))
            commas += numbers.count(",")
            points += numbers.count(".")
    return commas > points


def _all_plain(cells: Sequence[Cell], decimal_comma: bool) -> list[object] | None:
    """The numbers of a column in which every cell is plain digits, sign, decimal sign and exponent; else None."""
    if not all(type(cell) is str for cell in cells):
        return None
    joined = "\n".join(cells)  # type: ignore[arg-type]  # every cell was seen to be text
    if not _PLAIN.fullmatch(joined) or ("." if decimal_comma else ",") in joined:
        return None
    try:
        values = list(map(float, joined.replace(",", ".").split("\n")))
    except ValueError:
        return None
    ordinary = (
        max(values, default=0.0) <= LARGEST_NUMBER
        and min(values, default=0.0) >= -LARGEST_NUMBER
        and min(map(abs, filter(None, values)), default=1.0) >= SMALLEST_NUMBER
    )
    return list(values) if ordinary else None


def _number_of_text(text: str, decimal_comma: bool) -> float | None:
    tidy = text.strip().replace("\N{MINUS SIGN}", "-")
    if not _NUMBER.fullmatch(tidy):
        return None
    if ("." if decimal_comma else ",") in tidy:
        return None
    return float(tidy.replace(",", ".") if decimal_comma else tidy)


def _check_range(
    column: Column,
    cells: Sequence[Cell],
    values: list[object],
    unused: frozenset[int],
    table: TypedTable,
    findings: Findings,
) -> None:
    allowed = column.range
    numbers = [value for value in values if isinstance(value, float)]
    if allowed is None or not numbers or (allowed.holds(min(numbers)) and allowed.holds(max(numbers))):
        return
    for place, value in enumerate(values):
        if isinstance(value, float) and not allowed.holds(value):
            table.broken.add(place)
            if place not in unused:
                _report_cell(
                    findings,
                    "not-allowed",
                    table.where(place, column.quantity),
                    "the value is not possible",
                    cells[place],
                    allowed.text,
                    "correct the value, or the unit in the head" if column.dimension else "correct the value",
                )


def _instants(
    column: Column,
    cells: Sequence[Cell],
    epoch: datetime | None,
    unused: frozenset[int],
    table: TypedTable,
    findings: Findings,
) -> list[object]:
    values: list[object] = []
    serials: list[int] = []
    for place, cell in enumerate(cells):
        value = instant_of(cell)
        if value is None and epoch is not None and (value := _instant_of_serial(cell, epoch)) is not None:
            serials.append(place)
        if value is None and not is_blank(cell):
            table.broken.add(place)
            if place not in unused:
                _report_cell(
                    findings,
                    "not-a-time",
                    table.where(place, column.quantity),
                    "the cell must hold a date and a time of day",
                    cell,
                    "a date-time as ISO 8601 writes it, such as 2043-05-18T09:30:00",
                    "write year, month, day, then the time",
                )
        values.append(value)
    if serials:
        first = serials[0]
        findings.add(
            "date-from-number",
            table.where(first, column.quantity),
            f"{len(serials)} cell{'s hold serial dates' if len(serials) > 1 else ' holds a serial date'} in place of "
            f"a date-time; {cell_text(cells[first])} was read as {values[first]}",
            "format the cells as date and time",
        )
    return values


def _instant_of_serial(cell: Cell, epoch: datetime) -> datetime | None:
    """The date-time of a serial date of a workbook, to the millisecond; a whole number lacks its time of day."""
    if not isinstance(cell, float) or cell.is_integer() or not FIRST_SERIAL_DAY <= cell <= LAST_SERIAL_DAY:
        return None
    return epoch + timedelta(milliseconds=round(cell * 86_400_000))


def instant_of(cell: Cell) -> datetime | None:
    """The date-time a cell holds, or None; a date without a time of day is none."""
    if isinstance(cell, datetime):
        return cell
    if isinstance(cell, str):
        text = cell.strip()
        try:
            date.fromisoformat(text)
        except ValueError:
            pass
        else:
            return None
        try:
            return datetime.fromisoformat(text)
        except ValueError:
            return None
    return None


def _expected(column: Column) -> str:
    if column.range is not None:
        return column.range.text
    return {
        Content.NUMBER: "a number",
        Content.INSTANT: "a date-time such as 2043-05-18T09:30:00",
        Content.WORDS: f"the {column.quantity}",
        Content.YES_NO: "yes or no",
    }[column.content]


def _report_cell(
    findings: Findings, kind: str, where: Origin, text: str, cell: Cell, expected: str, mend: str
) -> None:
    findings.add(kind, where, text, mend, found=quoted(cell_text(cell)), expected=expected)


def shortened(text: str) -> str:
    """A text for a message, long ones cut."""
    return text if len(text) <= _LONGEST_QUOTE else f"{text[:_LONGEST_QUOTE]}..."


def quoted(text: str) -> str:
    """A cell for a message: in quotes, long ones cut."""
    return f"'{shortened(text)}'"


__all__ = [
    "Default",
    "TypedTable",
    "did_you_mean",
    "instant_of",
    "quoted",
    "shortened",
    "typed_table",
    "unit_conversion",
]
