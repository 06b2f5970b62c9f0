"""Repeats, sharings and budgets to their edges: single repeats, blocks without errors, sources without variance."""

from __future__ import annotations

import dataclasses
import math

import numpy as np
import pytest

from coulombook.uncertainty.budget import budget
from coulombook.uncertainty.errors import Block, Correlated, Declaration, Source, build_inputs
from coulombook.uncertainty.linearised import Linearised, covariance, sparse_map
from coulombook.uncertainty.scatter import pool

GROUP = np.array([2, 0, 0, 2, 1, 0, 2])
VALUES = np.array([1.0, 4.0, 5.0, 2.0, 9.0, 9.0, 6.0])


def test_groups_are_pooled_wherever_their_repeats_stand() -> None:
    rng = np.random.default_rng(2)
    jacobian = rng.normal(scale=0.5, size=(7, 4))
    x = Linearised(VALUES, sparse_map(*np.indices((7, 4)).reshape(2, -1), jacobian.ravel(), (7, 4)))
    found = pool(x, GROUP, 3)
    assert isinstance(found.mean, Linearised)
    c = jacobian @ jacobian.T
    for group in range(3):
        held = np.flatnonzero(group == GROUP)
        m = len(held)
        assert found.count[group] == m
        assert found.mean.value[group] == pytest.approx(VALUES[held].mean())
        own = c[np.ix_(held, held)]
        assert covariance(found.mean)[group, group] == pytest.approx(own.sum() / m**2)
        np.testing.assert_allclose(found.residual[held], VALUES[held] - VALUES[held].mean())
        if m == 1:
            assert math.isnan(found.deviation[group])
            assert found.explained[group] == 0.0
            assert found.unexplained[group] == 0.0
            continue
        s2 = VALUES[held].var(ddof=1)
        explained = np.diag(own).mean() - own[~np.eye(m, dtype=bool)].mean()
        assert found.deviation[group] == pytest.approx(s2**0.5)
        assert found.explained[group] == pytest.approx(explained)
        assert found.unexplained[group] == pytest.approx(max(s2 - explained, 0.0))


def test_plain_repeats_explain_nothing() -> None:
    found = pool(VALUES, GROUP, 3)
    assert found.explained.tolist() == [0.0, 0.0, 0.0]
    assert found.count.tolist() == [3.0, 1.0, 3.0]
    assert found.unexplained == pytest.approx([7.0, 0.0, 7.0])


def _block(**changes: object) -> Block:
    plain = Block("flow", "inlet flow", np.array([10.0, -20.0, np.nan, 0.0]), np.array([0, 1, 1, 5]))
    return dataclasses.replace(plain, **changes)  # type: ignore[arg-type] # fields of a Block


def _jacobian(block: Block, *declared: Declaration) -> np.ndarray:
    number = build_inputs([block], declared).numbers["flow"]
    assert isinstance(number, Linearised)
    return number.jacobian.toarray()


def test_a_relative_error_keeps_the_sign_and_leaves_out_what_is_unknown_or_zero() -> None:
    assert _jacobian(_block(), Declaration("inlet flow", 0.1, None, "day")).tolist() == [
        [1.0],
        [-2.0],
        [0.0],
        [0.0],
    ]
    by_run = _jacobian(_block(), Declaration("inlet flow", 0.1, None, "run"))
    assert by_run.tolist() == [[1.0, 0.0], [0.0, -2.0], [0.0, 0.0], [0.0, 0.0]]
    by_reading = _jacobian(_block(), Declaration("inlet flow", 0.1, None, "reading"))
    assert by_reading.tolist() == [[1.0, 0.0], [0.0, -2.0], [0.0, 0.0], [0.0, 0.0]]


def test_an_absolute_error_moves_every_value_alike_unless_the_block_says_otherwise() -> None:
    assert _jacobian(_block(), Declaration("inlet flow", None, 0.3, "day")).ravel().tolist() == [0.3] * 4
    chosen = _block(per_absolute=np.array([1.0, 0.0, 2.0, -1.0]))
    assert _jacobian(chosen, Declaration("inlet flow", None, 0.5, "day")).ravel().tolist() == [
        0.5,
        0.0,
        1.0,
        -0.5,
    ]
    relative = _block(per_relative=np.array([0.0, 1.0, 2.0, 3.0]))
    assert _jacobian(relative, Declaration("inlet flow", 0.1, None, "day")).ravel() == pytest.approx(
        [0.0, 0.1, 0.2, 0.3]
    )


