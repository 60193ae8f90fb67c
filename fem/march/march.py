"""The march: accepted steps of an adaptive second-order scheme, one after another.

Variable-step BDF2 for the stored amounts, with backward Euler for the first step after a
start or an event. Every step is finished conservatively: the stored amounts follow the
recurrence of the scheme to rounding, and the accounts of what left are carried by the very same
coefficients, so that comparing the two is a check of the solver and not of the quadrature.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

import numpy as np

from fem.errors import RunFailure
from fem.march.control import Control
from fem.march.newton import Effort, solve
from fem.march.problem import Array, Problem
from fem.march.step import Moment, Step, begin, recurrence

SMALLEST = 1e-9
"""No step is shorter than this share of the time that has passed, or of a second."""


def march(
    problem: Problem,
    start: Moment,
    end: float,
    landings: Sequence[float],
    control: Control,
    effort: Effort,
    stop: Callable[[Step], float | None] | None = None,
) -> Iterator[Step]:
    """Yield accepted steps from `start` until `end`, landing exactly on `landings`.

    Parameters
    ----------
    problem
        What is marched.
    start
        State to start from (see `begin`).
    end
        Last time [s]; landed on exactly.
    landings
        Times at which a step has to end [s]; those outside the march are ignored.
    control
        Tolerances and limits.
    effort
        Counted up as the march goes.
    stop
        Looks at a provisional step; the time inside it at which the march has to end, or None.
        The step is then cut there, and is the last.

    Raises
    ------
    RunFailure
        When no step of any size succeeds; what was yielded before stands.

    """
    targets = sorted({t for t in landings if start.time < t < end} | {end})
    history = [start]
    size = control.first_step or first_step(problem, start, control)
    for target in targets:
        while history[-1].time < target:
            now = history[-1]
            left = target - now.time
            # Spread evenly what is left before a landing; a last sliver would cost a step.
            step_size = left / max(1, int(np.ceil(left / min(size, control.largest_step or np.inf) - 1e-6)))
            landed = step_size > 0.999999 * left
            step, size = _accepted(problem, history, step_size, target if landed else None, control, effort)
            stopped = stop(step) if stop else None
            if stopped is not None:
                yield step.cut(problem, stopped)
                return
            yield step
            history = [*(moment.aged() for moment in history[-2:]), step.after]


def first_step(problem: Problem, start: Moment, control: Control) -> float:
    """Return a first step in which no unknown moves by more than a small share of its reach [s]."""
    speed = problem.fastest(start.rate)
    return control.first_move / speed if speed > 0 else 1.0


def _accepted(
    problem: Problem,
    history: list[Moment],
    size: float,
    landing: float | None,
    control: Control,
    effort: Effort,
) -> tuple[Step, float]:
    """Return an accepted step and the size for the next, trying smaller ones where needed."""
    began = history[-1].time
    last_error = ""
    for _ in range(control.most_tries):
        result = _attempt(problem, history, size, landing, control, effort)
        if size < SMALLEST * max(began, 1.0):
            break
        if result is None:
            size, landing = 0.3 * size, None
            last_error = "the iteration of a step did not converge"
            continue
        step, error = result
        order = 3 if len(history) > 1 else 2
        factor = 0.9 * (control.tolerance / max(error, 1e-12)) ** (1.0 / order)
        if error <= control.accept * control.tolerance:
            effort.steps += 1
            return step, size * min(max(factor, 0.4), control.growth)
        effort.rejected += 1
        size, landing = size * min(max(factor, 0.2), 0.7), None
        last_error = f"the error of a step stayed {error / control.tolerance:.3g} times its bound"
    raise RunFailure(
        why=f"{last_error}, down to steps of {size:.3g} s",
        time=began,
        causes=(
            "a coolant or heat transfer coefficient that jumps inside the stage",
            "a table with a kink that no step resolves",
        ),
    )


def _attempt(
    problem: Problem,
    history: list[Moment],
    size: float,
    landing: float | None,
    control: Control,
    effort: Effort,
) -> tuple[Step, float] | None:
    """Take one step; return it with its error, or None where the iteration failed."""
    now = history[-1]
    time = landing if landing is not None else now.time + size
    size = time - now.time
    earlier = now.time - history[-2].time if len(history) > 1 else None
    new, old, g = recurrence(size, earlier)
    known, known_carried = new * now.stored, new * now.carried
    if earlier is not None:
        known = known - old * history[-2].stored
        known_carried = known_carried - old * history[-2].carried
    start, guess, share = _forecast(history, time)
    found = solve(problem, time, problem.impose(time, start), known, g, control, effort)
    if found is None:
        return None
    look, stored = found
    u = problem.settle(stored, look)
    carried = known_carried + g * look.passed
    u_rate = np.where(problem.free, look.rate / look.stored_slope, (u - now.u) / size)
    after = Moment(time, u, stored, carried, look.rate, look.passed, u_rate, look)
    gap = share * (u - guess) * look.stored_slope
    error = max(problem.mean_size(gap), problem.smooth_size(gap, now.look, look))
    return Step(now, after, earlier), error


def _forecast(history: list[Moment], time: float) -> tuple[Array, Array, float]:
    """Return where the iteration of a step starts, from what its error is told, and its share of that.

    Both from past values, not from slopes: as a front crosses cells, the slopes at one moment go
    up and down in stairs. The iteration starts on the parabola through the last three, but
    nowhere further from the line through the last two than half of its rise: beyond, the
    parabola throws nodes across latent heat, and each costs an iteration to bring back.
    """
    now = history[-1]
    size = time - now.time
    if len(history) == 1:
        guess = now.u + size * now.u_rate
        return guess, guess, 0.5
    before = history[-2]
    earlier = now.time - before.time
    r = size / earlier
    slope = (now.u - before.u) / earlier
    line = now.u + size * slope
    # Errors of the scheme and of the parabola, both in units of the third derivative.
    corrector = (1 + r) ** 2 / (r * (1 + 2 * r))
    if len(history) == 2:
        guess = line + size * (size + earlier) * (now.u_rate - slope) / earlier
        predictor = (1 + r) / r
    else:
        first = history[-3]
        bend = (slope - (before.u - first.u) / (before.time - first.time)) / (now.time - first.time)
        guess = line + size * (size + earlier) * bend
        predictor = (1 + r) / r * (time - first.time) / size
    most = 0.5 * np.abs(line - now.u)
    return line + np.clip(guess - line, -most, most), guess, corrector / (corrector + predictor)


__all__ = ["Effort", "Moment", "Step", "begin", "march"]
