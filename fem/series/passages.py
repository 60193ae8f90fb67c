"""When watched points pass temperatures, and how those times move with inputs: one march, no folder."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from threadpoolctl import threadpool_limits

from fem.curve import Array
from fem.ending import Ending
from fem.errors import RunFailure
from fem.heat.problem import HeatProblem
from fem.march.march import Effort, Step, begin, march
from fem.plan import Plan
from fem.sensitivity import Input, Sensitivity
from fem.watch.arrival import Arrival
from fem.watch.gauge import Gauge


@dataclass(frozen=True)
class Level:
    """A temperature that a watched point passes on its way down.

    Parameters
    ----------
    at
        Name of the point.
    temperature
        [degC].

    """

    at: str
    temperature: float


@dataclass(frozen=True)
class Passages:
    """When each level was passed first, in the order of the levels.

    Parameters
    ----------
    times
        Since the run began [s], NaN where it never was; shape (k,).
    slopes
        Derivative of each time per half-width of each input [s], shape (k, m).
    paces
        How fast the temperature fell then [K/s], shape (k,); NaN after a bare march.

    """

    times: Array
    slopes: Array
    paces: Array


def passages(plan: Plan, levels: Sequence[Level], inputs: Sequence[Input]) -> Passages:
    """March a case until every level is passed, or to its end.

    Parameters
    ----------
    plan
        The case made ready; it watches the points that the levels name.
    levels
        What is to be passed.
    inputs
        To which the times are differentiated; none for a bare march.

    Raises
    ------
    RunFailure
        Where the march cannot go on.
    ValueError
        Where an input cannot be moved.

    """
    gauge = Gauge(plan.body, plan.case.watch.points, plan.cooling)
    carried = Sensitivity(plan, gauge, inputs) if inputs else None
    crossings = _Crossings(levels, gauge, carried, len(inputs))
    time, u = 0.0, plan.start
    try:
        with threadpool_limits(1):
            for stage in plan.case.stages:
                problem = HeatProblem(plan.body, stage.surfaces, time, plan.span)
                ending = Ending(stage, gauge, time, u)
                if ending.met:
                    continue
                moment = begin(problem, time, u, plan.no_accounts(stage))
                if carried is not None:
                    carried.begin_stage(stage, problem, moment)
                landings, control = plan.landings(stage, time), plan.control(stage)
                for step in march(problem, moment, ending.latest, landings, control, Effort(), ending.stop):
                    if carried is not None:
                        carried.advance(step)
                    crossings.see(step)
                    if crossings.complete:
                        return crossings.found()
                time, u = step.after.time, step.after.u
                if carried is not None:
                    carried.end_stage(stage, step, ending.met)
    except RunFailure as failure:
        failure.where = failure.where or plan.place_of(failure.unknown)
        raise
    return crossings.found()


class _Crossings:
    """Finds in each step which levels are passed in it."""

    def __init__(self, levels: Sequence[Level], gauge: Gauge, carried: Sensitivity | None, inputs: int):
        self._levels, self._gauge, self._carried = levels, gauge, carried
        self._times = np.full(len(levels), np.nan)
        self._slopes = np.full((len(levels), inputs), np.nan)
        self._paces = np.full(len(levels), np.nan)
        self._points = tuple(dict.fromkeys(level.at for level in levels))

    @property
    def complete(self) -> bool:
        """Whether every level has been passed."""
        return bool(np.all(np.isfinite(self._times)))

    def see(self, step: Step) -> None:
        """Take note of the levels that are passed in a step."""
        now = {at: self._gauge.measure(step.after.u, at) for at in self._points}
        for i, level in enumerate(self._levels):
            if np.isfinite(self._times[i]) or now[level.at] > level.temperature:
                continue
            time = self._arrival(level).within(step)
            assert time is not None, "the temperature at the end of the step is below the level"
            self._times[i] = time
            if self._carried is not None:
                self._slopes[i], self._paces[i] = self._carried.crossing(step, time, level.at)

    def _arrival(self, level: Level) -> Arrival:
        return Arrival(lambda u: self._gauge.measure(u, level.at), level.temperature, below=True)

    def found(self) -> Passages:
        """Return what was found."""
        return Passages(self._times, self._slopes, self._paces)
