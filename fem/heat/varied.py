"""How a stage's heat problem depends on inputs of the case.

Each input has a twin: the same stage with that input moved by a hair. Comparing the twin with
the stage at the same unknowns gives the derivative of its equations to anything a case can say,
a coefficient, a recipe or a thickness that moves the mesh, by one mechanism.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fem.curve import Array
from fem.heat.problem import HeatProblem, Look

# Iterations on the exact Jacobian where the symmetric matrix is only near it.
MOST_ROUNDS = 8
CLOSE = 1e-3


@dataclass(frozen=True, eq=False)
class Twin:
    """A stage with one input moved.

    Parameters
    ----------
    problem
        The stage as it would be.
    hair
        By how much the input was moved, in its own measure.

    """

    problem: HeatProblem
    hair: float


class VariedProblem:
    """A stage with its twins, in the terms that `fem.march.tangent` asks for.

    Parameters
    ----------
    problem
        The stage.
    twins
        One for each input.

    """

    def __init__(self, problem: HeatProblem, twins: Sequence[Twin]):
        self.problem = problem
        self.twins = tuple(twins)
        self.free = problem.free
        # Twins of the same materials have the same temperature at the same unknowns.
        own = list(problem.body.materials.values())
        self._same = [
            all(a is b for a, b in zip(own, t.problem.body.materials.values(), strict=True)) for t in twins
        ]
        self._last: Array | None = None

    def imposed(self, time: float, u: Array) -> Array:
        """Return the derivative of the unknowns whose temperature is imposed, 0 for free ones."""
        out = np.zeros((len(u), len(self.twins)))
        held = self.problem.held
        if len(held):
            for i, twin in enumerate(self.twins):
                moved = twin.problem.impose(time, u)
                out[held, i] = (moved[held] - u[held]) / twin.hair
        return out

    def varied(self, time: float, look: Look) -> tuple[Array, Array]:
        """Return the derivatives of what is stored [J] and of its rate [W] at fixed unknowns."""
        stored = np.zeros((len(look.u), len(self.twins)))
        rate = np.zeros_like(stored)
        for i, twin in enumerate(self.twins):
            if twin.problem.body is self.problem.body:
                left = twin.problem.leaving(time, look.state.temperature)
                rate[:, i] = (self.problem.leaving(time, look.state.temperature) - left) / twin.hair
            else:
                held, brought = twin.problem.balance(time, look.u, look.state if self._same[i] else None)
                stored[:, i] = (held - look.stored) / twin.hair
                rate[:, i] = (brought - look.rate) / twin.hair
        return stored, rate

    def stored_change(self, look: Look, du: Array) -> Array:
        """Return what a change of the unknowns changes of what is stored [J]."""
        return np.asarray(look.stored_slope[:, None] * du)

    def tangent(self, look: Look, g: float, known: Array) -> Array:
        """Return the change of the unknowns for a change of what is known [J].

        Rows of imposed unknowns hold their change itself.
        """
        problem, body = self.problem, self.problem.body
        to_u = (look.state.capacity / body.scale(look.state))[:, None]
        held = ~self.free[:, None]
        solve = problem.factored(look, g)
        size = np.abs(np.where(held, 0.0, known)).max(axis=0) + 1e-300
        # The derivatives change little from step to step: start from the last.
        du = np.where(held, known, 0.0 if self._last is None else self._last)
        rest = np.where(held, 0.0, known - problem.jacobian(look, g, du))
        for _ in range(MOST_ROUNDS):
            du += to_u * solve(rest)
            if body.single:
                break
            rest = np.where(held, 0.0, known - problem.jacobian(look, g, du))
            if np.all(np.abs(rest).max(axis=0) <= CLOSE * size):
                break
        self._last = du
        return du
