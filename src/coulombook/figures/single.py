"""Figures of single things: a log, a calibration curve, the scans of an electrode, a spectrum."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from coulombook.book.tables import Book, Table
from coulombook.figures import details
from coulombook.figures.data import MARK, Row, number
from coulombook.figures.legends import legend
from coulombook.figures.marks import BLACK, BLUE, GREY, ORANGE, SKY, VERMILION
from coulombook.figures.sheet import (
    COLUMN_MM,
    house_style,
    new_axes,
    new_figure,
    plain_decades,
    plain_labels,
    shown,
)
from coulombook.library.picture import LEVEL, Picture, residual_reach

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_TWO_PANELS = 0.85  # height over width
_HIGHEST_MM = 95.0
_LEAST_SPAN_VOLT = 0.02  # what a potentiostat holds a potential to is noise, not news


def trace(book: Book, run: str, ax: Axes | None = None, *, width_mm: float = COLUMN_MM) -> Axes:
    """The log of a run: current, and on a sheet of our own the potential below, with injections and their windows.

    Returns the axes of the current; those of the potential are ``ax.figure.axes[1]``. Otherwise like
    `coulombook.figures.fe_against_potential`.
    """
    return draw_trace(details.trace(book, run), details.potential_scale(book), ax, width_mm)


def draw_trace(table: Table, scale: str, ax: Axes | None = None, width_mm: float = COLUMN_MM) -> Axes:
    """The figure of a table of `coulombook.figures.details.trace`."""
    rows = list(table.records())
    if ax is not None:
        _current(ax, rows)
        ax.set_xlabel("t / s")
        plain_labels(ax)
        return ax
    with house_style():
        figure = new_figure(width_mm, min(width_mm * _TWO_PANELS, _HIGHEST_MM))
        upper, lower = figure.subplots(2, 1, sharex=True, height_ratios=(1.4, 1))
        handles, names = _current(upper, rows)
        _envelope(lower, rows, "E / V", ORANGE)
        lower.set_xlabel("t / s")
        lower.set_ylabel(shown(scale, 30), parse_math=False)
        figure.align_ylabels([upper, lower])
        legend(upper, handles, names, own=True)
        plain_labels(upper)
        plain_labels(lower)
    return upper  # type: ignore[no-any-return] # subplots is typed as an array of anything


def _current(ax: Axes, rows: Sequence[Row]) -> tuple[list[Any], list[str]]:
    handles: dict[str, Any] = {}
    for row in rows:
        time, until = number(row["time / s"]) or 0.0, number(row["until / s"]) or 0.0
        if row["what"] == details.WINDOW:
            handles["window of the run"] = ax.vlines(
                [time, until], 0.0, 1.0, transform=ax.get_xaxis_transform(), color=BLACK, lw=0.6, ls=(0, (4, 2)),
                gid=str(row[MARK]),
            )  # fmt: skip
        elif row["what"] == details.AVERAGED:
            handles["averaged"] = ax.axvspan(
                time, until, color=SKY, alpha=0.45, lw=0, gid=str(row[MARK]), zorder=0
            )
        elif row["what"] == details.INJECTION:
            handles["injection"] = ax.axvline(time, color=VERMILION, lw=0.7, gid=str(row[MARK]))
    _envelope(ax, rows, "I / mA", BLUE)
    ax.set_ylabel("I / mA")
    return list(handles.values()), list(handles)


def _envelope(ax: Axes, rows: Sequence[Row], quantity: str, colour: str) -> None:
    log = [row for row in rows if row["what"] == details.LOG]
    time, low, high = (
        _column(log, head) for head in ("time / s", f"lowest {quantity}", f"highest {quantity}")
    )
    mark = str(log[0][MARK]) if log else ""
    ax.fill_between(time, low, high, color=colour, lw=0.6, gid=f"{mark}:{quantity[0]}")
    ax.margins(x=0.01)
    bottom, top = ax.get_ylim()
    if quantity.startswith("E") and top - bottom < _LEAST_SPAN_VOLT:
        middle = 0.5 * (bottom + top)
        ax.set_ylim(middle - 0.5 * _LEAST_SPAN_VOLT, middle + 0.5 * _LEAST_SPAN_VOLT)


def capacitance(book: Book, electrode: str, ax: Axes | None = None, *, width_mm: float = COLUMN_MM) -> Axes:
    """Charging current of an electrode against scan rate, and the line whose slope is the capacitance."""
    return draw_capacitance(details.capacitance(book, electrode), ax, width_mm)


def draw_capacitance(table: Table, ax: Axes | None = None, width_mm: float = COLUMN_MM) -> Axes:
    """The figure of a table of `coulombook.figures.details.capacitance`."""

    def paint(axes: Axes, rows: Sequence[Row]) -> None:
        line = [row for row in rows if row["what"] == details.LINE]
        axes.plot(
            *_both(line, "scan rate / mV s^-1", "charging current / mA"), color=BLUE, gid=str(line[0][MARK])
        )
        for row in rows:
            if row["what"] == details.SCAN:
                _dot(axes, row, "scan rate / mV s^-1", "charging current / mA")
        axes.set_xlabel("scan rate / mV s⁻¹")
        axes.set_ylabel("charging current / mA")

    return _alone(paint, table, ax, width_mm)


def spectrum(book: Book, file: str, ax: Axes | None = None, *, width_mm: float = COLUMN_MM) -> Axes:
    """An impedance spectrum in the complex plane, with the fitted circuit."""
    return draw_spectrum(details.spectrum(book, file), ax, width_mm)


def draw_spectrum(table: Table, ax: Axes | None = None, width_mm: float = COLUMN_MM) -> Axes:
    """The figure of a table of `coulombook.figures.details.spectrum`."""

    def paint(axes: Axes, rows: Sequence[Row]) -> None:
        fitted = [row for row in rows if row["what"] == details.FITTED]
        axes.plot(*_both(fitted, "Zre / ohm", "-Zim / ohm"), color=BLUE, gid=str(fitted[0][MARK]))
        for row in rows:
            if row["what"] == details.MEASURED:
                _dot(axes, row, "Zre / ohm", "-Zim / ohm")
        axes.set_xlabel("Re Z / Ω")
        axes.set_ylabel("−Im Z / Ω")
        axes.set_aspect("equal", adjustable="datalim")

    return _alone(paint, table, ax, width_mm)


def curve_fit(book: Book, name: str, ax: Axes | None = None, *, width_mm: float = COLUMN_MM) -> Axes:
    """A calibration curve with its standards, bands and limits; on a sheet of our own its residuals below.

    Returns the axes of the curve; those of the residuals are ``ax.figure.axes[1]``.
    """
    return draw_curve(details.curve(book, name), ax, width_mm)


def curve_residuals(book: Book, name: str, ax: Axes | None = None, *, width_mm: float = COLUMN_MM) -> Axes:
    """The residuals of a calibration curve's standards, with its bands."""

    def paint(axes: Axes, rows: Sequence[Row]) -> None:
        _residuals(axes, rows, table.heads)
        axes.set_xlabel(table.heads[1], parse_math=False)

    table = details.curve(book, name)
    return _alone(paint, table, ax, width_mm)


