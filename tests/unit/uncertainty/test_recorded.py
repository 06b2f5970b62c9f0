"""A recorded function, replayed for draws, gives what the function gives for plain arrays of the same draws."""

from __future__ import annotations

import sys
from collections.abc import Callable

import numpy as np
import pytest

from coulombook.uncertainty.linearised import (
    Linearised,
    Number,
    chain,
    chain_each,
    gather,
    known_where,
    linear_map,
    nominal,
    select,
    sparse_map,
    without_slope,
)
from coulombook.uncertainty.recorded import Elementwise, Mapped, Picked, Recorded, UnitErrors, map_linearly
from coulombook.uncertainty.replay import Needs, Program, aligned

N, M, ERRORS, CHUNK = 4, 9, 6, 64
RNG = np.random.default_rng(20430518)
VALUE = RNG.uniform(1.0, 2.0, N)
JACOBIAN = sparse_map([0, 1, 2, 3, 3], [0, 1, 2, 3, 4], [0.1, 0.05, 0.02, 0.03, 0.04], (N, ERRORS))
OTHER = RNG.uniform(2.0, 3.0, N)
# the second element has no error of its own
OTHER_JACOBIAN = sparse_map([0, 2, 3], [4, 5, 5], [0.1, 0.05, 0.02], (N, ERRORS))
INDEX = np.array([0, 1, 2, 3, 0, 1, 2, 3, 0])
BACKWARD = INDEX[::-1].copy()
WEIGHT = RNG.uniform(0.5, 1.5, M)
MEAN = sparse_map(np.arange(M) % 3, np.arange(M), 1.0 / 3.0, (3, M))
MIXED = sparse_map([0, 0, 1, 2, 2], [0, 3, 1, 2, 0], [0.3, 0.7, 1.0, 2.0, -1.0], (3, N))
MASK = np.array([True, False, True, False])

Function = Callable[[Number, Number], Number]

FUNCTIONS: dict[str, Function] = {
    "sum": lambda x, y: x + y - 2.0 * x + 1.0,
    "constants": lambda x, y: VALUE + x * OTHER - y / VALUE - (OTHER - x) + (2.0 - y) + -x,
    "product of gathered": lambda x, y: gather(x, INDEX) * gather(y, INDEX) / gather(x * y, BACKWARD),
    "regrouped products": lambda x, y: (
        (gather(x, BACKWARD) * gather(x, INDEX)) * gather(y, INDEX)
        + (gather(x, BACKWARD) / gather(x, INDEX)) * gather(y, INDEX)
        + (gather(x, BACKWARD) * gather(x, INDEX)) / gather(y, INDEX)
        + (gather(x, BACKWARD) / gather(x, INDEX)) / gather(y, INDEX)
    ),
    "factors": lambda x, y: (
        WEIGHT * gather(x, INDEX) * (4.0 * gather(y, BACKWARD)) / (3.0 * gather(x, BACKWARD))
    ),
    "functions": lambda x, y: (
        np.sqrt(gather(x, INDEX)) + np.exp(-gather(y, INDEX)) + np.log(gather(x, BACKWARD))
    ),
    "powers": lambda x, y: x**2 + y**4 + x**1.5 + 1.0 / y + 2.0 / (3.0 * x),
    "quadratic inverse": lambda x, y: 2.0 * y / (gather(x, np.arange(N)) + np.sqrt(x**2 + 4.0 * x * y)),
    "maps": lambda x, y: linear_map(MEAN, WEIGHT * gather(x, INDEX)) + linear_map(MIXED, x * y),
    "map of a map": lambda x, y: linear_map(
        sparse_map([0, 1], [2, 0], 1.0, (2, 3)), linear_map(MIXED, x + y)
    ),
    "less its own map": lambda x, y: (x * y) - linear_map(sparse_map([0], [1], 0.5, (N, N)), x * y),
    "empty map": lambda x, y: x + linear_map(sparse_map([], [], 1.0, (N, N)), y),
    "map with an empty row": lambda x, y: linear_map(sparse_map([0, 2], [1, 3], 2.0, (3, N)), x + y),
    "select": lambda x, y: select(MASK, x * y, x / y) + select(~MASK, y, OTHER),
    "chain": lambda x, y: chain(gather(x, INDEX), lambda v: (np.sin(v), np.cos(v))) * gather(y, INDEX),
    "chain of each": lambda x, y: (
        chain_each(x, lambda v, e: (v * OTHER[e], np.broadcast_to(OTHER[e], v.shape))) + y
    ),
    "unknown": lambda x, y: known_where(lambda v: v > 1.5, gather(x, INDEX)) * gather(y, INDEX),
    "without slope": lambda x, y: without_slope(x) * y,
    "used twice": lambda x, y: (x + y) * (x + y) + np.sqrt(x + y),
}


