"""Double-layer capacitance from voltammograms at several scan rates.

In a window without reaction the current is the charging current of the double layer, i = C v, on top of
whatever both sweeps carry alike. Half the difference of the anodic and the cathodic sweep in the middle of
the window is C v (McCrory, Jung, Peters & Jaramillo, J. Am. Chem. Soc. 135 (2013) 16977).
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

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
LINE, POWER_LAW = "line", "power law"
# rates from which on two laws of two parameters each can be told apart
_FORMS_FROM = 4
# difference of an information criterion that counts as strong evidence (Kass & Raftery, J. Am. Stat. Assoc. 90
# (1995) 773, on the Bayesian one; with as many parameters in both laws Akaike's differs by as much)
_STRONG = 6.0
_BOTH_WAYS = "a potential that rises and falls"


class ScanError(ValueError):
    """A voltammogram that gives no charging current; ``expected`` says what would do."""

    def __init__(self, message: str, expected: str) -> None:
        self.expected = expected
        super().__init__(message)


@dataclass(frozen=True, slots=True)
class CapacitanceFit:
    """Charging current against scan rate: the line i = C v + i_0, and the power law i = k v^exponent beside it."""

    capacitance_farad: float  # slope of the line
    u_capacitance_farad: float  # NaN when no degree of freedom is left
    intercept_ampere: float
    r_squared: float
    exponent: float  # slope of ln i against ln v, 1 for charging; NaN unless every i is above zero
    residual_sd_ampere: float  # of the line; NaN when no degree of freedom is left
    u_exponent: float  # NaN when no degree of freedom is left
    form: str  # what the evidence speaks for: "line" or "power law"
    evidence: float  # information criterion of the line less that of the power law; NaN where it cannot tell
    power_capacitance_farad: (
        float  # i / v of the power law at the geometric mean of the rates; NaN without one
    )


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


@dataclass(frozen=True, slots=True, eq=False)
class Cycle:
    """One cycle of a voltammogram, as the steps from sample to sample, in the order recorded."""

    number: float
    from_volt: FloatArray  # (n_steps,)
    to_volt: FloatArray  # (n_steps,)
    from_ampere: FloatArray  # (n_steps,)
    to_ampere: FloatArray  # (n_steps,)
    direction: FloatArray  # (n_steps,) +1 in the rising sweep, -1 in the falling one
    duration_second: FloatArray | None  # (n_steps,) None where the record has no time that increases

    @property
    def lowest_volt(self) -> float:
        """The lower turning point."""
        return float(min(self.from_volt.min(), self.to_volt.min()))

    @property
    def highest_volt(self) -> float:
        """The upper turning point."""
        return float(max(self.from_volt.max(), self.to_volt.max()))


def cycles_of(
    potential_volt: FloatArray,
    current_ampere: FloatArray,
    cycle: FloatArray | None = None,
    time_second: FloatArray | None = None,
    chosen_cycle: float | None = None,
) -> tuple[Cycle, tuple[Cycle, ...]]:
    """The cycle to take, and every whole cycle of the record in its order.

    Parameters as in `charging_current_ampere`; ``time_second`` (n_samples,) is kept where it increases. [s]

    Raises
    ------
    ScanError
        Too few samples, a potential that does not move, or no such cycle.
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
    duration = None if time_second is None else np.diff(time_second)
    if duration is not None and not (duration > 0.0).all():
        duration = None

    def steps_of(number: float) -> Cycle:
        held = np.flatnonzero(owner == number)
        return Cycle(
            float(number),
            e[held],
            e[held + 1],
            i[held],
            i[held + 1],
            directions[held],
            None if duration is None else duration[held],
        )

    numbers, member = np.unique(owner, return_inverse=True)
    member = member.reshape(-1)
    lengths = np.bincount(member, weights=directions * np.diff(e))
    first_step = [int(np.flatnonzero(member == k)[0]) for k in range(len(numbers))]
    whole = sorted(np.flatnonzero(lengths >= _WHOLE * lengths.max()).tolist(), key=first_step.__getitem__)
    held = tuple(steps_of(numbers[k]) for k in whole)
    if chosen_cycle is None:
        return held[-1], held
    if not (owner == chosen_cycle).any():
        raise ScanError(
            f"there is no cycle {chosen_cycle:g}; the last one is {owner.max():g}",
            f"a cycle from {owner.min():g} to {owner.max():g}",
        )
    return steps_of(chosen_cycle), held


