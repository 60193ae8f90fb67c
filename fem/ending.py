"""When a stage is over, and why."""

from __future__ import annotations

from fem.case.case import Stage
from fem.curve import Array
from fem.march.step import Step
from fem.watch.arrival import Arrival
from fem.watch.gauge import Gauge


class Ending:
    """Decides when a stage is over, and says why.

    Parameters
    ----------
    stage
        What is to end.
    gauge
        Reads the temperatures that the stage's condition names.
    began, u
        When it began [s] and the unknowns then.

    """

    def __init__(self, stage: Stage, gauge: Gauge, began: float, u: Array):
        self.latest = began + stage.lasts
        self.why = "its time was up"
        self.arrival: Arrival | None = None
        self.met = False
        if stage.until is not None:
            until = stage.until
            self.arrival = Arrival(lambda u: gauge.measure(u, until.at), until.temperature, until.below)
            self._said = f"{until.at} {'<=' if until.below else '>='} {until.temperature:g} degC"
            self.why = f"its time was up before {self._said}"
            self.met = self.arrival.lag(u) <= 0.0
            if self.met:
                self.why = f"{self._said} held from its start"

    def stop(self, step: Step) -> float | None:
        """Return when the stage's condition is met in a step, or None."""
        time = self.arrival.within(step) if self.arrival else None
        if time is not None:
            self.met, self.why = True, f"{self._said} was reached"
        return time
