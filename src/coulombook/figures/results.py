"""Figures of a day's results: efficiencies, partial currents, selectivity, closure, budget."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from coulombook.book.shares import TOTAL
from coulombook.book.tables import Book, Table
from coulombook.figures import data
from coulombook.figures.data import MARK, Basis, Row, number
from coulombook.figures.legends import legend
from coulombook.figures.marks import BLACK, BLUE, GREY, VERMILION, style_of_product, styles_of_catalysts
from coulombook.figures.sheet import (
    COLUMN_MM,
    house_style,
    name_ticks,
    new_axes,
    plain_decades,
    plain_labels,
    shown,
)
from coulombook.prose.numbers import fixed

if TYPE_CHECKING:
    from matplotlib.axes import Axes

POTENTIAL = "E vs RHE / V"
_BAR = 0.78
_LEAST_SPAN_VOLT = 0.1
_MANY_FOLD = 30.0  # a range over more than this factor is drawn on a logarithmic axis
_VERDICTS = {data.CLOSED: (BLACK, "o"), data.SHORT: (VERMILION, "v"), data.OVER: (BLUE, "^")}


def fe_against_potential(
    book: Book, catalyst: str, ax: Axes | None = None, *, width_mm: float = COLUMN_MM
) -> Axes:
    """Stacked Faradaic efficiencies of a catalyst's products at each level, with the total and its uncertainty.

    Parameters
    ----------
    book : Book
    catalyst : str
    ax : Axes, optional
        Where to draw; axes on a sheet of the house's style by default.
    width_mm : float
        Of that sheet.

    Returns
    -------
    Axes
        ``ax.figure.savefig(...)`` writes it; `coulombook.figures.sheet.rendered` does so with letters embedded.

    Raises
    ------
    ValueError
        The day has no such catalyst.
    """
    return _drawn(_efficiencies, data.fe_against_potential(book, catalyst), ax, width_mm)


def partial_currents(
    book: Book,
    catalyst: str,
    basis: Basis = "geometric",
    ax: Axes | None = None,
    *,
    width_mm: float = COLUMN_MM,
) -> Axes:
    """Partial current densities of a catalyst's products against potential, logarithmic; see `fe_against_potential`."""
    return _drawn(_currents, data.partial_currents(book, catalyst, basis), ax, width_mm)


def selectivity(book: Book, ax: Axes | None = None, *, width_mm: float = COLUMN_MM) -> Axes:
    """C2+/C1 of every catalyst against potential; see `fe_against_potential`."""
    return _drawn(_selectivities, data.selectivity(book), ax, width_mm)


def closure(book: Book, ax: Axes | None = None, *, width_mm: float = COLUMN_MM) -> Axes:
    """Total Faradaic efficiency of each run with its interval, and the line of 100 %; see `fe_against_potential`."""
    return _drawn(_closures, data.closure(book), ax, width_mm)


def budget(
    book: Book,
    run: str | None = None,
    output: str = TOTAL,
    ax: Axes | None = None,
    *,
    width_mm: float = COLUMN_MM,
) -> Axes:
    """Shares of the sources in an output's variance, of one run or the mean over all; see `fe_against_potential`."""
    return _drawn(_shares, data.budget(book, run, output), ax, width_mm)


def draw(table: Table, ax: Axes | None = None, width_mm: float = COLUMN_MM) -> Axes:
    """The figure of a table of `coulombook.figures.data`."""
    return _drawn(_PAINTERS[table.name], table, ax, width_mm)


def _drawn(paint: Any, table: Table, ax: Axes | None, width_mm: float) -> Axes:
    if ax is not None:
        paint(ax, list(table.records()), False)
        plain_labels(ax)
        return ax
    with house_style():
        own = new_axes(width_mm)
        paint(own, list(table.records()), True)
        plain_labels(own)
    return own