def draw_curve(table: Table, ax: Axes | None = None, width_mm: float = COLUMN_MM) -> Axes:
    """The figure of a table of `coulombook.figures.details.curve_table`."""
    if ax is not None:
        _curve(ax, list(table.records()), table.heads)
        ax.set_xlabel(table.heads[1], parse_math=False)
        plain_labels(ax)
        return ax
    return _curve_sheet(table, "", width_mm).axes[0]


def curve_sheet(drawn: Picture, name: str, heads: tuple[str, str], title: str, width_mm: float) -> Figure:
    """A curve and its residuals under a title, on a sheet of the house."""
    return _curve_sheet(details.curve_table(drawn, name, *heads), title, width_mm)


def _curve_sheet(table: Table, title: str, width_mm: float) -> Figure:
    rows = list(table.records())
    with house_style():
        figure = new_figure(width_mm, min(width_mm * _TWO_PANELS, _HIGHEST_MM))
        upper, lower = figure.subplots(2, 1, sharex=True, height_ratios=(2.2, 1))
        if title:
            figure.suptitle(title, fontsize=8, parse_math=False)
        handles, names = _curve(upper, rows, table.heads)
        _residuals(lower, rows, table.heads)
        lower.set_xlabel(table.heads[1], parse_math=False)
        figure.align_ylabels([upper, lower])
        legend(upper, handles, names, own=True)
        plain_labels(upper)
        plain_labels(lower)
    return figure


