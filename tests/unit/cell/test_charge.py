"""Charge and means over windows of a trace."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.cell.charge import (
    CumulativeTrace,
    charge_coulomb,
    interpolate,
    sample_weight,
    time_mean,
    window,
)

# irregular steps, and a current that is a straight line between them
TIME = np.array([0.0, 1.0, 3.0, 4.0, 8.0])
CURRENT = np.array([-2.0, -4.0, -4.0, 0.0, -8.0])
WINDOWS = [
    (0.0, 8.0),
    (0.5, 3.5),
    (0.2, 0.7),
    (1.0, 3.0),
    (3.0, 8.0),
    (0.5, 1.5),
    (4.0, 8.0),
    (3.5, 4.5),
    (0.0, 4.0),
]


def test_charge_is_minus_the_trapezoids_on_the_traces_own_steps() -> None:
    # 1 x 3 + 2 x 4 + 1 x 2 + 4 x 4 = 29 C of cathodic charge, counted positive
    assert charge_coulomb(TIME, CURRENT) == 29.0


def test_charge_of_a_window_ends_on_straight_lines_between_samples() -> None:
    # 0.5 s: I = -3; to 1 s: 0.5 x 3.5 = 1.75; 1 to 3 s: 8; 3 to 3.5 s: I = -2 there, 0.5 x 3 = 1.5; sum 11.25
    assert charge_coulomb(TIME, CURRENT, 0.5, 3.5) == pytest.approx(11.25, rel=1e-15)
    assert time_mean(TIME, CURRENT, 0.5, 3.5) == pytest.approx(-11.25 / 3.0, rel=1e-15)


def test_charge_of_a_window_within_one_step() -> None:
    # I(0.2) = -2.4, I(0.7) = -3.4: 0.5 s x 2.9 A
    assert charge_coulomb(TIME, CURRENT, 0.2, 0.7) == pytest.approx(1.45, rel=1e-15)


def test_window_defaults_to_the_whole_trace() -> None:
    assert window(TIME, None, None) == (0.0, 8.0)
    assert window(TIME, 1.5, None) == (1.5, 8.0)
    assert window(TIME, None, 2.0) == (0.0, 2.0)


@pytest.mark.parametrize(
    ("time", "start", "stop", "message"),
    [
        (TIME, 3.0, 3.0, "must start before it stops"),
        (TIME, 5.0, 3.0, "must start before it stops"),
        (TIME, float("nan"), 3.0, "must start before it stops"),
        (TIME, -1.0, 3.0, "reaches beyond the trace, which runs from 0 s to 8 s"),
        (TIME, 0.0, 9.0, "reaches beyond the trace"),
        (TIME[:1], None, None, "1 sample"),
        (TIME[:0], None, None, "0 sample"),
        (np.array([0.0, 2.0, 2.0, 3.0]), None, None, r"sample 3 \(2 s\) is not later"),
        (
            np.array([0.0, 2.0, 1.0]),
            None,
            None,
            r"sample 3 \(1 s\) is not later than the one before it \(2 s\)",
        ),
        (np.array([0.0, np.nan, 1.0]), None, None, "sample 2"),
    ],
)
def test_bad_window_or_clock_is_refused(
    time: np.ndarray, start: float | None, stop: float | None, message: str
) -> None:
    with pytest.raises(ValueError, match=message):
        window(time, start, stop)


def test_interpolation_gives_samples_back_and_refuses_to_extrapolate() -> None:
    assert interpolate(TIME, CURRENT, TIME).tolist() == CURRENT.tolist()
    assert interpolate(TIME, CURRENT, 6.0) == -4.0
    for outside in (-0.1, 8.1, float("nan")):
        with pytest.raises(ValueError, match="outside the trace"):
            interpolate(TIME, CURRENT, [1.0, outside])


@pytest.mark.parametrize(("start", "stop"), WINDOWS)
def test_running_integral_agrees_with_the_single_window(start: float, stop: float) -> None:
    trace = CumulativeTrace(TIME, CURRENT)
    # two sums of a few terms of size 10: agreement to their rounding
    assert trace.integral(start, stop) == pytest.approx(
        -charge_coulomb(TIME, CURRENT, start, stop), abs=1e-14
    )
    assert trace.mean(start, stop) == pytest.approx(time_mean(TIME, CURRENT, start, stop), abs=1e-14)


def test_running_integral_answers_many_windows_at_once() -> None:
    trace = CumulativeTrace(TIME, CURRENT)
    starts, stops = np.array(WINDOWS).T
    expected = [-charge_coulomb(TIME, CURRENT, a, b) for a, b in WINDOWS]
    np.testing.assert_allclose(trace.integral(starts, stops), expected, rtol=1e-14)
    assert trace.integral(starts.reshape(3, 3), stops.reshape(3, 3)).shape == (3, 3)
    assert trace.integral(2.0, 2.0) == 0.0


def test_mean_over_an_empty_window_is_refused() -> None:
    with pytest.raises(ValueError, match="start before it stops"):
        CumulativeTrace(TIME, CURRENT).mean([0.0, 2.0], [1.0, 2.0])


def test_cutting_a_window_in_two_loses_no_charge() -> None:
    rng = np.random.default_rng(20)
    time = np.cumsum(rng.uniform(0.01, 2.0, 5000))
    trace = CumulativeTrace(time, rng.normal(-0.1, 0.02, 5000))
    cuts = np.sort(rng.uniform(time[0], time[-1], 50))
    edges = np.concatenate((time[:1], cuts, time[-1:]))
    parts = trace.integral(edges[:-1], edges[1:])
    # 5000 additions of like size: relative rounding well below 1e-12
    assert parts.sum() == pytest.approx(float(trace.until(time[-1])), rel=1e-12)


@pytest.mark.parametrize(("start", "stop"), WINDOWS)
def test_sample_weight_is_the_norm_of_the_weights_of_the_mean(start: float, stop: float) -> None:
    # the mean is linear in the samples: its weights are the means of the unit vectors
    weights = [time_mean(TIME, unit, start, stop) for unit in np.eye(TIME.size)]
    assert sample_weight(TIME, start, stop) == pytest.approx(np.linalg.norm(weights), rel=1e-14)


def test_sample_weight_of_many_even_samples_is_one_over_the_root_of_their_number() -> None:
    time = np.arange(10001.0)
    # the two half-weighted ends make a difference of the order 1/m
    np.testing.assert_allclose(
        sample_weight(time, [0.0, 100.0], [10000.0, 500.0]), 1 / np.sqrt([10000.0, 400.0]), rtol=2e-3
    )


def test_noise_of_a_mean_is_what_the_sample_weight_says() -> None:
    rng = np.random.default_rng(21)
    time = np.cumsum(rng.uniform(0.1, 3.0, 60))
    noise = rng.standard_normal((4000, 60))
    means = [CumulativeTrace(time, row).mean(time[3] + 0.1, time[50] + 0.05) for row in noise]
    # the standard deviation of 4000 draws is known to 1/sqrt(8000) = 1.1 %; three of them
    assert np.std(means) == pytest.approx(
        float(sample_weight(time, time[3] + 0.1, time[50] + 0.05)), rel=0.034
    )
