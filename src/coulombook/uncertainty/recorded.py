"""Numbers that are written down instead of evaluated, so that one evaluation can be repeated for many draws.

A measurement function that is given `Recorded` numbers returns the record of how its outputs come from its inputs. The
record is made once a day; `replay.py` takes the outputs that are wanted, leaves out what they do not need, and
evaluates the rest for chunk after chunk of draws.

Constants are moved outward while the record is made, so that they are applied to few elements instead of many: a
product remembers its constant factors apart, linear maps of linear maps become one, and a function of elements that
were gathered is evaluated before they are. The results are the same to rounding.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from scipy.sparse import csr_array

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]
Operand = Any  # `Recorded`, array (n,) or float


class Recorded:
    """``count`` elements that come from unit errors by arithmetic.

    Supports what `Linearised` supports. Comparisons are refused: what is to be done must not depend on a draw.
    """

    __slots__ = ("count",)

    count: int

    def __len__(self) -> int:
        return self.count

    def __add__(self, other: Operand) -> Recorded:
        return _sum(np.add, self, other)

    def __radd__(self, other: Operand) -> Recorded:
        return _sum(np.add, self, other)

    def __sub__(self, other: Operand) -> Recorded:
        return _sum(np.subtract, self, other)

    def __rsub__(self, other: Operand) -> Recorded:
        return _sum(np.subtract, other, self)

    def __neg__(self) -> Recorded:
        return _scaled(self, -1.0)

    def __mul__(self, other: Operand) -> Recorded:
        return _product(self, other)

    def __rmul__(self, other: Operand) -> Recorded:
        return _product(self, other)

    def __truediv__(self, other: Operand) -> Recorded:
        return _quotient(self, other)

    def __rtruediv__(self, other: Operand) -> Recorded:
        return _quotient(other, self)

    def __pow__(self, exponent: float) -> Recorded:
        if exponent == 2:
            return _of_one(np.square, self)
        if exponent == 4:
            return _of_one(np.square, _of_one(np.square, self))
        return _of_one(np.power, self, exponent)

    def __array_ufunc__(self, ufunc: np.ufunc, method: str, *inputs: Any, **kwargs: Any) -> Any:
        if method != "__call__" or kwargs:
            return NotImplemented
        rule = _UFUNCS.get(ufunc)
        return NotImplemented if rule is None else rule(*inputs)


class UnitErrors(Recorded):
    """The independent errors of unit variance all inputs come from."""

    __slots__ = ()

    def __init__(self, count: int) -> None:
        self.count = count


class Picked(Recorded):
    """Elements ``index`` (n,) of another number, times ``weight`` (n,) if there is one."""

    __slots__ = ("index", "source", "weight")

    def __init__(self, source: Recorded, index: IntArray, weight: FloatArray | None) -> None:
        self.count = len(index)
        self.source = source
        self.index = index
        self.weight = weight


class Mapped(Recorded):
    """A linear map of another number: matrix (n, m) times its elements (m,)."""

    __slots__ = ("matrix", "source")

    def __init__(self, source: Recorded, matrix: csr_array) -> None:
        self.count = matrix.shape[0]
        self.source = source
        self.matrix = matrix


class Elementwise(Recorded):
    """A function of numpy's, element by element; at least one argument is `Recorded`."""

    __slots__ = ("arguments", "function")

    def __init__(self, function: np.ufunc, *arguments: Operand) -> None:
        self.count = next(len(one) for one in arguments if isinstance(one, Recorded))
        self.function = function
        self.arguments = arguments


class Selected(Recorded):
    """One number where ``mask`` (n,) holds, the other elsewhere."""

    __slots__ = ("mask", "otherwise", "x")

    def __init__(self, mask: NDArray[np.bool_], x: Operand, otherwise: Operand) -> None:
        self.count = len(mask)
        self.mask = mask
        self.x = x
        self.otherwise = otherwise


class Applied(Recorded):
    """A function of another number's values.

    ``function`` takes values in any layout, or, where elements differ, values (..., n) and which elements (n,) they are
    of: ``differs``.
    """

    __slots__ = ("differs", "function", "source")

    def __init__(self, source: Recorded, function: Callable[..., FloatArray], differs: bool) -> None:
        self.count = len(source)
        self.source = source
        self.function = function
        self.differs = differs


def pick(x: Recorded, index: IntArray) -> Recorded:
    """Elements of x in the order of ``index``; negative ones count from the end."""
    return _picked(x, np.where(index < 0, index + len(x), index), None)


