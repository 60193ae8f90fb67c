"""The places of a symmetric sparse matrix, and an order of its unknowns with a narrow band."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp
from scipy.sparse.csgraph import breadth_first_order, reverse_cuthill_mckee

from fem.mesh.domain import Array


class Pattern:
    """The places of a symmetric sparse matrix, built once from every entry that may ever be.

    Parameters
    ----------
    rows, columns
        Entries, repeated ones added up, shape (entries,).
    size
        Number of unknowns.

    """

    def __init__(self, rows: np.ndarray, columns: np.ndarray, size: int):
        diagonal = np.arange(size, dtype=np.int32)
        rows, columns = np.concatenate([rows, diagonal]), np.concatenate([columns, diagonal])
        # Bytes that only say that there is an entry: their sum is never looked at.
        places = sp.csr_matrix((np.ones(len(rows), dtype=np.int8), (rows, columns)), shape=(size, size))
        self.size = size
        self.indptr, self.columns = places.indptr, places.indices
        self.rows = _rows(places)
        self.diagonal = np.flatnonzero(self.rows == self.columns)

    def gather(self, rows: np.ndarray, columns: np.ndarray, values: Array) -> Array:
        """Return the values of coordinate entries laid out along the pattern, shape (nnz,)."""
        summed = sp.csr_matrix((values, (rows, columns)), shape=(self.size, self.size))
        if summed.nnz == len(self.rows):
            return np.asarray(summed.data)
        size = np.int64(self.size)
        place = np.searchsorted(self.rows * size + self.columns, _rows(summed) * size + summed.indices)
        data = np.zeros(len(self.rows))
        data[place] = summed.data
        return data

    def matrix(self, data: Array) -> sp.csr_matrix:
        """Return a CSR matrix that shares `data`, exact zeros and all."""
        return sp.csr_matrix((data, self.columns, self.indptr), shape=(self.size, self.size))


def narrow_order(pattern: Pattern) -> np.ndarray:
    """Return the unknowns in an order of small bandwidth.

    Breadth first from a whole row of nodes at the far end. From a single node, as Cuthill and
    McKee start, the fronts of a mesh of quadrilaterals fold round a corner and are twice as wide.
    """
    best = np.asarray(reverse_cuthill_mckee(pattern.matrix(np.ones(len(pattern.rows))), symmetric_mode=True))
    order, start = best, np.array([0])
    for _ in range(3):
        order, last = _layers(pattern, order, start)
        if len(order) < pattern.size:
            # A body in several pieces: the walk saw only one.
            return best
        if width(pattern, order) < width(pattern, best):
            best = order
        start = np.arange(pattern.size - last, pattern.size)
    return best


def width(pattern: Pattern, order: np.ndarray) -> int:
    """Return how far from the diagonal the entries reach in an order of the unknowns."""
    place = np.empty_like(order)
    place[order] = np.arange(pattern.size)
    return int(np.max(np.abs(place[pattern.rows] - place[pattern.columns])))


def _layers(pattern: Pattern, order: np.ndarray, start: np.ndarray) -> tuple[np.ndarray, int]:
    """Walk breadth first from the unknowns at places `start` of `order`, ties kept in that order.

    Returns the new order and how many unknowns its last layer has.
    """
    size = pattern.size
    place = np.empty_like(order)
    place[order] = np.arange(size)
    # One node more, joined to all that the walk starts from.
    rows = np.concatenate([place[pattern.rows], np.full(len(start), size)])
    columns = np.concatenate([place[pattern.columns], start])
    graph = sp.csr_matrix((np.ones(len(rows)), (rows, columns)), shape=(size + 1, size + 1))
    walk, parent = breadth_first_order(graph, size)
    when = np.empty(size + 1, dtype=np.int64)
    when[walk] = np.arange(len(walk))
    parents = when[parent[walk[1:]]]
    begin, end = 0, 1
    while end < len(walk):
        begin, end = end, 1 + int(np.searchsorted(parents, end))
    return order[walk[1:]], end - begin


def _rows(matrix: sp.csr_matrix) -> np.ndarray:
    """Row of each entry, shape (nnz,)."""
    return np.repeat(np.arange(matrix.shape[0], dtype=np.int32), np.diff(matrix.indptr))
