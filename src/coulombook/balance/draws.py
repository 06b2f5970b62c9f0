"""Monte Carlo: the same measurement function, evaluated for draws of its inputs (JCGM 101:2008).

The measurement function is written down once (`uncertainty/recorded.py`) and repeated for some runs at a time, so that
memory does not grow with the number of runs. What the wanted outputs do not need is neither evaluated nor drawn.

An error that runs of several turns share has a stream of random numbers of its own, made from the seed and its place:
it is the same error in whichever turn it is drawn. The errors that one turn has for itself come from one stream.
"""

from __future__ import annotations

import os
from collections import Counter
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from threading import Lock

import numpy as np

from coulombook.balance.evaluate import evaluate
from coulombook.balance.readings import FloatArray
from coulombook.balance.settle import Settled
from coulombook.uncertainty.coverage import Coverage, coverage
from coulombook.uncertainty.linearised import (
    IntArray,
    Linearised,
    Number,
    nominal,
    select,
    squared_norms,
)
from coulombook.uncertainty.recorded import Recorded, UnitErrors, map_linearly
from coulombook.uncertainty.replay import Needs, Program, aligned

# draws that are evaluated at a time: with the runs of a turn, what a processor holds in its own memory
CHUNK = 256

_THREADS = min(2, os.cpu_count() or 1)
_RUNS_OF_A_TURN = 8  # what runs share is then evaluated once for so many
_TURN_BYTE = (
    36_000_000  # of the draws of a turn's outputs, which are kept to be sorted; one run may need more
)
_SHARED_BYTE = 48_000_000  # of the draws of shared errors, which are kept to be used again

# Quantities that cannot be negative. Where a normal distribution would put more than 3e-7 of its draws below zero (zero
# within five standard deviations), a lognormal one of the same mean and standard deviation takes its place.
_NEAR_ZERO = 0.2
_POSITIVE = (
    "peak area", "check area", "check mole fraction", "integral", "standard integral", "standard amount", "aliquot",
    "compartment volume", "electrode area", "scan area", "scan rate", "inlet flow", "outlet flow", "tracer flow",
    "headspace", "pressure", "temperature", "feed co2", "specific capacitance",
)  # fmt: skip


@dataclass(frozen=True, slots=True, eq=False)
class Drawn:
    """What the draws of one turn say of its runs, ``day_runs`` (places in the day).

    ``efficiency`` of the products (rows of the ledger) and ``total``, ``c2_plus``, ``ratio`` of the runs.
    """

    day_runs: IntArray
    products: IntArray
    efficiency: Coverage
    total: Coverage
    c2_plus: Coverage
    ratio: Coverage


def draw_day(
    settled: Settled, count: int, seed: int, progress: Callable[[int, int], None] | None = None
) -> Iterator[Drawn]:
    """Draw every run of the day, some at a time, in order.

    Parameters
    ----------
    settled
        The settled account of the day.
    count : int
        Number of draws M; JCGM 101 asks for 1e4/(1 - level) and more.
    seed : int
        The same seed and number give the same draws.
    progress : callable, optional
        Called as progress(done, of), in runs.
    """
    record = _Record(settled)
    turns = _turns(settled, count)
    held_by = Counter(column for turn in turns for column in record.columns(turn).tolist())
    shared = _SharedErrors({column: turns for column, turns in held_by.items() if turns > 1}, count, seed)
    level = settled.plan.settings.level_of_confidence

    def draw(number: int) -> Drawn:
        own = np.random.SFC64([seed, len(record.errors) + number])
        return _draw_turn(record, turns[number], shared, np.random.Generator(own), count, level)

    done = 0
    with ThreadPoolExecutor(_THREADS) as pool:
        for drawn in pool.map(draw, range(len(turns))):
            yield drawn
            done += len(drawn.day_runs)
            if progress is not None:
                progress(done, len(settled.plan.runs))


def _turns(settled: Settled, count: int) -> list[IntArray]:
    """Runs that are drawn together: neighbours, for these share the most."""
    products = settled.plan.products.run
    outputs = 3 + len(products) / max(len(settled.plan.runs), 1)
    fitting = int(_TURN_BYTE / (outputs * count * 8))
    runs = np.arange(len(settled.plan.runs))
    size = max(1, min(_RUNS_OF_A_TURN, fitting))
    return [runs[first : first + size] for first in range(0, len(runs), size)]


class _Record:
    """The measurement function of a day, written down."""

    def __init__(self, settled: Settled) -> None:
        inputs = settled.inputs
        self.errors = UnitErrors(len(inputs.sources))
        self._product_run = settled.plan.products.run
        x = {
            name: _recorded(number, self.errors, name in _POSITIVE) for name, number in inputs.numbers.items()
        }
        scatter = _recorded(settled.scatter, self.errors), _recorded(settled.liquid_scatter, self.errors)
        counted = settled.detection.counted
        self._outcome = evaluate(settled.plan, x, settled.weights, counted, *scatter)

    def products(self, turn: IntArray) -> IntArray:
        """Rows of the ledger."""
        first, last = np.searchsorted(self._product_run, (turn[0], turn[-1] + 1))
        return np.arange(first, last)

    def outputs(self, turn: IntArray) -> list[tuple[Number, IntArray]]:
        """Faradaic efficiencies, totals, C2+ and C2+/C1 of some runs."""
        outcome = self._outcome
        of_runs = (outcome.total, outcome.c2_plus, outcome.ratio)
        return [(outcome.faradaic_efficiency, self.products(turn)), *((number, turn) for number in of_runs)]

    def columns(self, turn: IntArray) -> IntArray:
        """The errors that some runs need."""
        return Needs(_moving(self.outputs(turn))).rows.get(id(self.errors), np.zeros(0, dtype=np.intp))


