"""Drawings of one curve: characters for the terminal, and a figure for paper.

Both show the same: standards and curve above, residuals with the band of a reading below.
"""

from __future__ import annotations

import math
import os
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from tempfile import mkstemp

import numpy as np
from rich.text import Text

from coulombook.library.picture import FloatArray, Picture
from coulombook.report.numbers import brief

ROWS, RESIDUAL_ROWS = 14, 9  # an odd number has a middle row
NARROWEST, WIDEST = 24, 100  # columns of the drawing, without its labels
FORMATS = (".svg", ".png", ".pdf")

# of the palette of Okabe & Ito (2008), which colour-blind readers tell apart
_CURVE, _BAND, _ODD, _MARK = "#0072B2", "#56B4E9", "#D55E00", "#666666"
_DOTS_PER_INCH = 200


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
    half = _half(drawn)
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


def _half(drawn: Picture) -> float:
    """Half the height of the residuals' drawing: all residuals, and the band where it is not far beyond them."""
    band = drawn.scaled(drawn.reading_band)
    band = np.abs(band[np.isfinite(band)])
    residual = float(np.abs(drawn.residual).max()) if drawn.residual.size else 0.0
    typical = float(np.median(band)) if band.size else 0.0
    half = max(1.05 * residual, min(1.1 * float(band.max(initial=0.0)), max(1.5 * residual, 1.5 * typical)))
    return half if half > 0.0 else 1.0


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


# --- the figure


def write_figure(drawn: Picture, path: Path, *, title: str, x_label: str, y_label: str) -> None:
    """Write a figure of a curve as SVG, PNG or PDF by the name's ending: beside its place first, then into it.

    Letters stay letters in SVG and are embedded in PDF. No text is taken for markup.

    Raises
    ------
    ValueError
        Another ending.
    OSError
        The place cannot be written.
    """
    ending = path.suffix.lower()
    if ending not in FORMATS:
        raise ValueError(f"a figure is written as {', '.join(FORMATS)}, not '{path.suffix}'")
    # beside the place it goes to, so that the last step is a change of name
    handle, beside = mkstemp(prefix=".figure-", suffix=ending, dir=path.parent)
    os.close(handle)
    try:
        _save(drawn, beside, ending, title, x_label, y_label)
        # a temporary file is private; a figure is like any other file its owner writes
        mask = os.umask(0)
        os.umask(mask)
        os.chmod(beside, 0o666 & ~mask)
        os.replace(beside, path)
    except BaseException:
        os.unlink(beside)
        raise


def _save(drawn: Picture, file: str, ending: str, title: str, x_label: str, y_label: str) -> None:
    import warnings

    import matplotlib as mpl
    from matplotlib.figure import Figure

    with mpl.rc_context(), warnings.catch_warnings():
        # a letter the font lacks becomes a box; the title says the name in full elsewhere
        warnings.simplefilter("ignore")
        mpl.rcdefaults()  # the reader's own settings would change what the figure says
        mpl.rcParams.update(
            {
                "svg.fonttype": "none",
                "svg.hashsalt": "coulombook",
                "pdf.fonttype": 42,
                "font.size": 9.0,
                "axes.spines.top": False,
                "axes.spines.right": False,
                "axes.unicode_minus": False,
            }
        )
        figure = Figure(figsize=(6.3, 5.2), layout="constrained")
        upper, lower = figure.subplots(2, 1, sharex=True, height_ratios=(3, 1.4))
        figure.suptitle(title, fontsize=10, parse_math=False)
        band = f"{drawn.level * 100:.0f} % band"
        # a band may reach below zero, where a logarithmic axis ends; it is drawn down to the axis
        floor = float(drawn.grid_y.min()) * 0.5 if drawn.wide else -math.inf
        known = bool(np.isfinite(drawn.reading_band).any())
        if known:
            for wide, alpha, what in (
                (drawn.reading_band, 0.35, "of a reading"),
                (drawn.curve_band, 0.6, "of the curve"),
            ):
                below = np.maximum(drawn.grid_y - wide, floor)
                upper.fill_between(
                    drawn.grid_x,
                    below,
                    drawn.grid_y + wide,
                    color=_BAND,
                    alpha=alpha,
                    lw=0,
                    label=f"{band} {what}",
                )
        upper.plot(drawn.grid_x, drawn.grid_y, color=_CURVE, lw=1.3, label="curve")
        _points(upper, drawn, drawn.y, labels=True)
        lower.axhline(0.0, color=_CURVE, lw=1.3)
        if known:
            for wide, alpha in ((drawn.reading_band, 0.35), (drawn.curve_band, 0.6)):
                off = drawn.scaled(wide)
                lower.fill_between(drawn.grid_x, -off, off, color=_BAND, alpha=alpha, lw=0)
        _points(lower, drawn, drawn.residual, labels=False)
        half = _half(drawn) * 1.1
        lower.set_ylim(-half, half)
        for value, what, line in (
            (drawn.detection, "detection limit", ":"),
            (drawn.quantification, "quantification limit", "--"),
        ):
            if value is not None:
                upper.axvline(value, color=_MARK, lw=0.9, ls=line, label=what)
                lower.axvline(value, color=_MARK, lw=0.9, ls=line)
        if drawn.wide:
            upper.set_xscale("log")
            upper.set_yscale("log")
        upper.set_ylabel(y_label, parse_math=False)
        lower.set_ylabel("residual / %" if drawn.wide else "residual", parse_math=False)
        lower.set_xlabel(x_label, parse_math=False)
        upper.legend(loc="upper left", fontsize=8, edgecolor="none", framealpha=0.9)
        figure.align_ylabels([upper, lower])
        # without a date, the same curve gives the same file
        without_date = {".svg": {"Date": None}, ".pdf": {"CreationDate": None}, ".png": {}}[ending]
        figure.savefig(file, format=ending[1:], dpi=_DOTS_PER_INCH, metadata=without_date)


def _points(axes: object, drawn: Picture, values: FloatArray, *, labels: bool) -> None:
    """Standards as circles, the outlying one in a shape and colour of its own."""
    usual = np.ones(values.size, dtype=bool)
    if drawn.outlier is not None:
        usual[drawn.outlier] = False
    style = {"ls": "none", "ms": 4.5, "zorder": 3}
    if usual.any():
        axes.plot(  # type: ignore[attr-defined] # matplotlib is loaded late; its Axes stand here as object
            drawn.x[usual], values[usual], marker="o", mfc="white", mec="black", **style,
            label="standard" if labels else None,
        )  # fmt: skip
    if drawn.outlier is not None:
        axes.plot(  # type: ignore[attr-defined] # matplotlib is loaded late; its Axes stand here as object
            drawn.x[~usual], values[~usual], marker="X", color=_ODD, **{**style, "ms": 7},
            label="outlying standard" if labels else None,
        )  # fmt: skip
