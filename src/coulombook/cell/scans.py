"""Judge voltammograms for capacitance: has the charging current settled, is the window free of reaction.

A double layer in series with a resistance charges with a lag: after a turning point the current follows
i = C v (1 - A exp(-t/RC)), with A = 1 for a sweep that starts at rest and A = 2 / (1 + exp(-T/RC)) for sweeps
of duration T without end (Bard & Faulkner, Electrochemical Methods, 2nd ed. (2001), sect. 1.2.4, for the
first sweep; the second by periodicity).

A leak that is a straight line in potential is the same in both sweeps and odd about the middle of the window.
What is left even about the middle in the sum of the sweeps, or odd in their difference, is no double layer.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from coulombook.cell.capacitance import (
    MIDDLE_SHARE,
    Band,
    Cycle,
    FloatArray,
    band,
    bands,
    capacitance_by_charge_farad,
    charging_profile_ampere,
    cycles_of,
    middle_of,
    window_of,
)

# RC over the time from turning point to turning point that a scan may have, the window being as wide as the scan:
# the middle fifth then begins 8 RC after the turn, and 0.03 % of the transient is left
SETTLED_RATIO = 0.05
SETTLED_AFTER = 0.5 * (1.0 - MIDDLE_SHARE) / SETTLED_RATIO  # in RC, from the turn to the middle fifth
# share of the charging current by which the sweeps may be out of symmetry (common practice, no source)
CLEAN = 0.2
_BINS = 40
_FEWEST_BINS = 8
# difference of Akaike's criterion that leaves the other model without support (Burnham & Anderson, Model Selection
# and Multimodel Inference, 2nd ed. (2002), sect. 2.6)
_NO_SUPPORT = 10.0
_EDGE = (
    0.3  # of the current in the middle; a current that falls below it at the turns is a transient, not a hump
)
# choice of a window: ends by steps of a twentieth of the scan, at least two fifths of it wide
_STEPS = 20
_NARROWEST = 8


@dataclass(frozen=True, slots=True)
class Transient:
    """How far the charging current lags behind. NaN throughout where there are too few samples to tell."""

    rc_second: float  # 0: nothing of a lag is seen
    highest_rc_second: (
        float  # what the scatter of the sweeps leaves possible (95 %); 0 where a hump explains them
    )
    sweep_second: float  # from turning point to turning point


@dataclass(frozen=True, slots=True)
class Symmetry:
    """What is not a double layer in a window, as a share of the charging current in its middle."""

    tilt: float  # difference of the charging current between the upper and the lower side
    bend: float  # what the common current of the sides has above that of the middle
    u: float  # standard uncertainty of both that the scatter of the sweeps causes
    leakage_siemens: float  # slope of the common current against potential

    @property
    def clean(self) -> bool:
        """Whether both stay within what is allowed, their scatter considered."""
        allowed = CLEAN + 2.0 * self.u
        # a NaN is no proof of a clean window
        return abs(self.tilt) <= allowed and abs(self.bend) <= allowed


@dataclass(frozen=True, slots=True, eq=False)
class ScanFigures:
    """What is taken from one voltammogram."""

    cycle: Cycle
    lowest_volt: float  # turning points
    highest_volt: float
    low_volt: float  # window
    high_volt: float
    charging_ampere: float  # in the middle fifth of the window
    central_ampere: float  # over the central three fifths
    window_ampere: float  # over the whole window
    charge_capacitance_farad: float  # by charge over time; NaN without a time
    cycle_deviation_ampere: (
        float  # standard deviation between whole cycles, the first left aside; NaN below two
    )
    measured_rate_volt_per_second: float  # by the record's own time; NaN without one
    transient: Transient
    symmetry: Symmetry

    def settled(self, rc_second: float) -> bool:
        """Whether the lag is over where the middle fifth of the window begins."""
        rate = (self.highest_volt - self.lowest_volt) / self.transient.sweep_second
        begin, end = middle_of(self.low_volt, self.high_volt)
        since = min(begin - self.lowest_volt, self.highest_volt - end) / rate
        # a hair of rounding must not unsettle a scan that meets the limit exactly
        return not rc_second * SETTLED_AFTER > since * (1.0 + 1e-9)


def scan_figures(
    potential_volt: FloatArray,
    current_ampere: FloatArray,
    scan_rate_volt_per_second: float,
    *,
    cycle: FloatArray | None = None,
    time_second: FloatArray | None = None,
    chosen_cycle: float | None = None,
    window_low_volt: float | None = None,
    window_high_volt: float | None = None,
) -> ScanFigures:
    """Read a voltammogram: charging current by each method, its lag, and the symmetry of its window.

    Parameters as in `coulombook.cell.capacitance.charging_current_ampere`, with the scan rate [V/s] and the time of
    the samples (n_samples,) [s]. Raises `ScanError` as there.
    """
    chosen, whole = cycles_of(potential_volt, current_ampere, cycle, time_second, chosen_cycle)
    low, high = window_of(chosen, window_low_volt, window_high_volt)
    return _figures(chosen, whole, scan_rate_volt_per_second, low, high)


def _figures(chosen: Cycle, whole: Sequence[Cycle], rate: float, low: float, high: float) -> ScanFigures:
    middle = middle_of(low, high)
    fifths = _fifths(low, high)
    in_middle, central, across, *sides = bands(
        chosen, [middle, middle_of(low, high, 3.0 * MIDDLE_SHARE), (low, high), *fifths]
    )
    # the first cycle is still coming to rest
    later = [band(one, *middle).charging_ampere for one in whole[1:]]
    return ScanFigures(
        chosen,
        chosen.lowest_volt,
        chosen.highest_volt,
        low,
        high,
        in_middle.charging_ampere,
        central.charging_ampere,
        across.charging_ampere,
        capacitance_by_charge_farad(chosen, low, high),
        float(np.std(later, ddof=1)) if len(later) > 1 else math.nan,
        _measured_rate(chosen),
        transient_of(chosen, rate),
        _symmetry(chosen, low, high, sides),
    )


def _measured_rate(cycle: Cycle) -> float:
    if cycle.duration_second is None:
        return math.nan
    path = float(np.sum(cycle.direction * (cycle.to_volt - cycle.from_volt)))
    return path / float(cycle.duration_second.sum())


def _bins(cycle: Cycle, low: float, high: float) -> int:
    """How many stretches of potential the samples of a sweep can fill, two samples each."""
    inside = (cycle.to_volt >= low) & (cycle.to_volt <= high)
    fewest = min(int((inside & (cycle.direction == sign)).sum()) for sign in (1.0, -1.0))
    return min(_BINS, fewest // 2)


def transient_of(cycle: Cycle, scan_rate_volt_per_second: float) -> Transient:
    """Time constant of the lag after the turning points, by least squares.

    Half the difference of the sweeps, averaged over stretches of potential and over both sides of the middle, is
    held against a constant, a parabola (a capacitance that depends on potential) and the two laws of the lag.
    The lag is taken only where it is by far the better account.

    Parameters
    ----------
    cycle : Cycle
    scan_rate_volt_per_second : float
    """
    low, high = cycle.lowest_volt, cycle.highest_volt
    sweep = (high - low) / scan_rate_volt_per_second
    bins = _bins(cycle, low, high)
    if bins < _FEWEST_BINS:
        return Transient(math.nan, math.nan, sweep)
    edges = np.linspace(low, high, bins + 1)
    raw = charging_profile_ampere(cycle, edges)
    even = 0.5 * (raw + raw[::-1])[: (bins + 1) // 2]
    count = even.size
    floor = count * (1e-9 * float(np.abs(even).max())) ** 2
    # neither a number that is none nor a current of nothing tells of a lag
    if not 0.0 < floor < math.inf:
        return Transient(math.nan, math.nan, sweep)
    flat = float(np.sum((even - even.mean()) ** 2)) + floor
    edge = np.linspace(0.0, 1.0, bins + 1)
    ratio, lag, limit = _best_lag(even, edge[: count + 1], floor)
    place = np.abs(0.5 * (edge[:count] + edge[1 : count + 1]) - 0.5)
    design = np.stack([np.ones(count), place**2], axis=1)
    solution, *_ = np.linalg.lstsq(design, even, rcond=None)
    hump = float(np.sum((even - design @ solution) ** 2)) + floor
    at_turn = float(solution[0] + 0.25 * solution[1]) / float(solution[0]) if solution[0] else math.inf
    better = count * math.log(flat / lag) > 2.0 + _NO_SUPPORT
    seen = better and even[0] < even[-1] and (lag <= hump or abs(at_turn) < _EDGE)
    # a capacitance that depends on potential looks like a long lag to a law that knows nothing else
    explained = not seen and count * math.log(flat / hump) > 2.0 + _NO_SUPPORT
    if seen:
        return Transient(ratio * sweep, max(ratio, limit) * sweep, sweep)
    return Transient(0.0, 0.0 if explained else limit * sweep, sweep)


def _best_lag(even: FloatArray, edge: FloatArray, floor: float) -> tuple[float, float, float]:
    """RC over the time of a sweep, its residual square, and the largest RC the residuals do not exclude."""
    best = (math.nan, math.inf)
    limit = 0.0
    for periodic in (True, False):
        low, high = 1e-3, 3.0
        while True:
            ratios = np.exp(np.linspace(math.log(low), math.log(high), 41))
            square = _lag_residuals(even, edge, ratios, periodic) + floor
            place = int(np.argmin(square))
            if high / low > 100.0:
                # chi-square of one parameter at 95 % is 3.84, the scatter being taken from the residuals
                allowed = square[place] * (1.0 + 3.84 / max(even.size - 2, 1))
                possible = float(ratios[np.flatnonzero(square <= allowed)[-1]])
            if high / low < 1.0 + 1e-4:
                break
            low, high = float(ratios[max(place - 1, 0)]), float(ratios[min(place + 1, 40)])
        if square[place] < best[1]:
            best = (float(ratios[place]), float(square[place]))
            limit = possible
    return *best, limit


def _lag_residuals(even: FloatArray, edge: FloatArray, ratio: FloatArray, periodic: bool) -> FloatArray:
    """Residual square of the lag's law for each ratio of RC to the time of a sweep; times in sweeps."""
    r = ratio[:, None]
    ends = np.exp(-edge / r) - np.exp(-(1.0 - edge) / r)
    # mean of exp(-t/RC) + exp(-(1-t)/RC) over each stretch
    mean = r * (ends[:, :-1] - ends[:, 1:]) / np.diff(edge)
    last = np.exp(-1.0 / r)
    size = 1.0 / (1.0 + last) if periodic else 0.75 - 0.25 * last
    shape = 1.0 - size * mean
    factor = shape @ even / np.sum(shape**2, axis=1)
    square: FloatArray = np.sum((even - factor[:, None] * shape) ** 2, axis=1)
    return square


