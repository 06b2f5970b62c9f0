"""Series at common potentials: interpolated inside what was measured, never beyond it.

Catalysts held at one set potential come to lie at different potentials once the ohmic drop is taken off, and a
comparison at one level then compares potentials as well. So each series is interpolated to the same potentials by
monotone cubics, which never overshoot the points (Fritsch & Butland, SIAM J. Sci. Stat. Comput. 5 (1984) 300): in the
logarithm where all points of a series are above zero and the quantity spans decades, else as it is.

Every point carries its uncertainty in the quantity and in the potential through the interpolation. What lies between
points nobody measured: the way from the cubic to the straight line is the half width of a rectangular distribution
(common practice, no source).
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from coulombook.compare.replicates import Series, widened
from coulombook.uncertainty.linearised import (
    FloatArray,
    IntArray,
    Linearised,
    linear_map,
    nominal,
    sparse_map,
)

STEPS_VOLT = (0.2, 0.1, 0.05, 0.02, 0.01)
FEWEST, MOST = 3, 5
_SHIFT = 1e-4  # of a node's distance to the next, for derivatives; the central difference leaves an error of its square


@dataclass(frozen=True, slots=True, eq=False)
class Interpolated:
    """Series of several owners at one potential, those alone whose range holds it."""

    owners: tuple[str, ...]
    mean: Linearised  # (n_owners,) with the errors of the series, and last one for the interpolation of each
    runs: IntArray  # (n_owners,) runs of the points beside the potential
    electrodes: IntArray


def ranges(series: Series) -> dict[str, tuple[float, float]]:
    """Lowest and highest potential of each owner with two points or more at different potentials. [V]"""
    potential = nominal(series.potential_volt)
    found = {}
    for owner in dict.fromkeys(point.catalyst for point in series.points):
        places = series.of(owner)
        low, high = float(potential[places[0]]), float(potential[places[-1]])
        if low < high:
            found[owner] = (low, high)
    return found


def common_potentials(spans: Sequence[tuple[float, float]]) -> tuple[float, ...]:
    """Round potentials that as many ranges as possible hold, three to five where there is room. [V]

    Empty where no two ranges overlap.

    >>> common_potentials([(-1.113, -0.735), (-1.142, -0.743), (-1.077, -0.740)])
    (-1.0, -0.9, -0.8)
    >>> common_potentials([(-1.1, -0.9), (-0.8, -0.6)])
    ()
    """
    widest = _most_shared(spans)
    if widest is None:
        return ()
    low, high = widest
    for step in STEPS_VOLT:
        first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
        if last - first + 1 >= FEWEST or (step == STEPS_VOLT[-1] and last >= first):
            places = np.linspace(first, last, min(last - first + 1, MOST)).round().astype(int)
            return tuple(round(float(place * step), 6) for place in places)
    return (0.5 * (low + high),)


def _most_shared(spans: Sequence[tuple[float, float]]) -> tuple[float, float] | None:
    """The widest stretch that the largest number of ranges, two or more, has in common."""
    ends = sorted({end for span in spans for end in span})
    stretches: list[tuple[int, float, float, float]] = []
    for place, low in enumerate(ends):
        for high in ends[place + 1 :]:
            count = sum(span[0] <= low and high <= span[1] for span in spans)
            stretches.append((count, high - low, low, high))
    best = max(stretches, default=None)
    return None if best is None or best[0] < 2 else best[2:]


def interpolate(series: Series, potential_volt: float, *, logarithm: bool) -> Interpolated:
    """Every series whose range holds a potential, there.

    Parameters
    ----------
    series : Series
    potential_volt : float
        Against the reversible hydrogen electrode, or whatever scale the series is on. [V]
    logarithm : bool
        Interpolate the logarithm of a series all of whose points are above zero.
    """
    potential = nominal(series.potential_volt)
    found = []
    for owner, (low, high) in ranges(series).items():
        if low <= potential_volt <= high:
            _, first = np.unique(potential[series.of(owner)], return_index=True)
            found.append((owner, _at(series, series.of(owner)[first], potential_volt, logarithm)))
    return Interpolated(
        tuple(owner for owner, _ in found),
        _together(series, [one for _, one in found]),
        np.array([one.runs for _, one in found], dtype=np.intp),
        np.array([one.electrodes for _, one in found], dtype=np.intp),
    )


@dataclass(frozen=True, slots=True, eq=False)
class _Reading:
    """One series at one potential: its value, and how it moves with the points it was read from."""

    value: float
    by_mean: FloatArray  # (n_points,)
    by_potential: FloatArray
    u_between: float  # of the way between points
    places: IntArray  # (n_points,) of the points in the series
    runs: int
    electrodes: int


def _at(series: Series, places: IntArray, potential_volt: float, logarithm: bool) -> _Reading:
    e, y = nominal(series.potential_volt)[places], nominal(series.mean)[places]
    in_logarithm = logarithm and bool((y > 0).all())
    ordinate = np.log(y) if in_logarithm else y
    value = _cubic(e, ordinate, potential_volt)
    straight = float(np.interp(potential_volt, e, ordinate))
    by_mean = _derivatives(lambda moved: _cubic(e, moved, potential_volt), ordinate, _SHIFT * _span(ordinate))
    by_potential = _derivatives(
        lambda moved: _cubic(moved, ordinate, potential_volt), e, _SHIFT * float(np.diff(e).min())
    )
    if in_logarithm:
        value, straight = math.exp(value), math.exp(straight)
        by_mean, by_potential = value * by_mean / y, value * by_potential
    near = np.flatnonzero(by_mean)
    # the fewest replicates of the points that have a say
    beside = near[np.abs(by_mean[near]) > 0.25 * np.abs(by_mean).max()]
    return _Reading(
        value,
        by_mean,
        by_potential,
        abs(value - straight) / math.sqrt(3.0),
        places,
        min(len(series.points[places[one]].rows) for one in beside),
        min(int(series.electrodes[places[one]]) for one in beside),
    )


def _cubic(e: FloatArray, y: FloatArray, potential_volt: float) -> float:
    from scipy.interpolate import PchipInterpolator

    # a node that is moved for a derivative may leave the potential outside by a hair
    return float(PchipInterpolator(e, y)(potential_volt))


def _span(ordinate: FloatArray) -> float:
    """A size by which to move ordinates: their spread, or where they are all alike their own size."""
    return float(np.ptp(ordinate)) or float(np.abs(ordinate).max()) or 1.0


def _derivatives(function: Callable[[FloatArray], float], at: FloatArray, step: float) -> FloatArray:
    shifts = step * np.eye(len(at))
    return np.array([(function(at + one) - function(at - one)) / (2.0 * step) for one in shifts])


def _together(series: Series, found: Sequence[_Reading]) -> Linearised:
    """The readings as numbers, one error more for the interpolation of each."""
    count = len(found)
    nothing = np.zeros(0)
    rows = np.repeat(np.arange(count), [len(one.places) for one in found]).astype(np.intp)
    places = np.concatenate([nothing, *(one.places for one in found)])
    by_mean = np.concatenate([nothing, *(one.by_mean for one in found)])
    by_potential = np.concatenate([nothing, *(one.by_potential for one in found)])
    shape = (count, len(series.points))
    whole = linear_map(sparse_map(rows, places, by_mean, shape), series.mean) + linear_map(
        sparse_map(rows, places, by_potential, shape), series.potential_volt
    )
    assert isinstance(whole, Linearised)
    between = sparse_map(range(count), range(count), [one.u_between for one in found], (count, count))
    return widened(Linearised(np.array([one.value for one in found]), whole.jacobian), between)
