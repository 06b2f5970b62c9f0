"""numpy's own functions, called by name, do to numbers with derivatives what the operators do."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from coulombook.uncertainty.linearised import Linearised, sparse_map

VALUE = np.array([1.5, 2.5])
JACOBIAN = sparse_map([0, 1, 1], [0, 0, 1], [0.1, 0.2, 0.3], (2, 2))
ARRAY = np.array([4.0, 0.5])


@pytest.mark.parametrize(
    ("function", "operator"),
    [
        (np.add, lambda a, b: a + b),
        (np.subtract, lambda a, b: a - b),
        (np.multiply, lambda a, b: a * b),
        (np.true_divide, lambda a, b: a / b),
    ],
)
@pytest.mark.parametrize("order", ["number first", "array first", "two numbers", "scalar first"])
def test_functions_of_two_are_the_operators(
    function: np.ufunc, operator: Callable[[object, object], Linearised], order: str
) -> None:
    x = Linearised(VALUE, JACOBIAN)
    a, b = {
        "number first": (x, ARRAY),
        "array first": (ARRAY, x),
        "two numbers": (x, x * x),
        "scalar first": (np.float64(3.0), x),
    }[order]
    found, expected = function(a, b), operator(a, b)
    assert isinstance(found, Linearised)
    np.testing.assert_array_equal(found.value, expected.value)
    np.testing.assert_array_equal(found.jacobian.toarray(), expected.jacobian.toarray())
    plain = [one.value if isinstance(one, Linearised) else one for one in (a, b)]
    np.testing.assert_allclose(found.value, function(*plain))


def test_negative_is_minus() -> None:
    found = np.negative(Linearised(VALUE, JACOBIAN))  # type: ignore[call-overload] # numpy hands it over
    np.testing.assert_array_equal(found.value, -VALUE)
    np.testing.assert_array_equal(found.jacobian.toarray(), -JACOBIAN.toarray())


def test_functions_without_a_rule_are_refused() -> None:
    x = Linearised(VALUE, JACOBIAN)
    with pytest.raises(TypeError):
        np.cos(x)  # type: ignore[call-overload] # on purpose
    with pytest.raises(TypeError):
        np.add.reduce(x)  # type: ignore[arg-type] # on purpose
    with pytest.raises(TypeError):
        np.add(x, 1.0, out=np.zeros(2))  # type: ignore[call-overload] # on purpose


def test_a_number_says_how_much_of_it_there_is() -> None:
    assert repr(Linearised(VALUE, sparse_map([0], [2], 1.0, (2, 5)))) == "Linearised(2 values, 5 errors)"
    assert len(Linearised(VALUE, JACOBIAN)) == 2
