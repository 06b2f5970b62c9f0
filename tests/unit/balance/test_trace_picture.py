"""A log as it is drawn keeps its peaks."""

import numpy as np

from coulombook.balance.readings import Trace
from coulombook.balance.trace_picture import MOST_POINTS, picture_of


def log(samples: int) -> Trace:
    time = np.arange(samples, dtype=float)
    return Trace(time, np.full(samples, -1.0), -0.02 + 1e-4 * np.sin(time), None)


def test_a_short_log_is_drawn_sample_by_sample() -> None:
    trace = log(50)
    picture = picture_of(trace)
    assert np.array_equal(picture.time_second, trace.time_second)
    assert np.array_equal(picture.lowest_current_ampere, trace.current_ampere)
    assert np.array_equal(picture.highest_current_ampere, trace.current_ampere)


def test_one_sample_of_a_long_log_that_peaks_is_still_seen_at_its_time() -> None:
    trace = log(100_003)
    trace.current_ampere[77_777] = -0.5
    trace.potential_volt[12_345] = 2.0
    picture = picture_of(trace)
    assert len(picture.time_second) <= MOST_POINTS
    place = int(picture.lowest_current_ampere.argmin())
    assert picture.lowest_current_ampere[place] == -0.5
    assert picture.time_second[place] <= 77_777 < picture.time_second[place + 1]
    assert picture.highest_potential_volt.max() == 2.0


def test_samples_that_are_no_numbers_leave_no_hole() -> None:
    trace = log(10_000)
    trace.potential_volt[5] = np.nan
    assert np.isfinite(picture_of(trace).lowest_potential_volt).all()


def test_a_short_picture_does_not_hold_the_log_itself() -> None:
    trace = log(10)
    picture = picture_of(trace)
    trace.current_ampere[:] = 0.0
    assert (picture.lowest_current_ampere < 0).all()