def _wide(heads: Sequence[str]) -> bool:
    return heads[3].endswith("%")


def _curve(ax: Axes, rows: Sequence[Row], heads: Sequence[str]) -> tuple[list[Any], list[str]]:
    _, x_head, y_head, _, curve_band, reading_band, _ = heads
    wide = _wide(heads)
    grid = [row for row in rows if row["what"] == details.CURVE]
    x, y = (np.array(one) for one in _both(grid, x_head, y_head))
    handles: dict[str, Any] = {}
    # a band may reach below zero, where a logarithmic axis ends; it is drawn down to the axis
    floor = float(y.min()) * 0.5 if wide else -math.inf
    for head, alpha, what in ((reading_band, 0.3, "of a reading"), (curve_band, 0.6, "of the curve")):
        if all(row[head] is not None for row in grid):
            band = np.array(_column(grid, head)) * (y / 100.0 if wide else 1.0)
            handles[f"{100.0 * LEVEL:.0f} % band {what}"] = ax.fill_between(
                x, np.maximum(y - band, floor), y + band, color=SKY, alpha=alpha, lw=0
            )
    handles["curve"] = ax.plot(x, y, color=BLUE, gid=str(grid[0][MARK]))[0]
    for row in rows:
        what = str(row["what"])
        if what in (details.STANDARD, details.OUTLYING):
            handles[what] = _dot(ax, row, x_head, y_head, odd=what == details.OUTLYING)
        elif what.endswith(details.LIMIT):
            handles[what] = ax.axvline(
                number(row[x_head]) or 0.0, color=BLACK, lw=0.7, ls=":" if "detection" in what else "--",
                gid=str(row[MARK]),
            )  # fmt: skip
    if wide:
        ax.set_xscale("log")
        ax.set_yscale("log")
        plain_decades(ax, "x")
        plain_decades(ax, "y")
    ax.set_ylabel(y_head, parse_math=False)
    return list(handles.values()), list(handles)


def _residuals(ax: Axes, rows: Sequence[Row], heads: Sequence[str]) -> None:
    _, x_head, _, residual, curve_band, reading_band, _ = heads
    grid = [row for row in rows if row["what"] == details.CURVE]
    x = _column(grid, x_head)
    ax.axhline(0.0, color=BLUE)
    for head, alpha in ((reading_band, 0.3), (curve_band, 0.6)):
        if all(row[head] is not None for row in grid):
            band = np.array(_column(grid, head))
            ax.fill_between(x, -band, band, color=SKY, alpha=alpha, lw=0)
    for row in rows:
        if row["what"] in (details.STANDARD, details.OUTLYING):
            _dot(ax, row, x_head, residual, odd=row["what"] == details.OUTLYING, of="residual")
    if _wide(heads):
        ax.set_xscale("log")
        plain_decades(ax, "x")
    ax.set_ylabel(residual, parse_math=False)
    standards = [row for row in rows if row["what"] in (details.STANDARD, details.OUTLYING)]
    known = [row for row in grid if row[reading_band] is not None]
    half = residual_reach(np.array(_column(standards, residual)), np.array(_column(known, reading_band)))
    ax.set_ylim(-1.1 * half, 1.1 * half)


def _alone(paint: Any, table: Table, ax: Axes | None, width_mm: float) -> Axes:
    rows = list(table.records())
    if ax is not None:
        paint(ax, rows)
        plain_labels(ax)
        return ax
    with house_style():
        own = new_axes(width_mm)
        paint(own, rows)
        plain_labels(own)
    return own


def _dot(ax: Axes, row: Row, x_head: str, y_head: str, *, odd: bool = False, of: str = "") -> Any:
    (line,) = ax.plot(
        [number(row[x_head]) or 0.0], [number(row[y_head]) or 0.0], ls="none", marker="X" if odd else "o",
        mfc=VERMILION if odd else GREY, mec=BLACK, zorder=4, gid=str(row[MARK]) + (f":{of}" if of else ""),
    )  # fmt: skip
    return line


def _column(rows: Sequence[Row], head: str) -> list[float]:
    return [number(row[head]) or 0.0 for row in rows]


def _both(rows: Sequence[Row], x_head: str, y_head: str) -> tuple[list[float], list[float]]:
    return _column(rows, x_head), _column(rows, y_head)
