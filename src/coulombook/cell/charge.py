"""Charge and mean current over windows of one trace.

Between two samples a reading is taken as a straight line, so the trapezoidal rule on the trace's own time
steps is exact for it, and a window may end anywhere between two samples.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]


def window(
    time_second: FloatArray, start_second: float | None, stop_second: float | None
) -> tuple[float, float]:
    """Start and stop of a window of a trace. [s]

    Parameters
    ----------
    time_second : (n_samples,) float array
        Times of the trace, increasing. [s]
    start_second, stop_second : float or None
        As entered; None means the first and the last sample. [s]

    Raises
    ------
    ValueError
        The trace has fewer than two samples, its times do not increase or are not numbers, or the window is
        empty or reaches beyond the trace.
    """
    if time_second.size < 2:
        raise ValueError(f"the trace has {time_second.size} sample(s); at least two are needed")
    # "not above" instead of "at or below", so that NaN is caught as well
    wrong = np.flatnonzero(~(np.diff(time_second) > 0.0))
    if wrong.size:
        row = int(wrong[0]) + 1
        raise ValueError(
            f"the time of sample {row + 1} ({time_second[row]:g} s) is not later than the one before it "
            f"({time_second[row - 1]:g} s)"
        )
    first, last = float(time_second[0]), float(time_second[-1])
    start = first if start_second is None else start_second
    stop = last if stop_second is None else stop_second
    if not start < stop:
        raise ValueError(
            f"the window starts at {start:g} s and stops at {stop:g} s; it must start before it stops"
        )
    if start < first or stop > last:
        raise ValueError(
            f"the window {start:g} s to {stop:g} s reaches beyond the trace, which runs from {first:g} s "
            f"to {last:g} s"
        )
    return start, stop


def _segment(time_second: FloatArray, at_second: FloatArray) -> NDArray[np.intp]:
    """Index k of the segment [t_k, t_k+1] that holds each time; ValueError outside the trace."""
    # "not inside" instead of "outside", so that NaN is caught as well
    outside = ~((at_second >= time_second[0]) & (at_second <= time_second[-1]))
    if outside.any():
        raise ValueError(
            f"{np.atleast_1d(at_second)[np.atleast_1d(outside)][0]:g} s lies outside the trace, which runs "
            f"from {time_second[0]:g} s to {time_second[-1]:g} s"
        )
    return np.clip(np.searchsorted(time_second, at_second, side="right") - 1, 0, time_second.size - 2)


def interpolate(time_second: FloatArray, y: FloatArray, at_second: ArrayLike) -> FloatArray:
    """Reading at any times within the trace, by straight lines between its samples; y's own unit.

    Raises ValueError for a time outside the trace: nothing is extrapolated.
    """
    at = np.asarray(at_second, dtype=float)
    k = _segment(time_second, at)
    share = (at - time_second[k]) / (time_second[k + 1] - time_second[k])
    # this order gives the samples themselves back exactly at both ends of a segment
    result: FloatArray = (1.0 - share) * y[k] + share * y[k + 1]
    return result


class CumulativeTrace:
    """Running integral of one trace, for many windows of it at once.

    Costs one pass over the samples; each window afterwards costs a search and a few operations, whatever
    its length.

    Parameters
    ----------
    time_second : (n_samples,) float array
        Increasing times. [s]
    y : (n_samples,) float array
        Readings, for instance the current.
    """

    __slots__ = ("_running", "time_second", "y")

    def __init__(self, time_second: FloatArray, y: FloatArray) -> None:
        self.time_second = time_second
        self.y = y
        self._running = np.empty_like(y, dtype=float)
        self._running[0] = 0.0
        # in place: a trace may have 1e6 samples, and 200 of them come one after the other
        step = self._running[1:]
        np.add(y[1:], y[:-1], out=step)
        step *= np.diff(time_second)
        step *= 0.5
        np.cumsum(step, out=step)

    def until(self, at_second: ArrayLike) -> FloatArray:
        """Integral from the first sample to each time; y's unit times s. ValueError outside the trace."""
        at = np.asarray(at_second, dtype=float)
        t, y = self.time_second, self.y
        k = _segment(t, at)
        ahead = at - t[k]
        slope = (y[k + 1] - y[k]) / (t[k + 1] - t[k])
        result: FloatArray = self._running[k] + ahead * (y[k] + 0.5 * slope * ahead)
        return result

    def integral(self, start_second: ArrayLike, stop_second: ArrayLike) -> FloatArray:
        """Integral over each window; y's unit times s."""
        result: FloatArray = self.until(stop_second) - self.until(start_second)
        return result

    def mean(self, start_second: ArrayLike, stop_second: ArrayLike) -> FloatArray:
        """Time-weighted mean over each window; y's own unit.

        Raises ValueError for a window that does not start before it stops.
        """
        start, stop = np.asarray(start_second, dtype=float), np.asarray(stop_second, dtype=float)
        if not (stop > start).all():
            raise ValueError("a window must start before it stops")
        result: FloatArray = self.integral(start, stop) / (stop - start)
        return result


