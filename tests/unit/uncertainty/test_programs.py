"""Programs of a record: drawn at random they give what plain arithmetic gives, and they hold no more than they need."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from coulombook.uncertainty.linearised import (
    Number,
    chain,
    chain_each,
    gather,
    known_where,
    linear_map,
    select,
    sparse_map,
)
from coulombook.uncertainty.recorded import (
    Applied,
    Elementwise,
    Mapped,
    Picked,
    Recorded,
    Selected,
    UnitErrors,
    map_linearly,
    pick,
)
from coulombook.uncertainty.replay import Needs, Program, aligned

ERRORS, CHUNK = 5, 8
FloatArray = np.ndarray


def compiled(
    outputs: list[tuple[Recorded, np.ndarray]], errors: UnitErrors, chunk: int = CHUNK, seed: int = 3
) -> tuple[Program, FloatArray]:
    """A program, its normals filled in a scrambled order, and the normals of all errors (ERRORS, chunk)."""
    needs = Needs(outputs)
    columns = needs.rows.get(id(errors), np.zeros(0, dtype=np.intp))
    rng = np.random.default_rng(seed)
    drawn = rng.standard_normal((errors.count, chunk))
    # a row more than is needed, in another order than that of the errors
    place = rng.permutation(len(columns) + 1)[: len(columns)]
    normals = aligned(len(columns) + 1, chunk)
    normals[...] = np.nan
    normals[place] = drawn[columns]
    return Program(outputs, needs, errors, place, normals), drawn


class Pair:
    """A recorded number beside the plain draws (n, CHUNK) it must stand for."""

    def __init__(self, recorded: Recorded, plain: FloatArray) -> None:
        self.recorded = recorded
        self.plain = plain
        assert len(recorded) == len(plain)

    def __len__(self) -> int:
        return len(self.plain)


def _both(function: Callable[..., Number], *pairs: Pair) -> Pair | None:
    """A function of pairs; None where it is no longer recorded."""
    recorded = function(*(one.recorded for one in pairs))
    if not isinstance(recorded, Recorded):
        return None
    plain = function(*(one.plain.T for one in pairs))
    return Pair(recorded, np.asarray(plain).T)


class Drawing:
    """Draws numbers at random from those there are, keeping all of them near one."""

    def __init__(self, seed: int) -> None:
        self.rng = np.random.default_rng(seed)
        self.errors = UnitErrors(ERRORS)
        self.drawn = np.random.default_rng(3).standard_normal((ERRORS, CHUNK))
        self.pairs: list[Pair] = []
        for n in (3, 5):
            self.pairs.append(self._source(n))
            self.pairs.append(self._source(n))

    def _source(self, n: int) -> Pair:
        base = self.rng.uniform(0.8, 1.2, n)
        jacobian = sparse_map(
            np.arange(n), self.rng.integers(0, ERRORS, n), self.rng.uniform(0.01, 0.05, n), (n, ERRORS)
        )
        moved = map_linearly(jacobian, self.errors)
        assert isinstance(moved, Recorded)
        return Pair(base + moved, base[:, None] + jacobian @ self.drawn)

    def one(self, n: int | None = None) -> Pair:
        held = [one for one in self.pairs if n is None or len(one) == n]
        # the last ones more often: a record has depth
        return held[-1 - min(int(self.rng.geometric(0.3)) - 1, len(held) - 1)]

    def constant(self, n: int) -> FloatArray | float:
        kind = self.rng.integers(0, 4)
        if kind == 0:
            return (1.0, 2.0, 0.5)[self.rng.integers(0, 3)]
        return self.rng.uniform(0.5, 1.5, n) if kind > 1 else np.full(n, 1.0)

    def step(self) -> None:
        rng = self.rng
        x = self.one()
        n = len(x)
        y = self.one(n)
        c = self.constant(n)
        m = int(rng.integers(1, 7))
        index = rng.integers(0, n, m) if rng.random() < 0.7 else np.arange(n)
        if rng.random() < 0.2:
            index = index - n  # counted from the end
        if rng.random() < 0.3:
            index = np.arange(n)[int(rng.integers(0, n)) :]
        mask = rng.random(n) < rng.choice([0.0, 0.5, 1.0])
        rows = int(rng.integers(1, 4))
        weights = np.where(rng.random(n) < 0.3, 1.0, rng.uniform(0.2, 1.0, n))
        gathering = sparse_map(np.arange(n), rng.integers(0, n, n), weights, (n, n))
        summing = sparse_map(rng.integers(0, rows, n), np.arange(n), 1.0 / n, (rows, n))
        partly = sparse_map([0, n - 1], [0, n - 1], [0.25, 0.5], (n, n))
        both = np.full(n, 0.25)
        functions: list[tuple[Callable[..., Number], tuple[Pair, ...]]] = [
            (lambda a, b: a + b, (x, y)),
            (lambda a, b: a - 0.5 * b, (x, y)),
            (lambda a, b: a * b, (x, y)),
            (lambda a, b: a / b, (x, y)),
            (lambda a: a + c, (x,)),
            (lambda a: c + a, (x,)),
            (lambda a: a - c, (x,)),
            (lambda a: c - a, (x,)),
            (lambda a: a * c, (x,)),
            (lambda a: c * a, (x,)),
            (lambda a: a / c, (x,)),
            (lambda a: c / a, (x,)),
            (lambda a: a + 0.0, (x,)),
            (lambda a: 0.0 - a, (x,)),
            (lambda a: -a, (x,)),
            (lambda a: a**2, (x,)),
            (lambda a: a**4, (x,)),
            (lambda a: (a * a) ** 0.5, (x,)),
            (lambda a: np.sqrt(a * a), (x,)),
            (lambda a: np.exp(0.2 * a), (x,)),
            (lambda a: np.log(a * a + 1.0), (x,)),
            (lambda a: gather(a, index), (x,)),
            (lambda a: gather(a, index) * gather(a, index[::-1]), (x,)),
            (lambda a, b: gather(a, index) * gather(b, index), (x, y)),
            (lambda a, b: gather(a, index) / gather(b, index), (x, y)),
            (lambda a, b: gather(a, index) - gather(b, index), (x, y)),
            (lambda a, b: (a / gather(b, np.arange(n))) * b, (x, y)),
            (lambda a: linear_map(gathering, a), (x,)),
            (lambda a: linear_map(summing, a), (x,)),
            (lambda a: linear_map(summing, both * a), (x,)),
            (lambda a: a + linear_map(partly, a), (x,)),
            (lambda a: a - linear_map(partly, a), (x,)),
            (lambda a: linear_map(gathering, a) + linear_map(partly, a), (x,)),
            (lambda a: linear_map(gathering, linear_map(gathering, a)), (x,)),
            (lambda a: linear_map(partly, a + c), (x,)),
            (lambda a, b: select(mask, a, b), (x, y)),
            (lambda a: select(mask, a, both), (x,)),
            (lambda a: select(mask, both, a), (x,)),
            (lambda a: chain(a, lambda v: (np.sin(v), np.cos(v))), (x,)),
            (lambda a: chain_each(a, lambda v, e: (v * both[e] + e, both[e])), (x,)),
            (lambda a: known_where(lambda v: v > -1e9, a), (x,)),
        ]
        function, arguments = functions[rng.integers(0, len(functions))]
        found = _both(function, *arguments)
        if found is None or not np.isfinite(found.plain).all():
            return
        if np.abs(found.plain).max() > 50.0 or np.abs(found.plain).min() < 1e-3:
            return  # what divides by it would tell rounding from rounding
        self.pairs.append(found)


@pytest.mark.parametrize("seed", range(150))
def test_a_record_drawn_at_random_is_replayed_as_it_was_computed(seed: int) -> None:
    drawing = Drawing(seed)
    for _ in range(40):
        drawing.step()
    chosen = drawing.pairs[4::3] + drawing.pairs[-2:]
    rows = [
        np.sort(drawing.rng.choice(len(one), drawing.rng.integers(1, len(one) + 1), replace=False))
        for one in chosen
    ]
    program, drawn = compiled(
        [(one.recorded, held) for one, held in zip(chosen, rows, strict=True)], drawing.errors
    )
    np.testing.assert_array_equal(drawn, drawing.drawn)
    for _ in range(2):  # again in the same buffers
        program.run()
        for one, held, result in zip(chosen, rows, program.results, strict=True):
            assert len(result) == len(held)
            # a chain of forty steps, some of which divide by a thousandth
            np.testing.assert_allclose(result, one.plain[held], rtol=1e-8, atol=1e-8)


def number(n: int = 4, seed: int = 1) -> tuple[Recorded, UnitErrors]:
    errors = UnitErrors(ERRORS)
    rng = np.random.default_rng(seed)
    jacobian = sparse_map(np.arange(n), np.arange(n) % ERRORS, rng.uniform(0.1, 0.2, n), (n, ERRORS))
    return rng.uniform(1.0, 2.0, n) + map_linearly(jacobian, errors), errors  # type: ignore[return-value] # it has rows


def pair(n: int = 4) -> tuple[Recorded, Recorded, UnitErrors]:
    errors = UnitErrors(ERRORS)
    found = []
    for seed in (1, 2):
        rng = np.random.default_rng(seed)
        jacobian = sparse_map(np.arange(n), (np.arange(n) + seed) % ERRORS, 0.1, (n, ERRORS))
        found.append(rng.uniform(1.0, 2.0, n) + map_linearly(jacobian, errors))
    return found[0], found[1], errors  # type: ignore[return-value] # they have rows


INDEX = np.array([0, 1, 2, 3, 3, 2, 1, 0, 0])
BACKWARD = np.array([3, 2, 1, 0, 0, 1, 2, 3, 3])


# what a constant costs: applied to few elements, not to the many that repeat them


def test_whole_numbers_and_ones_cost_nothing() -> None:
    x, _ = number()
    assert x + 0.0 is x
    assert x - 0.0 is x
    assert 0.0 + x is x
    assert (0.0 - x) is not x
    assert x * 1.0 is x
    assert x / 1.0 is x
    assert pick(x, np.arange(4)) is x
    assert isinstance(x * np.ones(4), Picked)  # as an array it stays, for its elements might differ


def test_elements_of_elements_are_taken_from_the_first() -> None:
    x, _ = number()
    twice = pick(pick(x, INDEX), np.array([8, 4, -1]))
    assert isinstance(twice, Picked)
    assert twice.source is x
    assert twice.index.tolist() == [0, 3, 0]
    assert twice.weight is None


def test_factors_of_factors_are_one_factor() -> None:
    x, _ = number()
    weighted = np.arange(1.0, 5.0) * x * np.array([2.0, 3.0, 4.0, 5.0])
    assert isinstance(weighted, Picked)
    assert weighted.source is x
    assert weighted.weight is not None
    assert weighted.weight.tolist() == [2.0, 6.0, 12.0, 20.0]
    taken = pick(weighted, np.array([3, 0]))
    assert isinstance(taken, Picked)
    assert taken.source is x
    assert taken.weight is not None
    assert taken.weight.tolist() == [20.0, 2.0]


def test_a_single_factor_is_applied_before_elements_are_repeated() -> None:
    x, _ = number()
    for found in (2.0 * pick(x, INDEX), pick(x, INDEX) + 2.0, 2.0 - pick(x, INDEX), -pick(x, INDEX)):
        assert isinstance(found, Picked)
        assert found.weight is None
        assert len(found.source) == 4
    # elements that are fewer than their source have nothing to gain
    few = pick(x, np.array([1])) + 2.0
    assert isinstance(few, Elementwise)
    assert few.count == 1


def test_numbers_gathered_alike_are_combined_before() -> None:
    x, y, _ = pair()
    for found in (
        pick(x, INDEX) * pick(y, INDEX),
        pick(x, INDEX) / pick(y, INDEX.copy()),
        pick(x, INDEX) + pick(y, INDEX),
        pick(x, INDEX) - pick(y, INDEX),
    ):
        assert isinstance(found, Picked)
        assert isinstance(found.source, Elementwise)
        assert found.source.count == 4
    other = pick(x, INDEX) * pick(y, BACKWARD)
    assert isinstance(other, Elementwise)
    assert other.count == 9


@pytest.mark.parametrize(
    ("first", "second", "outer", "inner", "swapped"),
    [
        (np.multiply, np.multiply, np.multiply, np.multiply, False),
        (np.true_divide, np.multiply, np.multiply, np.true_divide, True),
        (np.multiply, np.true_divide, np.multiply, np.true_divide, False),
        (np.true_divide, np.true_divide, np.true_divide, np.multiply, False),
    ],
)
def test_factors_gathered_alike_are_combined_first(
    first: np.ufunc, second: np.ufunc, outer: np.ufunc, inner: np.ufunc, swapped: bool
) -> None:
    x, y, _ = pair()
    a, g, b = pick(x, BACKWARD), pick(y, INDEX), pick(x, INDEX)
    found = second(first(a, g), b)
    assert isinstance(found, Elementwise)
    assert found.function is outer
    assert found.arguments[0] is a
    together = found.arguments[1]
    assert isinstance(together, Picked)
    assert isinstance(together.source, Elementwise)
    assert together.source.count == 4
    assert together.source.function is inner
    assert together.source.arguments == ((x, y) if swapped else (y, x))


def test_constant_factors_leave_products_and_quotients() -> None:
    x, y, _ = pair()
    two, three = np.full(4, 2.0), np.array([3.0, 4.0, 5.0, 6.0])
    for found, factor in (
        ((two * x) * (three * y), 2.0 * three),
        ((two * x) / (three * y), 2.0 / three),
        (1.0 / (three * y), 1.0 / three),
        (three / (two * y), three / 2.0),
    ):
        assert isinstance(found, Picked)
        assert found.weight is not None
        np.testing.assert_allclose(found.weight, factor, rtol=1e-15)
        assert isinstance(found.source, Elementwise)


def test_squares_are_multiplied_and_not_raised() -> None:
    x, _ = number()
    square, fourth, cube = x**2, x**4, x**3
    assert isinstance(square, Elementwise)
    assert (square.function, square.arguments) == (np.square, (x,))
    assert isinstance(fourth, Elementwise)
    assert fourth.function is np.square
    assert fourth.arguments[0].function is np.square
    assert isinstance(cube, Elementwise)
    assert (cube.function, cube.arguments) == (np.power, (x, 3))


def test_maps_that_only_move_become_elements() -> None:
    x = number()[0] ** 2  # no sum, through which a map would go
    moved = map_linearly(sparse_map([0, 1, 2], [3, 0, 0], 1.0, (3, 4)), x)
    assert isinstance(moved, Picked)
    assert (moved.index.tolist(), moved.weight) == ([3, 0, 0], None)
    scaled = map_linearly(sparse_map([0, 1], [2, 1], [1.0, 2.0], (2, 4)), x)
    assert isinstance(scaled, Picked)
    assert scaled.weight is not None
    assert scaled.weight.tolist() == [1.0, 2.0]
    nothing = map_linearly(sparse_map([], [], 1.0, (3, 4)), x)
    assert isinstance(nothing, np.ndarray)
    assert nothing.tolist() == [0.0, 0.0, 0.0]


def test_a_map_of_gathered_elements_is_one_of_their_source() -> None:
    x, _ = number()
    summed = map_linearly(sparse_map([0] * 9, np.arange(9), 1.0, (1, 9)), 2.0 * np.ones(9) * pick(x, INDEX))
    assert isinstance(summed, Mapped)
    assert summed.source is x
    # 0 stands thrice in INDEX, the others twice
    assert summed.matrix.toarray().tolist() == [[6.0, 4.0, 4.0, 4.0]]


def test_a_moved_map_is_one_map() -> None:
    x, _ = number()
    summed = map_linearly(sparse_map([0, 0, 1, 1], [0, 1, 2, 3], 1.0, (2, 4)), x)
    assert isinstance(summed, Mapped)
    moved = map_linearly(sparse_map([0, 1], [1, 0], [1.0, 2.0], (2, 2)), summed)
    assert isinstance(moved, Mapped)
    assert moved.source is x
    assert moved.matrix.toarray().tolist() == [[0.0, 0.0, 1.0, 1.0], [2.0, 2.0, 0.0, 0.0]]
    weighted = summed * np.array([3.0, 5.0])
    assert isinstance(weighted, Mapped)
    assert weighted.matrix.toarray().tolist() == [[3.0, 3.0, 0.0, 0.0], [0.0, 0.0, 5.0, 5.0]]
    again = map_linearly(sparse_map([0, 0], [0, 1], 1.0, (1, 2)), summed)
    assert isinstance(again, Mapped)
    assert again.source is summed


def test_a_number_and_its_own_map_become_one_map() -> None:
    x, y, _ = pair()
    x = x * y
    half = map_linearly(sparse_map([0, 1, 1], [1, 0, 2], 0.5, (4, 4)), x)
    other = map_linearly(sparse_map([0, 0, 3], [0, 2, 3], 0.25, (4, 4)), x)
    assert isinstance(half, Mapped)
    assert isinstance(other, Mapped)
    dense = half.matrix.toarray()
    for found, expected in (
        (x + half, np.eye(4) + dense),
        (x - half, np.eye(4) - dense),
        (half + other, dense + other.matrix.toarray()),
        (half - other, dense - other.matrix.toarray()),
    ):
        assert isinstance(found, Mapped)
        assert found.source is x
        np.testing.assert_allclose(found.matrix.toarray(), expected)
    assert isinstance(half + map_linearly(sparse_map([0, 0], [0, 1], 1.0, (4, 4)), y), Elementwise)


def test_functions_of_many_are_evaluated_for_few() -> None:
    x, _ = number()
    known = known_where(lambda v: v > 1.0, pick(x, INDEX))  # type: ignore[arg-type] # a Recorded is a number
    assert isinstance(known, Picked)
    assert isinstance(known.source, Applied)
    assert known.source.count == 4
    assert not known.source.differs
    each = chain_each(pick(x, INDEX), lambda v, e: (v, v))  # type: ignore[arg-type] # a Recorded is a number
    assert isinstance(each, Applied)
    assert each.differs


def test_what_no_rule_knows_is_refused() -> None:
    x, _ = number()
    with pytest.raises(TypeError):
        np.cos(x)  # type: ignore[call-overload] # on purpose
    with pytest.raises(TypeError):
        np.add.reduce(x)  # type: ignore[arg-type] # on purpose
    with pytest.raises(TypeError):
        np.add(x, 1.0, out=np.zeros(4))  # type: ignore[call-overload] # on purpose
    errors = UnitErrors(1)
    stranger = type("Stranger", (Recorded,), {})()
    stranger.count = 1
    with pytest.raises(TypeError, match="Stranger cannot be replayed"):
        Program(
            [(stranger, np.array([0]))],
            Needs([(stranger, np.array([0]))]),
            errors,
            np.zeros(0, int),
            aligned(1, 2),
        )


# what a program holds: one buffer for each number that is alive at a time, and nothing twice


def buffers(program: Program) -> set[int]:
    """Where the memory of all that the steps write begins."""
    found = set()
    for function, arguments in program._steps:
        written = (
            arguments[2] if isinstance(getattr(function, "__self__", None), np.ndarray) else arguments[-1]
        )
        assert isinstance(written, np.ndarray)
        found.add(written.__array_interface__["data"][0])
    return found


def test_a_chain_of_steps_works_in_one_buffer() -> None:
    x, errors = number()
    y = x * x
    for _ in range(6):
        y = np.sqrt(y + 1.0)
    program, _ = compiled([(y, np.arange(4))], errors)
    # x from the errors and its product with itself; all else is written over what it comes from
    assert len(buffers(program)) <= 2


def test_a_number_that_is_read_again_keeps_its_buffer() -> None:
    x, errors = number()
    kept = x * x
    y = kept
    for _ in range(6):
        y = np.sqrt(y + 1.0)
    late = y * kept
    program, _ = compiled([(late, np.arange(4)), (kept, np.arange(4))], errors)
    program.run()
    first, second = (one.copy() for one in program.results)
    expected = np.sqrt(second + 1.0)
    for _ in range(5):
        expected = np.sqrt(expected + 1.0)
    np.testing.assert_allclose(first, expected * second, rtol=1e-14)
    assert len(buffers(program)) <= 3


def test_the_same_step_is_laid_out_once() -> None:
    x, errors = number()
    once, _ = compiled([(np.sqrt(x), np.arange(4))], errors)
    # three equal records, as a measurement function writes them down again and again
    both, _ = compiled([(one, np.arange(4)) for one in (np.sqrt(x), np.sqrt(x), np.sqrt(x))], errors)
    assert len(both._steps) == len(once._steps)
    assert both.results[0] is both.results[1]
    apart, _ = compiled([(np.sqrt(x), np.arange(4)), (np.exp(x), np.arange(4))], errors)
    assert len(apart._steps) == len(once._steps) + 1
    taken, _ = compiled([(pick(x, INDEX[3:]) * BACKWARD[3:], np.arange(6)) for _ in range(3)], errors)
    single, _ = compiled([(pick(x, INDEX[3:]) * BACKWARD[3:], np.arange(6))], errors)
    assert len(taken._steps) == len(single._steps)


def test_other_factors_of_the_same_elements_are_other_numbers() -> None:
    x, errors = number()
    outputs = [
        (np.array(factor) * pick(x, np.array([2, 0])), np.arange(2))
        for factor in ([2.0, 3.0], [3.0, 2.0], [1.0, 1.0])
    ]
    program, _ = compiled(outputs, errors)
    program.run()
    plain = program.results[2]
    np.testing.assert_allclose(program.results[0], np.array([[2.0], [3.0]]) * plain, rtol=1e-15)
    np.testing.assert_allclose(program.results[1], np.array([[3.0], [2.0]]) * plain, rtol=1e-15)


def test_nothing_is_done_for_elements_that_nobody_wants() -> None:
    x, errors = number()
    wide = pick(x, INDEX) * np.arange(1.0, 10.0) + np.arange(9.0)
    program, _ = compiled([(wide, np.array([2, 5]))], errors)
    for _, arguments in program._steps:
        assert all(
            len(one) <= 2 for one in arguments if isinstance(one, np.ndarray) and one.shape[-1] == CHUNK
        )
    needs = Needs([(wide, np.array([2, 5]))])
    assert needs.rows[id(x)].tolist() == [2]
    assert needs.rows[id(errors)].tolist() == [2]


def test_a_side_that_is_selected_nowhere_is_not_needed() -> None:
    x, y, errors = pair()
    mask = np.array([True, True, False, False])
    chosen = Selected(mask, x, y)
    needs = Needs([(chosen, np.array([0, 1]))])
    assert needs.rows[id(x)].tolist() == [0, 1]
    assert needs.rows[id(y)].tolist() == []
    program, _ = compiled([(chosen, np.array([1, 2]))], errors)
    program.run()
    whole, _ = compiled([(x, np.arange(4)), (y, np.arange(4))], errors)
    whole.run()
    np.testing.assert_array_equal(program.results[0][0], whole.results[0][1])
    np.testing.assert_array_equal(program.results[0][1], whole.results[1][2])
    # one side alone is that side, without a copy
    alone, _ = compiled([(chosen, np.array([0, 1])), (x, np.array([0, 1]))], errors)
    assert alone.results[0] is alone.results[1]


def test_maps_of_one_number_are_multiplied_at_once() -> None:
    x, y, errors = pair()
    z = x * y
    first = map_linearly(sparse_map([0, 0, 1, 1], [0, 1, 2, 3], 1.0, (2, 4)), z)
    second = map_linearly(sparse_map([0, 0, 0], [1, 2, 3], [1.0, 2.0, 3.0], (1, 4)), z)
    assert isinstance(first, Mapped)
    assert isinstance(second, Mapped)
    together, _ = compiled([(first, np.arange(2)), (second, np.arange(1)), (z, np.arange(4))], errors)
    one, _ = compiled([(first, np.arange(2)), (z, np.arange(4))], errors)
    assert len(together._steps) == len(one._steps)
    together.run()
    z_drawn = together.results[2]
    np.testing.assert_allclose(
        together.results[0], [z_drawn[0] + z_drawn[1], z_drawn[2] + z_drawn[3]], rtol=1e-14
    )
    np.testing.assert_allclose(
        together.results[1], [z_drawn[1] + 2.0 * z_drawn[2] + 3.0 * z_drawn[3]], rtol=1e-14
    )


def test_results_of_one_run_are_those_of_its_own_normals() -> None:
    x, errors = number()
    y = np.exp(x) / (x + 3.0)
    program, _ = compiled([(y, np.arange(4))], errors)
    program.run()
    before = program.results[0].copy()
    held = program._errors.held
    held *= 2.0
    program.run()
    assert not np.allclose(program.results[0], before)
    held *= 0.5
    program.run()
    np.testing.assert_array_equal(program.results[0], before)


def test_an_output_without_errors_needs_none() -> None:
    errors = UnitErrors(3)
    x = errors + np.array([1.0, 2.0, 3.0])
    needs = Needs([(x, np.zeros(0, dtype=np.intp))])
    assert needs.rows[id(errors)].tolist() == []
    assert needs.order[0] is errors


@pytest.mark.parametrize(("rows", "columns"), [(1, 1), (3, 5), (7, 8), (2, 64)])
def test_aligned_memory_has_the_shape_asked_for(rows: int, columns: int) -> None:
    held = aligned(rows, columns)
    assert held.shape == (rows, columns)
    assert held.flags.c_contiguous
    assert held.dtype == np.float64
    held[...] = 1.0  # all of it can be written
    assert held.sum() == rows * columns
