"""Columns of text side by side, for a terminal.

rich draws tables too, but measures and wraps every cell: a fifth of a second for the tables of a usual day, more than
the tally itself takes. Here every cell is one short line already.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from rich.cells import cell_len
from rich.text import Text

GAP = 2  # blanks between two columns


@dataclass(frozen=True, slots=True)
class Column:
    """One column: the lines of its head, its cells, and the style of some of them by row."""

    head: tuple[str, ...]
    cells: tuple[str, ...]
    words: bool = False  # words begin, numbers end under one another
    styles: Mapping[int, str] = field(default_factory=dict)

    @property
    def width(self) -> int:
        """Cells of the terminal it takes."""
        return max(map(cell_len, [*self.head, *self.cells]), default=0)


def grid(columns: Sequence[Column], *, rule: str, gap: int = GAP) -> Text:
    """The columns side by side, heads in bold above a rule; without blanks at the ends of lines."""
    widths = [column.width for column in columns]
    text = Text(no_wrap=True)
    for line in range(len(columns[0].head)):
        cells = [_padded(one.head[line], width, one) for one, width in zip(columns, widths, strict=True)]
        text.append((" " * gap).join(cells).rstrip() + "\n", style="bold")
    text.append(rule * (sum(widths) + gap * (len(columns) - 1)))
    for row in range(len(columns[0].cells)):
        text.append("\n")
        blanks = ""  # put off until something follows them
        for column, width in zip(columns, widths, strict=True):
            cell = _padded(column.cells[row], width, column)
            if cell.strip():
                text.append(blanks + cell.rstrip(), style=column.styles.get(row))
                blanks = " " * (len(cell) - len(cell.rstrip()) + gap)
            else:
                blanks += " " * (width + gap)
    return text


def _padded(cell: str, width: int, column: Column) -> str:
    blanks = " " * (width - cell_len(cell))
    return cell + blanks if column.words else blanks + cell