def window_of(cycle: Cycle, low_volt: float | None, high_volt: float | None) -> tuple[float, float]:
    """The window as given, its turning points where an end is not. [V]

    Raises `ScanError` when both sweeps do not cross it.
    """
    lowest, highest = cycle.lowest_volt, cycle.highest_volt
    low = lowest if low_volt is None else low_volt
    high = highest if high_volt is None else high_volt
    within = f"a window within {lowest:g} V to {highest:g} V that the potential crosses both ways"
    if not low < high:
        raise ScanError(
            f"the window runs from {low:g} V to {high:g} V; it must start below where it ends", within
        )
    middle, half = 0.5 * (low + high), 0.5 * MIDDLE_SHARE * (high - low)
    slack = 0.5 * (1.0 - _CROSSED) * (high - low)
    for sign, name in ((1.0, "rising"), (-1.0, "falling")):
        _, covered = _sweep_mean(cycle, sign, middle - half, middle + half)
        if lowest > low + slack or highest < high - slack or not covered >= _CROSSED:
            raise ScanError(
                f"the {name} sweep of cycle {cycle.number:g} does not cross the window {low:g} V to {high:g} V; "
                f"the cycle runs from {lowest:g} V to {highest:g} V",
                within,
            )
    return low, high


def _sweep_mean(cycle: Cycle, sign: float, low: float, high: float) -> tuple[float, float]:
    """Mean current of one sweep over [low, high], and the share of that stretch it covers."""
    area, width = _sweep_integrals(cycle, sign, np.array([low]), np.array([high]))
    return (float(area[0] / width[0]) if width[0] else math.nan), abs(float(width[0])) / (high - low)


