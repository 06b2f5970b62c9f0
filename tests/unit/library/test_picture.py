"""Numbers of a drawing."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from tests.unit.library.shelves import falling_rows, gas_rows, write_calibration

from coulombook.curves.prediction import curve_variance, reading_variance
from coulombook.library.picture import picture, reading_scatter
from coulombook.library.shelf import Entry, open_library


def entry_of(tmp_path: Path, rows: list[str], curve: str = 'form = "line"\nweights = "1/x^2"') -> Entry:
    write_calibration(tmp_path, "gc", rows, curve=curve)
    return open_library([tmp_path]).entries[0]


def test_a_wide_range_is_drawn_by_decades_with_residuals_in_percent(tmp_path: Path) -> None:
    entry = entry_of(tmp_path, gas_rows(), 'form = "line through zero"\nweights = "1/x^2"')
    drawn = picture(entry)
    assert drawn.wide
    assert (drawn.grid_x[0], drawn.grid_x[-1]) == pytest.approx((10.0, 1000.0))  # ppm
    # the slope is the mean of y/x, 2.0 by the wobble's sum of zero
    assert drawn.residual == pytest.approx([0.4, -0.6, -0.3, 0.5, 0.2, -0.2], rel=1e-6)
    assert entry.curve is not None
    variance = curve_variance(entry.curve, 1e-3) + reading_variance(entry.curve, 1e-3)
    # Student's t of 5 degrees of freedom: 2.570582 (tables)
    assert drawn.reading_band[-1] == pytest.approx(2.570582 * float(variance) ** 0.5, rel=1e-6)
    assert (drawn.curve_band < drawn.reading_band).all()


def test_a_narrow_range_or_one_from_zero_is_drawn_as_it_is(tmp_path: Path) -> None:
    rows = [f"FID,ethylene,{x},{1 + 2 * x + 0.1 * (-1) ** x},," for x in (0, 100, 200, 300, 400)]
    drawn = picture(entry_of(tmp_path, rows, 'form = "line"'))
    assert not drawn.wide
    assert drawn.grid_x[0] == 0.0
    assert drawn.residual == pytest.approx(drawn.y - np.interp(drawn.x, drawn.grid_x, drawn.grid_y), abs=1e-9)
    assert drawn.detection is not None  # it lies within the drawing
    assert drawn.detection < 5.0


def test_unknown_scatter_has_no_band(tmp_path: Path) -> None:
    entry = entry_of(tmp_path, ["FID,ethylene,10,20,,", "FID,ethylene,20,41,,"], 'form = "line"')
    assert np.isnan(picture(entry).reading_band).all()
    assert reading_scatter(entry) is None


def test_the_scatter_of_a_reading_is_that_of_the_weights(tmp_path: Path) -> None:
    # relative wobble: sum of squares 94e-6 on 5 degrees of freedom
    found = reading_scatter(entry_of(tmp_path, gas_rows(), 'form = "line through zero"\nweights = "1/x^2"'))
    assert found == pytest.approx((0.004336, 0.004336), rel=1e-3)


def test_a_curve_that_is_none_cannot_be_drawn(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="could not be fitted"):
        picture(entry_of(tmp_path, falling_rows()))
