"""Logs of the runs: a small drawing that needs no script, and the figures from which a script draws a larger one.

The figures are the envelope of `coulombook.figures.details.trace`. Each column is laid over 16 bits between its lowest
and highest value, as differences from reading to reading, deflated and written in base 64: a tenth of the space of the
same numbers as text, and finer than a screen. A browser that cannot inflate them keeps the small drawing.
"""

from __future__ import annotations

import base64
import json
import math
import zlib
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.readings import FloatArray
from coulombook.book import Book, Table
from coulombook.figures.details import INJECTION, LOG, WINDOW, potential_scale, trace
from coulombook.prose.numbers import brief
from coulombook.report.page.html import Html, element, join, whole
from coulombook.report.page.words import MINUS

_STEPS = 65535
_WIDTH, _PANEL, _GAP, _LEFT, _RIGHT, _FOOT = 900, 110, 16, 62, 14, 22
_STRETCHES = 100  # of the small drawing
_LEAST_SPAN = 0.04  # of the larger end
_CURRENT, _POTENTIAL = ("lowest I / mA", "highest I / mA"), ("lowest E / V", "highest E / V")


@dataclass(frozen=True, slots=True, eq=False)
class _Log:
    """One log as drawn; ``windows`` and ``injections`` are (start, stop) and (time, name)."""

    time: FloatArray
    columns: dict[str, FloatArray]
    window: tuple[float, float]
    injections: tuple[tuple[float, str], ...]


def show_trace(book: Book, run: str) -> Html | None:
    """The log of a run; None where the book does not hold it."""
    if book.settled is None or not book.pictures:
        return None
    log, scale = _log(trace(book, run)), potential_scale(book)
    span = f"{brief(float(log.time[0]))} to {brief(float(log.time[-1]))} s"
    label = (
        f"Current and potential of run {run} against time, {span}; the window of the run is shaded, "
        f"{len(log.injections)} gas injections are marked."
    )
    return element(
        "figure",
        element("figcaption", f"Log: current and potential against time ({scale})"),
        _drawing(log, scale, label),
        class_="trace",
        data_log=whole(json.dumps(_packed(log, scale), separators=(",", ":"), allow_nan=False)),
        data_label=label,
    )


def _log(table: Table) -> _Log:
    rows = list(table.records())
    samples = [row for row in rows if row["what"] == LOG]

    def column(head: str) -> FloatArray:
        return np.array([row[head] if row[head] is not None else math.nan for row in samples], dtype=float)

    window = next(row for row in rows if row["what"] == WINDOW)
    return _Log(
        column("time / s"),
        {head: column(head) for head in (*_CURRENT, *_POTENTIAL)},
        (_float(window["time / s"]), _float(window["until / s"])),
        tuple((_float(row["time / s"]), str(row["name"])) for row in rows if row["what"] == INJECTION),
    )


def _float(cell: object) -> float:
    assert isinstance(cell, int | float)
    return float(cell)


def _packed(log: _Log, scale: str) -> dict[str, object]:
    """What the script draws from. A log that is its own envelope sends each column once."""
    single = all(
        np.array_equal(log.columns[low], log.columns[high], equal_nan=True)
        for low, high in (_CURRENT, _POTENTIAL)
    )
    heads = [_CURRENT[0], _POTENTIAL[0]] if single else [*_CURRENT, *_POTENTIAL]
    columns = [log.time, *(log.columns[head] for head in heads)]
    # of noise that steps from reading to reading the differences are smaller than the readings
    steps = b"".join(
        np.diff(_steps(column), prepend=np.uint16(0)).astype("<u2").tobytes() for column in columns
    )
    return {
        "ends": [(float(np.nanmin(column)), float(np.nanmax(column))) for column in columns],
        "steps": base64.b64encode(zlib.compress(steps, 9)).decode("ascii"),
        "window": log.window,
        "injections": log.injections,
        "potential": scale,
    }


def _steps(values: FloatArray) -> NDArray[np.uint16]:
    """Values laid over 16 bits between the lowest and the highest."""
    low = float(np.nanmin(values))
    span = float(np.nanmax(values)) - low or 1.0
    return np.rint(np.nan_to_num((values - low) / span) * _STEPS).astype(np.uint16)


