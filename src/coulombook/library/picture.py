"""What a drawing of a curve shows: points, curve, bands and residuals, in the units people see."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coulombook.curves.prediction import curve_response, curve_variance, prediction, reading_variance
from coulombook.curves.quantiles import student_quantile
from coulombook.library.shelf import Entry

FloatArray = NDArray[np.float64]

LEVEL = 0.95
WIDE = 50.0  # a range over more than this factor is drawn on logarithmic axes
_PERCENT = 100.0


@dataclass(frozen=True, slots=True, eq=False)
class Picture:
    """Numbers of a drawing. x is in ppm (gas) or an amount ratio; responses are raw.

    ``wide`` asks for logarithmic axes; residuals and the bands about zero are then in percent of the curve's response,
    otherwise in its unit. Bands are half-widths at ``level``: of the curve itself, and of a single reading; NaN where
    the scatter is unknown.
    """

    x: FloatArray  # (n_points,)
    y: FloatArray  # (n_points,)
    residual: FloatArray  # (n_points,)
    outlier: int | None
    grid_x: FloatArray  # (n_grid,)
    grid_y: FloatArray  # (n_grid,)
    curve_band: FloatArray  # (n_grid,) in the unit of the response
    reading_band: FloatArray  # (n_grid,)
    wide: bool
    level: float
    detection: float | None  # within the drawing, in the unit of x
    quantification: float | None

    def scaled(self, half_width: FloatArray) -> FloatArray:
        """A band about zero, in the unit of the residuals."""
        result: FloatArray = half_width / self.grid_y * _PERCENT if self.wide else half_width
        return result


def picture(entry: Entry, grid: int = 200, level: float = LEVEL) -> Picture:
    """Numbers to draw a curve with.

    Raises ValueError for an entry without curve.
    """
    curve, standards = entry.curve, entry.standards
    if curve is None:
        raise ValueError(f"{entry.full_name} could not be fitted")
    smallest = min(curve.lowest, float(standards.x.min())) if standards.x.size else curve.lowest
    # from zero or below a logarithm has nowhere to begin; a response at or below zero it cannot show
    wide = smallest > 0.0 and curve.highest / smallest > WIDE
    wide = wide and float(curve_response(curve, smallest)) > 0.0 and bool((standards.y > 0.0).all())
    if wide:
        grid_x = np.geomspace(smallest, curve.highest, grid)
    else:
        grid_x = np.linspace(min(0.0, smallest), curve.highest, grid)
    grid_y = curve_response(curve, grid_x)
    at_points = curve_response(curve, standards.x)
    residual = standards.y - at_points
    if wide:
        residual = residual / at_points * _PERCENT
    curve_band = reading_band = np.full(grid, math.nan)
    if curve.degrees_of_freedom > 0:
        t = student_quantile(0.5 + 0.5 * level, curve.degrees_of_freedom)
        curve_band = t * np.sqrt(curve_variance(curve, grid_x))
        variance, freedom = prediction(curve, grid_x)
        reading_band = student_quantile(0.5 + 0.5 * level, freedom) * np.sqrt(variance)
    ends = float(grid_x[0]), float(grid_x[-1])
    detection, quantification = (
        None if entry.limits is None or not ends[0] <= one <= ends[1] else one * entry.x_scale
        for one in (
            (entry.limits.detection, entry.limits.quantification) if entry.limits else (math.nan, math.nan)
        )
    )
    return Picture(
        x=standards.x * entry.x_scale,
        y=standards.y,
        residual=residual,
        outlier=entry.judgement.outlier if entry.judgement else None,
        grid_x=grid_x * entry.x_scale,
        grid_y=grid_y,
        curve_band=curve_band,
        reading_band=reading_band,
        wide=wide,
        level=level,
        detection=detection,
        quantification=quantification,
    )


def axis_heads(entry: Entry) -> tuple[str, str]:
    """What the axes of a curve say, x and response."""
    if entry.x_scale == 1.0:
        return "amount ratio", "integral ratio"
    return "mole fraction / ppm", "peak area"


def residual_reach(residual: FloatArray, band: FloatArray) -> float:
    """Half the height of a drawing of residuals: all of them, and the band where it is not far beyond them."""
    wide = np.abs(band[np.isfinite(band)])
    most = float(np.abs(residual).max()) if residual.size else 0.0
    typical = float(np.median(wide)) if wide.size else 0.0
    half = max(1.05 * most, min(1.1 * float(wide.max(initial=0.0)), max(1.5 * most, 1.5 * typical)))
    return half if half > 0.0 else 1.0


def reading_scatter(entry: Entry) -> tuple[float, float] | None:
    """Standard deviation of a single reading over the response, at the lowest and the highest standard. [1]

    None where it is not known, or a response is not above zero.
    """
    curve = entry.curve
    if curve is None or curve.degrees_of_freedom < 1:
        return None
    ends = np.array(
        [
            max(
                curve.lowest,
                float(np.min(entry.standards.x, where=entry.standards.x > 0.0, initial=curve.highest)),
            ),
            curve.highest,
        ]
    )
    response = curve_response(curve, ends)
    if not (response > 0.0).all():
        return None
    low, high = (np.sqrt(reading_variance(curve, ends)) / response).tolist()
    return low, high
