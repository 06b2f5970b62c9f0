"""A table as cells: the common ground of text files and workbook sheets."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import date, datetime, time, timedelta

from coulombook.findings import Origin
from coulombook.intake import text
from coulombook.intake.limits import MOST_COLUMNS, MOST_TABLE_ROWS

Cell = str | float | int | bool | datetime | date | time | timedelta | None
Score = Callable[[Sequence[Cell]], float]


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """The heads of a table and the rows below them that are not blank, numbered as the spreadsheet does."""

    file: str
    sheet: str | None
    head_row: int
    heads: tuple[str, ...]
    numbers: tuple[int, ...]  # (n_rows,) row numbers
    rows: tuple[Sequence[Cell], ...]  # (n_rows,) cells; a row may be shorter or longer than the heads
    epoch: datetime | None = None  # day 0 of the serial dates of a workbook

    @property
    def head_origin(self) -> Origin:
        """The place of the heads."""
        return Origin(self.file, self.sheet, self.head_row)

    def origin(self, place: int, head: str | None = None) -> Origin:
        """The place of a cell of the row with index ``place``."""
        return Origin(self.file, self.sheet, self.numbers[place], head)


class FaultyCell(str):
    """A blank in place of a cell whose fault has been told already."""

    __slots__ = ()


def is_blank(cell: Cell) -> bool:
    """Whether a cell holds nothing but blanks."""
    return cell is None or (isinstance(cell, str) and not cell.strip())


def cell_text(cell: Cell) -> str:
    """A cell as words; a whole number in a workbook reads as it would in text."""
    if cell is None:
        return ""
    if isinstance(cell, str):
        return cell.strip()
    if isinstance(cell, float) and cell.is_integer() and abs(cell) < 1e15:
        return str(int(cell))
    if isinstance(cell, datetime):
        return cell.isoformat(sep=" ")
    return str(cell)


def grid_of_text(data: bytes, file: str, score: Score) -> Grid:
    """The table in a delimited text file.

    The head line is the first that ``score`` calls complete, else the one with the best score, else the first line.
    Raises `text.UnreadableText` when the bytes are no text.
    """
    lines = text.lines_of(text.decode(data))
    if len(lines) > MOST_TABLE_ROWS:
        raise text.UnreadableText(
            f"{len(lines)} lines", f"at most {MOST_TABLE_ROWS} lines in a table of a day"
        )
    found = text.find_head_line(lines, score)
    if found is None:
        first = next((place for place, line in enumerate(lines) if line.strip()), None)
        if first is None:
            raise text.UnreadableText("an empty file", "a line of heads and the rows below it")
        found = first, text.guess_separator(lines[first:])
    (_, heads), *rows = text.rows_below(lines, *found)
    if len(heads) > MOST_COLUMNS:
        raise text.UnreadableText(
            f"{len(heads)} heads in row {found[0] + 1}", f"at most {MOST_COLUMNS} columns"
        )
    return _grid(file, None, found[0] + 1, heads, rows)


def grid_of_rows(
    rows: Sequence[tuple[int, Sequence[Cell]]],
    file: str,
    sheet: str,
    score: Score,
    epoch: datetime | None = None,
) -> Grid | None:
    """The table in the numbered rows of a workbook sheet, its heads found as in a text; None for a blank sheet.

    Raises `text.UnreadableText` when it has more columns than any table.
    """
    best: tuple[float, int] | None = None
    for place, (_, cells) in enumerate(rows):
        value = score(cells)
        if value > 0 and (best is None or value > best[0]):
            best = value, place
            if value >= 1:
                break
    filled = [place for place, (_, cells) in enumerate(rows) if not all(map(is_blank, cells))]
    if not filled:
        return None
    head = best[1] if best is not None else filled[0]
    number, heads = rows[head]
    if len(heads) > MOST_COLUMNS:
        raise text.UnreadableText(f"{len(heads)} heads in row {number}", f"at most {MOST_COLUMNS} columns")
    return _grid(file, sheet, number, [cell_text(cell) for cell in heads], rows[head + 1 :], epoch)


def _grid(
    file: str,
    sheet: str | None,
    head_row: int,
    heads: Sequence[str],
    rows: Sequence[tuple[int, Sequence[Cell]]],
    epoch: datetime | None = None,
) -> Grid:
    # cells of text are stripped already, so that any() sees blank rows; it would miss a lone 0 in a workbook
    kept = [
        (number, cells)
        for number, cells in rows
        if (any(cells) if sheet is None else not all(map(is_blank, cells)))
    ]
    width = len(heads)
    while width and not heads[width - 1]:
        width -= 1
    return Grid(
        file,
        sheet,
        head_row,
        tuple(" ".join(head.split()) for head in heads[:width]),
        tuple(number for number, _ in kept),
        tuple(cells for _, cells in kept),
        epoch,
    )
