"""Current that an injection from an unflushed headspace belongs to.

A well-mixed gas volume between electrode and sample loop forgets with the time constant tau, so the gas
drawn at T carries the current before T, weighted with exp(-(T - s)/tau)/tau:

    I_k = integral from start to T of -I(s) exp(-(T - s)/tau) ds / tau.

Nothing is in the headspace at the start, so a constant current is seen as 1 - exp(-(T - start)/tau) of
itself.

Integrated by parts over one stretch [a, b], for a current x(s) = -I(s) that is straight between samples,

    x(b) - x(a) e(a) - sum over segments of (x_i+1 - x_i) D_i,   e(s) = exp(-(b - s)/tau),

where D_i is the mean of e over the segment, e(middle) sinh(h/2 tau)/(h/2 tau) for a step h. This is exact
on irregular steps, and nothing cancels for short steps: a constant current gives a sum of exact zeros. The
stretch before enters through its own value times exp(-(b - a)/tau).

The sum is wanted for many tau, over traces of up to 1e6 samples. Segments much shorter than tau are
therefore gathered in blocks of 0.1 tau once: within a block both e and the sinh are power series in 1/tau
that end at the seventh power with an error below 1e-14, so a block is eight sums over its segments, and
each further tau costs a few hundred blocks instead of the trace.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import ArrayLike, NDArray

from coulombook.cell.charge import interpolate
from coulombook.uncertainty.linearised import Number

FloatArray = NDArray[np.float64]

# exp(-45) = 3e-20: what lies further back than this many time constants is below the rounding of the rest
_FORGOTTEN = 45.0
_BLOCK = 0.1  # length of a block, and of the longest segment gathered in one, over the shortest tau
_POWERS = 8  # of 1/tau kept: (0.05)^8 / 8! = 1e-15
_SINH = (1.0, 1.0 / 24.0, 1.0 / 1920.0, 1.0 / 322560.0)  # sinh(r/2)/(r/2) in powers of r^2
HALF_RANGE = float(np.log(1.5))  # of ln tau, either side of the centre, unless more is asked for
# the series falls by 7 or more a term for the usual range, less for a wider: tau acts through exp(-age/tau) alone
_NODES = (12, 20, 32, 48, 72)
_TOLERANCE = 1.0e-9  # of the last Chebyshev coefficients, relative to the first


def filled_share(elapsed_second: Number, tau_second: Number) -> Number:
    """Share of a constant current that the headspace shows after a time, 1 - exp(-elapsed/tau). [1]"""
    return 1.0 - np.exp(-elapsed_second / tau_second)


@dataclass(frozen=True, slots=True, eq=False)
class _Stretch:
    """The trace between two stops, ready for any tau from ``shortest_second`` to ``longest_second``."""

    span_second: float
    first_ampere: float  # reduction current at the start of the stretch
    last_ampere: float
    shortest_second: float
    block_age_second: FloatArray  # (n_blocks,) from the middle of a block to the end of the stretch
    sums_ampere: FloatArray  # (_POWERS, n_blocks) what multiplies (shortest/tau)^k exp(-age/tau)
    long_rise_ampere: FloatArray  # (n_long,) segments too long for a block
    long_old_second: FloatArray  # (n_long,) age of their start
    long_new_second: FloatArray  # (n_long,) age of their end

    @classmethod
    def of(
        cls,
        time_second: FloatArray,
        reduction_ampere: FloatArray,
        shortest_second: float,
        longest_second: float,
    ) -> _Stretch:
        end = time_second[-1]
        kept = int(np.searchsorted(time_second, end - _FORGOTTEN * longest_second, side="right")) - 1
        times, reduction = time_second[max(kept, 0) :], reduction_ampere[max(kept, 0) :]
        rise, old, new = np.diff(reduction), end - times[:-1], end - times[1:]
        step = np.diff(times)
        length = _BLOCK * shortest_second
        long = step > length
        far = (rise[long], old[long], new[long])
        if long.any():
            rise, old, new, step = rise[~long], old[~long], new[~long], step[~long]
        age = 0.5 * (old + new)
        block = np.floor(age / length)
        starts = np.flatnonzero(np.diff(block, prepend=-1.0)) if block.size else np.empty(0, dtype=np.intp)
        block_age = (block[starts] + 0.5) * length
        sums = np.zeros((_POWERS, starts.size))
        if starts.size:
            forward = ((block + 0.5) * length - age) / shortest_second
            square = np.square(step / shortest_second)
            widest = float(square.max())
            for order, weight in enumerate(_SINH):
                term = rise.copy()
                # (order, power) gives the power 2 order + power of 1/tau
                for power in range(_POWERS - 2 * order):
                    if power:
                        term *= forward
                    share = weight / math.factorial(power)
                    sums[2 * order + power] += share * np.add.reduceat(term, starts)
                if order + 1 < len(_SINH) and widest ** (order + 1) * _SINH[order + 1] < 1e-17:
                    break
                rise = rise * square
        return cls(
            float(end - time_second[0]),
            float(reduction_ampere[0]),
            float(reduction_ampere[-1]),
            shortest_second,
            block_age,
            sums,
            *far,
        )

    def at(self, tau_second: float) -> tuple[float, float]:
        """Value at the end, the headspace being empty at the start, and its derivative in ln tau. [A]"""
        age = self.block_age_second / tau_second
        kept = np.exp(-age)
        power = np.arange(_POWERS)
        scale = (self.shortest_second / tau_second) ** power
        gathered = float(scale @ (self.sums_ampere @ kept))
        gathered_slope = float(
            scale @ (self.sums_ampere @ (kept * age)) - (scale * power) @ (self.sums_ampere @ kept)
        )
        old, new = self.long_old_second / tau_second, self.long_new_second / tau_second
        e_old, e_new = np.exp(-old), np.exp(-new)
        mean = (e_new - e_old) / (old - new)
        mean_slope = (e_new * new - e_old * old) / (old - new) + mean
        whole = self.span_second / tau_second
        value = (
            (self.last_ampere - self.first_ampere)
            - self.first_ampere * float(np.expm1(-whole))
            - gathered
            - float(self.long_rise_ampere @ mean)
        )
        slope = (
            -self.first_ampere * whole * float(np.exp(-whole))
            - gathered_slope
            - float(self.long_rise_ampere @ mean_slope)
        )
        return value, slope


def _stretches(
    time_second: FloatArray,
    current_ampere: FloatArray,
    start_second: float,
    at_second: FloatArray,
    shortest_second: float,
    longest_second: float,
) -> list[_Stretch | None]:
    """The stretches from one stop to the next; None for one without length."""
    stops = np.concatenate(([start_second], at_second))
    ends = -interpolate(time_second, current_ampere, stops)
    after = np.searchsorted(time_second, stops, side="right")
    before = np.searchsorted(time_second, stops, side="left")
    result: list[_Stretch | None] = []
    for k in range(at_second.size):
        if stops[k + 1] == stops[k]:
            result.append(None)
            continue
        inside = slice(after[k], before[k + 1])
        times = np.concatenate((stops[k : k + 1], time_second[inside], stops[k + 1 : k + 2]))
        reduction = np.concatenate((ends[k : k + 1], -current_ampere[inside], ends[k + 1 : k + 2]))
        result.append(_Stretch.of(times, reduction, shortest_second, longest_second))
    return result


def _along(stretches: Sequence[_Stretch | None], tau_second: float) -> tuple[FloatArray, FloatArray]:
    """Value at the end of each stretch with what came before it, and its derivative in ln tau. [A], [A]"""
    values, slopes = np.empty(len(stretches)), np.empty(len(stretches))
    value, slope = 0.0, 0.0
    for k, stretch in enumerate(stretches):
        if stretch is not None:
            fresh, fresh_slope = stretch.at(tau_second)
            whole = stretch.span_second / tau_second
            kept = float(np.exp(-whole))
            slope = (slope + value * whole) * kept + fresh_slope
            value = value * kept + fresh
        values[k], slopes[k] = value, slope
    return values, slopes


def _in_order(start_second: float, at_second: ArrayLike) -> tuple[FloatArray, NDArray[np.intp]]:
    """The times ascending, and the place of each of the given times among them."""
    at = np.atleast_1d(np.asarray(at_second, dtype=float))
    # "not at or after" instead of "before", so that NaN is caught as well
    early = np.flatnonzero(~(at >= start_second))
    if early.size:
        raise ValueError(f"the time {at[early[0]]:g} s is before the start at {start_second:g} s")
    order = np.argsort(at, kind="stable")
    place = np.empty_like(order)
    place[order] = np.arange(order.size)
    return at[order], place


def mixed_current_ampere(
    time_second: FloatArray,
    current_ampere: FloatArray,
    start_second: float,
    at_second: ArrayLike,
    tau_second: float,
) -> FloatArray:
    """Current that the gas in a well-mixed headspace belongs to, positive for reduction. [A]

    integral from start to t of -I(s) exp(-(t - s)/tau) ds / tau, exact for a current that is a straight
    line between samples, on any steps.

    Parameters
    ----------
    time_second : (n_samples,) float array
        Increasing times of the trace. [s]
    current_ampere : (n_samples,) float array
        Current, cathodic negative. [A]
    start_second : float
        Start of the run, when the headspace holds no product yet. [s]
    at_second : (n_times,) array_like
        Times of the injections less the dead time, in any order, none before the start or after the trace. [s]
    tau_second : float
        Mixing time, headspace volume over actual outlet volume flow. [s]

    Returns
    -------
    (n_times,) float array

    Raises
    ------
    ValueError
        A time lies before the start or outside the trace, or tau is not above zero.

    Examples
    --------
    One time constant after the start of a constant current, 1 - 1/e of it:

    >>> t, current = np.array([0.0, 10.0, 400.0]), np.array([-1.0, -1.0, -1.0])
    >>> mixed_current_ampere(t, current, 0.0, [100.0], 100.0).round(6)
    array([0.632121])
    """
    return mixed_current_with_slope(time_second, current_ampere, start_second, at_second, tau_second)[0]


def mixed_current_with_slope(
    time_second: FloatArray,
    current_ampere: FloatArray,
    start_second: float,
    at_second: ArrayLike,
    tau_second: float,
) -> tuple[FloatArray, FloatArray]:
    """`mixed_current_ampere`, and its derivative with respect to ln tau. [A], [A]"""
    # "not above" instead of "at or below", so that NaN is caught as well
    if not tau_second > 0.0:
        raise ValueError(f"the mixing time is {tau_second:g} s; it must be above zero")
    at, place = _in_order(start_second, at_second)
    stretches = _stretches(time_second, current_ampere, start_second, at, tau_second, tau_second)
    value, slope = _along(stretches, tau_second)
    return value[place], slope[place]


class MixedCurrent:
    """The current of each injection as a function of tau, near a centre.

    A Chebyshev series in ln tau over a factor (1.5, unless more is asked for) either side of the centre, so that draws
    of tau and derivatives cost a few operations and not a pass over the trace. Error below 1e-8 of the value (tested).

    Parameters
    ----------
    centre_ln_tau : (n_injections,) float array
        Centre of each series. [ln s]
    coefficients_ampere : (n_terms, n_injections) float array
        Chebyshev coefficients in (ln tau - centre)/half_range. [A]
    half_range : (n_injections,) float array
        How far each series reaches, in ln tau, either side of its centre. [1]
    """

    __slots__ = ("centre_ln_tau", "coefficients_ampere", "half_range", "slope_coefficients_ampere")

    def __init__(
        self, centre_ln_tau: FloatArray, coefficients_ampere: FloatArray, half_range: FloatArray
    ) -> None:
        self.centre_ln_tau = centre_ln_tau
        self.coefficients_ampere = coefficients_ampere
        self.half_range = half_range
        self.slope_coefficients_ampere = (
            np.asarray(chebyshev.chebder(coefficients_ampere, axis=0)) / half_range
        )

    @classmethod
    def of_trace(
        cls,
        time_second: FloatArray,
        current_ampere: FloatArray,
        start_second: float,
        at_second: ArrayLike,
        centre_tau_second: float,
        half_range: float = HALF_RANGE,
    ) -> MixedCurrent:
        """The series for the injections of one run; parameters and errors as in `mixed_current_ampere`."""
        if not centre_tau_second > 0.0:
            raise ValueError(f"the mixing time is {centre_tau_second:g} s; it must be above zero")
        at, place = _in_order(start_second, at_second)
        factor = float(np.exp(half_range))
        shortest, longest = centre_tau_second / factor, centre_tau_second * factor
        stretches = _stretches(time_second, current_ampere, start_second, at, shortest, longest)
        for nodes in _NODES:
            angle = (np.arange(nodes) + 0.5) * (np.pi / nodes)
            taus = centre_tau_second * np.exp(half_range * np.cos(angle))
            values = np.array([_along(stretches, float(tau))[0] for tau in taus])
            cosines = np.cos(np.outer(np.arange(nodes), angle))
            coefficients = 2.0 / nodes * (cosines @ values)
            coefficients[0] *= 0.5
            size = np.abs(coefficients).max(axis=0)
            if (np.abs(coefficients[-2:]) <= _TOLERANCE * size).all():
                break
        return cls(
            np.full(at.size, np.log(centre_tau_second)), coefficients[:, place], np.full(at.size, half_range)
        )

    @classmethod
    def join(cls, parts: Sequence[MixedCurrent]) -> MixedCurrent:
        """One object for the injections of several runs, in order."""
        if not parts:
            return cls(np.empty(0), np.empty((1, 0)), np.empty(0))
        terms = max(part.coefficients_ampere.shape[0] for part in parts)
        padded = [
            np.pad(part.coefficients_ampere, ((0, terms - part.coefficients_ampere.shape[0]), (0, 0)))
            for part in parts
        ]
        return cls(
            np.concatenate([part.centre_ln_tau for part in parts]),
            np.concatenate(padded, axis=1),
            np.concatenate([part.half_range for part in parts]),
        )

    def of(self, injections: NDArray[np.intp]) -> MixedCurrent:
        """The series of some of the injections."""
        return MixedCurrent(
            self.centre_ln_tau[injections],
            self.coefficients_ampere[:, injections],
            self.half_range[injections],
        )

    def __len__(self) -> int:
        return len(self.centre_ln_tau)

    def value_and_slope(self, tau_second: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Current of each injection, and its derivative with respect to tau. [A], [A/s]

        ``tau_second`` has the shape (..., n_injections). Meaningless where `covers` says no; the caller asks.
        """
        x = (np.log(tau_second) - self.centre_ln_tau) / self.half_range
        value = chebyshev.chebval(x, self.coefficients_ampere, tensor=False)
        slope = chebyshev.chebval(x, self.slope_coefficients_ampere, tensor=False) / tau_second
        return np.asarray(value, dtype=float), np.asarray(slope, dtype=float)

    def covers(self, tau_second: FloatArray) -> NDArray[np.bool_]:
        """Whether each tau, of shape (..., n_injections), lies inside the range of its series."""
        with np.errstate(invalid="ignore", divide="ignore"):
            distance = np.abs(np.log(tau_second) - self.centre_ln_tau)
        # a hair beyond the edge, so that the edge itself counts whatever the rounding of the logarithm
        result: NDArray[np.bool_] = distance <= self.half_range * (1.0 + 1e-12)
        return result
