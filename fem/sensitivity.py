"""What the answer hangs on: derivatives of its numbers to uncertain inputs, carried by the run itself."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np

from fem.case.case import Case, Stage
from fem.case.shift import Spread, shifted
from fem.curve import Array
from fem.heat.body import Body
from fem.heat.problem import HeatProblem
from fem.heat.varied import Twin, VariedProblem
from fem.march.step import Moment, Step
from fem.march.tangent import Tangents
from fem.mesh.build import build
from fem.plan import Plan
from fem.watch.arrival import Arrival
from fem.watch.gauge import Gauge

# How far a twin stands from its case, in half-widths: far above rounding, far below any bend.
HAIR = 1e-4


@dataclass(frozen=True)
class Input:
    """An uncertain number of the case.

    Parameters
    ----------
    key
        Dotted, as the case has it.
    spread
        Half-width of the interval that it lies in 19 times out of 20.
    default
        What stands for it where the case leaves it to the program; None where the case says.

    """

    key: str
    spread: Spread
    default: float | None = None


@dataclass
class Effects:
    """Derivatives per half-width of each input, in the inputs' order.

    Parameters
    ----------
    time
        Of the time to the aim [s]; None where it was not reached.
    stages
        For each stage that ended: of its end [s], of the slowest and the mean temperature there
        [K] and of the heat removed by then [J].
    pace
        How fast the temperature that was asked for moved when it met the aim [K/s].

    """

    time: Array | None = None
    pace: float | None = None
    stages: list[dict[str, Array]] = field(default_factory=list)


class Sensitivity:
    """Carries the derivatives along with a run.

    Parameters
    ----------
    plan
        The case made ready.
    gauge
        Reads the temperatures that the case asks for.
    inputs
        What is uncertain.

    Raises
    ------
    ValueError
        Where an input cannot be moved; says which.

    """

    def __init__(self, plan: Plan, gauge: Gauge, inputs: Sequence[Input]):
        self.plan, self.gauge, self.inputs = plan, gauge, tuple(inputs)
        self.effects = Effects()
        self._twins = [_twin_plan(plan, entry) for entry in inputs]
        self._hairs = [hair for _, hair in self._twins]
        self._gauges = [
            gauge if twin.body is plan.body else Gauge(twin.body, plan.case.watch.points, plan.cooling)
            for twin, _ in self._twins
        ]
        self._du = np.column_stack([(twin.start - plan.start) / hair for twin, hair in self._twins])
        self._began = np.zeros(len(inputs))
        self._tangents: Tangents | None = None
        self._earlier: Moment | None = None
        self._latest: Moment | None = None

    def begin_stage(self, stage: Stage, problem: HeatProblem, moment: Moment) -> None:
        """Start a stage from the derivatives that the one before ended with."""
        n = self.plan.case.stages.index(stage)
        twins = [
            Twin(HeatProblem(twin.body, twin.case.stages[n].surfaces, problem.began, self.plan.span), hair)
            for twin, hair in self._twins
        ]
        self._tangents = Tangents(VariedProblem(problem, twins), moment, self._du)
        self._earlier = self._latest = None

    def advance(self, step: Step) -> None:
        """Carry the derivatives over a step."""
        assert self._tangents is not None
        self._tangents.advance(step)
        self._earlier, self._latest = self._latest, step.before

    def see(self, step: Step, arrival: Arrival | None) -> None:
        """Take note of the aim where it is met in the step that was carried last."""
        aim = self.plan.case.aim
        if aim is None or arrival is None or arrival.time is None or self.effects.time is not None:
            return
        if step.before.time <= arrival.time <= step.after.time:
            self.effects.time, self.effects.pace = self.crossing(step, arrival.time, aim.at)

    def crossing(self, step: Step, time: float, at: str) -> tuple[Array, float]:
        """Return how the time at which a temperature passes a level moves with each input.

        Parameters
        ----------
        step
            The step that was carried last.
        time
            When it passes, inside the step [s].
        at
            "slowest", or the name of a watched point.

        Returns
        -------
        Derivatives of that time per half-width [s], shape (inputs,), NaN where the temperature
        stands still; and how fast it moves there [K/s].

        """
        shift, pace = self._event(step, time, at)
        return self._began + shift, pace

    def end_stage(self, stage: Stage, step: Step | None, met: bool) -> None:
        """Close a stage: its end may move with an input too."""
        if step is None:
            return
        assert self._tangents is not None
        n = self.plan.case.stages.index(stage)
        if met and stage.until is not None:
            shift, _ = self._event(step, step.after.time, stage.until.at)
        else:
            shift = np.array([(t.case.stages[n].lasts - stage.lasts) / hair for t, hair in self._twins])
        self._du = self._tangents.du + self._rate(step, step.after.time)[:, None] * shift
        self._began = self._began + shift
        u = step.after.u
        self.effects.stages.append(
            {
                "ended_s": self._began,
                "slowest_degC": self._change(u, self._du, lambda g, v: g.measure(v, "slowest")),
                "mean_degC": self._change(u, self._du, lambda g, v: g.product.mean(v)),
                "heat_removed_J": self._heat_change(u),
            }
        )

    def _event(self, step: Step, time: float, at: str) -> tuple[Array, float]:
        """Return how a crossing moves with each input on the stage's clock [s], and its pace [K/s]."""
        assert self._tangents is not None
        u, _ = step.at(time)
        reach = 1e-3 * step.size
        pace = (
            self.gauge.measure(u + reach * self._rate(step, time), at) - self.gauge.measure(u, at)
        ) / reach
        change = self._change(u, self._tangents.at(step, time), lambda g, v: g.measure(v, at))
        return (-change / pace if pace else np.full(len(self.inputs), np.nan)), pace

    def _rate(self, step: Step, time: float) -> Array:
        """Return how fast the unknowns move at a time in a step [J/m3/s].

        From the states themselves, as a parabola through the last three: the rate at one node
        carries what the iteration of the step has left, which the states hardly do.
        """
        moments = [m for m in (self._earlier, step.before, step.after) if m is not None]
        t = np.array([m.time for m in moments]) - time
        # Weights of the derivative at 0 of the polynomial through these times.
        powers = np.vander(t, increasing=True).T
        weights = np.linalg.solve(powers, np.eye(len(t))[1])
        return np.asarray(weights @ np.array([m.u for m in moments]))

    def _change(self, u: Array, du: Array, read: Callable[[Gauge, Array], float]) -> Array:
        """Return the derivative of anything that is read off the unknowns."""
        here = read(self.gauge, u)
        there = [
            read(g, u + h * du[:, i]) for i, (g, h) in enumerate(zip(self._gauges, self._hairs, strict=True))
        ]
        return np.array([(value - here) / h for value, h in zip(there, self._hairs, strict=True)])

    def _heat_change(self, u: Array) -> Array:
        """Return the derivative of the heat that has left [J]."""

        def removed(body: Body, start: Array, end: Array) -> float:
            return sum(body.heat(start).values()) - sum(body.heat(end).values())

        here = removed(self.plan.body, self.plan.start, u)
        return np.array(
            [
                (removed(twin.body, twin.start, u + hair * self._du[:, i]) - here) / hair
                for i, (twin, hair) in enumerate(self._twins)
            ]
        )