def test_runs_share_an_error_over_all_blocks_of_a_quantity() -> None:
    blocks = [
        Block("one", "volume", np.array([1.0, 2.0]), np.array([7, 3])),
        Block("two", "volume", np.array([4.0, 8.0]), np.array([3, 9])),
        Block("other", "aliquot", np.array([5.0]), np.array([7])),
    ]
    inputs = build_inputs(blocks, [Declaration("volume", 1.0, None, "run")])
    # runs 3, 7 and 9 in this order
    assert inputs.numbers["one"].jacobian.toarray().tolist() == [[0.0, 1.0, 0.0], [2.0, 0.0, 0.0]]  # type: ignore[union-attr] # it is moved
    assert inputs.numbers["two"].jacobian.toarray().tolist() == [[4.0, 0.0, 0.0], [0.0, 0.0, 8.0]]  # type: ignore[union-attr] # it is moved
    assert inputs.numbers["other"].tolist() == [5.0]  # type: ignore[union-attr] # a plain array
    assert inputs.sources == (Source("volume", "run"),) * 3


def test_readings_of_two_blocks_share_nothing() -> None:
    blocks = [Block(name, "volume", np.array([1.0, 2.0]), np.array([0, 1])) for name in ("one", "two")]
    inputs = build_inputs(blocks, [Declaration("volume", 1.0, None, "reading")])
    assert len(inputs.sources) == 4
    first, second = (inputs.numbers[name].jacobian.toarray() for name in ("one", "two"))  # type: ignore[union-attr] # both are moved
    assert (first @ second.T).tolist() == [[0.0, 0.0], [0.0, 0.0]]


def test_a_declaration_that_moves_nothing_says_so_and_takes_no_column() -> None:
    declared = [
        Declaration("outlet flow", 0.1, None, "day"),
        Declaration("inlet flow", None, None, "day"),
        Declaration("inlet flow", 0.0, None, "run"),
        Declaration("inlet flow", 0.1, None, "reading"),
        Declaration("inlet flow", 0.1, None, "day"),
    ]
    inputs = build_inputs([_block(sharings=("day", "run"))], declared)
    assert inputs.moved == (False, False, False, False, True)
    assert inputs.sources == (Source("inlet flow", "day"),)


def test_reserved_columns_come_last_and_are_empty() -> None:
    kept = [(Source("injection scatter", "reading"), 2), (Source("vial scatter", "reading"), 3)]
    factor = np.array([[0.0, 1.0], [2.0, 0.0]])
    group = Correlated(Source("curve", "day"), (("flow", 0), ("flow", 3)), factor)
    inputs = build_inputs([_block()], [Declaration("inlet flow", 0.1, None, "day")], [group], kept)
    assert inputs.reserved == (3, 5)
    assert [one.name for one in inputs.sources] == ["inlet flow", "curve", "curve"] + [
        "injection scatter"
    ] * 2 + ["vial scatter"] * 3
    number = inputs.numbers["flow"]
    assert isinstance(number, Linearised)
    expected = np.zeros((4, 8))
    expected[0, :3] = 1.0, 0.0, 1.0
    expected[1, 0] = -2.0
    expected[3, 1] = 2.0
    assert number.jacobian.toarray().tolist() == expected.tolist()


def test_draws_move_each_block_by_its_own_errors() -> None:
    still = Block("still", "aliquot", np.array([3.0, 4.0]), np.array([0, 1]))
    moving = Block("flow", "inlet flow", np.array([10.0, 20.0]), np.array([0, 1]))
    inputs = build_inputs([still, moving], [Declaration("inlet flow", 0.1, None, "run")])
    drawn = inputs.draw(np.array([[1.0, 0.0], [0.0, -1.0], [2.0, 3.0]]))
    assert drawn["flow"].tolist() == [[11.0, 20.0], [10.0, 18.0], [12.0, 26.0]]
    assert drawn["still"].tolist() == [[3.0, 4.0]] * 3


def test_shares_are_those_of_each_output_and_zero_where_there_is_no_finite_variance() -> None:
    jacobian = sparse_map([0, 0, 1, 2, 2], [0, 2, 1, 0, 1], [3.0, 4.0, 2.0, np.inf, 1.0], (4, 3))
    one, two = Source("a", "day"), Source("b", "run")
    found = budget(Linearised(np.ones(4), jacobian), [one, two, two])
    assert found.sources == (one, two)
    assert found.u.tolist() == [[3.0, 4.0], [0.0, 2.0], [np.inf, 1.0], [0.0, 0.0]]
    assert found.share == pytest.approx(np.array([[0.36, 0.64], [0.0, 1.0], [0.0, 0.0], [0.0, 0.0]]))
    # a source of the same name that is shared otherwise is another source
    assert budget(Linearised(np.ones(4), jacobian), [one, Source("a", "run"), two]).u.shape == (4, 3)
