"""Monte Carlo: the same measurement function, evaluated for draws of its inputs (JCGM 101:2008).

The measurement function is written down once (`uncertainty/recorded.py`) and repeated for some runs at a time, so that
memory does not grow with the number of runs. What the wanted outputs do not need is neither evaluated nor drawn.

An error that runs of several turns share has a stream of random numbers of its own, made from the seed and its place:
it is the same error in whichever turn it is drawn. The errors that one turn has for itself come from one stream.
"""

from __future__ import annotations

from collections import Counter, deque
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass
from functools import cached_property
from itertools import cycle

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

# draws that are drawn at a time
BLOCK = 8 * CHUNK
THREADS = 2
_RUNS_OF_A_TURN = 8  # at most: what runs share is evaluated once for so many
# of the draws of a turn's outputs, which are kept to be sorted; one run may need more
_TURN_BYTE = 36_000_000
_SHARED_BYTE = 32_000_000  # of the draws of shared errors, which are kept to be used again

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
    record = Record(settled)
    runs = _turns(settled, count)
    columns = [record.columns(turn) for turn in runs]
    shared = _SharedErrors(Counter(column for one in columns for column in one.tolist()), count, seed)
    turns = [
        _Turn(
            record,
            turn,
            one,
            np.random.Generator(np.random.SFC64([seed, len(record.errors) + number])),
            shared,
        )
        for number, (turn, one) in enumerate(zip(runs, columns, strict=True))
    ]
    draws = np.empty((max((turn.rows for turn in turns), default=0), count))
    level = settled.plan.settings.level_of_confidence
    done = 0
    # normals are drawn ahead in a thread of their own: half of the work, in calls that let the other half go on
    with ThreadPoolExecutor(THREADS - 1) as pool:
        blocks = _ahead(pool, turns, count)
        for turn in turns:
            with np.errstate(all="ignore"):
                for first in range(0, count, BLOCK):
                    turn.evaluate(next(blocks), draws[:, first : first + BLOCK])
                found = turn.summary(draws, level)
            yield found
            done += len(turn.runs)
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


class Record:
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

    def __init__(self, turns: Counter[int], count: int, seed: int) -> None:
        self._left = {column: number for column, number in turns.items() if number > 1}
        self._count = -(-count // BLOCK) * BLOCK
        self._room = _SHARED_BYTE // (self._count * 8)
        self._seed = seed
        self._kept: dict[int, FloatArray] = {}

    def __contains__(self, column: int) -> bool:
        return column in self._left

    def take(self, column: int) -> Iterator[FloatArray]:
        """Draws of one error from their start, a block at a time; a turn takes all of them or none."""
        stream = np.random.Generator(np.random.SFC64([self._seed, column]))
        if column not in self._kept and len(self._kept) < self._room:
            self._kept[column] = stream.standard_normal(self._count)
        kept = self._kept.get(column)
        for first in range(0, self._count, BLOCK):
            # before the last block is handed out, for nobody asks for one beyond it
            if first + BLOCK >= self._count:
                self._left[column] -= 1
                if not self._left[column]:
                    self._kept.pop(column, None)
            yield stream.standard_normal(BLOCK) if kept is None else kept[first : first + BLOCK]


class _Turn:
    """Some runs that are drawn together."""

    def __init__(
        self,
        record: Record,
        runs: IntArray,
        columns: IntArray,
        own: np.random.Generator,
        shared: _SharedErrors,
    ) -> None:
        self.runs = runs
        self.columns: list[int] = columns.tolist()  # the errors it needs
        self._record = record
        self._own = own
        self._shared = shared
        self._outputs = record.outputs(runs)
        self.rows = sum(len(rows) for _, rows in self._outputs)

    @cached_property
    def _of_others(self) -> list[Iterator[FloatArray]]:
        return [self._shared.take(column) for column in self.columns if column in self._shared]

    def draw(self, block: FloatArray) -> FloatArray:
        """Normals of the next block of draws, (chunks, errors, draws of a chunk), in memory that is given."""
        columns = len(self.columns)
        own = columns - len(self._of_others)
        normals = block[: BLOCK * columns].reshape(-1, columns, CHUNK)
        for chunk in normals:
            self._own.standard_normal(out=chunk[:own])
        for row, stream in enumerate(self._of_others, start=own):
            normals[:, row] = next(stream).reshape(-1, CHUNK)
        return normals

    @cached_property
    def _program(self) -> tuple[FloatArray, Program]:
        columns = np.array(self.columns, dtype=np.intp)
        of_others = np.array([column in self._shared for column in self.columns], dtype=bool)
        place = (
            np.where(of_others, np.count_nonzero(~of_others) + np.cumsum(of_others), np.cumsum(~of_others))
            - 1
        )
        normals, moving = aligned(len(columns), CHUNK), _moving(self._outputs)
        return normals, Program(moving, Needs(moving), self._record.errors, place, normals)

    def evaluate(self, block: FloatArray, draws: FloatArray) -> None:
        """Fill the first rows of ``draws`` with the outputs, one below the other; draws beyond its end are left out."""
        normals, program = self._program
        filled = [
            part
            for part, (number, _) in zip(self._parts(draws), self._outputs, strict=True)
            if isinstance(number, Recorded)
        ]
        for first, chunk in zip(range(0, draws.shape[1], CHUNK), block, strict=False):
            normals[...] = chunk
            program.run()
            for part, result in zip(filled, program.results, strict=True):
                held = part[:, first : first + CHUNK]
                held[...] = result[:, : held.shape[1]]

    def _parts(self, draws: FloatArray) -> list[FloatArray]:
        """The rows of each output."""
        ends = np.cumsum([len(rows) for _, rows in self._outputs]).tolist()
        return [draws[end - len(rows) : end] for end, (_, rows) in zip(ends, self._outputs, strict=True)]

    def summary(self, draws: FloatArray, level: float) -> Drawn:
        """What the draws say; they are sorted in place."""
        found = []
        for part, (number, rows) in zip(self._parts(draws), self._outputs, strict=True):
            if not isinstance(number, Recorded):
                part[...] = nominal(number)[rows, None]
            found.append(coverage(part, level))
        # what a turn was made with is not wanted any more
        for name in ("_of_others", "_program"):
            self.__dict__.pop(name, None)
        return Drawn(self.runs, self._record.products(self.runs), *found)


def _ahead(pool: ThreadPoolExecutor, turns: Sequence[_Turn], count: int) -> Iterator[FloatArray]:
    """Blocks of normals for one turn after the other, drawn before they are asked for."""
    blocks = len(range(0, count, BLOCK))
    most = max((len(turn.columns) for turn in turns), default=0)
    # one that is in use, one that waits, one that is being filled
    rooms = cycle([np.empty(BLOCK * most) for _ in range(3)])
    waiting: deque[Future[FloatArray]] = deque()
    for turn in turns:
        for _ in range(blocks):
            waiting.append(pool.submit(turn.draw, next(rooms)))
            if len(waiting) == 2:
                yield waiting.popleft().result()
    while waiting:
        yield waiting.popleft().result()
