"""All observers of a run, and the rows they fill."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from fem.curve import Array
from fem.heat.body import Body
from fem.heat.problem import HeatProblem, Look
from fem.march.march import Step
from fem.watch.fronts import Fronts
from fem.watch.gauge import Gauge
from fem.watch.ledger import Ledger
from fem.watch.schedule import Watch

Row = dict[str, float | None]


@dataclass(frozen=True)
class Rows:
    """One row of the curves and one of the fronts, at the same time."""

    curves: Row
    fronts: Row


class Record:
    """Looks at steps as they come and fills the rows of curves and fronts.

    Parameters
    ----------
    body
        Mesh and materials.
    watch
        What to look at, how often.
    surfaces
        Surfaces that exchange heat in any stage, in their order.
    cooling
        Whether the run means to cool.

    Raises
    ------
    ValueError
        Where a point or a ray does not lie in the piece.

    """

    def __init__(self, body: Body, watch: Watch, surfaces: tuple[str, ...], cooling: bool):
        self.body = body
        self.watch = watch
        self.gauge = Gauge(body, watch.points, cooling)
        self.product = self.gauge.product
        self.ledger = Ledger()
        self.surfaces = surfaces
        self.fronts = Fronts(self.product, watch.front, watch.rays)
        self._next = 0

    def measure(self, u: Array, at: str) -> float:
        """Return the temperature at the slowest point or at a watched one [degC]."""
        return self.gauge.measure(u, at)

    def begin_stage(self, problem: HeatProblem, u: Array) -> Iterator[Rows]:
        """Open the accounts of a stage; yield the row of time 0 before anything is imposed."""
        look = problem.look(problem.began, u)
        self.ledger.begin_stage(problem, look)
        if self._next == 0:
            self._next = 1
            yield self._row(problem, look, problem.began, np.zeros(len(problem.surfaces)))

    def see(self, problem: HeatProblem, step: Step, last: bool) -> Iterator[Rows]:
        """Yield a row for each multiple of `every` in a step, and for its end if it is the last."""
        self.ledger.step(step.before.carried, step.after.carried)
        end = step.after.time
        while self._next * self.watch.every <= end * (1 + 1e-12):
            time = min(self._next * self.watch.every, end)
            self._next += 1
            if time > step.before.time:
                u, carried = step.at(time)
                at_front = step.chord(time) if self.fronts.sharp else u
                yield self._row(problem, problem.look(time, u), time, carried, at_front)
        if last:
            look = problem.look(end, step.after.u)
            if (self._next - 1) * self.watch.every < end * (1 - 1e-12):
                yield self._row(problem, look, end, step.after.carried)
            self.ledger.end_stage(look, step.after.carried)

    def _row(
        self, problem: HeatProblem, look: Look, time: float, carried: Array, at_front: Array | None = None
    ) -> Rows:
        u, T = look.u, look.state.temperature
        curves: Row = {"time [s]": time}
        for name, value in self.gauge.points(T).items():
            curves[f"point.{name} [degC]"] = value
        curves["slowest [degC]"] = self.product.slowest(T)[1]
        curves["mean [degC]"] = self.product.mean(u)
        ice = self.product.mean_ice(self.product.ice(T))
        curves["ice_mean [-]"] = None if np.isnan(ice) else ice
        loads = dict(zip(problem.surfaces, map(float, look.passed), strict=True))
        for surface in self.surfaces:
            curves[f"heat_load.{surface} [W]"] = loads.get(surface, 0.0)
        curves["heat_removed [J]"] = sum(self.ledger.left(look, carried).values())
        fronts: Row = {"time [s]": time}
        for name, (position, speed) in self.fronts.see(time, u if at_front is None else at_front, T).items():
            fronts[f"{name}.position [mm]"] = None if position is None else position * 1e3
            fronts[f"{name}.speed [mm/min]"] = None if speed is None else speed * 6e4
        return Rows(curves, fronts)