def _picked(x: Recorded, index: IntArray, weight: FloatArray | None) -> Recorded:
    if isinstance(x, Picked):
        if x.weight is not None:
            of_x = x.weight[index]
            weight = of_x if weight is None else weight * of_x
        return _picked(x.source, x.index[index], weight)
    elif isinstance(x, Mapped) and weight is not None and _is_every(index, len(x)):
        return Mapped(x.source, _scaled_rows(x.matrix, weight))
    if weight is None and _is_every(index, len(x)):
        return x
    return Picked(x, index, weight)


def map_linearly(matrix: csr_array, x: Recorded) -> Recorded | FloatArray:
    """matrix (m, n) times x (n,); zeros where nothing is mapped at all."""
    if not matrix.nnz:
        return np.zeros(matrix.shape[0])
    if isinstance(x, Picked):
        matrix, x = _with_columns_of(matrix, x), x.source
    elif _moves_only(matrix) and isinstance(x, Mapped):
        matrix, x = matrix @ x.matrix, x.source
    elif _moves_only(matrix) and isinstance(x, Elementwise) and x.function in (np.add, np.subtract):
        # on both parts it costs no more, and it may become one with theirs
        parts = [
            map_linearly(matrix, one)
            if isinstance(one, Recorded)
            else matrix @ np.broadcast_to(one, (len(x),))
            for one in x.arguments
        ]
        return _sum(x.function, *parts)
    if (np.diff(matrix.indptr) == 1).all():
        weight = None if (matrix.data == 1.0).all() else matrix.data
        return _picked(x, matrix.indices.astype(np.intp), weight)
    return Mapped(x, matrix)


def _moves_only(matrix: csr_array) -> bool:
    """Whether no row adds anything up."""
    return bool((np.diff(matrix.indptr) <= 1).all())


def _with_columns_of(matrix: csr_array, x: Picked) -> csr_array:
    """The map of x's source that does what ``matrix`` does with x."""
    data = matrix.data if x.weight is None else matrix.data * x.weight[matrix.indices]
    shape = (matrix.shape[0], len(x.source))
    found = type(matrix)((data.copy(), x.index[matrix.indices], matrix.indptr.copy()), shape=shape)
    found.sum_duplicates()
    return found


def _scaled_rows(matrix: csr_array, factor: FloatArray) -> csr_array:
    data = matrix.data * np.repeat(factor, np.diff(matrix.indptr))
    return type(matrix)((data, matrix.indices, matrix.indptr), shape=matrix.shape)


def _is_every(index: IntArray, count: int) -> bool:
    return len(index) == count and bool((index == np.arange(count)).all())


def _is_gathered(x: Operand) -> bool:
    """Whether x is a repetition of elements of a number that has no more of them."""
    return isinstance(x, Picked) and x.weight is None and len(x.source) <= len(x)


def _alike(a: Operand, b: Operand) -> bool:
    """Whether both are gathered in the same way."""
    return (
        _is_gathered(a)
        and _is_gathered(b)
        and len(a.source) == len(b.source)
        and (a.index is b.index or np.array_equal(a.index, b.index))
    )


def apply(function: Callable[[FloatArray, IntArray], FloatArray], x: Recorded) -> Recorded:
    """A function (values (..., n), elements (n,)) -> values of the elements."""
    return Applied(x, function, True)


def apply_to_each(function: Callable[[FloatArray], FloatArray], x: Recorded) -> Recorded:
    """A function of values, the same for every element."""
    if isinstance(x, Picked) and _is_gathered(x):
        return _picked(apply_to_each(function, x.source), x.index, None)
    return Applied(x, function, False)


def _of_one(function: np.ufunc, x: Recorded, *scalars: float) -> Recorded:
    if isinstance(x, Picked) and _is_gathered(x):
        return _picked(_of_one(function, x.source, *scalars), x.index, None)
    return Elementwise(function, x, *scalars)


def _of_two(function: np.ufunc, a: Operand, b: Operand) -> Recorded:
    """A function of two numbers of which one or both are `Recorded`."""
    if isinstance(a, Picked) and isinstance(b, Picked) and _alike(a, b):
        return _picked(_of_two(function, a.source, b.source), a.index, None)
    return Elementwise(function, a, b)