def _moving(outputs: Sequence[tuple[Number, IntArray]]) -> list[tuple[Recorded, IntArray]]:
    """Those outputs that are not constant."""
    return [(number, rows) for number, rows in outputs if isinstance(number, Recorded)]


def _recorded(number: Number, errors: UnitErrors, positive: bool = False) -> Number:
    """An input as a function of the unit errors; one without errors stays what it is."""
    if not isinstance(number, Linearised):
        return number
    value = number.value
    drawn: Number = value + map_linearly(number.jacobian, errors)
    if not positive or not (value[np.isfinite(value)] > 0.0).all():
        return drawn
    u = np.sqrt(squared_norms(number.jacobian))
    near = u > _NEAR_ZERO * value
    if not near.any():
        return drawn
    # lognormal with the mean and the standard deviation of the input: ln x is normal with variance ln(1 + (u/x)^2)
    spread, centre = np.zeros(len(value)), np.zeros(len(value))
    spread[near] = np.sqrt(np.log1p((u[near] / value[near]) ** 2))
    centre[near] = np.log(value[near]) - 0.5 * spread[near] ** 2
    unit = Linearised(value, number.jacobian) * np.divide(spread, u, out=np.zeros(len(u)), where=near)
    assert isinstance(unit, Linearised)
    return select(near, np.exp(centre + map_linearly(unit.jacobian, errors)), drawn)


class _SharedErrors:
    """Draws of errors that several turns need: kept from the first of these turns to the last, as room allows."""

    def __init__(self, turns: dict[int, int], count: int, seed: int) -> None:
        self._left = turns
        self._count = -(-count // CHUNK) * CHUNK
        self._room = max(_SHARED_BYTE // (self._count * 8), 0)
        self._seed = seed
        self._kept: dict[int, FloatArray] = {}
        self._lock = Lock()

    def __contains__(self, column: int) -> bool:
        return column in self._left

    def stream(self, column: int) -> np.random.Generator:
        """The random numbers of one error, from their start."""
        return np.random.Generator(np.random.SFC64([self._seed, column]))

    def fetch(self, columns: Sequence[int]) -> dict[int, FloatArray]:
        """Draws of those of some errors that there is room for."""
        with self._lock:
            for column in columns:
                if column not in self._kept and len(self._kept) < self._room:
                    self._kept[column] = self.stream(column).standard_normal(self._count)
            return {column: self._kept[column] for column in columns if column in self._kept}

    def release(self, columns: Sequence[int]) -> None:
        """A turn is done with them."""
        with self._lock:
            for column in columns:
                self._left[column] -= 1
                if not self._left[column]:
                    self._kept.pop(column, None)


def _draw_turn(
    record: _Record,
    turn: IntArray,
    shared: _SharedErrors,
    own: np.random.Generator,
    count: int,
    level: float,
) -> Drawn:
    outputs = record.outputs(turn)
    moving = _moving(outputs)
    needs = Needs(moving)
    columns = needs.rows.get(id(record.errors), np.zeros(0, dtype=np.intp)).tolist()
    of_others = [column for column in columns if column in shared]
    n_own = len(columns) - len(of_others)
    normals = aligned(len(columns), CHUNK)
    row_of = {column: n_own + row for row, column in enumerate(of_others)}
    free = iter(range(n_own))
    place = np.array(
        [row_of[column] if column in row_of else next(free) for column in columns], dtype=np.intp
    )
    program = Program(moving, needs, record.errors, place, normals)

    kept = shared.fetch(of_others)
    held = [(normals[row_of[column]], draws) for column, draws in kept.items()]
    anew = [(normals[row_of[column]], shared.stream(column)) for column in of_others if column not in kept]
    drawn = [np.empty((len(rows), count)) for _, rows in outputs]
    filled = [
        draws for draws, (number, _) in zip(drawn, outputs, strict=True) if isinstance(number, Recorded)
    ]
    with np.errstate(all="ignore"):
        for first in range(0, count, CHUNK):
            own.standard_normal(out=normals[:n_own])
            for row, draws in held:
                row[:] = draws[first : first + CHUNK]
            for row, stream in anew:
                stream.standard_normal(out=row)
            program.run()
            for draws, found in zip(filled, program.results, strict=True):
                part = draws[:, first : first + CHUNK]
                part[...] = found[:, : part.shape[1]]
        shared.release(of_others)
        for draws, (number, rows) in zip(drawn, outputs, strict=True):
            if not isinstance(number, Recorded):
                draws[...] = nominal(number)[rows, None]
        return Drawn(turn, record.products(turn), *(coverage(draws, level) for draws in drawn))
