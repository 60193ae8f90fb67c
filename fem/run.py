"""From a case to its answer: the one place where everything meets."""

from __future__ import annotations

import logging
import time as clock
from collections.abc import Callable, Iterator
from pathlib import Path

from fem.case.case import Case, Stage
from fem.case.portable import portable
from fem.errors import CaseError, Problem, RunFailure
from fem.heat.problem import HeatProblem
from fem.march.march import Moment, Step, begin, march
from fem.mesh.domain import Array
from fem.plan import Plan
from fem.result.fields import check_format
from fem.result.folder import Result, RunFolder
from fem.summary import Summary
from fem.watch.arrival import Arrival
from fem.watch.record import Record

log = logging.getLogger("fem.run")
Progress = Callable[[float, Record, Moment], None]


def run(
    case: Case, folder: str | Path | None = None, *, overwrite: bool = False, progress: Progress | None = None
) -> Result:
    """Run a case.

    Parameters
    ----------
    case
        From `fem.case.read.load`.
    folder
        Run folder to write, which must not exist; None to write nothing.
    overwrite
        Whether an earlier run's folder may be replaced.
    progress
        Called after each step with the time [s], the observers and the state.

    Returns
    -------
    Summary, curves and fronts; the same as `fem.result.folder.open_run` reads from the folder.

    Raises
    ------
    CaseError
        Where a watched place lies outside the piece, or the folder exists.
    RunFailure
        Where the march cannot go on; the folder says so and keeps what came before.
    OSError
        Where the folder cannot be written; likewise, as far as there is room.

    """
    started = clock.perf_counter()
    plan = Plan.of(case)
    try:
        check_format(case.watch.fields)
        record = Record(plan.body, case.watch, plan.surfaces, plan.cooling)
    except ValueError as error:
        raise CaseError(case.source, [Problem("watch", str(error))]) from error
    out = RunFolder(Path(folder), *portable(case.text, case.folder), overwrite) if folder is not None else None
    summary = Summary(case, plan.body, plan.start, record, out, started, plan.cautions())
    try:
        summary.begin()
        for step in _steps(plan, record, summary):
            if progress is not None:
                progress(step.after.time, record, step.after)
            summary.progress(step)
        summary.end("finished", "every stage was run")
    except RunFailure as failure:
        failure.where = failure.where or plan.place_of(failure.unknown)
        failure.kept = "What was computed before is kept in the run folder." if out else ""
        summary.end("failed", str(failure))
        raise
    except KeyboardInterrupt:
        summary.end("interrupted", "stopped from the keyboard; what was computed before is kept")
        raise
    except OSError as error:
        summary.give_up(error)
        raise
    finally:
        if out is not None:
            out.close()
    return summary.result()


def _steps(plan: Plan, record: Record, summary: Summary) -> Iterator[Step]:
    """March through the stages, each from the last state of the one before."""
    time, u = 0.0, plan.start
    for stage in plan.case.stages:
        problem = HeatProblem(plan.body, stage.surfaces, time, plan.span)
        for rows in record.begin_stage(problem, u):
            summary.add(rows)
        ending = _Ending(stage, record, time, u)
        if not ending.met:
            moment = begin(problem, time, u, plan.no_accounts(stage))
            landings = plan.landings(stage, time)
            control = plan.control(stage)
            for step in march(problem, moment, ending.latest, landings, control, summary.effort, ending.stop):
                for rows in record.see(problem, step, last=ending.met or step.after.time >= ending.latest):
                    summary.add(rows)
                time, u = step.after.time, step.after.u
                yield step
        summary.end_stage(stage, time, u, ending.why, ending.met)


class _Ending:
    """Decides when a stage is over, and says why."""

    def __init__(self, stage: Stage, record: Record, began: float, u: Array):
        self.latest = began + stage.lasts
        self.why = "its time was up"
        self.arrival: Arrival | None = None
        self.met = False
        if stage.until is not None:
            until = stage.until
            self.arrival = Arrival(lambda u: record.measure(u, until.at), until.temperature, until.below)
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