def _twin_plan(plan: Plan, entry: Input) -> tuple[Plan, float]:
    """Return the case with an input moved by a hair, on the same mesh, and the hair."""
    for hair in (HAIR, -HAIR):
        twin = moved(plan, entry, hair)
        if twin is not None:
            return twin, hair
    raise ValueError(f'"{entry.key}" cannot be moved without meshing the piece anew')


def moved(plan: Plan, entry: Input, by: float) -> Plan | None:
    """Return the case with an input moved by a number of half-widths, on the same mesh.

    None where its mesh would be another one.
    """
    case = shifted(plan.case, entry.key, entry.spread, by, entry.default)
    body = _twin_body(plan, case, entry.key)
    return None if body is None else Plan(case, body)


def _twin_body(plan: Plan, case: Case, key: str) -> Body | None:
    """Return the body of a moved case; None where its mesh is another one."""
    kind = key.split(".")[0]
    if kind == "shape" or key == "piece.length":
        domain = build(case.shape, case.piece.length)
        same = domain.mesh.t.shape == plan.body.domain.mesh.t.shape
        if not (same and np.array_equal(domain.mesh.t, plan.body.domain.mesh.t)):
            return None
        return Body(domain, plan.body.materials)
    if kind == "materials":
        name = key.split(".")[1]
        moved = case.materials[name].build()
        return plan.body.with_materials(
            {r: moved if case.regions[r] == name else m for r, m in plan.body.materials.items()}
        )
    return plan.body
