"""From a case to its answer: the one place where everything meets."""

from __future__ import annotations

import logging
import sys
import time as clock
from collections.abc import Callable, Iterator
from pathlib import Path
from types import ModuleType
from typing import Any

from threadpoolctl import threadpool_limits

from fem.case.case import Case
from fem.case.portable import portable
from fem.ending import Ending
from fem.errors import RunFailure
from fem.estimate.by_hand import estimates
from fem.estimate.by_poisson import poisson
from fem.estimate.numerical import numerical_error as error_from
from fem.estimate.numerical import twin_of
from fem.hangs_on import HangsOn
from fem.heat.problem import HeatProblem
from fem.march.march import Moment, Step, begin, march
from fem.plan import Plan
from fem.result.folder import Result, RunFolder
from fem.summary import Summary
from fem.watch.record import Record

log = logging.getLogger("fem.run")
Progress = Callable[[float, Record, Moment], None]


def run(
    case: Case,
    folder: str | Path | None = None,
    *,
    overwrite: bool = False,
    progress: Progress | None = None,
    ranges: bool = True,
    numerical_error: bool = True,
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
    ranges
        Whether to carry along what the answer hangs on, and to give it a range.
    numerical_error
        Whether to run a coarse twin too, for about a fifth of the cost, and say how far off the
        numbers are.

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
    record = plan.record()
    hangs_on = HangsOn.of(plan, record.gauge) if ranges and case.aim is not None else None
    out = (
        RunFolder(Path(folder), *portable(case.text, case.folder), overwrite) if folder is not None else None
    )
    expected = [*estimates(plan), poisson(plan)]
    summary = Summary(case, plan.body, plan.start, record, out, started, plan.cautions(), expected)
    try:
        summary.begin()
        # Two threads of BLAS are slower than one on matrices of this size, at times a thousandfold.
        with threadpool_limits(1):
            for step in _steps(plan, record, summary, hangs_on):
                if progress is not None:
                    progress(step.after.time, record, step.after)
                summary.progress(step)
                if hangs_on is not None:
                    hangs_on.see(step, summary.arrival)
        summary.uncertainty = hangs_on.as_dict(summary.arrival) if hangs_on is not None else None
        if numerical_error:
            summary.numerical_error = _compared_with_twin(plan, summary)
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


def _compared_with_twin(plan: Plan, summary: Summary) -> dict[str, Any]:
    """Run the coarse twin of a case and return what it says of the case's own error."""
    summary.marched()
    try:
        twin = run(twin_of(plan.case), ranges=False, numerical_error=False)
    except RunFailure as failure:
        said = f"not known: the coarse run that it is compared with failed {failure}"
        return {"time_s": None, "heat_removed_J": None, "how": said}
    return error_from(plan, summary.as_dict(), twin.summary)


def _steps(plan: Plan, record: Record, summary: Summary, hangs_on: HangsOn | None) -> Iterator[Step]:
    """March through the stages, each from the last state of the one before."""
    time, u = 0.0, plan.start
    for stage in plan.case.stages:
        problem = HeatProblem(plan.body, stage.surfaces, time, plan.span)
        for rows in record.begin_stage(problem, u):
            summary.add(rows)
        ending = Ending(stage, record.gauge, time, u)
        if not ending.met:
            moment = begin(problem, time, u, plan.no_accounts(stage))
            landings = plan.landings(stage, time)
            control = plan.control(stage)
            if hangs_on is not None:
                hangs_on.begin_stage(stage, problem, moment)
            for step in march(problem, moment, ending.latest, landings, control, summary.effort, ending.stop):
                for rows in record.see(problem, step, last=ending.met or step.after.time >= ending.latest):
                    summary.add(rows)
                time, u = step.after.time, step.after.u
                yield step
            if hangs_on is not None:
                hangs_on.end_stage(stage, step, ending.met)
        summary.end_stage(stage, time, u, ending.why, ending.met)


class _Callable(ModuleType):
    """Lets ``fem.run(case)`` run a case: Python puts this module over the function of its name."""

    def __call__(self, *args: Any, **kwargs: Any) -> Result:
        return run(*args, **kwargs)


sys.modules[__name__].__class__ = _Callable
