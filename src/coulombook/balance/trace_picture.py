"""A potentiostat log as it is drawn: an envelope that keeps every peak, however long the log is."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from coulombook.balance.readings import FloatArray, Trace

# more points than a wide screen has columns; a log with fewer samples is kept as it is
MOST_POINTS = 1200


@dataclass(frozen=True, slots=True, eq=False)
class TracePicture:
    """Lowest and highest value of each stretch of a log, (n_points,); single samples where the log is short.

    The current is negative when cathodic, as logged.
    """

    time_second: FloatArray  # of the first sample of the stretch
    lowest_current_ampere: FloatArray
    highest_current_ampere: FloatArray
    lowest_potential_volt: FloatArray
    highest_potential_volt: FloatArray


def picture_of(trace: Trace) -> TracePicture:
    """The envelope of one log, in stretches of equal numbers of samples."""
    samples = len(trace.time_second)
    step = max(1, -(-samples // MOST_POINTS))
    first = np.arange(0, samples, step)
    time = trace.time_second[first]
    if step == 1:
        current, potential = trace.current_ampere.copy(), trace.potential_volt.copy()
        return TracePicture(time, current, current, potential, potential)
    return TracePicture(
        time,
        np.fmin.reduceat(trace.current_ampere, first),
        np.fmax.reduceat(trace.current_ampere, first),
        np.fmin.reduceat(trace.potential_volt, first),
        np.fmax.reduceat(trace.potential_volt, first),
    )
