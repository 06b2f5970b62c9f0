"""From declared standard uncertainties to independent unit errors.

Every input of the measurement function is a block of values. A declaration gives the standard uncertainty of a
quantity and how far one error is shared: by the whole day, by a run, or by nothing but the single reading. The blocks
of one quantity share the same error where the declaration says so, wherever they stand in the tables.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from coulombook.uncertainty.linearised import FloatArray, IntArray, Linearised, Number, sparse_map
from coulombook.units import written

DAY, RUN, READING = "day", "run", "reading"


@dataclass(frozen=True, slots=True, eq=False)
class Block:
    """Values of one quantity that enter the measurement function together.

    Parameters
    ----------
    name : str
        Name under which the measurement function knows the block.
    quantity : str
        Name under which uncertainties are declared for it.
    values : (n,) float array
    owner : (n,) int array
        The run each value belongs to; values with the same owner share an error declared per run. Readings that belong
        to no run carry numbers of their own, so that nothing is shared by accident.
    per_relative, per_absolute : (n,) float array or None
        How the block moves with a relative and with an absolute error of the quantity; by default with its
        own size and by one. A value whose per_absolute is zero ignores absolute errors.
    sharings : tuple of str
        The sharings this block answers to.
    """

    name: str
    quantity: str
    values: FloatArray
    owner: IntArray
    per_relative: FloatArray | None = None
    per_absolute: FloatArray | None = None
    sharings: tuple[str, ...] = (DAY, RUN, READING)


@dataclass(frozen=True, slots=True)
class Declaration:
    """Standard uncertainty of a quantity: a fraction, or an absolute value in the block's own unit."""

    quantity: str
    relative: float | None
    absolute: float | None
    shared: str


@dataclass(frozen=True, slots=True)
class Source:
    """What an error column stands for."""

    name: str
    shared: str


@dataclass(frozen=True, slots=True, eq=False)
class Correlated:
    """Errors that are estimated, not declared, such as the coefficients of a curve.

    ``rows`` are (block name, element) pairs; ``factor`` (n_rows, k) maps k new unit errors onto them.
    """

    source: Source
    rows: tuple[tuple[str, int], ...]
    factor: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class Inputs:
    """The blocks as numbers for the measurement function.

    ``numbers`` holds a `Linearised` for every block that carries an error and a plain array for the rest;
    ``sources`` names each error column; ``moved`` tells of each declaration whether it moved anything.
    """

    numbers: Mapping[str, Number]
    nominal: Mapping[str, FloatArray]
    sources: tuple[Source, ...]
    moved: tuple[bool, ...]
    reserved: tuple[int, ...]  # first column of each kind that was reserved

    def draw(self, normals: FloatArray) -> dict[str, FloatArray]:
        """Inputs for Monte Carlo: blocks (n_draws, n) from standard normals (n_draws, n_errors)."""
        drawn = {}
        for name, values in self.nominal.items():
            number = self.numbers[name]
            moved = (number.jacobian @ normals.T).T if isinstance(number, Linearised) else 0.0
            drawn[name] = np.broadcast_to(values + moved, (len(normals), len(values)))
        return drawn


class _Columns:
    """Collects the entries of the error matrix of all blocks."""

    def __init__(self) -> None:
        self.sources: list[Source] = []
        self.entries: dict[str, list[tuple[NDArray[Any], NDArray[Any], FloatArray]]] = {}

    def open(self, source: Source, count: int) -> int:
        """Reserve ``count`` columns; returns the first."""
        first = len(self.sources)
        self.sources.extend([source] * count)
        return first

    def put(self, block: str, rows: NDArray[Any], columns: NDArray[Any], values: FloatArray) -> None:
        self.entries.setdefault(block, []).append((rows, columns, values))


def build_inputs(
    blocks: Sequence[Block],
    declarations: Iterable[Declaration],
    correlated: Iterable[Correlated] = (),
    reserve: Iterable[tuple[Source, int]] = (),
) -> Inputs:
    """Turn blocks and declarations into numbers that carry their errors.

    ``reserve`` keeps so many columns of each source for errors whose size is known only after a first evaluation
    (scatter of repeats).
    Raises ValueError for a declaration with an unknown sharing.
    """
    by_quantity: dict[str, list[Block]] = {}
    for block in blocks:
        by_quantity.setdefault(block.quantity, []).append(block)
    columns = _Columns()
    moved = []
    for declaration in declarations:
        if declaration.shared not in (DAY, RUN, READING):
            raise ValueError(f"shared must be day, run or reading, not {declaration.shared!r}")
        moved.append(_declare(columns, by_quantity.get(declaration.quantity, ()), declaration))
    for group in correlated:
        first = columns.open(group.source, group.factor.shape[1])
        for (name, element), row in zip(group.rows, group.factor, strict=True):
            held = np.flatnonzero(row)
            columns.put(name, np.full(held.size, element), first + held, row[held])

    reserved = tuple(columns.open(*kept) for kept in reserve)

    numbers: dict[str, Number] = {}
    for block in blocks:
        found = columns.entries.get(block.name)
        if found is None:
            numbers[block.name] = block.values
            continue
        rows, places, values = (np.concatenate(parts) for parts in zip(*found, strict=True))
        shape = (len(block.values), len(columns.sources))
        numbers[block.name] = Linearised(block.values, sparse_map(rows, places, values, shape))
    nominal = {block.name: block.values for block in blocks}
    return Inputs(numbers, nominal, tuple(columns.sources), tuple(moved), reserved)


def _declare(columns: _Columns, blocks: Sequence[Block], declaration: Declaration) -> bool:
    """Add the errors of one declaration to every block of its quantity; whether anything moves."""
    moving = []
    for block in blocks:
        if declaration.shared not in block.sharings:
            continue
        sizes = _sizes(block, declaration)
        held = np.flatnonzero(np.isfinite(sizes) & (sizes != 0))
        if held.size:
            moving.append((block, sizes[held], held))
    if not moving:
        return False
    source = Source(written(declaration.quantity), declaration.shared)
    if declaration.shared == DAY:
        first = columns.open(source, 1)
        for block, sizes, held in moving:
            columns.put(block.name, held, np.full(held.size, first), sizes)
    elif declaration.shared == RUN:
        owners = np.unique(np.concatenate([block.owner[held] for block, _, held in moving]))
        first = columns.open(source, len(owners))
        for block, sizes, held in moving:
            columns.put(block.name, held, first + np.searchsorted(owners, block.owner[held]), sizes)
    else:
        for block, sizes, held in moving:
            first = columns.open(source, held.size)
            columns.put(block.name, held, first + np.arange(held.size), sizes)
    return True


def _sizes(block: Block, declaration: Declaration) -> FloatArray:
    if declaration.relative is not None:
        # the sign is kept: a shared gain error moves a negative reading the other way
        scale = block.values if block.per_relative is None else block.per_relative
        return declaration.relative * scale
    if declaration.absolute is None:
        return np.zeros(len(block.values))
    scale = np.ones(len(block.values)) if block.per_absolute is None else block.per_absolute
    return declaration.absolute * scale
