"""Check injections on the control chart of their curve, in characters."""

from __future__ import annotations

import numpy as np
from rich.console import Console
from rich.text import Text

from coulombook.curves.control import ACTION, ACTION_LIMIT, IN_CONTROL, WARNING, WARNING_LIMIT
from coulombook.library.checks import ChartedChecks
from coulombook.prose.numbers import ABSENT, brief, fixed, plain
from coulombook.prose.text import visible
from coulombook.report.curve_plot import BOXES, PLAIN, Axis, Canvas
from coulombook.report.grid import Column, grid
from coulombook.report.terminal import hanging

ROWS = 13  # an odd number has a middle row
_SIGN = {IN_CONTROL: ("o", "bold"), WARNING: ("!", "bold yellow"), ACTION: ("X", "bold red")}
_STYLE = {IN_CONTROL: "green", WARNING: "yellow", ACTION: "red"}
_PERCENT = 100.0


def show_checks(found: ChartedChecks, console: Console) -> None:
    """Print the chart of a day's checks, each check, and the rules of runs that were met."""
    entry, chart = found.entry, found.chart
    names = (visible(one, 60) for one in (entry.name, found.day, entry.calibration.name))
    title = "checks of {} in {}, against {}".format(*names)
    console.print(Text(title, style="bold"))
    if np.isfinite(chart.score).any():
        console.print(_drawing(found, console), soft_wrap=True)
    columns = [
        Column(("", "at"), tuple(f"{one.at:%Y-%m-%d %H:%M}" for one in found.checks), True),
        Column(("known", "ppm"), tuple(brief(one.mole_fraction * entry.x_scale) for one in found.checks)),
        Column(("", "found"), tuple(plain(one.peak_area, 5) for one in found.checks)),
        Column(("", "expected"), tuple(plain(one, 5) for one in chart.expected.tolist())),
        Column(
            ("off by", "%"),
            tuple(fixed(one * _PERCENT, 2) for one in (chart.deviation / chart.expected).tolist()),
        ),
        Column(("in standard", "deviations"), tuple(fixed(one, 1) for one in chart.score.tolist())),
        Column(
            ("", "zone"),
            tuple(
                ABSENT if np.isnan(score) else zone
                for zone, score in zip(chart.zones, chart.score, strict=True)
            ),
            True,
            {row: _STYLE[zone] for row, zone in enumerate(chart.zones)},
        ),
    ]
    rule = PLAIN.across if console.options.ascii_only else BOXES.across
    console.print(grid(columns, rule=rule), soft_wrap=True)
    for one in chart.runs:
        hanging("rule met  ", f"{one.rule}, at {found.checks[one.check].at:%Y-%m-%d %H:%M}", console)
    hanging(
        "",
        f"Warning beyond {WARNING_LIMIT:g}, action beyond {ACTION_LIMIT:g} standard deviations of a reading about the "
        "curve. The drift correction of a day takes every deviation for drift of the detector, linear between checks.",
        console,
    )


def _drawing(found: ChartedChecks, console: Console) -> Text:
    signs = PLAIN if console.options.ascii_only else BOXES
    score = found.chart.score
    known = score[np.isfinite(score)]
    height = max(ACTION_LIMIT + 1.0, 1.05 * float(np.abs(known).max()))
    axis = Axis(-height, height, False, ROWS)
    columns = max(min(console.width - 8, 4 * score.size), 24)
    x = Axis(-0.5, score.size - 0.5, False, columns)
    canvas = Canvas(columns, ROWS)
    lines = (-ACTION_LIMIT, -WARNING_LIMIT, 0.0, WARNING_LIMIT, ACTION_LIMIT)
    for line, row in zip(lines, axis.places(np.array(lines)), strict=True):
        sign = signs.dot if abs(line) == WARNING_LIMIT else signs.across
        canvas.curve(range(columns), [row] * columns, sign, "dim")
    places = zip(
        x.places(np.arange(score.size, dtype=float)), axis.places(score), found.chart.zones, strict=True
    )
    for column, row, zone in places:
        if column is not None and row is not None:
            canvas.put(column, row, *_SIGN[zone])
    text = Text("deviation / standard deviations\n", style="bold", no_wrap=True)
    canvas.onto(text, axis, lines, 3, signs)
    text.append("   " + signs.corner + signs.across * columns)
    return text
