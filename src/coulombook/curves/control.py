"""Control chart of check injections against a curve.

A Shewhart chart whose centre and limits come from the curve: a check of known x lies about f(x) with the variance of
a reading and of the curve there (and of its own x). Warning beyond two, action beyond three standard deviations (ISO
7870-2), and rules for runs:

- eight in a row on one side of the centre, and two of three beyond the same warning limit: Western Electric,
  Statistical Quality Control Handbook (1956);
- six in a row rising or falling: Nelson, J. Qual. Technol. 16 (1984) 237, test 3.

All from memory. The curve's own error is common to all checks of one x: a run on one side says that checks and curve
disagree, be it by drift of the detector or by an error of the curve.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from coulombook.curves.fit import Curve
from coulombook.curves.prediction import curve_response, curve_variance, reading_variance, slope

FloatArray = NDArray[np.float64]

IN_CONTROL, WARNING, ACTION = "in control", "warning", "action"
WARNING_LIMIT, ACTION_LIMIT = 2.0, 3.0  # standard deviations
_ON_ONE_SIDE, _STEADY = 8, 6
_ROUNDING = 1e-9  # of the response: a deviation that is none


@dataclass(frozen=True, slots=True)
class RunSignal:
    """A run rule that was met; ``check`` is the one that completed it."""

    check: int
    rule: str


@dataclass(frozen=True, slots=True, eq=False)
class ControlChart:
    """Checks on the chart, in the order given.

    ``score`` is the deviation in standard deviations; infinite where the curve has no scatter and the check
    still deviates, NaN where the scatter is unknown (no degree of freedom).
    """

    expected: FloatArray  # (n_checks,) response of the curve
    standard_deviation: FloatArray  # (n_checks,)
    deviation: FloatArray  # (n_checks,) response less expected
    score: FloatArray  # (n_checks,)
    zones: tuple[str, ...]
    runs: tuple[RunSignal, ...]

    def limits(self, score: float) -> tuple[FloatArray, FloatArray]:
        """Lower and upper limit at so many standard deviations. [raw detector units]"""
        return (
            self.expected - score * self.standard_deviation,
            self.expected + score * self.standard_deviation,
        )


def control_chart(
    curve: Curve, x: ArrayLike, y: ArrayLike, repeats: int = 1, u_x: ArrayLike | None = None
) -> ControlChart:
    """Place check injections on the control chart of a curve.

    Parameters
    ----------
    curve : Curve
    x, y : (n_checks,) array_like
        Known x of each check and its response, in the order of time.
    repeats : int
        Injections each response is the mean of.
    u_x : (n_checks,) array_like, optional
        Standard uncertainty of x. [unit of x]

    Examples
    --------
    >>> from coulombook.curves.fit import fit_curve
    >>> curve = fit_curve([1.0, 2.0, 3.0, 4.0, 5.0], [10.1, 19.9, 30.0, 40.1, 49.9])
    >>> control_chart(curve, [3.0, 3.0], [30.1, 31.0]).zones
    ('in control', 'action')
    """
    x, y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
    expected = curve_response(curve, x)
    variance = reading_variance(curve, x) / repeats + curve_variance(curve, x)
    if u_x is not None:
        variance = variance + np.square(slope(curve, x) * np.asarray(u_x, dtype=float))
    sd = np.sqrt(variance)
    deviation = y - expected
    if curve.degrees_of_freedom < 1:
        score = np.full(y.shape, np.nan)
    else:
        none = np.abs(deviation) <= _ROUNDING * np.abs(expected)
        with np.errstate(divide="ignore", invalid="ignore"):
            score = np.where((sd == 0.0) & none, 0.0, deviation / sd)
    zones = tuple(
        ACTION if abs(one) > ACTION_LIMIT else WARNING if abs(one) > WARNING_LIMIT else IN_CONTROL
        for one in score.tolist()
    )
    return ControlChart(expected, sd, deviation, score, zones, tuple(_runs(score)))


def _runs(score: FloatArray) -> Iterator[RunSignal]:
    """Run rules as they are met, each once per run."""
    side = same = rising = falling = 0
    for check, value in enumerate(score.tolist()):
        here = (value > 0.0) - (value < 0.0)
        same = same + 1 if here == side and here else abs(here)
        side = here
        if same == _ON_ONE_SIDE:
            yield RunSignal(check, f"{_ON_ONE_SIDE} checks in a row on one side of the curve")
        before = score[check - 1] if check else np.nan
        rising = rising + 1 if value > before else 1
        falling = falling + 1 if value < before else 1
        if _STEADY in (rising, falling):
            yield RunSignal(
                check, f"{_STEADY} checks in a row, each {'above' if rising == _STEADY else 'below'} the last"
            )
        last = score[max(0, check - 2) : check + 1]
        if here and abs(value) > WARNING_LIMIT and np.sum(here * last > WARNING_LIMIT) == 2:
            yield RunSignal(check, "two of three checks beyond the same warning limit")
