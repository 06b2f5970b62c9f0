"""Errors of the standards themselves, as their certificates state them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]


def standard_errors(
    x: FloatArray,
    u_x: ArrayLike | None = None,
    parent: Sequence[str] | None = None,
    u_parent: ArrayLike | None = None,
) -> FloatArray:
    """Factor L of the covariance U = L L^T of the standards. [unit of x]

    Two kinds of error make it, each a column of independent unit errors:

    - the error of a standard itself, u_x. Points of the same x, u_x and parent are injections of one
      standard: they share its error, for no repetition averages out what the certificate got wrong;
    - the error of a parent cylinder several standards were diluted from: cov(x_i, x_j) = u_i x_i u_j x_j for
      all i, j of one parent, the diagonal included, u being ``u_parent``.

    Parameters
    ----------
    x : (n_points,) float array
    u_x : (n_points,) array_like, optional
        Standard uncertainty of each standard, without what it inherits from its parent. [unit of x]
    parent : (n_points,) sequence of str, optional
        Parent of each standard; "" where there is none.
    u_parent : (n_points,) array_like, optional
        Relative standard uncertainty of the parent. [1]

    Returns
    -------
    (n_points, n_errors) float array
        No columns when nothing is stated, or all is zero.

    Raises
    ------
    ValueError
        An uncertainty is negative or not a finite number.

    Examples
    --------
    >>> L = standard_errors(np.array([1.0, 1.0, 2.0]), [0.1, 0.1, 0.2])
    >>> (L @ L.T).round(3).tolist()
    [[0.01, 0.01, 0.0], [0.01, 0.01, 0.0], [0.0, 0.0, 0.04]]
    """
    columns: list[FloatArray] = []
    own = np.zeros_like(x) if u_x is None else np.asarray(u_x, dtype=float)
    inherited = np.zeros_like(x) if u_parent is None else np.asarray(u_parent, dtype=float)
    for values, name in ((own, "a standard"), (inherited, "a parent")):
        wrong = np.flatnonzero(~(np.isfinite(values) & (values >= 0.0)))
        if wrong.size:
            raise ValueError(
                f"the uncertainty of {name} must be a number at or above zero, not {values[wrong[0]]:g}"
            )
    names = ("",) * x.size if parent is None else tuple(parent)
    if own.any():
        groups: dict[tuple[float, float, str], list[int]] = {}
        for place in np.flatnonzero(own > 0.0).tolist():
            groups.setdefault((float(x[place]), float(own[place]), names[place]), []).append(place)
        columns += [_column(x.size, places, own) for places in groups.values()]
    if inherited.any():
        families: dict[str, list[int]] = {}
        for place, name in enumerate(names):
            if name:
                families.setdefault(name, []).append(place)
        columns += [_column(x.size, places, inherited * x) for places in families.values()]
    columns = [one for one in columns if one.any()]
    return np.column_stack(columns) if columns else np.zeros((x.size, 0))


def _column(size: int, places: list[int], values: FloatArray) -> FloatArray:
    column = np.zeros(size)
    column[places] = values[places]
    return column
