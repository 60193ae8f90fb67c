"""One implicit step: Newton's method, stopped early and finished conservatively."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from fem.march.control import Control
from fem.march.problem import Array, Problem


@dataclass
class Effort:
    """What the march has cost so far."""

    steps: int = 0
    rejected: int = 0
    newton: int = 0
    factorisations: int = 0


def solve(
    problem: Problem, time: float, u: Array, known: Array, g: float, control: Control, effort: Effort
) -> tuple[Any, Array] | None:
    """Solve ``stored(u) = known + g rate(u)``; return the last look and what is then stored.

    Stopped well inside the tolerance of the step, not at rounding: the remainder is put into
    `stored`, which keeps the balance exact.
    """
    for iteration in range(control.most_iterations):
        look = problem.look(time, u)
        effort.newton += 1
        target = known + g * look.rate
        residual = np.where(problem.free, look.stored - target, 0.0)
        if not np.all(np.isfinite(residual)):
            return None
        mean, worst = problem.mean_size(residual), problem.worst_size(residual, look)
        if (
            iteration
            and mean <= control.stop_mean * control.tolerance
            and worst <= control.stop_worst * control.tolerance
        ):
            return look, np.where(problem.free, target, look.stored)
        try:
            u = u + problem.correct(look, g, residual)
        except ArithmeticError:
            return None
        effort.factorisations += 1
    return None