def _efficiencies(ax: Axes, rows: Sequence[Row], own: bool) -> None:
    places = {level: place for place, level in enumerate(dict.fromkeys(row["level"] for row in rows))}
    above, below = [0.0] * len(places), [0.0] * len(places)
    handles, names = [], []
    stacked: dict[str, list[Row]] = {}
    for row in rows:
        if row["what"] == data.PRODUCT:
            stacked.setdefault(str(row["product"]), []).append(row)
    for name, members in stacked.items():
        style = style_of_product(name)
        at, heights = [places[row["level"]] for row in members], _column(members, "FE / %")
        stacks = [above if height >= 0.0 else below for height in heights]
        bars = ax.bar(
            at, heights, _BAR, bottom=[stack[place] for stack, place in zip(stacks, at, strict=True)],
            color=style.colour, hatch=style.hatch, edgecolor=BLACK, linewidth=0.4,
        )  # fmt: skip
        for patch, stack, place, height, row in zip(bars.patches, stacks, at, heights, members, strict=True):
            patch.set_gid(str(row[MARK]))
            stack[place] += height
        handles.append(bars)
        names.append(name)
    total = None
    for row in rows:
        if row["what"] == data.WHOLE:
            value, u = number(row["FE / %"]) or 0.0, number(row["u(FE) / %"]) or 0.0
            total = _point(
                ax, places[row["level"]], value, str(row[MARK]), BLACK, "D", face="white", size=2.8
            )
            _errors(ax, [places[row["level"]]], [value], [u])
    if total is not None:
        handles.append(total)
        names.append("total")
    ax.axhline(100.0, color=BLACK, lw=0.6, ls=(0, (4, 3)), zorder=0)
    if any(below):
        ax.axhline(0.0, color=BLACK, lw=0.6)
    potentials = {row["level"]: number(row[POTENTIAL]) for row in rows}
    labels = [
        shown(level) if potentials[level] is None else _minus(fixed(potentials[level], 2)) for level in places
    ]
    name_ticks(ax, labels, own=own)
    ax.set_xlabel(POTENTIAL)
    ax.set_ylabel("FE / %")
    ax.set_ylim(bottom=min(0.0, ax.get_ylim()[0]) if any(below) else 0.0)
    legend(ax, handles, names, own=own)


def _currents(ax: Axes, rows: Sequence[Row], own: bool) -> None:
    handles, names = [], []
    series: dict[str, list[Row]] = {}
    for row in rows:
        if row[MARK] is not None:
            series.setdefault(str(row["product"]), []).append(row)
    for name, members in series.items():
        style = style_of_product(name)
        e, j = _column(members, POTENTIAL), _column(members, "j / mA cm^-2")
        ax.plot(e, j, color=style.colour, lw=0.7, zorder=1)
        _errors(ax, e, j, _column(members, "u(j) / mA cm^-2"), _column(members, "u(E vs RHE) / V"))
        points = [
            _point(ax, x, y, str(row[MARK]), style.colour, style.marker)
            for x, y, row in zip(e, j, members, strict=True)
        ]
        handles.append(points[0])
        names.append(name)
    if series:
        ax.set_yscale("log", nonpositive="clip")
        # error bars that reach below zero would otherwise stretch the axis without end
        values = [value for members in series.values() for value in _column(members, "j / mA cm^-2")]
        ax.set_ylim(min(values) / 2.0, max(values) * 2.0)
        plain_decades(ax, "y")
    _potentials(ax)
    basis = next((str(row["basis"]) for row in rows), "geometric")
    ax.set_ylabel("partial j / mA cm⁻²" if basis == "geometric" else "partial j on real area / mA cm⁻²")
    legend(ax, handles, names, own=own)


def _selectivities(ax: Axes, rows: Sequence[Row], own: bool) -> None:
    styles = styles_of_catalysts([str(row["catalyst"]) for row in rows])
    handles = []
    for name, style in styles.items():
        members = [row for row in rows if row["catalyst"] == name]
        e, ratio = _column(members, POTENTIAL), _column(members, "C2+/C1")
        ax.plot(e, ratio, color=style.colour, lw=0.7, zorder=1)
        _errors(ax, e, ratio, _column(members, "u(C2+/C1)"), _column(members, "u(E vs RHE) / V"))
        points = [
            _point(ax, x, y, str(row[MARK]), style.colour, style.marker)
            for x, y, row in zip(e, ratio, members, strict=True)
        ]
        handles.append(points[0])
    ratios = _column(rows, "C2+/C1")
    if ratios and min(ratios) > 0.0 and max(ratios) > _MANY_FOLD * min(ratios):
        ax.set_yscale("log", nonpositive="clip")
        ax.set_ylim(min(ratios) / 2.0, max(ratios) * 2.0)
        plain_decades(ax, "y")
    elif ratios:
        ax.set_ylim(bottom=min(0.0, *ratios) - 0.03 * max(map(abs, ratios)))
    _potentials(ax)
    ax.set_ylabel("FE(C2+) / FE(C1)")
    legend(ax, handles, list(styles), own=own)


