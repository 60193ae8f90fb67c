"""The ledger of heat: what left through each surface, against what the regions gave up."""

from __future__ import annotations

import numpy as np

from fem.curve import Array
from fem.heat.problem import HeatProblem, Look


class Ledger:
    """Heat that has left the piece, from the fluxes at its surfaces.

    It never looks at a change of stored heat, except that of the nodes whose temperature is
    imposed: there what leaves is what conduction brings less what the nodes keep.
    """

    def __init__(self) -> None:
        self.moved = 0.0
        self._before: dict[str, float] = {}
        self._problem: HeatProblem | None = None
        self._held = np.zeros(0)

    def begin_stage(self, problem: HeatProblem, look: Look) -> None:
        """Start the accounts of a stage from the state before any surface is imposed on it."""
        self._problem = problem
        self._held = problem.held_heat(look.stored)

    def end_stage(self, look: Look, carried: Array) -> None:
        """Close the accounts of a stage with its last state."""
        self._before = self.left(look, carried)
        self._problem = None

    def step(self, before: Array, after: Array) -> None:
        """Add up the heat that moved in a step, whichever way [J]."""
        self.moved += float(np.abs(after - before).sum())

    def left_at(self, u: Array, carried: Array) -> float:
        """Return the heat that has left by a state of the present stage, all surfaces [J]."""
        if self._problem is None:
            return sum(self._before.values())
        return sum(self.left(self._problem.look(self._problem.began, u), carried).values())

    def left(self, look: Look, carried: Array) -> dict[str, float]:
        """Return the heat that has left through each surface since the run began [J]."""
        assert self._problem is not None
        held = self._problem.held_heat(look.stored)
        out = dict(self._before)
        for i, surface in enumerate(self._problem.surfaces):
            out[surface] = out.get(surface, 0.0) + float(carried[i] + self._held[i] - held[i])
        return out


def imbalance(left: float, given_up: float, moved: float) -> float:
    """Return by how much two accounts of the same heat differ, relative to the heat moved."""
    return (left - given_up) / max(moved, abs(given_up), abs(left), 1e-300)
