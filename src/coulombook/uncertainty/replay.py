"""Evaluate a record (`recorded.py`) for chunks of draws.

A `Program` holds what a set of outputs needs and nothing else: only the elements they come from, with one buffer for
each number that is alive at a time. Rows are elements and columns are draws, so that gathering copies rows and every
pass runs through memory in order; the buffers are meant to stay in the processor's own memory.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from coulombook.uncertainty.recorded import (
    Applied,
    Elementwise,
    FloatArray,
    IntArray,
    Mapped,
    Picked,
    Recorded,
    Selected,
    UnitErrors,
)

if TYPE_CHECKING:
    from scipy.sparse import csr_array

# what a processor reads at once; a row that starts elsewhere costs two reads in place of one
_LINE_BYTE = 64
_LINE = 8

Step = tuple[Callable[..., Any], tuple[Any, ...]]


def aligned(rows: int, columns: int) -> FloatArray:
    """An array whose memory starts where the processor likes it."""
    raw = np.empty(rows * columns + _LINE)
    first = (-raw.ctypes.data % _LINE_BYTE) // raw.itemsize
    return raw[first : first + rows * columns].reshape(rows, columns)


class Needs:
    """Which elements of every number of a record some outputs come from."""

    def __init__(self, outputs: Iterable[tuple[Recorded, IntArray]]) -> None:
        wanted = [(number, np.asarray(rows, dtype=np.intp)) for number, rows in outputs]
        self.order = _in_order([number for number, _ in wanted])
        pieces: dict[int, list[IntArray]] = {id(number): [] for number in self.order}
        for number, rows in wanted:
            pieces[id(number)].append(rows)
        self.rows: dict[int, IntArray] = {}
        for number in reversed(self.order):
            found = pieces[id(number)]
            rows = np.unique(np.concatenate(found)) if found else np.zeros(0, dtype=np.intp)
            self.rows[id(number)] = rows
            for source, needed in _sources(number, rows):
                pieces[id(source)].append(needed)


def _in_order(outputs: Sequence[Recorded]) -> list[Recorded]:
    """Every number of a record, each after those it comes from."""
    order: dict[int, Recorded] = {}
    waiting: list[tuple[Recorded, bool]] = [(one, False) for one in outputs]
    while waiting:
        number, ready = waiting.pop()
        if id(number) in order:
            continue
        if ready:
            order[id(number)] = number
            continue
        waiting.append((number, True))
        waiting += [(one, False) for one in _direct(number)]
    return list(order.values())


def _direct(number: Recorded) -> list[Recorded]:
    match number:
        case Picked() | Mapped() | Applied():
            return [number.source]
        case Elementwise():
            return [one for one in number.arguments if isinstance(one, Recorded)]
        case Selected():
            return [one for one in (number.x, number.otherwise) if isinstance(one, Recorded)]
    return []


def _sources(number: Recorded, rows: IntArray) -> list[tuple[Recorded, IntArray]]:
    """What some elements of a number come from."""
    match number:
        case Picked():
            return [(number.source, number.index[rows])]
        case Mapped():
            return [(number.source, np.unique(number.matrix[rows].indices).astype(np.intp))]
        case Selected():
            held = number.mask[rows]
            sides = ((number.x, rows[held]), (number.otherwise, rows[~held]))
            return [(one, needed) for one, needed in sides if isinstance(one, Recorded)]
    return [(one, rows) for one in _direct(number)]


@dataclass(eq=False, slots=True)
class _Slot:
    """A number of the program while it is laid out: rows of a buffer, and the last step that reads them.

    ``base``: the slot whose rows from ``first`` on these are.
    """

    rows: int
    last: int = -1
    buffer: FloatArray | None = None
    base: _Slot | None = None
    first: int = 0

    @property
    def held(self) -> FloatArray:
        """The rows, once their buffer is known."""
        if self.base is not None:
            return self.base.held[self.first : self.first + self.rows]
        assert self.buffer is not None
        return self.buffer

    def read(self, step: int) -> None:
        """Keep the rows until a step has read them."""
        self.last = max(self.last, step)
        if self.base is not None:
            self.base.read(step)


@dataclass(eq=False, slots=True)
class _Plan:
    """A number to be made: where, from what, and by which steps. ``in_place``: it may overwrite what it comes from."""

    slot: _Slot
    sources: list[_Slot]
    make: Callable[..., list[Step]]
    in_place: bool = False


_FOREVER = 1 << 60


class Program:
    """The evaluation of some outputs for one chunk of draws after the other.

    Parameters
    ----------
    outputs : sequence of (Recorded, (n,) int array)
        Numbers and the elements wanted of each, ascending.
    needs : Needs
        Of these outputs.
    errors : UnitErrors
        The errors of the record.
    place : (n_needed,) int array
        Row of ``normals`` that holds each needed error, in ascending order of the errors.
    normals : (n_needed, chunk) float array
        Filled by the caller before each `run`.

    ``results`` are the buffers, (n, chunk) each, that hold the outputs after a `run`.
    """

    def __init__(
        self,
        outputs: Sequence[tuple[Recorded, IntArray]],
        needs: Needs,
        errors: UnitErrors,
        place: IntArray,
        normals: FloatArray,
    ) -> None:
        self._needs = needs
        self._chunk = normals.shape[1]
        self._place = place
        self._slots: dict[int, _Slot] = {}
        self._plans: list[_Plan] = []
        self._known: dict[Any, _Slot] = {}
        self._errors = _Slot(len(normals), _FOREVER, normals)
        self._maps = self._maps_by_source()
        for number in needs.order:
            if number is not errors and len(needs.rows[id(number)]) and id(number) not in self._slots:
                self._slots[id(number)] = self._lay_out(number, needs.rows[id(number)])
        kept = [self._chosen(*one) for one in outputs]
        for slot in kept:
            slot.read(_FOREVER)
        self._steps = self._give_buffers()
        self.results = [slot.held for slot in kept]

    def run(self) -> None:
        """Evaluate the outputs for the normals in their buffer."""
        for function, arguments in self._steps:
            function(*arguments)

    def _give_buffers(self) -> list[Step]:
        for number, plan in enumerate(self._plans):
            for one in plan.sources:
                one.read(number)
        free: dict[int, list[FloatArray]] = {}
        alive: list[_Slot] = []
        steps: list[Step] = []
        for number, plan in enumerate(self._plans):
            slot = plan.slot
            dying = [one for one in alive if one.last <= number]
            over = next(
                (one for one in dying if plan.in_place and one in plan.sources and one.rows == slot.rows),
                None,
            )
            kept = free.setdefault(slot.rows, [])
            if over is not None:
                slot.buffer = over.buffer
                dying.remove(over)
                alive.remove(over)
            else:
                slot.buffer = kept.pop() if kept else aligned(slot.rows, self._chunk)
            steps += plan.make(slot.held, *(one.held for one in plan.sources))
            alive.append(slot)
            for one in dying:
                alive.remove(one)
                free.setdefault(one.rows, []).append(one.held)
        return steps

    def _plan(
        self, rows: int, sources: list[_Slot], make: Callable[..., list[Step]], in_place: bool = False
    ) -> _Slot:
        slot = _Slot(rows)
        self._plans.append(_Plan(slot, sources, make, in_place))
        return slot

    def _chosen(self, number: Recorded, rows: IntArray) -> _Slot:
        """Some elements of a number that has been laid out."""
        held = self._needs.rows[id(number)]
        slot = self._slots[id(number)]
        if len(rows) == len(held) and (rows == held).all():
            return slot
        return self._take(slot, np.searchsorted(held, rows), None)

    def _take(self, source: _Slot, index: IntArray, weight: FloatArray | None) -> _Slot:
        if weight is not None and (weight == 1.0).all():
            weight = None
        if weight is None and len(index) == source.rows and (index == np.arange(len(index))).all():
            return source
        key = ("take", id(source), index.tobytes(), None if weight is None else weight.tobytes())
        if key in self._known:
            return self._known[key]
        factor = None if weight is None else self._constant(weight)
        whole = bool((np.diff(index) == 1).all())

        def make(out: FloatArray, x: FloatArray) -> list[Step]:
            if whole:
                x = x[index[0] : index[0] + len(index)]
                return [(np.copyto, (out, x)) if factor is None else (np.multiply, (x, factor, out))]
            # out of a buffer's range never happens; "clip" alone writes straight into ``out``
            steps: list[Step] = [(x.take, (index, 0, out, "clip"))]
            return steps if factor is None else [*steps, (np.multiply, (out, factor, out))]

        # element by element, a factor may be applied where its number stands
        each = whole and len(index) == source.rows
        found = self._known[key] = self._plan(len(index), [source], make, each)
        return found

    def _constant(self, values: FloatArray) -> FloatArray | float:
        """A constant as wide as the chunk, for numpy is slow where it has to repeat one along the rows."""
        if values.size and (values == values[0]).all():
            return float(values[0])
        wide = aligned(len(values), self._chunk)
        wide[...] = values[:, None]
        return wide

    def _lay_out(self, number: Recorded, rows: IntArray) -> _Slot:
        match number:
            case Picked():
                weight = None if number.weight is None else number.weight[rows]
                return self._take(*self._of_source(number.source, number.index[rows]), weight)
            case Mapped():
                self._map(number.source)
                return self._slots[id(number)]
            case Elementwise():
                return self._elementwise(number, rows)
            case Selected():
                return self._select(number, rows)
            case Applied():
                return self._apply(number, rows)
        raise TypeError(f"{type(number).__name__} cannot be replayed")

    def _of_source(self, source: Recorded, elements: IntArray) -> tuple[_Slot, IntArray]:
        """Where elements of a source stand."""
        where = np.searchsorted(self._needs.rows[id(source)], elements)
        if isinstance(source, UnitErrors):
            return self._errors, self._place[where]
        return self._slots[id(source)], where

    def _maps_by_source(self) -> dict[int, list[Mapped]]:
        found: dict[int, list[Mapped]] = {}
        for number in self._needs.order:
            if isinstance(number, Mapped) and len(self._needs.rows[id(number)]):
                found.setdefault(id(number.source), []).append(number)
        return found

    def _map(self, source: Recorded) -> None:
        """All linear maps of one number at once: one call for many small ones."""
        from scipy.sparse import vstack

        parts, slots, first = [], [], 0
        for number in self._maps[id(source)]:
            matrix = number.matrix[self._needs.rows[id(number)]]
            if not matrix.nnz:
                self._slots[id(number)] = _Slot(
                    matrix.shape[0], _FOREVER, np.zeros((matrix.shape[0], self._chunk))
                )
                continue
            slot, where = self._of_source(source, matrix.indices.astype(np.intp))
            if (np.diff(matrix.indptr) == 1).all():
                self._slots[id(number)] = self._take(slot, where, matrix.data)
                continue
            rows = matrix.shape[0]
            parts.append(type(matrix)((matrix.data, where, matrix.indptr), shape=(rows, slot.rows)))
            slots.append(_Slot(rows, first=first))
            self._slots[id(number)] = slots[-1]
            first += rows
        if not parts:
            return
        whole = vstack(parts, format="csr")

        def make(out: FloatArray, x: FloatArray) -> list[Step]:
            return _multiplication(whole, x, out)

        base = self._plan(first, [slot], make)
        for one in slots:
            one.base = base

    def _elementwise(self, number: Elementwise, rows: IntArray) -> _Slot:
        function = number.function
        recorded: list[_Slot] = []
        given: list[Any] = []
        for one in number.arguments:
            if isinstance(one, Recorded):
                recorded.append(self._chosen(one, rows))
                given.append(None)
            else:
                given.append(self._constant(one[rows]) if np.ndim(one) else float(one))
        if function is np.add and any(one is not None and np.ndim(one) == 0 and one == 0.0 for one in given):
            return recorded[0]
        key = None
        if all(one is None or np.ndim(one) == 0 for one in given):
            key = (function, tuple(map(id, recorded)), tuple(given))
            if key in self._known:
                return self._known[key]

        def make(out: FloatArray, *values: FloatArray) -> list[Step]:
            left = iter(values)
            return [(function, (*(next(left) if one is None else one for one in given), out))]

        slot = self._plan(len(rows), recorded, make, in_place=True)
        if key is not None:
            self._known[key] = slot
        return slot

    def _select(self, number: Selected, rows: IntArray) -> _Slot:
        mask = number.mask[rows]
        sides: list[tuple[IntArray, _Slot | None, FloatArray | None]] = []
        for one, held in ((number.x, mask), (number.otherwise, ~mask)):
            if not held.any():
                continue
            if isinstance(one, Recorded):
                slot = self._chosen(one, rows[held])
                if held.all():
                    return slot
                sides.append((np.flatnonzero(held), slot, None))
            else:
                values = np.broadcast_to(np.asarray(one, dtype=float), (len(number),))
                sides.append((np.flatnonzero(held), None, values[rows[held], None]))
        recorded = [slot for _, slot, _ in sides if slot is not None]

        def make(out: FloatArray, *values: FloatArray) -> list[Step]:
            left = iter(values)
            return [
                (_put_rows, (out, held, next(left) if constant is None else constant))
                for held, _, constant in sides
            ]

        return self._plan(len(rows), recorded, make)

    def _apply(self, number: Applied, rows: IntArray) -> _Slot:
        def make(out: FloatArray, x: FloatArray) -> list[Step]:
            if not number.differs:
                return [(_call, (number.function, x, out))]
            return [(_call_on, (number.function, rows, x, out))]

        return self._plan(len(rows), [self._chosen(number.source, rows)], make)


def _multiplication(matrix: csr_array, x: FloatArray, out: FloatArray) -> list[Step]:
    """Steps that put matrix times x into ``out``."""
    try:
        # what scipy itself calls; not a public name, so that it may be missing one day
        from scipy.sparse._sparsetools import csr_matvecs
    except ImportError:
        return [(_multiply, (matrix, x, out))]
    what = (*matrix.shape, x.shape[1], matrix.indptr, matrix.indices, matrix.data, x.ravel(), out.ravel())
    return [(out.fill, (0.0,)), (csr_matvecs, what)]


def _multiply(matrix: csr_array, x: FloatArray, out: FloatArray) -> None:
    out[...] = matrix @ x


def _put_rows(out: FloatArray, rows: IntArray, values: FloatArray) -> None:
    out[rows] = values


def _call(function: Callable[[FloatArray], FloatArray], x: FloatArray, out: FloatArray) -> None:
    out[...] = function(x)


def _call_on(
    function: Callable[[FloatArray, IntArray], FloatArray], rows: IntArray, x: FloatArray, out: FloatArray
) -> None:
    out[...] = function(x.T, rows).T
