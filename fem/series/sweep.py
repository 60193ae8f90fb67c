"""Many runs of one case: as a plan says, each into a folder of its own, none of them twice."""

from __future__ import annotations

import json
import os
from collections.abc import Callable, Iterator
from contextlib import closing
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Protocol

from fem.case.portable import portable
from fem.errors import CaseError, Problem
from fem.result.disk import replace
from fem.series.axes import Point
from fem.series.store import Store, key_of, program
from fem.series.sweep_plan import SweepPlan, read_plan
from fem.series.table import TABLE, Heads, Row, write_table
from fem.series.work import Done, Task, reason_of, work

SWEEP, PLAN = "sweep.json", "plan.toml"


@dataclass(frozen=True)
class Progress:
    """Where a sweep stands.

    Parameters
    ----------
    done, of
        Runs that are in the table, and all.
    computed, failed
        How many of them were computed now, and how many failed.
    row
        The latest row; None at the start.

    """

    done: int
    of: int
    computed: int
    failed: int
    row: Row | None


@dataclass(frozen=True)
class Sweep:
    """What a sweep has found.

    Parameters
    ----------
    summary
        As in ``sweep.json``: title, outcome, answer, how many runs, which failed and why.
    rows
        As in ``table.csv``, in the order of the plan: header -> value, None where there is none.
    folder
        Where it stands.

    """

    summary: dict[str, Any]
    rows: list[Row] = field(repr=False)
    folder: Path

    @property
    def failed(self) -> list[Row]:
        """Rows of the runs that failed."""
        return [row for row in self.rows if row["outcome"] != "finished"]

    def column(self, head: str) -> list[Any]:
        """Return a column by its header, such as ``"time_to_aim [s]"``."""
        return [row[head] for row in self.rows]


def sweep(
    plan: str | Path | SweepPlan,
    into: str | Path | None = None,
    *,
    processes: int | None = None,
    cluster: str | None = None,
    progress: Callable[[Progress], None] | None = None,
) -> Sweep:
    """Run every case of a plan that has not been run yet, and say what they show together.

    Runs are found again by what was run and by what ran it: a sweep that was killed goes on where it
    stood, one whose plan has grown runs what is new.

    Parameters
    ----------
    plan
        Its file, or what `fem.series.sweep_plan.read_plan` has read.
    into
        Folder of the sweep; by default ``sweeps/NAME``, where NAME is the plan's.
    processes
        How many on this machine; by default as many as it has processors. A script that calls this
        keeps its own work under ``if __name__ == "__main__":``.
    cluster
        Address of a dask.distributed scheduler that does the runs instead.
    progress
        Called at the start and after each run.

    Returns
    -------
    Rows and answer, as they stand in the folder; runs that failed are among the rows.

    Raises
    ------
    CaseError
        Where the plan or its base is wrong, or the scheduler does not answer; nothing has run then.
    OSError
        Where the folder cannot be written.

    """
    read = plan if isinstance(plan, SweepPlan) else read_plan(plan)
    root = Path(into) if into is not None else Path("sweeps") / Path(read.source).stem
    engine = _engine(processes, cluster)
    store = _open(root)
    _write(root, {"title": read.title, "outcome": "running", "runs": read.runs, "program": program()})
    replace(root / PLAN, read.text)
    runner = _Runner(read, store, progress or (lambda seen: None), local=cluster is None)
    runner.run(engine)
    rows = runner.rows()
    summary = _summary(read, rows, runner)
    write_table(rows, root)
    from fem.series.sweep_page import write_page

    # The page and its picture say the answer; what it takes from the rows it returns for sweep.json.
    summary["answer"] = write_page(read, rows, summary, root)
    _write(root, summary)
    return Sweep(summary, rows, root)


def _write(root: Path, summary: dict[str, Any]) -> None:
    replace(root / SWEEP, json.dumps(summary, indent=2, ensure_ascii=False) + "\n")