def _sweep_means(cycle: Cycle, sign: float, low: FloatArray, high: FloatArray) -> FloatArray:
    """Mean current of one sweep in each stretch, (n_stretches,)."""
    # as many stretches at once as fit into some ten megabytes
    at_once = max(1, 1_000_000 // max(cycle.direction.size, 1))
    parts = [
        _mean_current(
            *_sweep_integrals(cycle, sign, low[first : first + at_once], high[first : first + at_once])
        )
        for first in range(0, low.size, at_once)
    ]
    return np.concatenate(parts)


def _mean_current(area: FloatArray, width: FloatArray) -> FloatArray:
    """NaN where a sweep does not come by."""
    return np.divide(area, width, out=np.full_like(area, math.nan), where=width != 0.0)


def _sweep_integrals(
    cycle: Cycle, sign: float, low: FloatArray, high: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Integral of the current over potential in each stretch, and the path within it; (n_stretches,) each."""
    steps = cycle.direction == sign
    e0, e1 = cycle.from_volt[steps], cycle.to_volt[steps]
    i0, i1 = cycle.from_ampere[steps], cycle.to_ampere[steps]
    slope = np.divide(i1 - i0, e1 - e0, out=np.zeros_like(e0), where=e1 != e0)
    a, b = (np.clip(e, low[:, None], high[:, None]) for e in (e0, e1))
    # signed, so that a step back within a noisy sweep takes away what it added
    area: FloatArray = np.sum((b - a) * (i0 + slope * (0.5 * (a + b) - e0)), axis=1)
    width: FloatArray = np.sum(b - a, axis=1)
    return area, width


@dataclass(frozen=True, slots=True)
class Band:
    """What the two sweeps of a cycle have in a stretch of potential."""

    charging_ampere: float  # half the difference of the rising and the falling sweep
    common_ampere: float  # half their sum: leakage, and every current that both carry


def bands(cycle: Cycle, stretches: Sequence[tuple[float, float]]) -> list[Band]:
    """Both sweeps averaged over stretches of potential by trapezoids, with straight lines to their ends."""
    low, high = np.array(stretches, dtype=float).T
    rising, falling = (_sweep_means(cycle, sign, low, high) for sign in (1.0, -1.0))
    return [
        Band(0.5 * (up - down), 0.5 * (up + down))
        for up, down in zip(rising.tolist(), falling.tolist(), strict=True)
    ]


def band(cycle: Cycle, low_volt: float, high_volt: float) -> Band:
    """The same of a single stretch."""
    return bands(cycle, [(low_volt, high_volt)])[0]


def charging_profile_ampere(cycle: Cycle, edges_volt: FloatArray) -> FloatArray:
    """Half the difference of the sweeps in each stretch between neighbouring edges, (n_edges - 1,). [A]"""
    rising, falling = (_sweep_means(cycle, sign, edges_volt[:-1], edges_volt[1:]) for sign in (1.0, -1.0))
    result: FloatArray = 0.5 * (rising - falling)
    return result


def middle_of(low_volt: float, high_volt: float, share: float = MIDDLE_SHARE) -> tuple[float, float]:
    """The central share of a window. [V]"""
    middle, half = 0.5 * (low_volt + high_volt), 0.5 * share * (high_volt - low_volt)
    return middle - half, middle + half


def capacitance_by_charge_farad(cycle: Cycle, low_volt: float, high_volt: float) -> float:
    """Capacitance from the charge that the sweeps carry through a window, C = (Q_rise - Q_fall) / (2 width). [F]

    The charge is integrated over the time of the record, so that no scan rate enters. NaN without a time.
    """
    if cycle.duration_second is None:
        return math.nan
    e0, e1 = cycle.from_volt, cycle.to_volt
    a, b = np.clip(e0, low_volt, high_volt), np.clip(e1, low_volt, high_volt)
    moved = e1 != e0
    share = np.divide(b - a, e1 - e0, out=((e0 > low_volt) & (e0 < high_volt)).astype(float), where=moved)
    slope = np.divide(cycle.to_ampere - cycle.from_ampere, e1 - e0, out=np.zeros_like(e0), where=moved)
    mean = np.where(
        moved, cycle.from_ampere + slope * (0.5 * (a + b) - e0), 0.5 * (cycle.from_ampere + cycle.to_ampere)
    )
    charge = float(np.sum(cycle.direction * share * cycle.duration_second * mean))
    return 0.5 * charge / (high_volt - low_volt)


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
    chosen, _ = cycles_of(potential_volt, current_ampere, cycle, None, chosen_cycle)
    low, high = window_of(chosen, window_low_volt, window_high_volt)
    return band(chosen, *middle_of(low, high)).charging_ampere


def fit_capacitance(
    scan_rate_volt_per_second: FloatArray, charging_current_ampere: FloatArray
) -> CapacitanceFit:
    """Capacitance as the slope of charging current against scan rate, i = C v + i_0, by least squares.

    Beside the line stands the power law i = k v^exponent; an ideal capacitor has the exponent 1, a porous or
    rough electrode that is charged unevenly a smaller one. Which of the two the currents speak for is told by
    an information criterion of their residuals, from four scan rates on; the capacitance stays the slope.

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
    line = CapacitanceFit(
        capacitance_farad=float(fit.coefficients[1]),
        u_capacitance_farad=math.sqrt(fit.covariance[1, 1]) if known else math.nan,
        intercept_ampere=float(fit.coefficients[0]),
        r_squared=fit.r_squared,
        exponent=math.nan,
        residual_sd_ampere=fit.residual_sd if known else math.nan,
        u_exponent=math.nan,
        form=LINE,
        evidence=math.nan,
        power_capacitance_farad=math.nan,
    )
    if not ((rate > 0.0).all() and (current > 0.0).all()):
        return line
    logs = fit_polynomial(np.log(rate), np.log(current), (0, 1))
    exponent = float(logs.coefficients[1])
    u_exponent = math.sqrt(logs.covariance[1, 1]) if known else math.nan
    power = _power_law(rate, current, exponent)
    evidence = math.nan
    if len(np.unique(rate)) >= _FORMS_FROM:
        # what double precision leaves of currents that fit exactly is no evidence
        floor = rate.size * (1e-12 * float(np.abs(current).max())) ** 2
        square = fit.degrees_of_freedom * fit.residual_sd**2 + floor
        evidence = rate.size * math.log(square / (power.residual_square + floor))
    bent = evidence > _STRONG and abs(exponent - 1.0) > 2.0 * u_exponent
    return replace(
        line,
        exponent=exponent,
        u_exponent=u_exponent,
        form=POWER_LAW if bent else LINE,
        evidence=evidence,
        power_capacitance_farad=power.secant,
    )


@dataclass(frozen=True, slots=True)
class _PowerLaw:
    """The least-squares power law in the currents themselves."""

    residual_square: float  # [A^2]
    secant: float  # i / v at the geometric mean of the rates [F]


def _power_law(rate: FloatArray, current: FloatArray, start: float) -> _PowerLaw:
    """Least squares in i, so that line and power law are judged by the same residuals; only the exponent is sought."""
    scaled = rate / math.exp(float(np.log(rate).mean()))
    centre, reach = start, 0.5
    while True:
        exponents = centre + reach * np.linspace(-1.0, 1.0, 21)
        shape = scaled ** exponents[:, None]
        factor = shape @ current / np.sum(shape**2, axis=1)
        square = np.sum((current - factor[:, None] * shape) ** 2, axis=1)
        best = int(np.argmin(square))
        centre, reach = float(exponents[best]), 0.2 * reach
        if reach < 1e-9:
            return _PowerLaw(float(square[best]), float(factor[best] * scaled[0] / rate[0]))
