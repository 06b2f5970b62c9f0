"""Declared uncertainties become independent errors, shared as declared."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.uncertainty.errors import Block, Correlated, Declaration, Source, build_inputs
from coulombook.uncertainty.linearised import Linearised, covariance

VALUES = np.array([10.0, 20.0, 30.0])
OWNER = np.array([0, 0, 1])


def _covariance(declarations: list[Declaration], block: Block | None = None) -> np.ndarray:
    chosen = block or Block("flow", "inlet flow", VALUES, OWNER)
    number = build_inputs([chosen], declarations).numbers[chosen.name]
    assert isinstance(number, Linearised)
    return covariance(number)


def test_an_error_shared_by_the_day_correlates_all_values_fully() -> None:
    # u = 1 % of 10, 20, 30 is 0.1, 0.2, 0.3, all from one error
    expected = np.outer([0.1, 0.2, 0.3], [0.1, 0.2, 0.3])
    np.testing.assert_allclose(_covariance([Declaration("inlet flow", 0.01, None, "day")]), expected)


def test_an_error_shared_by_a_run_correlates_only_that_run() -> None:
    expected = np.array([[0.01, 0.02, 0.0], [0.02, 0.04, 0.0], [0.0, 0.0, 0.09]])
    np.testing.assert_allclose(_covariance([Declaration("inlet flow", 0.01, None, "run")]), expected)


def test_an_error_of_the_reading_correlates_nothing() -> None:
    np.testing.assert_allclose(
        _covariance([Declaration("inlet flow", None, 2.0, "reading")]), np.eye(3) * 4.0
    )


def test_several_declarations_of_one_quantity_add_in_quadrature() -> None:
    both = [Declaration("inlet flow", None, 3.0, "reading"), Declaration("inlet flow", None, 4.0, "reading")]
    np.testing.assert_allclose(_covariance(both), np.eye(3) * 25.0)


def test_blocks_of_one_quantity_share_the_error_of_the_day() -> None:
    blocks = [
        Block("run area", "electrode area", np.array([1.0]), np.array([0])),
        Block("scan area", "electrode area", np.array([2.0]), np.array([7])),
    ]
    inputs = build_inputs(blocks, [Declaration("electrode area", 0.1, None, "day")])
    ratio = inputs.numbers["scan area"] / inputs.numbers["run area"]
    assert isinstance(ratio, Linearised)
    assert covariance(ratio)[0, 0] == pytest.approx(0.0, abs=1e-30)


def test_a_block_moves_as_it_says() -> None:
    gain = Block("gain", "i", np.zeros(2), np.array([0, 1]), np.ones(2), np.zeros(2), ("day", "run"))
    np.testing.assert_allclose(
        _covariance([Declaration("i", 0.02, None, "day")], gain), np.full((2, 2), 4e-4)
    )
    inputs = build_inputs(
        [gain], [Declaration("i", None, 1e-6, "day"), Declaration("i", 0.02, None, "reading")]
    )
    assert inputs.moved == (False, False)
    assert inputs.numbers["gain"] is gain.values


def test_missing_values_carry_no_error() -> None:
    block = Block("flow", "inlet flow", np.array([np.nan, 5.0]), np.array([0, 1]))
    expected = np.array([[0.0, 0.0], [0.0, 0.25]])
    np.testing.assert_allclose(_covariance([Declaration("inlet flow", 0.1, None, "day")], block), expected)


def test_estimated_errors_keep_their_covariance() -> None:
    blocks = [Block(name, "curve", np.array([1.0]), np.array([0]), sharings=()) for name in ("a0", "a1")]
    factor = np.array([[3.0, 0.0], [-1.0, 2.0]])
    inputs = build_inputs(blocks, [], [Correlated(Source("curve", "day"), (("a0", 0), ("a1", 0)), factor)])
    a0, a1 = inputs.numbers["a0"], inputs.numbers["a1"]
    assert isinstance(a0, Linearised)
    assert isinstance(a1, Linearised)
    assert (a0.jacobian @ a1.jacobian.T).toarray()[0, 0] == pytest.approx(-3.0)
    assert [source.name for source in inputs.sources] == ["curve", "curve"]


def test_draws_have_the_declared_spread_and_sharing() -> None:
    inputs = build_inputs(
        [Block("flow", "inlet flow", VALUES, OWNER)], [Declaration("inlet flow", 0.01, None, "day")]
    )
    normals = np.random.default_rng(5).standard_normal((4000, len(inputs.sources)))
    drawn = inputs.draw(normals)["flow"]
    # sd of an sd from 4,000 draws is 1.1 %; four of them
    np.testing.assert_allclose(drawn.std(axis=0), [0.1, 0.2, 0.3], rtol=0.045)
    np.testing.assert_allclose(np.corrcoef(drawn.T), np.ones((3, 3)))


def test_an_unknown_sharing_is_refused() -> None:
    with pytest.raises(ValueError, match="day, run or reading, not 'week'"):
        build_inputs([], [Declaration("inlet flow", 0.01, None, "week")])