def _open(root: Path) -> Store:
    if root.exists() and (not root.is_dir() or (any(root.iterdir()) and not (root / SWEEP).exists())):
        told = f"exists and is no sweep's folder (it holds no {SWEEP}); choose another"
        raise CaseError(str(root), [Problem("--into", told)])
    store = Store(root)
    store.clear_parts()
    return store


def _engine(processes: int | None, cluster: str | None) -> Any:
    if cluster is not None:
        from fem.series.cluster import Cluster

        return Cluster(work, cluster)
    from fem.series.workers import Processes

    return Processes(work, processes if processes is not None else len(_processors()))


def _processors() -> Any:
    return os.sched_getaffinity(0) if hasattr(os, "sched_getaffinity") else range(os.cpu_count() or 1)


class _Engine(Protocol):
    def run(self, tasks: Iterator[Task]) -> Iterator[tuple[Task, Any]]: ...


class _Runner:
    """Hands out what is still to be run, and gathers rows."""

    def __init__(self, plan: SweepPlan, store: Store, progress: Callable[[Progress], None], local: bool):
        self.plan, self.store, self.computed, self.failed = plan, store, 0, 0
        self._progress, self._local = progress, local
        self._heads = Heads(plan)
        self._rows: dict[int, Row] = {}
        self._waiting: dict[str, list[Point]] = {}

    def run(self, engine: _Engine) -> None:
        """Run what has not been run."""
        self._tell(None)
        with closing(engine.run(self._tasks())) as results:  # type: ignore[type-var]
            for task, result in results:
                done = result if isinstance(result, Done) else Done(None, str(result))
                if done.files is not None:
                    self.store.unpack(task.key, done.files)
                self.computed += 1
                for point in self._waiting.pop(task.key):
                    self._add(point, done.summary, done.why, task.key)

    def rows(self) -> list[Row]:
        """Return the rows in the order of the plan."""
        return [self._rows[number] for number in sorted(self._rows)]

    def _tasks(self) -> Iterator[Task]:
        """Yield what is to be run; what stands on disk, or cannot be read, gets its row at once."""
        for point in self.plan.points():
            try:
                case = self.plan.case_of(point)
                key = key_of(case, self.plan.keep)
            except CaseError as error:
                self._add(point, None, reason_of(error), None)
                continue
            found = self.store.find(key)
            if found is not None:
                self._add(point, found, "" if found["outcome"] == "finished" else found["why"], key)
                continue
            self._waiting.setdefault(key, []).append(point)
            if len(self._waiting[key]) == 1:
                text, sources = portable(case.text, case.folder)
                files = {name: path.read_bytes() for name, path in sources.items()}
                runs = str(self.store.runs.resolve()) if self._local else None
                yield Task(key, text, case.source, files, self.plan.keep, runs, program())

    def _add(self, point: Point, summary: dict[str, Any] | None, why: str, key: str | None) -> None:
        folder = self.store.place(key) if key is not None and summary is not None else ""
        row = self._heads.row(point, summary, why, folder)
        self._rows[point.number] = row
        self.failed += row["outcome"] != "finished"
        self._tell(row)

    def _tell(self, row: Row | None) -> None:
        self._progress(Progress(len(self._rows), self.plan.runs, self.computed, self.failed, row))


def _summary(plan: SweepPlan, rows: list[Row], runner: _Runner) -> dict[str, Any]:
    failed = [{"run": row["run"], "reason": row["reason"]} for row in rows if row["outcome"] != "finished"]
    return {
        "title": plan.title,
        "outcome": "part failed" if failed else "finished",
        "answer": "",
        "runs": len(rows),
        "computed": runner.computed,
        "met": sum(bool(row["met"]) for row in rows),
        "passes": sum(bool(row["passes"]) for row in rows),
        "failed": failed,
        "varied": {name: variation.key for name, variation in plan.vary.items()},
        "table": TABLE,
        "program": program(),
    }