def _closures(ax: Axes, rows: Sequence[Row], own: bool) -> None:
    handles: dict[str, Any] = {}
    verdicts = {str(row["closure"]) for row in rows}
    for verdict in sorted(
        verdicts, key=lambda one: (one not in _VERDICTS, [*_VERDICTS, one].index(one), one)
    ):
        colour, marker = _VERDICTS.get(verdict, (GREY, "s"))
        held = [(place, row) for place, row in enumerate(rows) if row["closure"] == verdict]
        total, high = (_column([row for _, row in held], head) for head in ("total FE / %", "high / %"))
        at = [place for place, _ in held]
        _errors(ax, at, total, [max(b - a, 0.0) for a, b in zip(total, high, strict=True)], colour=colour)
        for (place, row), value in zip(held, total, strict=True):
            handles[verdict] = _point(ax, place, value, str(row[MARK]), colour, marker)
    ax.axhline(100.0, color=BLACK, lw=0.6, ls=(0, (4, 3)), zorder=0)
    name_ticks(ax, [shown(row["run"], 16) for row in rows], own=own)
    ax.set_xlabel("run")
    ax.set_ylabel("total FE / %")
    legend(ax, list(handles.values()), list(handles), own=own)


def _shares(ax: Axes, rows: Sequence[Row], own: bool) -> None:
    for place, row in enumerate(rows):
        bar = ax.barh(place, number(row["share / %"]) or 0.0, 0.7, color=BLUE, edgecolor=BLACK, linewidth=0.4)
        bar.patches[0].set_gid(str(row[MARK]))
    names = [
        shown(row["source"], 34) + ("" if row["shared"] is None else f" ({shown(row['shared'], 12)})")
        for row in rows
    ]
    ax.set_yticks(range(len(rows)), names, parse_math=False)
    ax.set_ylim(len(rows) - 0.4, -0.6)
    ax.set_xlim(0.0, 100.0)
    ax.set_xlabel("share of the variance / %")


_PAINTERS = {
    "fe-against-potential": _efficiencies,
    "partial-currents": _currents,
    "selectivity": _selectivities,
    "closure": _closures,
    "budget": _shares,
}


def _potentials(ax: Axes) -> None:
    """Label the axis of potential, and keep a single potential from filling it with its uncertainty."""
    ax.set_xlabel(POTENTIAL)
    low, high = ax.get_xlim()
    if high - low < _LEAST_SPAN_VOLT:
        middle = 0.5 * (low + high)
        ax.set_xlim(middle - 0.5 * _LEAST_SPAN_VOLT, middle + 0.5 * _LEAST_SPAN_VOLT)


def _point(
    ax: Axes,
    x: float,
    y: float,
    gid: str,
    colour: str,
    marker: Any,
    face: str = "",
    size: float | None = None,
) -> Any:
    (line,) = ax.plot(
        [x], [y], ls="none", marker=marker, mfc=face or colour, mec=BLACK, ms=size, zorder=4, gid=gid
    )
    return line


def _errors(
    ax: Axes,
    x: Sequence[float],
    y: Sequence[float],
    u_y: Sequence[float],
    u_x: Sequence[float] | None = None,
    colour: str = BLACK,
) -> None:
    ax.errorbar(x, y, u_y, fmt="none", ecolor=colour, elinewidth=0.6, zorder=3)
    if u_x is not None:
        # the same for all that was measured at one potential, and so only a hint
        ax.errorbar(x, y, xerr=u_x, fmt="none", ecolor=colour, elinewidth=0.4, capsize=0.0, zorder=2)


def _column(rows: Sequence[Row], head: str) -> list[float]:
    return [number(row[head]) or 0.0 for row in rows]


def _minus(text: str) -> str:
    return text.replace("-", "\N{MINUS SIGN}")
