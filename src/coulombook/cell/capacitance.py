"""Double-layer capacitance from voltammograms at several scan rates.

In a window without reaction the current is the charging current of the double layer, i = C v, on top of
whatever both sweeps carry alike. Half the difference of the anodic and the cathodic sweep in the middle of
the window is C v (McCrory, Jung, Peters & Jaramillo, J. Am. Chem. Soc. 135 (2013) 16977).
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coulombook.curves.fit import fit_polynomial

FloatArray = NDArray[np.float64]

MIDDLE_SHARE = 0.2  # of the window, about its middle, that the current is averaged over
# a sweep counts as turned once it has crossed from one outer fifth of the scan to the other, whatever the
# noise
_OUTER = 0.2
_WHOLE = 0.9  # share of the path of the longest cycle that a whole one has at least
# share of the middle a sweep must cover; the record of a cycle may lack the step that joins it to the next
_CROSSED = 0.9
_BOTH_WAYS = "a potential that rises and falls"


class ScanError(ValueError):
    """A voltammogram that gives no charging current; ``expected`` says what would do."""

    def __init__(self, message: str, expected: str) -> None:
        self.expected = expected
        super().__init__(message)


@dataclass(frozen=True, slots=True)
class CapacitanceFit:
    """Charging current against scan rate, i = C v + i_0."""

    capacitance_farad: float
    u_capacitance_farad: float  # NaN when no degree of freedom is left
    intercept_ampere: float
    r_squared: float
    exponent: float  # slope of ln i against ln v, 1 for charging; NaN unless every i is above zero
    residual_sd_ampere: float  # NaN when no degree of freedom is left


def _directions(potential_volt: FloatArray) -> FloatArray:
    """+1 for a step of a rising sweep, -1 for one of a falling sweep, (n_samples - 1,)."""
    low, high = potential_volt.min(), potential_volt.max()
    span = high - low
    outer = np.where(potential_volt >= high - _OUTER * span, 1, 0) - np.where(
        potential_volt <= low + _OUTER * span, 1, 0
    )
    seen = np.flatnonzero(outer)
    # samples in an outer fifth, gathered into visits: each visit of one side has one turning point
    visit = np.concatenate(([0], np.flatnonzero(np.diff(outer[seen])) + 1, [seen.size]))
    turns, sides = [], []
    for first, last in itertools.pairwise(visit):
        held = seen[first:last]
        side = int(outer[held[0]])
        turns.append(int(held[np.argmax(side * potential_volt[held])]))
        sides.append(side)
    result = np.empty(potential_volt.size - 1)
    edges = [0, *turns, potential_volt.size - 1]
    # towards a high turning point the sweep rises; after the last one it goes back
    for first, last, sign in zip(edges[:-1], edges[1:], [*sides, -sides[-1]], strict=True):
        result[first:last] = sign
    return result


def _cycles(potential_volt: FloatArray, directions: FloatArray) -> FloatArray:
    """Number of the cycle of each sample, counted from 1, where the record has no column for it.

    A cycle is a path of twice the distance between the turning points, counted from the first sample, so
    that it holds one rise and one fall wherever it starts.
    """
    path = np.concatenate(([0.0], np.cumsum(directions * np.diff(potential_volt))))
    lap = 2.0 * float(potential_volt.max() - potential_volt.min())
    # a sample that closes a lap belongs to it, whatever the rounding
    result: FloatArray = np.maximum(np.ceil(path / lap - 1e-9), 1.0)
    return result


def _sweep_mean(
    potential_volt: FloatArray, current_ampere: FloatArray, steps: NDArray[np.intp], low: float, high: float
) -> tuple[float, float]:
    """Mean current over [low, high] along some steps, and the share of that stretch they cover."""
    e0, e1 = potential_volt[steps], potential_volt[steps + 1]
    i0, i1 = current_ampere[steps], current_ampere[steps + 1]
    a, b = np.clip(e0, low, high), np.clip(e1, low, high)
    slope = np.divide(i1 - i0, e1 - e0, out=np.zeros_like(e0), where=e1 != e0)
    # signed, so that a step back within a noisy sweep takes away what it added
    area = float(np.sum((b - a) * (i0 + slope * (0.5 * (a + b) - e0))))
    width = float(np.sum(b - a))
    return (area / width if width else math.nan), abs(width) / (high - low)


def charging_current_ampere(
    potential_volt: FloatArray,
    current_ampere: FloatArray,
    cycle: FloatArray | None = None,
    chosen_cycle: float | None = None,
    window_low_volt: float | None = None,
    window_high_volt: float | None = None,
) -> float:
    """Half the difference of the anodic and the cathodic current in the middle of a window. [A]

    Each sweep is averaged over the central fifth of the window by trapezoids in potential, with straight
    lines to the ends of the fifth: the mean of unevenly sampled points would weight the potentials
    differently in the two sweeps, and a current that grows with potential would not cancel.

    Parameters
    ----------
    potential_volt, current_ampere : (n_samples,) float arrays
        The voltammogram, in the order it was recorded; any reference electrode. [V], [A]
    cycle : (n_samples,) float array, optional
        Number of the cycle of each sample; told from the turning points where it is missing, counting from 1.
    chosen_cycle : float, optional
        The cycle to take; the last whole one by default.
    window_low_volt, window_high_volt : float, optional
        The window; the turning points of the cycle by default. [V]

    Raises
    ------
    ScanError
        Too few samples, a potential that does not move, no such cycle, or a sweep that does not cross the
        window.

    Examples
    --------
    >>> up = np.linspace(0.0, 0.1, 11)
    >>> e = np.concatenate((up, up[::-1]))
    >>> i = np.where(np.arange(22) < 11, 2e-6, -2e-6) + 1e-7
    >>> round(charging_current_ampere(e, i), 12)
    2e-06
    """
    e, i = potential_volt, current_ampere
    if e.size < 5:
        raise ScanError(f"the voltammogram has {e.size} sample(s); it needs a rise and a fall", _BOTH_WAYS)
    if not (np.isfinite(e).all() and np.isfinite(i).all()):
        raise ScanError("the voltammogram holds a value that is not a finite number", "finite numbers")
    if e.min() == e.max():
        raise ScanError("the potential of the voltammogram does not move", _BOTH_WAYS)
    directions = _directions(e)
    # a step belongs to the cycle of the sample it leads to
    owner = (_cycles(e, directions) if cycle is None else cycle)[1:]
    path = directions * np.diff(e)
    if chosen_cycle is None:
        numbers, member = np.unique(owner, return_inverse=True)
        lengths = np.bincount(member.reshape(-1), weights=path)
        whole = np.flatnonzero(lengths >= _WHOLE * lengths.max())
        first_step = {int(k): int(np.flatnonzero(member.reshape(-1) == k)[0]) for k in whole}
        chosen = float(numbers[max(whole.tolist(), key=first_step.__getitem__)])
    else:
        chosen = chosen_cycle
    steps = np.flatnonzero(owner == chosen)
    if steps.size == 0:
        raise ScanError(
            f"there is no cycle {chosen:g}; the last one is {owner.max():g}",
            f"a cycle from {owner.min():g} to {owner.max():g}",
        )
    lowest = float(min(e[steps].min(), e[steps + 1].min()))
    highest = float(max(e[steps].max(), e[steps + 1].max()))
    low = lowest if window_low_volt is None else window_low_volt
    high = highest if window_high_volt is None else window_high_volt
    within = f"a window within {lowest:g} V to {highest:g} V that the potential crosses both ways"
    if not low < high:
        raise ScanError(
            f"the window runs from {low:g} V to {high:g} V; it must start below where it ends", within
        )
    middle, half = 0.5 * (low + high), 0.5 * MIDDLE_SHARE * (high - low)
    slack = 0.5 * (1.0 - _CROSSED) * (high - low)
    means = []
    for sign, name in ((1.0, "rising"), (-1.0, "falling")):
        mean, covered = _sweep_mean(e, i, steps[directions[steps] == sign], middle - half, middle + half)
        if lowest > low + slack or highest < high - slack or covered < _CROSSED:
            raise ScanError(
                f"the {name} sweep of cycle {chosen:g} does not cross the window {low:g} V to {high:g} V; "
                f"the cycle runs from {lowest:g} V to {highest:g} V",
                within,
            )
        means.append(mean)
    return 0.5 * (means[0] - means[1])


def fit_capacitance(
    scan_rate_volt_per_second: FloatArray, charging_current_ampere: FloatArray
) -> CapacitanceFit:
    """Capacitance as the slope of charging current against scan rate, i = C v + i_0, by least squares.

    Parameters
    ----------
    scan_rate_volt_per_second, charging_current_ampere : (n_scans,) float arrays
        [V/s], [A]

    Raises
    ------
    ValueError
        Fewer than two different scan rates, or a value that is not finite.

    Examples
    --------
    >>> fit = fit_capacitance(np.array([0.02, 0.04, 0.08]), np.array([3e-5, 5e-5, 9e-5]))
    >>> round(fit.capacitance_farad, 9), round(fit.intercept_ampere, 9)
    (0.001, 1e-05)
    """
    rate, current = scan_rate_volt_per_second, charging_current_ampere
    fit = fit_polynomial(rate, current, (0, 1))
    known = fit.degrees_of_freedom > 0
    exponent = math.nan
    if (rate > 0.0).all() and (current > 0.0).all():
        exponent = float(fit_polynomial(np.log(rate), np.log(current), (0, 1)).coefficients[1])
    return CapacitanceFit(
        capacitance_farad=float(fit.coefficients[1]),
        u_capacitance_farad=math.sqrt(fit.covariance[1, 1]) if known else math.nan,
        intercept_ampere=float(fit.coefficients[0]),
        r_squared=fit.r_squared,
        exponent=exponent,
        residual_sd_ampere=fit.residual_sd if known else math.nan,
    )
