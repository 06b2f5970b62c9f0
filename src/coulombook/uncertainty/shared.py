"""Covariance matrices of many values that share few errors, without a matrix of all values by all values.

Values y = x + J e with independent errors e have the covariance J J^T. Errors of one value alone make it diagonal;
errors that neighbours share make it a band; errors that all values share add a few directions more. So V = A + U U^T,
with A block tridiagonal and U (n, k) of few columns, and V^-1 = A^-1 - A^-1 U (I + U^T A^-1 U)^-1 U^T A^-1 (Woodbury).
With bands and directions that do not grow with n, everything here takes a time proportional to n. What does not fit
the picture takes longer and stays exact: in the end A is one block.

Sources: block Cholesky decomposition and Woodbury's formula: Golub & Van Loan, Matrix Computations, 4th ed. (2013),
sect. 2.1.4 and 4.5; the diagonal of the inverse: Takahashi, Fagan & Chin, PICA Conf. Proc. (1973) 63 (from memory).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from coulombook.uncertainty.linearised import FloatArray, IntArray

if TYPE_CHECKING:
    from scipy.sparse import csr_array

_ONE_BLOCK = 64  # values that are cheaper dense than parted
_LEAST_BLOCK = 16
_WIDE = 0.25  # share of the values from which on an error is not looked at as one of neighbours


@dataclass(frozen=True, slots=True, eq=False)
class SharedCovariance:
    """A + U U^T of n values, in an order in which those that share errors are near each other.

    ``order`` (n,) is the value at each place; ``own`` (blocks, B, B) and ``next`` (blocks - 1, B, B) are A's blocks on
    the diagonal and below it, filled up with ones on the diagonal; ``wide`` (n, k) is U.
    """

    order: IntArray
    own: FloatArray
    next: FloatArray
    wide: FloatArray

    def __len__(self) -> int:
        return len(self.order)

    @classmethod
    def of_matrix(cls, v: FloatArray) -> SharedCovariance:
        """A covariance (n, n) as it is."""
        return cls(np.arange(len(v)), v[None, :, :], np.zeros((0, *v.shape)), np.zeros((len(v), 0)))

    @classmethod
    def of_errors(cls, jacobian: csr_array, variance: FloatArray) -> SharedCovariance:
        """J J^T + diag(variance), with J (n, n_errors) and variance (n,)."""
        columns = jacobian.tocsc()
        columns.eliminate_zeros()
        columns = columns[:, np.diff(columns.indptr) > 0]
        order, near, bandwidth = _arranged(columns)
        ordered = columns.tocsr()[order].tocsc()
        near_part = ordered[:, near]
        local = (near_part @ near_part.T).tocoo()
        size = min(max(bandwidth, _LEAST_BLOCK), len(order)) if len(order) > _ONE_BLOCK else len(order)
        own, below = _blocks(local.row, local.col, local.data, variance[order], max(size, 1))
        return cls(order, own, below, ordered[:, ~near].toarray())

    def inverse(self, added: FloatArray) -> Inverse:
        """Inverses of V + added I, for several variances (s,) that are added to every value."""
        return Inverse(self, added)


def _arranged(columns: csr_array) -> tuple[IntArray, NDArray[np.bool_], int]:
    """An order of the values, which errors are of neighbours then, and how far apart these reach at most."""
    n, touched = columns.shape[0], np.diff(columns.indptr)
    natural = np.arange(n)
    if n <= _ONE_BLOCK:
        return natural, np.ones(len(touched), dtype=bool), max(n - 1, 0)
    cost, near, band = _parted(columns, natural)
    if cost <= n * float(_ONE_BLOCK) ** 2:
        return natural, near, band
    from scipy.sparse.csgraph import reverse_cuthill_mckee

    few = columns[:, touched <= _WIDE * n]
    order = reverse_cuthill_mckee((few @ few.T).tocsr(), symmetric_mode=True).astype(np.intp)
    other, near_too, band_too = _parted(columns, order)
    return (order, near_too, band_too) if other < cost else (natural, near, band)


def _parted(columns: csr_array, order: IntArray) -> tuple[float, NDArray[np.bool_], int]:
    """Which errors are best taken as those of neighbours in an order, with what it costs, and how far they reach."""
    n = columns.shape[0]
    place = np.empty(n, dtype=np.intp)
    place[order] = np.arange(n)
    at, first = place[columns.indices], columns.indptr[:-1]
    span = np.zeros(0, dtype=np.intp)
    if at.size:
        span = np.maximum.reduceat(at, first) - np.minimum.reduceat(at, first)
    # with the c errors of least span in A: its band, squared, for every value, and so U's columns
    band = np.concatenate(([0], np.sort(span))).astype(float)
    left = np.arange(len(span), -1, -1).astype(float)
    cost = n * (band + _LEAST_BLOCK) ** 2 + n * left**2 + left**3
    best = int(cost.argmin())
    return float(cost[best]), span <= band[best], int(band[best])


def _blocks(
    rows: IntArray, columns: IntArray, data: FloatArray, variance: FloatArray, size: int
) -> tuple[FloatArray, FloatArray]:
    """Blocks on the diagonal and below it of a matrix whose band is no wider than a block."""
    n = len(variance)
    count = -(-n // size)
    own, below = np.zeros((count, size, size)), np.zeros((max(count - 1, 0), size, size))
    places = np.arange(count * size)
    own[places // size, places % size, places % size] = 1.0
    held = np.arange(n)
    own[held // size, held % size, held % size] = variance
    inside = rows // size == columns // size
    np.add.at(own, (rows[inside] // size, rows[inside] % size, columns[inside] % size), data[inside])
    under = rows // size == columns // size + 1
    below[columns[under] // size, rows[under] % size, columns[under] % size] = data[under]
    return own, below


class Inverse:
    """Inverses W of V + a I for several a.

    Raises numpy's LinAlgError where one is not positive definite.
    """

    def __init__(self, v: SharedCovariance, added: FloatArray) -> None:
        self._order = v.order
        self._wide = v.wide
        n, (count, size, _) = len(v), v.own.shape
        self._n, self._padded = n, count * size
        real = (np.arange(self._padded) < n).reshape(count, size)
        several = len(added)
        # Cholesky: triangles L on the diagonal, their inverses, and what stands below them
        self._triangle = np.empty((several, count, size, size))
        self._back = np.empty_like(self._triangle)
        self._below = np.empty((several, max(count - 1, 0), size, size))
        logdet = np.zeros(several)
        places = np.arange(size)
        for block in range(count):
            own = np.broadcast_to(v.own[block], (several, size, size)).copy()
            own[:, places, places] += added[:, None] * real[block]
            if block:
                before = self._below[:, block - 1]
                own -= before @ before.transpose(0, 2, 1)
            triangle = np.linalg.cholesky(own)
            self._triangle[:, block] = triangle
            self._back[:, block] = np.linalg.inv(triangle)
            logdet += 2.0 * np.log(triangle[:, places, places]).sum(axis=1)
            if block < count - 1:
                self._below[:, block] = v.next[block] @ self._back[:, block].transpose(0, 2, 1)
        self._spread = np.zeros((several, n, v.wide.shape[1]))
        diagonal = self._local_diagonal()
        for place in range(several if v.wide.shape[1] else 0):
            solved = self._solve_local(place, v.wide)
            triangle = np.linalg.cholesky(np.eye(v.wide.shape[1]) + v.wide.T @ solved)
            self._spread[place] = np.linalg.solve(triangle, solved.T).T
            logdet[place] += 2.0 * np.log(np.diag(triangle)).sum()
        diagonal -= np.square(self._spread).sum(axis=2)
        self.logdet = logdet  # (s,) of V + a I
        self.diagonal = np.empty_like(diagonal)  # (s, n) of W
        self.diagonal[:, v.order] = diagonal

    def solve(self, place: int, r: FloatArray) -> FloatArray:
        """W r for the a at ``place``; r (n, m)."""
        ordered = r[self._order]
        spread = self._spread[place]
        result = np.empty_like(ordered)
        result[self._order] = self._solve_local(place, ordered) - spread @ (spread.T @ ordered)
        return result

    def sample(self, place: int, generator: np.random.Generator, count: int) -> FloatArray:
        """Values (n, count) drawn from a normal distribution with covariance V + a I."""
        triangle, below = self._triangle[place], self._below[place]
        normals = generator.standard_normal((*triangle.shape[:2], count))
        drawn = triangle @ normals
        drawn[1:] += below @ normals[:-1]
        ordered = drawn.reshape(self._padded, count)[: self._n]
        ordered += self._wide @ generator.standard_normal((self._wide.shape[1], count))
        result: FloatArray = np.empty_like(ordered)
        result[self._order] = ordered
        return result

    def _solve_local(self, place: int, r: FloatArray) -> FloatArray:
        """A^-1 r, in the order of A."""
        back, below = self._back[place], self._below[place]
        count, size, _ = back.shape
        x = np.zeros((count, size, r.shape[1]))
        x.reshape(self._padded, -1)[: self._n] = r
        for block in range(count):
            if block:
                x[block] -= below[block - 1] @ x[block - 1]
            x[block] = back[block] @ x[block]
        for block in range(count - 1, -1, -1):
            if block < count - 1:
                x[block] -= below[block].T @ x[block + 1]
            x[block] = back[block].T @ x[block]
        result: FloatArray = x.reshape(self._padded, -1)[: self._n]
        return result

    def _local_diagonal(self) -> FloatArray:
        """Diagonal (s, n) of A^-1, in the order of A, from the last block to the first."""
        several, count, size, _ = self._back.shape
        found = np.empty((several, count, size))
        after = np.zeros((several, size, size))
        for block in range(count - 1, -1, -1):
            middle = np.broadcast_to(np.eye(size), (several, size, size))
            if block < count - 1:
                below = self._below[:, block]
                middle = middle + below.transpose(0, 2, 1) @ after @ below
            back = self._back[:, block]
            after = back.transpose(0, 2, 1) @ middle @ back
            found[:, block] = np.diagonal(after, axis1=1, axis2=2)
        return found.reshape(several, self._padded)[:, : self._n]