def _sum(function: np.ufunc, a: Operand, b: Operand) -> Recorded:
    """a + b or a - b."""
    if isinstance(a, Recorded) and isinstance(b, Recorded):
        joined = _joined(function, a, b)
        return _of_two(function, a, b) if joined is None else joined
    x: Recorded
    x, constant = (a, b) if isinstance(a, Recorded) else (b, a)
    if not np.any(constant) and (x is a or function is np.add):
        return x
    if isinstance(x, Picked) and _is_gathered(x) and np.ndim(constant) == 0:
        inner = _sum(function, *((x.source, b) if x is a else (a, x.source)))
        return _picked(inner, x.index, None)
    return Elementwise(function, a, b)


def _joined(function: np.ufunc, a: Recorded, b: Recorded) -> Recorded | None:
    """The sum of two linear maps of one number as one map; None where they are none."""
    if isinstance(b, Mapped) and b.source is a:
        from scipy.sparse import eye_array

        first = eye_array(len(a), format="csr")
    elif isinstance(a, Mapped) and isinstance(b, Mapped) and a.source is b.source:
        first = a.matrix
    else:
        return None
    found = map_linearly(first + b.matrix if function is np.add else first - b.matrix, b.source)
    return found if isinstance(found, Recorded) else None


def _parted(x: Recorded) -> tuple[Operand, Recorded]:
    """A constant factor (1.0: none) and what it multiplies."""
    if isinstance(x, Picked) and x.weight is not None:
        return x.weight, _picked(x.source, x.index, None)
    return 1.0, x


def _scaled(x: Recorded, factor: Operand) -> Recorded:
    if np.ndim(factor) == 0 and factor == 1.0:
        return x
    if np.ndim(factor) == 0 and isinstance(x, Picked) and _is_gathered(x):
        return _picked(Elementwise(np.multiply, x.source, factor), x.index, None)
    weight = np.broadcast_to(np.asarray(factor, dtype=float), (len(x),))
    return _picked(x, np.arange(len(x)), weight)


def _product(a: Recorded, b: Operand) -> Recorded:
    if not isinstance(b, Recorded):
        return _scaled(a, b)
    of_a, a = _parted(a)
    of_b, b = _parted(b)
    return _scaled(_regrouped(np.multiply, a, b), of_a * of_b)


def _quotient(a: Operand, b: Operand) -> Recorded:
    if not isinstance(b, Recorded):
        return _scaled(a, 1.0 / np.asarray(b, dtype=float))
    of_b, b = _parted(b)
    if not isinstance(a, Recorded):
        return _scaled(_of_one(np.reciprocal, b), a / of_b)
    of_a, a = _parted(a)
    return _scaled(_regrouped(np.true_divide, a, b), of_a / of_b)


# (a g) b = a (g b), (a / g) b = a (b / g), (a g) / b = a (g / b), (a / g) / b = a / (g b)
_REGROUPED: dict[tuple[np.ufunc, np.ufunc], tuple[np.ufunc, np.ufunc, bool]] = {
    (np.multiply, np.multiply): (np.multiply, np.multiply, False),
    (np.true_divide, np.multiply): (np.multiply, np.true_divide, True),
    (np.multiply, np.true_divide): (np.multiply, np.true_divide, False),
    (np.true_divide, np.true_divide): (np.true_divide, np.multiply, False),
}


def _regrouped(function: np.ufunc, a: Recorded, b: Recorded) -> Recorded:
    """a times or by b; factors that are gathered in the same way are combined before they are."""
    if isinstance(a, Elementwise) and (a.function, function) in _REGROUPED and _alike(a.arguments[1], b):
        outer, inner, swapped = _REGROUPED[a.function, function]
        pair = (b, a.arguments[1]) if swapped else (a.arguments[1], b)
        return _of_two(outer, a.arguments[0], _of_two(inner, *pair))
    return _of_two(function, a, b)


def _times(a: Operand, b: Operand) -> Recorded:
    return _product(a, b) if isinstance(a, Recorded) else _product(b, a)


# numpy calls these when an array stands left of a Recorded
_UFUNCS: dict[Any, Callable[..., Recorded]] = {
    np.add: lambda a, b: _sum(np.add, a, b),
    np.subtract: lambda a, b: _sum(np.subtract, a, b),
    np.multiply: _times,
    np.true_divide: _quotient,
    np.negative: lambda a: _scaled(a, -1.0),
    np.sqrt: lambda a: _of_one(np.sqrt, a),
    np.exp: lambda a: _of_one(np.exp, a),
    np.log: lambda a: _of_one(np.log, a),
}
