"""A resistance in series with a capacitance under a triangular sweep, solved exactly from sample to sample."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

FloatArray = np.ndarray


@dataclass(frozen=True)
class Record:
    """A voltammogram and the clock of its samples."""

    time_second: FloatArray
    potential_volt: FloatArray
    current_ampere: FloatArray


def sweep(
    capacitance: float,
    resistance: float,
    rate: float,
    *,
    low: float = -0.25,
    high: float = -0.15,
    cycles: int = 3,
    per_sweep: int = 200,
    leak: float = 0.0,
    noise: float = 0.0,
    seed: int = 1,
) -> Record:
    """Charging current from rest. Within a sweep RC di/dt = +-C v - i, so that i decays to +-C v."""
    step = (high - low) / rate / per_sweep
    number = np.arange(2 * per_sweep * cycles + 1)
    place = np.mod(number, 2 * per_sweep) / per_sweep
    potential = low + (high - low) * np.where(place <= 1.0, place, 2.0 - place)
    decay = np.exp(-step / (resistance * capacitance)) if resistance else 0.0
    current = np.zeros(number.size)
    for k in number[:-1]:
        aim = capacitance * rate * (1.0 if (k // per_sweep) % 2 == 0 else -1.0)
        current[k + 1] = aim + (current[k] - aim) * decay
    current += leak * (potential - 0.5 * (low + high))
    current += noise * np.random.default_rng(seed).standard_normal(number.size)
    return Record(number * step, potential, current)
