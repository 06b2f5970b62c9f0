"""Numbers that carry their first-order dependence on a set of unit errors.

The law of propagation (JCGM 100:2008, 5.2, and JCGM 102:2011, 6.2) needs the derivative of every output with
respect to every input. Here each input is written x = x0 + L e with independent errors e of unit variance, and a
`Linearised` holds x0 with its rows of L. Arithmetic carries both along (forward-mode differentiation), so that the
same measurement function gives the nominal value from plain arrays, Monte Carlo values from arrays with a leading
axis of draws, and covariances from `Linearised` numbers.

A fourth kind, `Recorded`, writes the function down, to be repeated for draws (`recorded.py`).

The functions of this module (`gather`, `linear_map`, `select`, `chain` and their like) take any of the four.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from coulombook.uncertainty.recorded import Recorded, Selected, apply, apply_to_each, map_linearly, pick

if TYPE_CHECKING:
    from scipy.sparse import csr_array

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]


def _scale_rows(jacobian: csr_array, factor: FloatArray) -> csr_array:
    """Each row of the matrix times its own factor."""
    data = jacobian.data * np.repeat(factor, np.diff(jacobian.indptr))
    return type(jacobian)((data, jacobian.indices, jacobian.indptr), shape=jacobian.shape)


def _keep_rows(jacobian: csr_array, mask: NDArray[np.bool_]) -> csr_array:
    """The rows where ``mask`` holds, the others zero even where they are NaN."""
    data = np.where(np.repeat(mask, np.diff(jacobian.indptr)), jacobian.data, 0.0)
    return type(jacobian)((data, jacobian.indices, jacobian.indptr), shape=jacobian.shape)


class Linearised:
    """Values (n,) with the derivatives (n, n_errors) of each with respect to the unit errors.

    Supports + - * / with floats, arrays (n,) and each other, powers with a constant exponent, and the numpy functions
    sqrt, exp and log. Comparisons are refused on purpose: a measurement function must not branch on a reading.
    """

    __slots__ = ("jacobian", "value")

    def __init__(self, value: FloatArray, jacobian: csr_array) -> None:
        self.value = value
        self.jacobian = jacobian

    def __len__(self) -> int:
        return len(self.value)

    def __repr__(self) -> str:
        return f"Linearised({len(self.value)} values, {self.jacobian.shape[1]} errors)"

    def _linear(self, value: FloatArray, slope: FloatArray | float) -> Linearised:
        """A function of this number alone, with its slope."""
        return Linearised(value, _scale_rows(self.jacobian, np.broadcast_to(slope, self.value.shape)))

    def __add__(self, other: Any) -> Linearised:
        if isinstance(other, Linearised):
            return Linearised(self.value + other.value, self.jacobian + other.jacobian)
        return Linearised(self.value + other, self.jacobian)

    __radd__ = __add__

    def __neg__(self) -> Linearised:
        return Linearised(-self.value, -self.jacobian)

    def __sub__(self, other: Any) -> Linearised:
        if isinstance(other, Linearised):
            return Linearised(self.value - other.value, self.jacobian - other.jacobian)
        return Linearised(self.value - other, self.jacobian)

    def __rsub__(self, other: Any) -> Linearised:
        return Linearised(other - self.value, -self.jacobian)

    def __mul__(self, other: Any) -> Linearised:
        if isinstance(other, Linearised):
            return Linearised(
                self.value * other.value,
                _scale_rows(self.jacobian, other.value) + _scale_rows(other.jacobian, self.value),
            )
        return self._linear(self.value * other, other)

    __rmul__ = __mul__

    def __truediv__(self, other: Any) -> Linearised:
        if isinstance(other, Linearised):
            quotient = self.value / other.value
            return Linearised(
                quotient,
                _scale_rows(self.jacobian, 1.0 / other.value)
                - _scale_rows(other.jacobian, quotient / other.value),
            )
        return self._linear(self.value / other, 1.0 / np.asarray(other, dtype=float))

    def __rtruediv__(self, other: Any) -> Linearised:
        quotient = other / self.value
        return self._linear(quotient, -quotient / self.value)

    def __pow__(self, exponent: float) -> Linearised:
        return self._linear(self.value**exponent, exponent * self.value ** (exponent - 1))

    def __array_ufunc__(self, ufunc: np.ufunc, method: str, *inputs: Any, **kwargs: Any) -> Any:
        if method != "__call__" or kwargs:
            return NotImplemented
        rule = _UFUNCS.get(ufunc)
        return NotImplemented if rule is None else rule(*inputs)


def _sqrt(x: Linearised) -> Linearised:
    root = np.sqrt(x.value)
    return x._linear(root, 0.5 / root)


def _exp(x: Linearised) -> Linearised:
    power = np.exp(x.value)
    return x._linear(power, power)


def _log(x: Linearised) -> Linearised:
    return x._linear(np.log(x.value), 1.0 / x.value)


# numpy calls these when an array stands left of a Linearised
_UFUNCS: dict[Any, Callable[..., Linearised]] = {
    np.add: lambda a, b: b + a if isinstance(b, Linearised) else a + b,
    np.subtract: lambda a, b: a - b if isinstance(a, Linearised) else b.__rsub__(a),
    np.multiply: lambda a, b: b * a if isinstance(b, Linearised) else a * b,
    np.true_divide: lambda a, b: a / b if isinstance(a, Linearised) else b.__rtruediv__(a),
    np.negative: lambda a: -a,
    np.sqrt: _sqrt,
    np.exp: _exp,
    np.log: _log,
}

Number = FloatArray | Linearised | Recorded


def nominal(x: Number) -> FloatArray:
    """The values without their derivatives."""
    if isinstance(x, Recorded):
        raise TypeError("a recorded number has no value")
    return x.value if isinstance(x, Linearised) else x


def without_slope(x: Number) -> Number:
    """The same values, taken as constants where derivatives are carried."""
    return x.value if isinstance(x, Linearised) else x


def gather(x: Number, index: IntArray) -> Number:
    """Elements of x in the order of ``index``, along the last axis."""
    if isinstance(x, Linearised):
        return Linearised(x.value[index], x.jacobian[index])
    if isinstance(x, Recorded):
        return pick(x, index)
    return x[..., index]


def linear_map(matrix: csr_array, x: Number) -> Number:
    """matrix (m, n) times x (n,), along the last axis."""
    if isinstance(x, Linearised):
        return Linearised(matrix @ x.value, matrix @ x.jacobian)
    if isinstance(x, Recorded):
        return map_linearly(matrix, x)
    result: FloatArray = (matrix @ x.T).T
    return result


def select(mask: NDArray[np.bool_], x: Number, otherwise: Number) -> Number:
    """x where ``mask`` (n,) holds, else ``otherwise``; the mask is part of the plan, never of the readings."""
    if isinstance(x, Recorded) or isinstance(otherwise, Recorded):
        return Selected(mask, x, otherwise)
    if not isinstance(x, Linearised) and not isinstance(otherwise, Linearised):
        return np.where(mask, x, otherwise)
    kept = np.where(mask, nominal(x), nominal(otherwise))
    parts = [
        _keep_rows(side.jacobian, held)
        for side, held in ((x, mask), (otherwise, ~mask))
        if isinstance(side, Linearised)
    ]
    return Linearised(kept, parts[0] if len(parts) == 1 else parts[0] + parts[1])


def chain(x: Number, function: Callable[[FloatArray], tuple[FloatArray, FloatArray]]) -> Number:
    """A function given with its elementwise derivative, applied to x."""
    return chain_each(x, lambda values, elements: function(values))


def chain_each(
    x: Number, function: Callable[[FloatArray, IntArray], tuple[FloatArray, FloatArray]]
) -> Number:
    """A function that differs between elements, applied to x: of values (..., k) and which elements (k,) they are of.

    It is given with its derivative, as in `chain`.
    """
    if isinstance(x, Recorded):
        return apply(lambda values, elements: function(values, elements)[0], x)
    every = np.arange(nominal(x).shape[-1])
    if isinstance(x, Linearised):
        value, slope = function(x.value, every)
        return x._linear(value, slope)
    return function(x, every)[0]


def known_where(test: Callable[[FloatArray], NDArray[np.bool_]], x: Number) -> Number:
    """x where its value passes the test, NaN elsewhere."""

    def known(values: FloatArray) -> FloatArray:
        return np.where(test(values), values, np.nan)

    if isinstance(x, Linearised):
        return Linearised(known(x.value), x.jacobian)
    return apply_to_each(known, x) if isinstance(x, Recorded) else known(x)


def standard_uncertainty(x: Number) -> FloatArray:
    """Standard uncertainty of each value: the norm of its row of derivatives. Zero for plain arrays."""
    if not isinstance(x, Linearised):
        return np.zeros(nominal(x).shape)
    return np.sqrt(squared_norms(x.jacobian))


def squared_norms(jacobian: csr_array) -> FloatArray:
    """Sum of squares of each row.

    No place of a row may be stored twice: sums, products and selections of matrices of `sparse_map` never do that.
    """
    entry_row = np.repeat(np.arange(jacobian.shape[0]), np.diff(jacobian.indptr))
    squares = np.bincount(entry_row, weights=jacobian.data**2, minlength=jacobian.shape[0])
    return np.asarray(squares, dtype=np.float64)


def covariance(x: Linearised) -> FloatArray:
    """Covariance matrix (n, n) of all values."""
    return np.asarray((x.jacobian @ x.jacobian.T).toarray())


def sparse_map(rows: Any, columns: Any, weights: Any, shape: tuple[int, int]) -> csr_array:
    """A linear map given by its entries; entries at the same place add up."""
    from scipy.sparse import coo_array

    places = (np.asarray(rows, dtype=np.intp), np.asarray(columns, dtype=np.intp))
    data = np.broadcast_to(np.asarray(weights, dtype=float), places[0].shape)
    result: csr_array = coo_array((data, places), shape=shape).tocsr()
    return result
