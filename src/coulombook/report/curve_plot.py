"""A drawing of one curve in characters: standards and curve above, residuals with the band of a reading below.

`coulombook.figures.single` draws the same for paper.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from rich.text import Text

from coulombook.library.picture import FloatArray, Picture, residual_reach
from coulombook.prose.numbers import brief

ROWS, RESIDUAL_ROWS = 14, 9  # an odd number has a middle row
NARROWEST, WIDEST = 24, 100  # columns of the drawing, without its labels


@dataclass(frozen=True, slots=True)
class Signs:
    """Characters of the drawing; the wider set lies within code page 437."""

    across: str
    upright: str
    corner: str
    tick: str
    dot: str


BOXES = Signs(
    "\N{BOX DRAWINGS LIGHT HORIZONTAL}",
    "\N{BOX DRAWINGS LIGHT VERTICAL}",
    "\N{BOX DRAWINGS LIGHT UP AND RIGHT}",
    "\N{BOX DRAWINGS LIGHT VERTICAL AND LEFT}",
    "\N{MIDDLE DOT}",
)
PLAIN = Signs("-", "|", "+", "+", ".")
STANDARD, OUTLYING, DETECTION, QUANTIFICATION = "o", "X", "D", "Q"


@dataclass(frozen=True, slots=True)
class Axis:
    """A stretch of numbers laid over a row or column of cells."""

    low: float
    high: float
    logarithmic: bool
    cells: int

    def places(self, values: FloatArray) -> list[int | None]:
        """The cell of each value; None outside, or for what is no number."""
        low, high = self._on(np.array([self.low, self.high]))
        share = (self._on(values) - low) / (high - low)
        return [
            round(one * (self.cells - 1)) if -1e-9 <= one <= 1.0 + 1e-9 else None for one in share.tolist()
        ]

    def ticks(self, most: int) -> list[float]:
        """At most so many round numbers within it."""
        if self.logarithmic:
            first, last = math.ceil(math.log10(self.low) - 1e-9), math.floor(math.log10(self.high) + 1e-9)
            step = max(1, -(-(last - first + 1) // most))
            decades = [10.0**power for power in range(first, last + 1, step)]
            if len(decades) > 1:
                return decades
        span = self.high - self.low
        power = 10.0 ** math.floor(math.log10(span / most))
        width = next(one * power for one in (1.0, 2.0, 5.0, 10.0) if span / (one * power) <= most)
        first, last = math.ceil(self.low / width - 1e-9), math.floor(self.high / width + 1e-9)
        return [width * one for one in range(first, last + 1)][:most]

    def _on(self, values: FloatArray) -> FloatArray:
        if not self.logarithmic:
            return values
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.asarray(np.log10(values))


def terminal_plot(
    drawn: Picture, width: int, *, x_label: str, y_label: str, ascii_only: bool = False
) -> Text:
    """A curve and its residuals in characters, in so many columns. Colour repeats what the characters say."""
    signs = PLAIN if ascii_only else BOXES
    y = Axis(*_ends([drawn.y, drawn.grid_y], drawn.wide), drawn.wide, ROWS)
    half = residual_reach(drawn.residual, drawn.scaled(drawn.reading_band))
    off = Axis(-half, half, False, RESIDUAL_ROWS)
    y_ticks = y.ticks(5)
    residual_ticks = [-_round_down(half), 0.0, _round_down(half)]
    margin = max(len(brief(one)) for one in (*y_ticks, *residual_ticks)) + 1
    columns = max(min(width - margin - 2, WIDEST), NARROWEST)
    x = Axis(*_ends([drawn.x, drawn.grid_x], drawn.wide), drawn.wide, columns)
    along = _columns(x, drawn)

    upper = Canvas(columns, ROWS)
    upper.curve(range(columns), y.places(np.interp(along, drawn.grid_x, drawn.grid_y)), signs.dot, "cyan")
    upper.points(x.places(drawn.x), y.places(drawn.y), drawn.outlier)
    lower = Canvas(columns, RESIDUAL_ROWS)
    lower.curve(range(columns), [RESIDUAL_ROWS // 2] * columns, signs.across, "dim")
    band = np.interp(along, drawn.grid_x, drawn.scaled(drawn.reading_band))
    for side in (-band, band):
        lower.curve(range(columns), off.places(side), signs.dot, "cyan")
    lower.points(x.places(drawn.x), off.places(drawn.residual), drawn.outlier)

    text = Text(no_wrap=True)
    text.append(f"{y_label}\n", style="bold")
    upper.onto(text, y, y_ticks, margin, signs)
    marks = [(drawn.detection, DETECTION), (drawn.quantification, QUANTIFICATION)]
    text.append(" " * margin + signs.corner + _rule(x, marks, signs) + "\n")
    text.append("residual / %\n" if drawn.wide else "residual\n", style="bold")
    lower.onto(text, off, residual_ticks, margin, signs)
    text.append(" " * margin + signs.corner + signs.across * columns + "\n")
    text.append(_tick_line(x, margin + 1) + "\n")
    text.append(f"{x_label:>{margin + 1 + columns}}", style="bold")
    return text


def legend(drawn: Picture, *, ascii_only: bool = False) -> str:
    """What the characters of `terminal_plot` mean, for those that occur."""
    signs = PLAIN if ascii_only else BOXES
    parts = []
    if drawn.x.size:
        parts.append(f"{STANDARD} standard (a digit: so many in one place)")
    if drawn.outlier is not None:
        parts.append(f"{OUTLYING} the outlying one")
    parts.append(f"{signs.dot} curve")
    if np.isfinite(drawn.reading_band).any():
        parts.append(f"below: {drawn.level * 100:.0f} % band of a single reading")
    parts += [
        f"{sign} {what}"
        for value, sign, what in (
            (drawn.detection, DETECTION, "detection limit"),
            (drawn.quantification, QUANTIFICATION, "quantification limit"),
        )
        if value is not None
    ]
    return "; ".join(parts)


class Canvas:
    """Cells with a character and a style each, the first row at the bottom."""

    def __init__(self, columns: int, rows: int) -> None:
        self._cells = [[(" ", "")] * columns for _ in range(rows)]

    def put(self, column: int, row: int, sign: str, style: str) -> None:
        """One character."""
        self._cells[row][column] = sign, style

    def curve(self, columns: Iterable[int], rows: Sequence[int | None], sign: str, style: str) -> None:
        """The same character in every column, where it has a row."""
        for column, row in zip(columns, rows, strict=True):
            if row is not None:
                self._cells[row][column] = sign, style

    def points(self, columns: Sequence[int | None], rows: Sequence[int | None], outlier: int | None) -> None:
        """Standards, a digit where several share a cell."""
        count: dict[tuple[int, int], int] = {}
        odd = None
        for place, (column, row) in enumerate(zip(columns, rows, strict=True)):
            if column is None or row is None:
                continue
            count[row, column] = count.get((row, column), 0) + 1
            if place == outlier:
                odd = row, column
        for (row, column), number in count.items():
            self._cells[row][column] = (STANDARD if number == 1 else str(min(number, 9))), "bold"
        if odd is not None:
            self._cells[odd[0]][odd[1]] = OUTLYING, "bold red"

    def onto(self, text: Text, axis: Axis, ticks: Sequence[float], margin: int, signs: Signs) -> None:
        """Draw it onto the text, from the top, behind an axis with labels."""
        labels = {
            row: brief(tick)
            for tick, row in zip(ticks, axis.places(np.array(ticks)), strict=True)
            if row is not None
        }
        for row in reversed(range(len(self._cells))):
            label = labels.get(row, "")
            text.append(f"{label:>{margin - 1}} " + (signs.tick if label else signs.upright))
            line = self._cells[row]
            last = max((place for place, (sign, _) in enumerate(line) if sign != " "), default=-1)
            for sign, style in line[: last + 1]:
                text.append(sign, style=style)
            text.append("\n")


def _ends(values: Sequence[FloatArray], logarithmic: bool) -> tuple[float, float]:
    every = np.concatenate(values)
    every = every[np.isfinite(every) & ((every > 0.0) | (not logarithmic))]
    low, high = float(every.min()), float(every.max())
    return (low, high) if high > low else (low - 1.0, high + 1.0)


def _round_down(value: float) -> float:
    """The largest 1, 2 or 5 times a power of ten that is not above a value."""
    power = 10.0 ** math.floor(math.log10(value) + 1e-12)
    return max(one * power for one in (1.0, 2.0, 5.0) if one * power <= value * (1.0 + 1e-12))


def _columns(x: Axis, drawn: Picture) -> FloatArray:
    """x at the middle of each column."""
    if drawn.wide:
        return np.geomspace(x.low, x.high, x.cells)
    return np.linspace(x.low, x.high, x.cells)


def _rule(x: Axis, marks: Sequence[tuple[float | None, str]], signs: Signs) -> str:
    line = [signs.across] * x.cells
    for value, sign in marks:
        place = None if value is None else x.places(np.array([value]))[0]
        if place is not None:
            line[place] = sign
    return "".join(line)


def _tick_line(x: Axis, indent: int) -> str:
    """Labels of the x axis under their columns, those that would touch left out."""
    line = [" "] * (indent + x.cells)
    free = 0
    ticks = x.ticks(7)
    for tick, place in zip(ticks, x.places(np.array(ticks)), strict=True):
        label = brief(tick)
        if place is None:
            continue
        start = min(max(indent + place - len(label) // 2, free), indent + x.cells - len(label))
        if start < free or abs(start + len(label) // 2 - indent - place) > 2:
            continue
        line[start : start + len(label)] = label
        free = start + len(label) + 1
    return "".join(line).rstrip()
