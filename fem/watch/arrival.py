"""When a temperature is reached, to a fraction of a second whatever the step."""

from __future__ import annotations

from collections.abc import Callable

from scipy.optimize import brentq

from fem.curve import Array
from fem.march.march import Step

# A crossing is wanted to 0.1 s; the root costs a look-up of temperatures for each bisection.
PRECISION = 1e-3


class Arrival:
    """Finds the first moment at which a temperature has come down (or up) to its aim.

    Parameters
    ----------
    measure
        From unknowns to the temperature that is followed [degC].
    aim
        Temperature to reach [degC].
    below
        Whether it has to fall to the aim; else to rise to it.

    """

    def __init__(self, measure: Callable[[Array], float], aim: float, below: bool):
        self.measure = measure
        self.aim = aim
        self.below = below
        self.time: float | None = None

    def lag(self, u: Array) -> float:
        """Return by how much the aim is missed [K]; 0 or below once it is met."""
        gap = self.measure(u) - self.aim
        return gap if self.below else -gap

    def within(self, step: Step) -> float | None:
        """Return the time at which the aim is met in a step [s], or None."""
        if self.lag(step.after.u) > 0.0:
            return None
        if self.lag(step.before.u) <= 0.0:
            return step.before.time
        a, b = step.before.time, step.after.time
        time = float(brentq(lambda t: self.lag(step.at(t)[0]), a, b, xtol=PRECISION / 4))
        # The root may fall on the near side, where the aim is missed by a rounding.
        return min(time + PRECISION / 4, b) if self.lag(step.at(time)[0]) > 0.0 else time

    def see(self, step: Step) -> None:
        """Note the time where the step is the first to meet the aim."""
        if self.time is None:
            self.time = self.within(step)