def symmetry_of(cycle: Cycle, low_volt: float, high_volt: float) -> Symmetry:
    """Tilt and bend of a window, from fifths that lie evenly about its middle, and the leak.

    Parameters
    ----------
    cycle : Cycle
    low_volt, high_volt : float
        The window. [V]
    """
    return _symmetry(cycle, low_volt, high_volt, bands(cycle, _fifths(low_volt, high_volt)))


def _fifths(low_volt: float, high_volt: float) -> list[tuple[float, float]]:
    """A fifth of a window below its middle, one about it, and one above."""
    width = high_volt - low_volt
    return [
        (low_volt + share * width, low_volt + (share + MIDDLE_SHARE) * width) for share in (0.1, 0.4, 0.7)
    ]


def _symmetry(cycle: Cycle, low_volt: float, high_volt: float, fifths: Sequence[Band]) -> Symmetry:
    width = high_volt - low_volt
    lower, middle, upper = fifths
    # a current that is no charging current has no symmetry to judge
    size = middle.charging_ampere if middle.charging_ampere > 0.0 else math.nan
    return Symmetry(
        (upper.charging_ampere - lower.charging_ampere) / size,
        (0.5 * (upper.common_ampere + lower.common_ampere) - middle.common_ampere) / size,
        _scatter_of_fifth(cycle, low_volt, high_volt) / size,
        (upper.common_ampere - lower.common_ampere) / (0.6 * width),
    )


