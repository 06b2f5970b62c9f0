"""Detector drift between check-gas injections."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]


def interpolation_weights(
    check_times: ArrayLike, at_times: ArrayLike
) -> tuple[IntArray, IntArray, FloatArray]:
    """Weights that turn the factors found at checks into the factor at other times. [1]

    Linear in time between checks, constant before the first and after the last. Checks at the same time
    count as their mean. Each row of weights adds to 1.

    Parameters
    ----------
    check_times : (n_checks,) array_like
        Times of the checks, in any order. [s]
    at_times : (n_times,) array_like
        Times at which the factor is wanted, on the same clock. [s]

    Returns
    -------
    rows, columns, values : (n_entries,) arrays
        Entries of the matrix (n_times, n_checks) that does it; each place occurs once.

    Raises
    ------
    ValueError
        There are no checks, or a time is not finite.

    Examples
    --------
    >>> rows, columns, values = interpolation_weights([0.0, 100.0], [-5.0, 25.0])
    >>> rows.tolist(), columns.tolist(), values.tolist()
    ([0, 1, 1], [0, 0, 1], [1.0, 0.75, 0.25])
    """
    checks, at = np.asarray(check_times, dtype=float), np.asarray(at_times, dtype=float)
    if checks.size == 0:
        raise ValueError("there are no checks to interpolate between")
    if not (np.isfinite(checks).all() and np.isfinite(at).all()):
        raise ValueError("a time of a check or of a reading is not a finite number")
    times, member, count = np.unique(checks, return_inverse=True, return_counts=True)
    members = [np.flatnonzero(member.reshape(-1) == k) for k in range(times.size)]
    held = np.clip(at, times[0], times[-1])
    left = np.clip(np.searchsorted(times, held, side="right") - 1, 0, max(times.size - 2, 0))
    right = np.minimum(left + 1, times.size - 1)
    width = times[right] - times[left]
    share = np.divide(held - times[left], width, out=np.zeros_like(held), where=width > 0.0)
    rows: list[int] = []
    columns: list[int] = []
    values: list[float] = []
    for row in range(at.size):
        for level, weight in ((left[row], 1.0 - share[row]), (right[row], share[row])):
            if weight != 0.0:
                rows += [row] * int(count[level])
                columns += members[level].tolist()
                values += [weight / count[level]] * int(count[level])
    return np.array(rows, dtype=np.intp), np.array(columns, dtype=np.intp), np.array(values, dtype=float)
