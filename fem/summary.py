"""``summary.json`` while a run goes on: what it will say, kept up to date."""

from __future__ import annotations

import logging
import platform
import time as clock
from contextlib import suppress
from functools import cache
from importlib.metadata import version
from typing import Any

from fem.case.case import Case, Stage
from fem.heat.body import Body
from fem.march.march import Effort, Step
from fem.mesh.domain import Array
from fem.result.fields import Fields
from fem.result.folder import Result, RunFolder, Table
from fem.watch.arrival import Arrival
from fem.watch.ledger import imbalance
from fem.watch.record import Record, Rows
from fem.watch.schedule import SLOWEST

log = logging.getLogger("fem.run")
SECONDS_BETWEEN = 0.5


class Summary:
    """Gathers what a run finds and writes it to the run folder, where there is one.

    Parameters
    ----------
    case
        As read.
    body, start
        The meshed piece and its enthalpies at the start [J/m3].
    record
        The observers.
    out
        The folder; None to write nothing.
    started
        Reading of the process's clock when the run began [s].
    cautions
        Sentences known before the first step.
    estimates
        Freezing times found without a march.

    """

    def __init__(
        self,
        case: Case,
        body: Body,
        start: Array,
        record: Record,
        out: RunFolder | None,
        started: float,
        cautions: list[str],
        estimates: list[dict[str, Any]],
    ):
        self.case, self.body, self.record, self.out = case, body, record, out
        self.effort = Effort()
        self.cautions = list(cautions)
        self.estimates = estimates
        self.stages: list[dict[str, Any]] = []
        self.curves = out.curves if out else Table()
        self.fronts = out.fronts if out else Table()
        self._started, self._marched, self._written = started, clock.perf_counter(), 0.0
        self._march_s: float | None = None
        self._heat = body.heat(start)
        self._u = start
        self._time = 0.0
        self._left: tuple[Array, Array] | None = None
        self._state: dict[str, Any] = {
            "outcome": "running",
            "why": "unfinished: still running, or it was killed",
        }
        self.arrival: Arrival | None = None
        if (aim := case.aim) is not None:
            self.arrival = Arrival(lambda u: record.measure(u, aim.at), aim.reach, record.product.cooling)
            if self.arrival.lag(start) <= 0.0:
                self.arrival.time = 0.0
        self.fields: Fields | None = None
        self.uncertainty: dict[str, Any] | None = None
        self.numerical_error: dict[str, Any] | None = None

    def begin(self) -> None:
        """Write the first word, and the fields at the start."""
        self._write()
        if self.out is not None and self.case.watch.fields != "none":
            reach = self.case.aim.reach if self.case.aim else None
            self.fields = Fields(self.out.path, self.case.watch, self.record.product, reach, self._u)

    def add(self, rows: Rows) -> None:
        """Take a row of the curves and one of the fronts."""
        self.curves.add(rows.curves)
        self.fronts.add(rows.fronts)

    def progress(self, step: Step) -> None:
        """Take note of an accepted step."""
        if self.arrival is not None:
            self.arrival.see(step)
        self._u, self._time = step.after.u, step.after.time
        self._left = (step.after.u, step.after.carried)
        if self.fields is not None:
            self.fields.see(step)
        log.debug("t = %.6g s, step %.4g s, %s", step.after.time, step.size, self.effort)
        if clock.perf_counter() - self._written > SECONDS_BETWEEN:
            self._write()

    def end_stage(self, stage: Stage, time: float, u: Array, why: str, met: bool) -> None:
        """Take note of the end of a stage."""
        product = self.record.product
        T = self.body.temperature(u)
        ice = product.mean_ice(product.ice(T))
        self.stages.append(
            {
                "name": stage.name,
                "ended_s": time,
                "why": why,
                "slowest_degC": product.slowest(T)[1],
                "mean_degC": product.mean(u),
                "ice": None if ice != ice else ice,
            }
        )
        if stage.until is not None and not met:
            self.cautions.append(f"stage {stage.name} ended because {why}")
        if self.fields is not None:
            self.fields.end_stage(time, u)
        log.info("stage %s ended at %.6g s: %s", stage.name, time, why)
        self._write()

    def marched(self) -> None:
        """Take note that the march is over; what follows is not counted as its time."""
        self._march_s = clock.perf_counter() - self._marched

    def end(self, outcome: str, why: str) -> None:
        """Write the last word."""
        self._state = {"outcome": outcome, "why": why}
        log.info("%s: %s", outcome, why)
        self.cautions += self._surprises()
        if self.fields is not None:
            self.fields.end(self._time, self._u)
        self._write()

    def give_up(self, error: OSError) -> None:
        """Say that the folder could not be written any further, if it takes even that."""
        why = f"{error.filename or 'a file'} could not be written: {error.strerror}"
        self._state = {"outcome": "failed", "why": why}
        with suppress(OSError):
            self._write()

    def result(self) -> Result:
        """Return what was last written, and every row."""
        return Result(
            self._last, self.curves.columns(), self.fronts.columns(), self.out.path if self.out else None
        )

    def as_dict(self) -> dict[str, Any]:
        """Return the content of ``summary.json``."""
        product = self.record.product
        T = self.body.temperature(self._u)
        node, slowest = product.slowest(T)
        now = self.body.heat(self._u)
        given = {region: self._heat[region] - now[region] for region in now}
        left = self.record.ledger.left_at(*self._left) if self._left else 0.0
        return {
            "title": self.case.title,
            **self._state,
            "aim": self._aim(),
            "uncertainty": self.uncertainty,
            "numerical_error": self.numerical_error,
            "slowest": {
                "at_m": [float(x) for x in self.body.domain.points[:, node]],
                "temperature_degC": slowest,
            },
            "heat_removed_J": left,
            "heat_J": given,
            "energy_imbalance": imbalance(left, sum(given.values()), self.record.ledger.moved),
            "mass_kg": self.body.masses(),
            "time_s": self._time,
            "stages": self.stages,
            "effort": self._effort(),
            "estimates": self._compared(),
            "cautions": self.cautions,
            "versions": versions(),
        }

    def _compared(self) -> list[dict[str, Any]]:
        """Return the estimates, with the run's own time over each where both are known."""
        own = self.arrival.time if self.arrival is not None else None
        if not own or self.case.aim is None or self.case.aim.at != SLOWEST:
            return self.estimates
        return [{**e, "ratio": own / e["time_s"]} if e["time_s"] else e for e in self.estimates]

    def _surprises(self) -> list[str]:
        """Say where the run leaves the band of an estimate that holds for its case."""
        said = []
        for e in self._compared():
            ratio, (low, high) = e.get("ratio"), e.get("band", (0.0, float("inf")))
            if ratio is not None and e["in_range"] and not low <= ratio <= high:
                found = f"the time to the aim is {ratio:.2f} times the {e['method']} estimate"
                said.append(f"{found}, theory allows {low:g} to {high:g}: look for a mistake in the case")
        return said

    def _aim(self) -> dict[str, Any] | None:
        aim = self.case.aim
        if aim is None or self.arrival is None:
            return None
        time = self.arrival.time
        met = time is not None and (aim.within is None or time <= aim.within)
        return {"at": aim.at, "reach_degC": aim.reach, "met": met, "time_s": time, "within_s": aim.within}

    def _effort(self) -> dict[str, Any]:
        now = clock.perf_counter()
        return {
            "nodes": self.body.size,
            "steps": self.effort.steps,
            "rejected": self.effort.rejected,
            "newton": self.effort.newton,
            "factorisations": self.effort.factorisations,
            "march_s": round(now - self._marched if self._march_s is None else self._march_s, 4),
            "elapsed_s": round(now - self._started, 4),
        }

    def _write(self) -> None:
        self._written = clock.perf_counter()
        self._last = self.as_dict()
        if self.out is not None:
            self.out.summarise(self._last)


@cache
def versions() -> dict[str, str]:
    """Return the versions of what computed the result; looking them up takes as long as a step."""
    names = ("rimefront", "numpy", "scipy", "scikit-fem")
    return {"python": platform.python_version(), **{name: version(name) for name in names}}
