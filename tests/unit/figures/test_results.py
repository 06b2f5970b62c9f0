"""What is drawn is what the tables say: bars, points, intervals, and nothing else."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.container import BarContainer
from matplotlib.lines import Line2D
from tests.unit.figures.books import book

from coulombook import figures
from coulombook.book import Book, Cell, Table
from coulombook.figures import data_of

MESH = "annealed copper mesh"


def number(cell: Cell) -> float:
    assert isinstance(cell, float | int)
    return float(cell)


def marks(axes: Axes) -> dict[str, Line2D]:
    return {str(line.get_gid()): line for line in axes.lines if line.get_gid()}


def bars(axes: Axes) -> dict[str, tuple[float, float]]:
    """Lower and upper end of each bar."""
    found = {}
    for container in axes.containers:
        if isinstance(container, BarContainer):
            for patch in container.patches:
                ends = sorted((patch.get_y(), patch.get_y() + patch.get_height()))
                found[str(patch.get_gid())] = (ends[0], ends[1])
    return found


def error_bars(axes: Axes) -> np.ndarray:
    """Lower and upper ends of all vertical error bars, by x."""
    found = []
    for collection in axes.collections:
        for x, y in (segment.T for segment in getattr(collection, "get_segments", list)()):
            if len(x) == 2 and x[0] == x[1]:
                found.append((x[0], *sorted(y)))
    return np.array(sorted(set(found)))


def with_cells(made: Book, table: str, change: dict[str, Cell], where: dict[str, Cell]) -> Book:
    rows = [
        row | change if all(row[head] == cell for head, cell in where.items()) else row
        for row in made.tables[table].records()
    ]
    return dataclasses.replace(made, tables=dict(made.tables) | {table: Table.of(table, rows)})


def test_each_bar_is_as_high_as_the_efficiency_in_the_series_and_stands_on_the_one_before() -> None:
    made = book()
    drawn, series = bars(figures.fe_against_potential(made, MESH)), made.tables["series"]
    rows = [row for row in series.records() if row["catalyst"] == MESH]
    assert len(drawn) == len(rows) == 36
    for row in rows:
        low, high = drawn[figures.mark_id("fe", MESH, str(row["level"]), str(row["product"]))]
        assert high - low == pytest.approx(number(row["FE / %"]), rel=1e-12)
    of_level = sorted(ends for gid, ends in drawn.items() if f":{rows[0]['level']}:" in gid)
    assert of_level[0][0] == 0.0
    assert [low for low, _ in of_level[1:]] == pytest.approx([high for _, high in of_level[:-1]])


def test_negative_efficiencies_hang_below_zero_and_lift_nothing() -> None:
    made = book(products=[("hydrogen", "H2", "gas", 2, -12.0), ("ethylene", "C2", "gas", 12, 60.0)])
    axes = figures.fe_against_potential(made, MESH)
    drawn = bars(axes)
    assert all(high == 0.0 for gid, (_, high) in drawn.items() if gid.endswith("hydrogen"))
    assert all(low == 0.0 for gid, (low, _) in drawn.items() if gid.endswith("ethylene"))
    assert axes.get_ylim()[0] < min(low for low, _ in drawn.values())


def test_the_total_of_each_level_stands_with_its_uncertainty() -> None:
    made = book()
    axes = figures.fe_against_potential(made, MESH)
    points, ends = marks(axes), error_bars(axes)
    for row in made.tables["summary"].records():
        if row["catalyst"] != MESH:
            continue
        (x,), (y,) = points[figures.mark_id("fe-total", MESH, str(row["level"]))].get_data()
        assert y == row["total FE / %"]
        u = number(row["u(total FE) / %"])
        assert any(np.allclose(one, (x, y - u, y + u)) for one in ends)


def test_a_level_of_several_runs_has_no_total_where_nothing_says_what_they_share() -> None:
    table = data_of("fe_against_potential", book(replicates=2), MESH)
    assert set(table.column("what")) == {"product"}


def test_levels_go_from_the_most_negative_potential_on_and_are_named_by_it() -> None:
    axes = figures.fe_against_potential(book(), MESH)
    assert [one.get_text() for one in axes.get_xticklabels()] == ["−1.05", "−0.85", "−0.62"]


def test_a_product_that_a_level_lacks_leaves_no_mark() -> None:
    level = str(book().tables["series"].column("level")[0])
    made = with_cells(book(), "series", {"FE / %": None}, {"product": "methane", "level": level})
    assert figures.mark_id("fe", MESH, level, "methane") not in bars(figures.fe_against_potential(made, MESH))


@pytest.mark.parametrize(("basis", "head"), [("geometric", "j / mA cm^-2"), ("real", "j real / mA cm^-2")])
def test_each_partial_current_stands_at_its_potential_on_a_logarithmic_axis(basis: str, head: str) -> None:
    made = book()
    axes = figures.partial_currents(made, MESH, "real" if basis == "real" else "geometric")
    points = marks(axes)
    rows = [row for row in made.tables["series"].records() if row["catalyst"] == MESH]
    assert len(points) == len(rows)
    for row in rows:
        line = points[figures.mark_id(f"j-{basis}", MESH, str(row["level"]), str(row["product"]))]
        assert float(line.get_ydata()[0]) == row[head]  # type: ignore[index] # a list of one
    assert axes.get_yscale() == "log"
    low, high = axes.get_ylim()
    # error bars of more than 100 % reach below zero; they must not stretch the axis
    assert low > 0.3 * min(number(row[head]) for row in rows)
    assert high > max(number(row[head]) for row in rows)


def test_currents_that_no_logarithm_has_stay_in_the_table_without_a_mark() -> None:
    made = with_cells(book(), "series", {"j / mA cm^-2": -0.1}, {"product": "hydrogen"})
    table = data_of("partial_currents", made, MESH)
    assert {row["mark"] for row in table.records() if row["product"] == "hydrogen"} == {None}
    assert not any("hydrogen" in gid for gid in marks(figures.partial_currents(made, MESH)))


def test_a_day_without_any_current_gives_an_empty_figure_and_no_error() -> None:
    made = with_cells(book(), "series", {"j / mA cm^-2": None}, {})
    assert not marks(figures.partial_currents(made, MESH))


def test_selectivities_are_those_of_the_summary() -> None:
    made = book()
    points = marks(figures.selectivity(made))
    rows = list(made.tables["summary"].records())
    assert len(points) == len(rows)
    for row in rows:
        line = points[figures.mark_id("selectivity", str(row["catalyst"]), str(row["level"]))]
        assert (line.get_xdata()[0], line.get_ydata()[0]) == (row["E vs RHE / V"], row["C2+/C1"])  # type: ignore[index]


def test_selectivities_that_span_decades_get_a_logarithmic_axis_unless_one_is_zero() -> None:
    level = str(book().tables["summary"].column("level")[0])
    wide = with_cells(book(), "summary", {"C2+/C1": 100.0}, {"level": level})
    assert figures.selectivity(wide).get_yscale() == "log"
    none = with_cells(wide, "summary", {"C2+/C1": 0.0}, {"catalyst": "silver foam"})
    assert figures.selectivity(none).get_yscale() == "linear"


def test_closure_shows_each_run_with_its_interval_its_verdict_and_the_line_of_100_percent() -> None:
    made = book()
    axes = figures.closure(made)
    points, ends = marks(axes), error_bars(axes)
    for place, row in enumerate(made.tables["summary"].records()):
        line = points[figures.mark_id("closure", str(row["run"]))]
        assert (line.get_xdata()[0], line.get_ydata()[0]) == (place, row["total FE / %"])  # type: ignore[index]
        assert line.get_marker() == ("o" if row["closure"] == "closed" else "v")
        # 1.959964: two-sided 95 % quantile of the normal distribution, as any table of it says
        half = 1.959964 * number(row["u(total FE) / %"])
        assert ends[place] == pytest.approx(
            [place, line.get_ydata()[0] - half, line.get_ydata()[0] + half], abs=1e-4
        )  # type: ignore[index]
    assert any(set(np.atleast_1d(line.get_ydata())) == {100.0} for line in axes.lines)


def test_axes_of_the_reader_keep_their_sheet_and_style() -> None:
    from matplotlib.figure import Figure

    sheet = Figure(figsize=(4, 3))
    mine = sheet.add_subplot()
    assert figures.closure(book(), mine) is mine
    assert tuple(sheet.get_size_inches()) == (4, 3)
    assert mine.spines["top"].get_visible()


@pytest.mark.parametrize(
    ("call", "said"),
    [
        (
            lambda made: figures.fe_against_potential(made, "meshh"),
            "no catalyst 'meshh'; known: annealed copper mesh, ",
        ),
        (
            lambda made: figures.partial_currents(made, MESH, "molar"),
            "no basis 'molar'; known: geometric, real",
        ),
        (lambda made: figures.trace(made, "r"), "tables alone"),
        (lambda made: data_of("fe", made), "no figure 'fe'; known: "),
    ],
)
def test_what_is_not_there_is_told_with_what_is(call: object, said: str) -> None:
    assert callable(call)
    with pytest.raises(ValueError, match=said):
        call(book())