def _trapezoid(times: FloatArray, y: FloatArray) -> float:
    """Trapezoidal rule as one dot product (np.trapezoid needs numpy 2)."""
    return 0.5 * float(np.dot(np.diff(times), y[1:] + y[:-1]))


def _window_samples(
    time_second: FloatArray, y: FloatArray, start_second: float, stop_second: float
) -> tuple[FloatArray, FloatArray]:
    """Times and readings inside a window, its interpolated ends included."""
    ends = interpolate(time_second, y, np.array([start_second, stop_second]))
    first = int(np.searchsorted(time_second, start_second, side="right"))
    last = int(np.searchsorted(time_second, stop_second, side="left"))
    times = np.concatenate(([start_second], time_second[first:last], [stop_second]))
    return times, np.concatenate((ends[:1], y[first:last], ends[1:]))


def charge_coulomb(
    time_second: FloatArray,
    current_ampere: FloatArray,
    start_second: float | None = None,
    stop_second: float | None = None,
) -> float:
    """Charge passed in a window, positive for reduction. [C]

    Q = -integral of I dt over [start, stop]: trapezoids on the trace's own steps, straight lines to the
    window's ends.

    Parameters
    ----------
    time_second : (n_samples,) float array
        Increasing times. [s]
    current_ampere : (n_samples,) float array
        Current, cathodic negative. [A]
    start_second, stop_second : float or None
        The window; the whole trace by default. [s]

    Raises
    ------
    ValueError
        See `window`.

    Examples
    --------
    >>> charge_coulomb(np.array([0.0, 1800.0, 3600.0]), np.array([-0.01, -0.01, -0.01]))
    36.0
    """
    start, stop = window(time_second, start_second, stop_second)
    times, current = _window_samples(time_second, current_ampere, start, stop)
    return -_trapezoid(times, current)


def time_mean(
    time_second: FloatArray,
    y: FloatArray,
    start_second: float | None = None,
    stop_second: float | None = None,
) -> float:
    """Time-weighted mean of a reading over a window (the whole trace by default); y's own unit.

    Raises ValueError as `window` does.
    """
    start, stop = window(time_second, start_second, stop_second)
    times, readings = _window_samples(time_second, y, start, stop)
    return _trapezoid(times, readings) / (stop - start)


def _hat_integral(time_second: FloatArray, i: NDArray[np.intp], at_second: FloatArray) -> FloatArray:
    """Integral up to a time of the hat function of sample i: 1 at the sample, 0 at its neighbours. [s]"""
    last = time_second.size - 1
    here = time_second[i]
    before, after = time_second[np.maximum(i - 1, 0)], time_second[np.minimum(i + 1, last)]
    up = np.clip(at_second, before, here) - before
    down = after - np.clip(at_second, here, after)
    # the first and the last sample have half a hat; the other half has no width and must not divide 0 by 0
    rising = np.divide(up * up, here - before, out=np.zeros_like(up), where=i > 0)
    falling = (after - here) - np.divide(down * down, after - here, out=np.zeros_like(down), where=i < last)
    result: FloatArray = 0.5 * (rising + falling)
    return result


def sample_weight(time_second: FloatArray, start_second: ArrayLike, stop_second: ArrayLike) -> FloatArray:
    """Factor that turns independent noise of single samples into noise of the mean over each window. [1]

    The mean is a sum over samples of w_i y_i, w_i being the integral of the sample's hat function over the
    window, divided by the window's length; noise of standard deviation s in every sample gives the mean s
    sqrt(sum of w_i^2). For m samples at even steps that fill the window this is about 1/sqrt(m).

    Parameters
    ----------
    time_second : (n_samples,) float array
        Increasing times. [s]
    start_second, stop_second : array_like
        Windows within the trace, each starting before it stops. [s]
    """
    t = time_second
    start, stop = (
        np.atleast_1d(np.asarray(start_second, float)),
        np.atleast_1d(np.asarray(stop_second, float)),
    )
    if not (stop > start).all():
        raise ValueError("a window must start before it stops")
    j, k = _segment(t, start), _segment(t, stop)
    # samples j + 2 .. k - 1 have their whole hat inside the window; at most four others reach into it
    whole = np.zeros_like(t)
    whole[1:-1] = 0.5 * (t[2:] - t[:-2])
    running = np.concatenate(([0.0], np.cumsum(whole * whole)))
    inside = np.where(k > j + 2, running[k] - running[j + 2], 0.0)
    edges = np.stack((j, j + 1, k, k + 1))
    counts = np.stack((k >= j, k >= j, k > j + 1, k > j))  # a sample that is two of the four counts once
    weight = _hat_integral(t, edges, stop) - _hat_integral(t, edges, start)
    total = inside + np.where(counts, weight * weight, 0.0).sum(axis=0)
    result: FloatArray = np.sqrt(total) / (stop - start)
    return result.reshape(np.broadcast_shapes(np.shape(start_second), np.shape(stop_second)))
