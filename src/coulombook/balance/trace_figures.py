"""What the balance needs to know of one potentiostat log, so that the log itself need not stay in memory."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.readings import FloatArray, Trace
from coulombook.cell.charge import CumulativeTrace, interpolate, sample_weight, window
from coulombook.cell.headspace import HALF_RANGE, MixedCurrent


@dataclass(frozen=True, slots=True, eq=False)
class TraceRequest:
    """What is asked of a log: its window, the injections (k) and samplings (m) of its run."""

    start_second: float | None
    stop_second: float | None
    injection_time_second: FloatArray  # (k,) ascending, dead time not yet taken off
    sampling_time_second: FloatArray  # (m,) infinite: end of the window
    current_window_second: float
    dead_time_second: float
    mixing_time_second: (
        FloatArray | None
    )  # (k,) guesses of the headspace's time constant; None without headspace
    mixing_reach: float = HALF_RANGE  # of ln tau, either side of the guesses


@dataclass(frozen=True, slots=True, eq=False)
class TraceFigures:
    """Figures of one log. Charge and current are positive for reduction."""

    start_second: float
    stop_second: float
    charge_coulomb: float
    mean_potential_volt: float
    mean_cell_voltage_volt: float  # NaN when it was not logged
    noise_weight: float  # noise of one sample -> noise of the mean over the window
    usable: NDArray[np.bool_]  # (k,) whether an injection has a current to be compared with
    injection_window_second: (
        FloatArray  # (k, 2) what its current is averaged over; NaN where it is not by a window
    )
    injection_current_ampere: FloatArray  # (k,) mean over the injection's window; NaN when not usable
    injection_noise_weight: FloatArray  # (k,)
    injection_slope_ampere_per_second: (
        FloatArray  # (k,) how that mean moves when the window is shifted in time
    )
    injection_since_second: FloatArray  # (k,) from the window's start to the injection, dead time taken off
    injection_now_ampere: FloatArray  # (k,) current at that moment
    sampling_charge_coulomb: FloatArray  # (m,) charge passed up to each sampling
    sampling_duration_second: FloatArray  # (m,)
    mixed: MixedCurrent | None


def figures_of(trace: Trace, request: TraceRequest) -> TraceFigures:
    """Integrate one log.

    Raises
    ------
    ValueError
        The window is no part of the log, or the log's times do not increase.
    """
    time, cell_voltage = trace.time_second, trace.cell_voltage_volt
    start, stop = window(time, request.start_second, request.stop_second)
    current = CumulativeTrace(time, trace.current_ampere)
    potential = CumulativeTrace(time, trace.potential_volt).mean(start, stop)
    voltage = np.nan if cell_voltage is None else CumulativeTrace(time, cell_voltage).mean(start, stop)

    moment = request.injection_time_second - request.dead_time_second
    # without headspace the averaging window ends at the run's window; a headspace remembers, so that an injection
    # after the hold still tells of it as long as the log goes on
    latest = stop if request.mixing_time_second is None else float(time[-1])
    low = np.maximum(moment - request.current_window_second, start)
    high = np.minimum(moment, stop)
    mixing = request.mixing_time_second
    usable = high > low if mixing is None else (moment > start) & (moment <= latest)
    held = np.clip(moment, start, latest)
    seen, weight, slope, now = (np.full(moment.shape, np.nan) for _ in range(4))
    # of the whole window and of the injections' windows in one pass over the log
    averaged = usable if mixing is None else np.zeros_like(usable)
    weights = sample_weight(time, np.append(start, low[averaged]), np.append(stop, high[averaged]))
    mixed = None
    if usable.any():
        now[usable] = -interpolate(time, trace.current_ampere, held[usable])
    if request.mixing_time_second is None:
        if usable.any():
            a, b = low[usable], high[usable]
            seen[usable] = -current.mean(a, b)
            weight[usable] = weights[1:]
            edges = interpolate(time, trace.current_ampere, np.concatenate((a, b)))
            first, last = -edges[: len(a)], -edges[len(a) :]
            # an end that is clipped to the run's window stays there when the injection is shifted
            moves_low = moment[usable] - request.current_window_second > start
            moves_high = moment[usable] < stop
            mean = seen[usable]
            slope[usable] = (moves_high * (last - mean) - moves_low * (first - mean)) / (b - a)
    elif len(moment):
        mixed = _mixed(trace, start, held, request.mixing_time_second, request.mixing_reach)
        seen[usable], weight[usable], slope[usable] = now[usable], 0.0, 0.0
    averaging = np.where(averaged[:, None], np.column_stack((low, high)), np.nan)
    until = np.clip(request.sampling_time_second, None, stop)
    sampled = np.maximum(until, start)
    return TraceFigures(
        start,
        stop,
        -float(current.integral(start, stop)),
        float(potential),
        float(voltage),
        float(weights[0]),
        usable,
        averaging,
        seen,
        weight,
        slope,
        moment - start,
        now,
        -current.integral(np.full(sampled.shape, start), sampled),
        until - start,
        mixed,
    )


def _mixed(trace: Trace, start: float, at: FloatArray, centre: FloatArray, reach: float) -> MixedCurrent:
    """Current that a headspace remembers at each injection; one pass over the log per distinct guess."""
    time, current = trace.time_second, trace.current_ampere
    if np.ptp(centre) == 0:
        return MixedCurrent.of_trace(time, current, start, at, float(centre[0]), reach)
    return MixedCurrent.join(
        [
            MixedCurrent.of_trace(time, current, start, at[k : k + 1], float(tau), reach)
            for k, tau in enumerate(centre)
        ]
    )
