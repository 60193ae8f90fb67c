"""Symmetric positive definite systems of one fixed pattern, solved many times over.

What depends on the pattern alone is done once. A ladder of three solvers: a small bandwidth goes
to banded Cholesky, which is dense arithmetic without any index; a wide one to sparse LDL'; and
many unknowns to conjugate gradients with a multigrid hierarchy that is kept while it serves.
"""

from __future__ import annotations

import warnings
from typing import Any, Protocol

import numpy as np
import scipy.sparse as sp
from scipy.linalg import lapack
from scipy.sparse.linalg import LinearOperator

from fem.heat.pattern import Pattern, narrow_order, width
from fem.mesh.domain import Array

# Times of one factorisation and solution in ms, bars with a wall and rods, one thread:
#
#   nodes      2.8k   10k   13k   26k   51k (rod)   65k   200k (rod)   256k
#   bandwidth    41    40    87   121          86   191          170    379
#   banded     0.78   3.3   7.2    21          38   112
#   LDL'       1.24   4.4    10    40          54   177          356   1527
#   multigrid   6.4   6.3    14    29          31    84          138    520
#
# The work of a band grows with its square; past this width LDL' is level with it.
WIDEST_BAND = 200
# Multigrid is level with the band here; a factor serves several right-hand sides at little cost.
MOST_FOR_FACTORS = 50_000
# A residual of 1e-8 of the right-hand side; looser ones show in the enthalpies.
RESIDUAL, MOST_ITERATIONS = 1e-8, 100
# A new hierarchy costs about as much as this many iterations.
PRICE_OF_HIERARCHY = 8


class Factor(Protocol):
    """Factorises matrices of one pattern."""

    def solve(self, data: Array, rhs: Array) -> Array:
        """Return x with A x = rhs, for the values of A along the pattern.

        Parameters
        ----------
        data
            Values of A along the pattern, shape (nnz,).
        rhs
            One right-hand side, shape (n,), or several, shape (n, m).

        Returns
        -------
        The solutions, shape of `rhs`.

        Raises
        ------
        ArithmeticError
            If A is not positive definite.

        """

    def again(self, rhs: Array) -> Array:
        """Return x with A x = rhs for the matrix of the last `solve`, shape of `rhs`."""


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
        self._factor, info = lapack.dpbtrf(self._band.T, lower=1, overwrite_ab=1)
        _refuse_unless(info == 0)
        return self.again(rhs)

    def again(self, rhs: Array) -> Array:
        """Return the solution for the last matrix (see `Factor`)."""
        x, _ = lapack.dpbtrs(self._factor, rhs[self.order], lower=1)
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
        self._diagonal = pattern.diagonal
        self._solver: Any = None

    def solve(self, data: Array, rhs: Array) -> Array:
        """Return the solution (see `Factor`)."""
        import qdldl

        _refuse_unless(data[self._diagonal].min() > 0.0)
        self._upper.data = data[self._take]
        if self._solver is None:
            self._solver = qdldl.Solver(self._upper, upper=True)
        else:
            self._solver.update(self._upper, upper=True)
        return self.again(rhs)

    def again(self, rhs: Array) -> Array:
        """Return the solution for the last matrix (see `Factor`)."""
        if rhs.ndim > 1:
            return np.column_stack([self.again(column) for column in rhs.T])
        x = np.asarray(self._solver.solve(np.ascontiguousarray(rhs)))
        # LDL' carries on past a negative pivot, and copying the pivots out costs a tenth of the
        # factorisation; the energy of the solution tells as much of what the right-hand side sees.
        _refuse_unless(bool(np.all(np.isfinite(x))) and bool(x @ rhs > 0.0 or not rhs.any()))
        return x


class Multigrid:
    """Conjugate gradients with classical algebraic multigrid.

    From step to step the matrix changes little: an old hierarchy takes a few iterations more and
    saves its construction. It is renewed once those iterations add up to its price.
    """

    def __init__(self, pattern: Pattern):
        self._pattern = pattern
        self._levels: Any = None
        self._fresh = self._excess = 0

    def solve(self, data: Array, rhs: Array) -> Array:
        """Return the solution (see `Factor`)."""
        _refuse_unless(data[self._pattern.diagonal].min() > 0.0)
        self._matrix = self._pattern.matrix(data)
        kept = self._levels is not None and self._excess < PRICE_OF_HIERARCHY
        if not kept:
            self._renew()
        try:
            return self.again(rhs)
        except ArithmeticError:
            if not kept:
                raise
        self._renew()
        return self.again(rhs)

    def again(self, rhs: Array) -> Array:
        """Return the solution for the last matrix (see `Factor`)."""
        from pyamg.krylov import cg

        if rhs.ndim > 1:
            return np.column_stack([self.again(column) for column in rhs.T])
        residuals: list[float] = []
        with warnings.catch_warnings():
            # The outcome says the same, and a run has no use for a warning.
            warnings.simplefilter("ignore")
            x, info = cg(
                self._matrix,
                np.ascontiguousarray(rhs),
                tol=RESIDUAL,
                maxiter=MOST_ITERATIONS,
                M=LinearOperator((rhs.size, rhs.size), matvec=self._cycle, dtype=float),
                residuals=residuals,
            )
        _refuse_unless(info == 0 and bool(np.all(np.isfinite(x))))
        iterations = len(residuals) - 1
        self._fresh = self._fresh or iterations
        self._excess += max(iterations - self._fresh, 0)
        return np.asarray(x)

    def _cycle(self, rhs: Array, depth: int = 0) -> Array:
        """Return what one V cycle makes of a residual.

        pyamg's own takes the norm of the residual before and after, two more products with the
        matrix where one is needed.
        """
        level = self._levels.levels[depth]
        if depth + 1 == len(self._levels.levels):
            return np.asarray(self._levels.coarse_solver(level.A, rhs))
        x = np.zeros_like(rhs)
        level.presmoother(level.A, x, rhs)
        x += level.P @ self._cycle(level.R @ (rhs - level.A @ x), depth + 1)
        level.postsmoother(level.A, x, rhs)
        return x

    def _renew(self) -> None:
        from pyamg import ruge_stuben_solver

        # Aggregation sets up no faster here and takes a third more iterations.
        self._levels = ruge_stuben_solver(
            self._matrix,
            presmoother=("gauss_seidel", {"sweep": "forward"}),
            # Backwards after forwards: as a whole symmetric, as conjugate gradients need it.
            postsmoother=("gauss_seidel", {"sweep": "backward"}),
        )
        self._fresh = self._excess = 0


def _refuse_unless(definite: bool) -> None:
    if not definite:
        raise ArithmeticError("the matrix of the step is not positive definite")


def factor_for(pattern: Pattern) -> Factor:
    """Return the solver that is fastest for a pattern, by its size and bandwidth."""
    if pattern.size > MOST_FOR_FACTORS:
        return Multigrid(pattern)
    order = narrow_order(pattern)
    return BandedCholesky(pattern, order) if width(pattern, order) <= WIDEST_BAND else SparseLDL(pattern)
