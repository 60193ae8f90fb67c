"""The range of an answer and what it hangs on, carried along with the run."""

from __future__ import annotations

from typing import Any

import numpy as np

from fem.case.case import Stage
from fem.case.shift import value_of
from fem.case.uncertainty import usual_uncertainty
from fem.heat.problem import HeatProblem
from fem.march.step import Moment, Step
from fem.plan import Plan
from fem.sensitivity import Input, Sensitivity
from fem.signal import Signal
from fem.spread import BENDS, Bend, bends_of, range_of, ranking
from fem.watch.arrival import Arrival
from fem.watch.gauge import Gauge

# A range wider than this share of its middle is drawn from tangents that no longer hold.
WIDE = 1.0


class HangsOn:
    """Sensitivities of a run, and what they mean in words and seconds.

    Parameters
    ----------
    plan
        The case made ready.
    sensitivity
        Carries the derivatives.
    said
        Whether the case itself says how uncertain its inputs are.

    """

    def __init__(self, plan: Plan, sensitivity: Sensitivity, said: bool):
        self.plan, self.said = plan, said
        self._sensitivity = sensitivity
        self._stage: list[Stage] = []

    @classmethod
    def of(cls, plan: Plan, gauge: Gauge) -> HangsOn | None:
        """Make ready for a case; None where nothing of it is uncertain."""
        case = plan.case
        said = case.uncertainty is not None
        product = {region: case.regions[region] for region in plan.body.domain.product}
        spreads = case.uncertainty if case.uncertainty is not None else usual_uncertainty(case, product)
        inputs = [Input(key, spread, default_of(plan, key)) for key, spread in spreads.items()]
        return cls(plan, Sensitivity(plan, gauge, inputs), said) if inputs else None

    def begin_stage(self, stage: Stage, problem: HeatProblem, moment: Moment) -> None:
        """Start a stage."""
        self._sensitivity.begin_stage(stage, problem, moment)

    def see(self, step: Step, arrival: Arrival | None) -> None:
        """Carry the derivatives over a step, and take note of the aim."""
        self._sensitivity.advance(step)
        self._sensitivity.see(step, arrival)

    def end_stage(self, stage: Stage, step: Step, met: bool) -> None:
        """Close a stage."""
        self._stage.append(stage)
        self._sensitivity.end_stage(stage, step, met)

    def as_dict(self, arrival: Arrival | None) -> dict[str, Any]:
        """Return ranges and ranking, as they stand in ``summary.json``."""
        effects, inputs = self._sensitivity.effects, self._sensitivity.inputs
        values = [_number(value_of(self.plan.case, entry.key)) for entry in inputs]
        bends = bends_of(inputs, values, self._freezing_point())
        out: dict[str, Any] = {
            "source": "the case says" if self.said else "the trade usually finds them",
            "inputs": [],
            "time_s": None,
            "stages": [],
            "remarks": [],
        }
        for stage, changes in zip(self._stage, effects.stages, strict=True):
            half = {name: float(np.sqrt(np.sum(change**2))) for name, change in changes.items()}
            out["stages"].append(
                {"name": stage.name, **{f"{name}_half_width": v for name, v in half.items()}}
            )
        if effects.time is None or arrival is None or arrival.time is None:
            return out
        if not np.all(np.isfinite(effects.time)):
            out["remarks"] = ["the temperature stands still where the aim is met: its time has no range"]
            return out
        spread = range_of(arrival.time, effects.time, bends)
        out["time_s"] = spread.as_dict()
        out["inputs"] = ranking(inputs, effects.time, bends, values)
        out["remarks"] = self._remarks(bends, spread.high - spread.low, arrival.time)
        return out

    def _freezing_point(self) -> float | None:
        materials = [self.plan.body.materials[r] for r in self.plan.body.domain.product]
        return next((m.freezing_point for m in materials if m.freezing_point is not None), None)

    def _remarks(self, bends: list[Bend], width: float, time: float) -> list[str]:
        """Say where the tangents are not to be trusted."""
        said = []
        case, pace = self.plan.case, self._sensitivity.effects.pace
        if any(b.share is not None and b.share > BENDS for b in bends):
            said.append("an input varies by more than half of what drives the heat: the range is rough")
        if width > WIDE * time:
            said.append("the range is wider than the answer: its ends are rough, run them")
        if pace is not None and case.aim is not None:
            start = self.plan.start_temperature
            mean_pace = abs(case.aim.reach - start) / max(time, 1e-9)
            if abs(pace) < 0.05 * mean_pace:
                said.append("the aim is barely reached: its time hangs on everything, and the range is rough")
        return said


def default_of(plan: Plan, key: str) -> float | None:
    """Return what the program chose for a key that the case leaves out."""
    if not key.startswith("materials."):
        return None
    name, last = key.split(".")[1], key.rsplit(".", 1)[1]
    region = next((r for r, m in plan.case.regions.items() if m == name), None)
    if region is None:
        return None
    material = plan.body.materials[region]
    return {"freezing_point": material.freezing_point, "density": material.density}.get(last)


def _number(value: Any) -> float | None:
    """Return a value that stands for a key, the first one where it changes with time."""
    if isinstance(value, Signal):
        return float(value.values[0])
    return value
