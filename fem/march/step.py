"""States on the way, and all that lies between two of them."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from fem.march.problem import Array, Problem


@dataclass(frozen=True, eq=False)
class Moment:
    """A state on the way.

    Parameters
    ----------
    time
        Since the run began [s].
    u
        Unknowns, shape (n,).
    stored
        What they hold, by the scheme's own recurrence, shape (n,).
    carried
        Accounts of what has left, carried by the same recurrence, shape (accounts,).
    rate, passed
        Time derivatives of `stored` and `carried`.
    u_rate
        Time derivative of the unknowns.
    look
        The problem's look at the state from which the rates come.

    """

    time: float
    u: Array
    stored: Array
    carried: Array
    rate: Array
    passed: Array
    u_rate: Array
    look: Any

    def aged(self) -> Moment:
        """Return the moment as later steps need it, without its look, which is large."""
        return replace(self, look=None)


@dataclass(frozen=True, eq=False)
class Step:
    """An accepted step, and everything between its ends.

    Parameters
    ----------
    before, after
        Its ends.
    earlier
        Length of the step before it [s]; None for the first after a start.

    """

    before: Moment
    after: Moment
    earlier: float | None

    @property
    def straight(self) -> bool:
        """Whether the step is the first after a start."""
        return self.earlier is None

    @property
    def size(self) -> float:
        """Length of the step [s]."""
        return self.after.time - self.before.time

    def at(self, time: float) -> tuple[Array, Array]:
        """Return unknowns and carried accounts at a time inside the step [s].

        Cubic through both ends with their slopes; straight in a first step, whose initial slope
        belongs to a jump at the surface.
        """
        a, b = self.before, self.after
        if time >= b.time:
            return b.u, b.carried
        s = (time - a.time) / self.size
        if self.straight:
            return a.u + s * (b.u - a.u), a.carried + s * (b.carried - a.carried)
        return (
            _hermite(s, self.size, a.u, b.u, a.u_rate, b.u_rate),
            _hermite(s, self.size, a.carried, b.carried, a.passed, b.passed),
        )

    def chord(self, time: float) -> Array:
        """Return the unknowns on a straight line between the ends, at a time inside the step [s].

        Where latent heat leaves at one temperature, nodes give theirs up one after another: a
        slope at one moment says nothing of the step, and a cubic through it misses the front by
        ten times as much as a straight line.
        """
        s = (time - self.before.time) / self.size
        return np.asarray(self.before.u + s * (self.after.u - self.before.u))

    def cut(self, problem: Problem, time: float) -> Step:
        """Return the step ended at a time inside it [s].

        What is stored is interpolated as the accounts are, so the balance stays closed.
        """
        if time >= self.after.time:
            return self
        a, b = self.before, self.after
        u, carried = self.at(time)
        s = (time - a.time) / self.size
        if self.straight:
            stored = a.stored + s * (b.stored - a.stored)
        else:
            free = problem.free
            rates = np.where(free, a.rate, 0.0), np.where(free, b.rate, 0.0)
            stored = _hermite(s, self.size, a.stored, b.stored, *rates)
        u = problem.impose(time, problem.settle(stored, problem.look(time, u)))
        return Step(a, begin(problem, time, u, carried), self.earlier)


def recurrence(size: float, earlier: float | None) -> tuple[float, float, float]:
    """Return new, old and g of ``stored = new stored_n - old stored_n-1 + g rate``.

    Variable-step BDF2, or backward Euler for a first step.

    Parameters
    ----------
    size, earlier
        Lengths of the step and of the one before it [s]; None for no step before.

    """
    if earlier is None:
        return 1.0, 0.0, size
    r = size / earlier
    return (1 + r) ** 2 / (1 + 2 * r), r * r / (1 + 2 * r), size * (1 + r) / (1 + 2 * r)


def begin(problem: Problem, time: float, u: Array, carried: Array) -> Moment:
    """Return the state that a march starts from; imposed unknowns jump to what holds at `time`."""
    u = problem.impose(time, u)
    look = problem.look(time, u)
    u_rate = np.where(problem.free, look.rate / look.stored_slope, 0.0)
    return Moment(time, u, look.stored, carried, look.rate, look.passed, u_rate, look)


def _hermite(s: float, size: float, a: Array, b: Array, a_rate: Array, b_rate: Array) -> Array:
    """Cubic through two values with their slopes, at the share `s` of the interval."""
    t = 1.0 - s
    return np.asarray(
        a * t * t * (1 + 2 * s) + b * s * s * (3 - 2 * s) + size * s * t * (t * a_rate - s * b_rate)
    )
