"""A current (or potential) that runs in straight lines between the rows of a log, treated exactly."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import PPoly


class PiecewiseLinear:
    """A quantity known at knots and straight in between.

    Integrals come from the antiderivative of the piecewise polynomial, not from a sum over clipped rows.
    """

    def __init__(self, knots: ArrayLike, values: ArrayLike) -> None:
        self.knots: NDArray[np.float64] = np.asarray(knots, dtype=float)
        self.values: NDArray[np.float64] = np.asarray(values, dtype=float)
        slopes = np.diff(self.values) / np.diff(self.knots)
        self._line = PPoly(np.vstack([slopes, self.values[:-1]]), self.knots)
        self._integral = self._line.antiderivative()

    def at(self, time: float) -> float:
        """Value at one time."""
        return float(self._line(time))

    def integral(self, low: float, high: float) -> float:
        """Integral from ``low`` to ``high``."""
        return float(self._integral(high) - self._integral(low))

    def mean(self, low: float, high: float) -> float:
        """Time-weighted mean from ``low`` to ``high``."""
        return self.integral(low, high) / (high - low)

    def mixed(self, start: float, time: float, tau: float) -> float:
        """Content y of a stirred vessel that was empty at ``start``: tau dy/dt = value(t) - y.

        On a straight stretch value = a + b s it is y = a + b (s - tau) + (y0 - a + b tau) exp(-s/tau); the
        stretches are joined end to end, which is exact.
        """
        inside = self.knots[(self.knots > start) & (self.knots < time)]
        edges = [start, *inside.tolist(), time]
        heights = self._line(np.array(edges)).tolist()
        content = 0.0
        for left, right, low, high in zip(edges, edges[1:], heights, heights[1:], strict=False):
            step = right - left
            rise = (high - low) / step
            content = high - rise * tau + (content - low + rise * tau) * math.exp(-step / tau)
        return content
