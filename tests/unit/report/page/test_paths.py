"""Paths made short that show the same."""

from __future__ import annotations

import math
import re

from hypothesis import given
from hypothesis import strategies as st

from coulombook.report.page.paths import dots, rounded, short_path, simplified

Point = tuple[float, float]


def distance(point: Point, start: Point, end: Point) -> float:
    """From a point to a stretch of line."""
    (x, y), (x0, y0), (x1, y1) = point, start, end
    dx, dy = x1 - x0, y1 - y0
    length = dx * dx + dy * dy
    at = 0.0 if length == 0 else max(0.0, min(1.0, ((x - x0) * dx + (y - y0) * dy) / length))
    return math.hypot(x - x0 - at * dx, y - y0 - at * dy)


@given(st.lists(st.floats(0, 100), min_size=3, max_size=60), st.floats(0.01, 5))
def test_no_point_of_a_line_lies_farther_off_the_short_one_than_allowed(
    heights: list[float], allowed: float
) -> None:
    line = [(float(x), y) for x, y in enumerate(heights)]
    short = simplified(line, allowed)
    assert (short[0], short[-1]) == (line[0], line[-1])
    assert set(short) <= set(line)
    for point in line:
        # a line that goes from left to right passes each point between its neighbours
        after = next(place for place, one in enumerate(short) if one[0] >= point[0])
        assert distance(point, short[max(after - 1, 0)], short[after]) <= allowed + 1e-9


def test_a_straight_line_of_many_points_becomes_one_of_two() -> None:
    path = "M 0 0 " + " ".join(f"L {x} {x / 2}" for x in range(1, 200))
    assert short_path(path) == "M0 0 199 99.5"


def test_a_ring_is_closed_again_and_keeps_its_corners() -> None:
    side = [f"{x} 0" for x in range(30)] + [f"29 {y}" for y in range(30)] + ["0 29"]
    path = "M " + " L ".join(side) + " z"
    assert short_path(path) == "M0 0 29 0 29 29 0 29z"


def test_curves_keep_every_figure_to_two_decimals() -> None:
    assert short_path("M 0 -2.000004 C 1.12345 2 3 4.5 5 6 z") == "M0 -2C1.12 2 3 4.5 5 6z"


def test_rounding_leaves_colours_and_names_alone() -> None:
    assert rounded("#009e73") == "#009e73"
    assert rounded("#0072b2; 1.23456 -0.0001") == "#0072b2; 1.23 0"


def test_equal_discs_become_points_of_their_width() -> None:
    disc = (
        "M {0} 1 C {0} 1.5 {1} 2 {2} 2 C {3} 2 {4} 1.5 {4} 1 C {4} 0.5 {3} 0 {2} 0 C {1} 0 {0} 0.5 {0} 1 z "
    )
    path = "".join(disc.format(x, x + 0.5, x + 1, x + 1.5, x + 2) for x in range(0, 60, 4))
    found = dots(path)
    assert found is not None
    assert found[1] == 2.0
    assert re.findall(r"M([\d.]+) ([\d.]+)h0", found[0])[:2] == [("1", "1"), ("5", "1")]


def test_lines_are_no_discs() -> None:
    assert dots("M 0 0 L 1 1 " * 20) is None
