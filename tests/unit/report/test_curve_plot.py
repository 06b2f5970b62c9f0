"""Drawings: what stands where, and what a file holds. Not how it looks to the last dot."""

from __future__ import annotations

import dataclasses
import re

import numpy as np
import pytest
from rich.cells import cell_len

from coulombook.library.picture import Picture
from coulombook.report.curve_plot import Axis, legend, terminal_plot

LABELS = {"x_label": "mole fraction / ppm", "y_label": "peak area"}


def drawing(*, wide: bool = False, outlier: int | None = None) -> Picture:
    """y = 2 x with residuals of +-1 (or 5 %), a band of +-2 (or 10 %)."""
    x = np.array([10.0, 10.0, 100.0, 1000.0]) if wide else np.array([0.0, 5.0, 5.0, 10.0])
    grid = np.geomspace(10.0, 1000.0, 50) if wide else np.linspace(0.0, 10.0, 50)
    off = np.array([0.0, 0.0, 5.0, -5.0]) if wide else np.array([1.0, -1.0, -1.0, 0.0])
    return Picture(
        x=x,
        y=2.0 * x * (1.0 + off / 100.0) if wide else 2.0 * x + off,
        residual=off,
        outlier=outlier,
        grid_x=grid,
        grid_y=2.0 * grid,
        curve_band=0.1 * grid if wide else np.ones(50),
        reading_band=0.2 * grid if wide else np.full(50, 2.0),
        wide=wide,
        level=0.95,
        detection=20.0 if wide else 1.0,
        quantification=None,
    )


def lines(drawn: Picture, width: int = 80, *, ascii_only: bool = False) -> list[str]:
    return terminal_plot(drawn, width, ascii_only=ascii_only, **LABELS).plain.splitlines()


@pytest.mark.parametrize("width", [20, 40, 80, 120, 300])
@pytest.mark.parametrize("wide", [False, True])
def test_the_drawing_keeps_to_its_width(width: int, wide: bool) -> None:
    # narrower than it can be, the terminal wraps
    assert max(map(cell_len, lines(drawing(wide=wide), width))) <= max(width, 40)


def test_every_standard_is_seen_above_and_below() -> None:
    # behind the axis; the two at x = 5 share a cell
    panels = "\n".join(re.sub("^.*?[│┤]", "", line) for line in lines(drawing())).split("residual")
    for panel in (panels[0], panels[1].partition("└")[0]):
        assert (panel.count("o"), panel.count("2")) == (2, 1)


def test_the_curve_rises_from_the_lower_left_to_the_upper_right() -> None:
    above = lines(drawing())[1:15]
    first, last = [line.find("·") for line in (above[-1], above[0])]
    assert 0 < first < 12
    assert last > 60


def test_axes_carry_round_numbers_and_names() -> None:
    found = lines(drawing(wide=True))
    assert found[0] == "peak area"
    assert found[-1].endswith("mole fraction / ppm")
    assert found[-2].split() == ["10", "100", "1000"]
    assert any(line.startswith(" 100 ") for line in found)
    assert "residual / %" in found


def test_the_outlying_standard_has_a_sign_of_its_own() -> None:
    assert "X" not in "\n".join(lines(drawing()))
    odd = drawing(outlier=3)
    assert "\n".join(lines(odd)).count("X") == 2
    assert "X the outlying one" in legend(odd)
    assert "X" not in legend(drawing())


def test_limits_within_the_drawing_are_marked() -> None:
    assert sum("D" in line for line in lines(drawing())) == 1
    assert "D detection limit" in legend(drawing())
    assert "quantification" not in legend(drawing())


@pytest.mark.parametrize("wide", [False, True])
def test_the_drawing_is_text_of_any_terminal(wide: bool) -> None:
    "\n".join(lines(drawing(wide=wide), ascii_only=True)).encode("ascii")
    legend(drawing(wide=wide), ascii_only=True).encode("ascii")
    "\n".join(lines(drawing(wide=wide))).encode("cp437")


def test_no_band_and_no_residual_still_make_a_drawing() -> None:
    nothing = np.full(50, np.nan)
    bare = dataclasses.replace(
        drawing(),
        x=np.zeros(0),
        y=np.zeros(0),
        residual=np.zeros(0),
        reading_band=nothing,
        curve_band=nothing,
    )
    assert "residual" in lines(bare)
    assert legend(bare) == "· curve; D detection limit"


@pytest.mark.parametrize(
    ("axis", "ticks"),
    [
        (Axis(0.0, 10.0, False, 10), [0, 2, 4, 6, 8, 10][:5]),
        (Axis(0.0, 9.0, False, 10), [0, 2, 4, 6, 8]),
        (Axis(-3.0, 4.0, False, 10), [-2, 0, 2, 4]),
        (Axis(1e-4, 1e3, True, 10), [1e-4, 1e-2, 1.0, 100.0]),
        (Axis(3.0, 9.0, True, 10), [4, 6, 8]),
    ],
)
def test_ticks_are_round_numbers_within_the_axis(axis: Axis, ticks: list[float]) -> None:
    assert axis.ticks(5) == pytest.approx(ticks)


def test_what_lies_outside_an_axis_has_no_place() -> None:
    axis = Axis(1.0, 100.0, True, 5)
    assert axis.places(np.array([1.0, 10.0, 100.0, 0.5, 0.0, -1.0, np.nan])) == [
        0,
        2,
        4,
        None,
        None,
        None,
        None,
    ]