def _drawing(log: _Log, scale: str, label: str) -> Html:
    """Two panels over one axis of time, as lines from low to high of some hundred stretches."""
    height = 2 * _PANEL + _GAP + _FOOT
    first, last = float(log.time[0]), float(log.time[-1])

    def x(second: float) -> float:
        return _LEFT + (_WIDTH - _LEFT - _RIGHT) * (second - first) / ((last - first) or 1.0)

    bottom = 2 * _PANEL + _GAP
    start, stop = (min(max(one, first), last) for one in log.window)
    marks = [
        element("rect", x=_at(x(start)), y=0, width=_at(x(stop) - x(start)), height=bottom, class_="window"),
        *(
            element("path", d=f"M{_at(x(time))} 0V{bottom}", class_="injection")
            for time, _ in log.injections
            if first <= time <= last
        ),
    ]
    panels = [
        _panel(log, heads, top, x, name, kind)
        for heads, top, name, kind in (
            (_CURRENT, 0, "I / mA", "current"),
            (_POTENTIAL, _PANEL + _GAP, scale, "potential"),
        )
    ]
    times = [
        element("text", _number(value), x=_at(x(value)), y=bottom + 16, text_anchor=anchor)
        for value, anchor in ((first, "start"), ((first + last) / 2, "middle"), (last, "end"))
    ]
    times.append(
        element("text", "t / s", x=_at(x(first + 0.75 * (last - first))), y=bottom + 16, text_anchor="middle")
    )
    return element(
        "svg",
        element("title", label),
        marks,
        panels,
        times,
        viewBox=f"0 0 {_WIDTH} {height}",
        role="img",
        class_="still",
    )


def _panel(
    log: _Log, heads: Sequence[str], top: int, x: Callable[[float], float], name: str, kind: str
) -> Html:
    lows, highs = (log.columns[head] for head in heads)
    low, high = _ends(lows, highs)
    span = high - low
    step = max(1, -(-len(log.time) // _STRETCHES))
    places = np.arange(0, len(log.time), step)
    of_low, of_high = np.fmin.reduceat(lows, places), np.fmax.reduceat(highs, places)
    ends = [
        (
            round(x(float(log.time[place]))),
            *(round(top + _PANEL * (high - value) / span, 1) for value in values),
        )
        for place, *values in zip(places.tolist(), of_low.tolist(), of_high.tolist(), strict=True)
        if values[0] == values[0]
    ]
    return join(
        element("path", d=whole(_up_and_down(ends)), class_=f"line {kind}") if ends else None,
        element("text", _number(high), x=_LEFT - 6, y=top + 11, text_anchor="end"),
        element("text", _number(low), x=_LEFT - 6, y=top + _PANEL, text_anchor="end"),
        element("text", name, x=_LEFT + 6, y=top + 12),
        element("path", d=f"M{_LEFT} {top}V{top + _PANEL}", class_="axis"),
    )


def _up_and_down(stretches: Sequence[tuple[float, float, float]]) -> str:
    """A line through the lowest and highest point of each stretch, in steps from point to point."""
    x, y, _ = stretches[0]
    parts = [f"M{brief(x)} {brief(y)}"]
    for column, low, high in stretches:
        # the nearer end first, so that the line runs no longer than it must
        for end in sorted((low, high), key=lambda one: abs(one - y)):
            step, rise = brief(round(column - x, 1)), brief(round(end - y, 1))
            if rise != "0" or step != "0":
                parts.append(
                    f"l{step}{rise if rise.startswith('-') else ' ' + rise}" if step != "0" else f"v{rise}"
                )
            x, y = column, end
    return "".join(parts)


def _ends(lows: FloatArray, highs: FloatArray) -> tuple[float, float]:
    every = np.concatenate((lows, highs))
    every = every[np.isfinite(every)]
    low, high = float(every.min()), float(every.max())
    # never so near that the noise of a steady reading fills the panel
    span = max(high - low, _LEAST_SPAN * max(abs(low), abs(high))) or 1.0
    return (low + high - span) / 2.0, (low + high + span) / 2.0


def _at(value: float) -> str:
    return brief(round(value, 1), 5)


def _number(value: float) -> str:
    return brief(value, 4).replace("-", MINUS)