def _scatter_of_fifth(cycle: Cycle, low: float, high: float) -> float:
    """Standard uncertainty of the difference of two fifths by the noise of single samples. [A]

    From second differences of the current along a sweep, which a slow change does not enter: their variance is six
    times that of a sample.
    """
    variances, fewest = [], math.inf
    for sign in (1.0, -1.0):
        held = (cycle.direction == sign) & (cycle.to_volt >= low) & (cycle.to_volt <= high)
        i = cycle.to_ampere[held]
        if i.size < 5:
            return 0.0
        variances.append(float(np.mean(np.diff(i, 2)[1:-1] ** 2)) / 6.0)
        fewest = min(fewest, MIDDLE_SHARE * i.size)
    # half the difference of two sweeps has half the variance of a sample, and two fifths are compared
    return math.sqrt(0.5 * sum(variances) / max(fewest, 1.0))


def clean_window(scans: Sequence[ScanFigures]) -> tuple[float, float] | None:
    """The widest window in which every scan of an electrode is clean, or None. [V]

    Windows of the same width are taken by the smaller sum of tilt and bend.
    """
    low = max(one.lowest_volt for one in scans)
    high = min(one.highest_volt for one in scans)
    if not low < high:
        return None
    grid = np.linspace(low, high, _STEPS + 1)
    for width in range(_STEPS - 1, _NARROWEST - 1, -1):
        found: tuple[float, float, float] | None = None
        for first in range(_STEPS - width + 1):
            a, b = float(grid[first]), float(grid[first + width])
            judged = [symmetry_of(one.cycle, a, b) for one in scans]
            if all(one.clean for one in judged):
                size = max(abs(one.tilt) + abs(one.bend) for one in judged)
                if found is None or size < found[0]:
                    found = size, a, b
        if found is not None:
            return found[1:]
    return None


def with_window(
    scan: ScanFigures, low_volt: float, high_volt: float, scan_rate_volt_per_second: float
) -> ScanFigures:
    """The same cycle read in another window; the scatter between cycles is not known there."""
    return _figures(scan.cycle, (), scan_rate_volt_per_second, low_volt, high_volt)
