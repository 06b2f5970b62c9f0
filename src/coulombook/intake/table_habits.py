"""What people do to tables: comments between rows, heads once more, units under the heads, merged and hidden cells.

Each is told of as a finding, and taken for what it plainly is.
"""

from __future__ import annotations

import re
from bisect import bisect_left, bisect_right
from collections.abc import Callable, Sequence
from dataclasses import replace

from coulombook.findings import Findings
from coulombook.intake.grid import Cell, Grid, cell_text, is_blank
from coulombook.intake.limits import MOST_CELLS
from coulombook.intake.numbers import is_like_a_number
from coulombook.intake.schema import Content, Schema
from coulombook.intake.workbook import Look
from coulombook.units import UnitError, conversion, parse_head

_COMMENT = re.compile(r"(#|%|//)")
_BRACKETS = re.compile(r"[\[(]\s*([^\[\]()]*?)\s*[\])]")
_AT_MOST = 5  # places named in one finding


def tidied(grid: Grid, schema: Schema, findings: Findings) -> Grid:
    """The grid without the rows that are none, and with the units of a row under its heads in the heads."""
    grid = _with_units(grid, schema, findings)
    grid = _without(
        grid,
        lambda row: _are_heads(row, grid.heads),
        "the heads are repeated in {rows}; the rows below them were taken for the same table",
        findings,
    )
    return _without(
        grid, lambda row: _is_comment(row, grid, schema), "{rows} a comment; passed over", findings
    )


def _without(grid: Grid, test: Callable[[Sequence[Cell]], bool], what: str, findings: Findings) -> Grid:
    found = [place for place, row in enumerate(grid.rows) if test(row)]
    if not found:
        return grid
    named = ", ".join(str(grid.numbers[place]) for place in found[:_AT_MOST])
    more = ", ..." if len(found) > _AT_MOST else ""
    rows = f"row{'s' if len(found) > 1 else ''} {named}{more}"
    if "a comment" in what:
        rows += " are each" if len(found) > 1 else " is"
    findings.add("lines-passed-over", grid.origin(found[0]), what.format(rows=rows))
    left_out = set(found)
    kept = [place for place in range(len(grid.rows)) if place not in left_out]
    return replace(
        grid, numbers=tuple(grid.numbers[place] for place in kept), rows=tuple(grid.rows[place] for place in kept)
    )  # fmt: skip


def _are_heads(row: Sequence[Cell], heads: Sequence[str]) -> bool:
    if not row or not isinstance(row[0], str) or row[0].strip().casefold() != heads[0].casefold():
        return False  # the first cell tells nearly every row apart
    words = [" ".join(cell_text(cell).split()).casefold() for cell in row]
    return words[: len(heads)] == [head.casefold() for head in heads] and not any(words[len(heads) :])


def _is_comment(row: Sequence[Cell], grid: Grid, schema: Schema) -> bool:
    """Whether a row begins as a comment does and holds no number: a run may be called '#1', and has numbers."""
    first = next((cell for cell in row if not is_blank(cell)), None)
    if not isinstance(first, str) or not _COMMENT.match(first.strip()):
        return False
    filled = sum(not is_blank(cell) for cell in row)
    if filled == 1:
        return True
    for head, cell in zip(grid.heads, row, strict=False):
        column = schema.by_name.get(parse_head(head).quantity)
        if column is not None and column.content is Content.NUMBER and is_like_a_number(cell_text(cell)):
            return False
    return bool(re.match(r"\s*(#|%|//)\s", first))


def _with_units(grid: Grid, schema: Schema, findings: Findings) -> Grid:
    """The grid with the units of the row under its heads written into them, where that row is one of units."""
    if not grid.rows:
        return grid
    heads, found = list(grid.heads), 0
    for place, head in enumerate(grid.heads):
        parsed = parse_head(head)
        column = schema.by_name.get(parsed.quantity)
        cell = cell_text(grid.rows[0][place]) if place < len(grid.rows[0]) else ""
        bracket = _BRACKETS.fullmatch(cell)
        unit = bracket[1] if bracket else cell
        if column is None:
            continue
        if column.content is not Content.NUMBER:
            # words have no unit: anything but a dash or the head once more is a row of the table
            if unit.casefold() not in ("", "-", "--", head.casefold()):
                return grid
        elif unit and not _is_unit_of(unit, column.dimension, column.raw):
            return grid
        elif unit and column.dimension is not None:
            if parsed.unit is None:
                heads[place] = f"{head} / {unit}"
            elif " ".join(parsed.unit.split()) != " ".join(unit.split()):
                return grid  # two units for one column: the row stays, and is a fault of its cells
            found += 1
    if not found:
        return grid
    findings.add(
        "units-row",
        grid.origin(0),
        "the row under the heads was taken for their units",
        "write the units into the heads, as in 'time / s'",
    )
    return replace(grid, heads=tuple(heads), numbers=grid.numbers[1:], rows=grid.rows[1:])


def _is_unit_of(unit: str, dimension: str | None, raw: bool) -> bool:
    if is_like_a_number(unit):
        return False
    if dimension is None:
        return raw or unit in ("-", "--", "1")
    try:
        conversion(unit, dimension)
    except UnitError:
        return False
    return True


# --- of a workbook ---


def with_look(grid: Grid, look: Look, findings: Findings) -> Grid:
    """The grid with the value of merged cells in each row that they span; what is hidden is told of."""
    if look.hidden:
        findings.add(
            "hidden-sheet",
            f"{grid.file}, sheet '{grid.sheet}'",
            f"hidden in the workbook and read all the same: {', '.join(look.hidden)}",
            "show it, or delete what is not to be used; rows are left out by use = no",
        )
    rows: list[list[Cell]] | None = None
    filled: list[str] = []
    spent = 0
    for one in look.merged:
        first, last = bisect_left(grid.numbers, one.top), bisect_right(grid.numbers, one.bottom)
        # a title across the heads is no value of the rows below
        if one.top <= grid.head_row or one.left >= len(grid.heads) or last - first < 2:
            continue
        if grid.numbers[first] != one.top or one.left >= len(grid.rows[first]):
            continue
        value = grid.rows[first][one.left]
        spent += last - first
        if is_blank(value) or spent > MOST_CELLS:
            continue
        rows = rows if rows is not None else [list(row) for row in grid.rows]
        for row in rows[first + 1 : last]:
            row.extend([None] * (one.left + 1 - len(row)))
            if is_blank(row[one.left]):
                row[one.left] = value
        filled.append(one.name)
    if rows is None:
        return grid
    findings.add(
        "merged-cells",
        f"{grid.file}, sheet '{grid.sheet}'",
        f"cells merged over several rows hold for each of them: {', '.join(filled[:_AT_MOST])}"
        + (", ..." if len(filled) > _AT_MOST else ""),
        "write the value into every row",
    )
    return replace(grid, rows=tuple(rows))
