"""Sensitivities carried by the march: the derivative of every state to a few inputs.

The recurrence of a step, differentiated, has the matrix of the step itself: one more
back-substitution for each input, and no run is repeated.
"""

from __future__ import annotations

from typing import Any, Protocol

import numpy as np

from fem.march.problem import Array
from fem.march.step import Moment, Step, recurrence


class Varied(Protocol):
    """A problem that knows how its equations depend on inputs, `m` of them."""

    @property
    def free(self) -> np.ndarray:
        """Unknowns that follow the equation; the others are imposed."""

    def imposed(self, time: float, u: Array) -> Array:
        """Return the derivative of imposed unknowns, 0 for free ones, shape (n, m)."""

    def varied(self, time: float, look: Any) -> tuple[Array, Array]:
        """Return the derivatives of `stored` and `rate` at fixed unknowns, shape (n, m) each."""

    def tangent(self, look: Any, g: float, known: Array) -> Array:
        """Return du with ``d stored(u) - g d rate(u) = known``, shape (n, m)."""

    def stored_change(self, look: Any, du: Array) -> Array:
        """Return what a change of the unknowns changes of `stored`, shape (n, m)."""


class Tangents:
    """Derivatives of the unknowns to the inputs, step by step.

    Parameters
    ----------
    problem
        What is marched, with its inputs.
    start
        Where the march starts.
    du
        Derivatives of the unknowns there, shape (n, m).

    """

    def __init__(self, problem: Varied, start: Moment, du: Array):
        self._problem = problem
        self.du = np.where(problem.free[:, None], du, problem.imposed(start.time, start.u))
        self.before = self.du
        explicit, _ = problem.varied(start.time, start.look)
        self._stored = problem.stored_change(start.look, self.du) + explicit
        self._stored_before = self._stored

    def advance(self, step: Step) -> None:
        """Carry the derivatives over an accepted step."""
        problem, after = self._problem, step.after
        new, old, g = recurrence(step.size, step.earlier)
        explicit, rates = problem.varied(after.time, after.look)
        known = new * self._stored - old * self._stored_before + g * rates - explicit
        imposed = problem.imposed(after.time, after.u)
        free = problem.free[:, None]
        du = problem.tangent(after.look, g, np.where(free, known, imposed))
        self.before, self.du = self.du, du
        self._stored_before, self._stored = self._stored, problem.stored_change(after.look, du) + explicit

    def at(self, step: Step, time: float) -> Array:
        """Return the derivatives at a time inside the step last advanced [s]; straight between ends."""
        s = (time - step.before.time) / step.size
        return np.asarray(self.before + s * (self.du - self.before))