def replayed(function: Function, rows: np.ndarray | None = None) -> tuple[np.ndarray, np.ndarray]:
    """The function's values by replay, and for plain arrays; (n, CHUNK) each."""
    errors = UnitErrors(ERRORS)
    x, y = (VALUE + map_linearly(JACOBIAN, errors), OTHER + map_linearly(OTHER_JACOBIAN, errors))
    record = function(x, y)
    assert isinstance(record, Recorded)
    wanted = np.arange(len(record)) if rows is None else rows
    needs = Needs([(record, wanted)])
    columns = needs.rows[id(errors)]
    normals = aligned(len(columns), CHUNK)
    program = Program([(record, wanted)], needs, errors, np.arange(len(columns)), normals)
    drawn = np.random.default_rng(1).standard_normal((ERRORS, CHUNK))
    found = None
    for _ in range(2):  # a second time in the same buffers
        normals[...] = drawn[columns]
        with np.errstate(invalid="ignore"):
            program.run()
        again = program.results[0].copy()
        assert found is None or np.array_equal(found, again, equal_nan=True)
        found = again
    plain = function((VALUE[:, None] + JACOBIAN @ drawn).T, (OTHER[:, None] + OTHER_JACOBIAN @ drawn).T)
    assert found is not None
    return found, nominal(plain).T[wanted]


@pytest.mark.parametrize("name", FUNCTIONS)
def test_replay_gives_what_the_function_gives(name: str) -> None:
    found, expected = replayed(FUNCTIONS[name])
    np.testing.assert_allclose(found, expected, rtol=1e-13, atol=1e-13)


@pytest.mark.parametrize("name", ["maps", "map with an empty row"])
def test_maps_need_nothing_but_public_names(name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    expected, _ = replayed(FUNCTIONS[name])
    monkeypatch.setitem(sys.modules, "scipy.sparse._sparsetools", None)
    np.testing.assert_array_equal(replayed(FUNCTIONS[name])[0], expected)


@pytest.mark.parametrize("name", FUNCTIONS)
def test_some_elements_alone_are_the_same(name: str) -> None:
    found, expected = replayed(FUNCTIONS[name], np.array([0, 2]) if name != "map of a map" else np.array([1]))
    np.testing.assert_allclose(found, expected, rtol=1e-13, atol=1e-13)


@pytest.mark.parametrize("name", FUNCTIONS)
def test_derivatives_agree_with_small_errors(name: str) -> None:
    """The fourth kind of number obeys the third: first order in errors of 1e-6."""
    function, step = FUNCTIONS[name], 1e-6
    linear = function(Linearised(VALUE, JACOBIAN), Linearised(OTHER, OTHER_JACOBIAN))
    assert isinstance(linear, Linearised)
    if name == "without slope":  # that is what it leaves out
        return
    for column in range(ERRORS):
        e = np.zeros(ERRORS)
        e[column] = step
        up = nominal(function(VALUE + JACOBIAN @ e, OTHER + OTHER_JACOBIAN @ e))
        down = nominal(function(VALUE - JACOBIAN @ e, OTHER - OTHER_JACOBIAN @ e))
        slope = linear.jacobian.toarray()[:, column]
        held = np.isfinite(up)
        np.testing.assert_allclose(((up - down) / (2 * step))[held], slope[held], rtol=1e-6, atol=1e-8)


def test_only_errors_that_are_needed_are_asked_for() -> None:
    errors = UnitErrors(ERRORS)
    x = VALUE + map_linearly(JACOBIAN, errors)
    needs = Needs([(gather(x, INDEX), np.array([1, 3]))])  # type: ignore[list-item] # Recorded here
    assert needs.rows[id(errors)].tolist() == [1, 3, 4]


def test_constant_factors_are_moved_into_maps() -> None:
    errors = UnitErrors(ERRORS)
    x = VALUE + map_linearly(JACOBIAN, errors)
    mapped = linear_map(MEAN, WEIGHT * gather(x * x, INDEX))
    assert isinstance(mapped, Mapped)
    assert isinstance(mapped.source, Elementwise)
    assert mapped.source.count == N


def test_functions_are_evaluated_before_elements_are_repeated() -> None:
    errors = UnitErrors(ERRORS)
    x = VALUE + map_linearly(JACOBIAN, errors)
    root = np.sqrt(gather(x, INDEX))
    assert isinstance(root, Picked)
    assert root.source.count == N


def test_a_recorded_number_has_no_value() -> None:
    with pytest.raises(TypeError, match="no value"):
        nominal(UnitErrors(3))


def test_comparisons_are_refused() -> None:
    with pytest.raises(TypeError):
        UnitErrors(3) > 1.0  # noqa: B015 # type: ignore[operator]


def test_buffers_start_where_the_processor_likes_it() -> None:
    assert all(aligned(rows, 8).ctypes.data % 64 == 0 for rows in range(1, 9))
