"""Symmetric positive definite systems of one fixed pattern, solved many times over.

The ordering and the symbolic factorisation are done once. A small bandwidth goes to banded
Cholesky, which is dense arithmetic without any index; a wide one to sparse LDL'.
"""

from __future__ import annotations

from typing import Any, Protocol

import numpy as np
import scipy.sparse as sp
from scipy.linalg import lapack
from scipy.sparse.csgraph import reverse_cuthill_mckee

from fem.mesh.domain import Array

# Banded work grows with the square of the bandwidth: past this the sparse factor is cheaper.
WIDEST_BAND = 160


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
        diagonal = np.arange(size)
        key = np.unique(np.concatenate([rows.astype(np.int64) * size + columns, diagonal * (size + 1)]))
        self.size = size
        self.rows = (key // size).astype(np.int32)
        self.columns = (key % size).astype(np.int32)
        self.indptr = np.searchsorted(self.rows, np.arange(size + 1)).astype(np.int32)
        self.diagonal = np.searchsorted(key, diagonal * (size + 1))
        self._key = key

    def gather(self, rows: np.ndarray, columns: np.ndarray, values: Array) -> Array:
        """Return the values of coordinate entries laid out along the pattern, shape (nnz,)."""
        place = np.searchsorted(self._key, rows.astype(np.int64) * self.size + columns)
        return np.asarray(np.bincount(place, weights=values, minlength=len(self._key)), dtype=float)

    def matrix(self, data: Array) -> sp.csr_matrix:
        """Return a CSR matrix that shares `data`, exact zeros and all."""
        return sp.csr_matrix((data, self.columns, self.indptr), shape=(self.size, self.size))


class Factor(Protocol):
    """Factorises matrices of one pattern."""

    def solve(self, data: Array, rhs: Array) -> Array:
        """Return x with A x = rhs, for the values of A along the pattern.

        Raises
        ------
        ArithmeticError
            If A is not positive definite.

        """


class BandedCholesky:
    """LAPACK's banded Cholesky after a reverse Cuthill-McKee ordering."""

    def __init__(self, pattern: Pattern, order: np.ndarray):
        place = np.empty_like(order)
        place[order] = np.arange(pattern.size)
        row, column = place[pattern.rows], place[pattern.columns]
        self.order = order
        self.width = int(np.max(row - column))
        self._lower = np.flatnonzero(row >= column)
        below, column = (row - column)[self._lower], column[self._lower]
        self._target = column.astype(np.int64) * (self.width + 1) + below
        self._band = np.zeros((pattern.size, self.width + 1))

    def solve(self, data: Array, rhs: Array) -> Array:
        """Return the solution (see `Factor`)."""
        self._band[:] = 0.0
        self._band.reshape(-1)[self._target] = data[self._lower]
        # The transpose of a C array is what LAPACK calls lower band storage, with no copy.
        factor, info = lapack.dpbtrf(self._band.T, lower=1, overwrite_ab=1)
        if info != 0:
            raise ArithmeticError("the matrix of the step is not positive definite")
        x, _ = lapack.dpbtrs(factor, rhs[self.order], lower=1)
        out = np.empty_like(rhs)
        out[self.order] = x
        return out


class SparseLDL:
    """QDLDL, whose elimination tree and ordering are kept between factorisations."""

    def __init__(self, pattern: Pattern):
        full = pattern.matrix(np.arange(1.0, len(pattern.rows) + 1.0)).tocsc()
        upper = sp.triu(full, format="csc")
        self._take = upper.data.astype(np.int64) - 1
        self._upper = upper
        self._solver: Any = None

    def solve(self, data: Array, rhs: Array) -> Array:
        """Return the solution (see `Factor`)."""
        import qdldl

        self._upper.data = data[self._take]
        if self._solver is None:
            self._solver = qdldl.Solver(self._upper, upper=True)
        else:
            self._solver.update(self._upper, upper=True)
        x = np.asarray(self._solver.solve(rhs))
        if not np.all(np.isfinite(x)):
            raise ArithmeticError("the matrix of the step is singular")
        return x


def factor_for(pattern: Pattern) -> Factor:
    """Return the solver that is fastest for a pattern: banded where the band is narrow."""
    order = np.asarray(reverse_cuthill_mckee(pattern.matrix(np.ones(len(pattern.rows))), symmetric_mode=True))
    place = np.empty_like(order)
    place[order] = np.arange(pattern.size)
    width = int(np.max(np.abs(place[pattern.rows] - place[pattern.columns])))
    return BandedCholesky(pattern, order) if width <= WIDEST_BAND else SparseLDL(pattern)
