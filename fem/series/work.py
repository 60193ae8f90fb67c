"""One run of a sweep, in whatever process it is done."""

from __future__ import annotations

import os
import shutil
import tempfile
import threading
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from fem.errors import CaseError, RunFailure
from fem.series.store import PART, program, settle
from fem.series.variations import Keep

# A run writes to one log and counts on one BLAS thread: a process does one at a time.
_ONE_AT_A_TIME = threading.Lock()


@dataclass(frozen=True)
class Task:
    """A run to be done.

    Parameters
    ----------
    key
        Name of its folder.
    text, source
        The case, its overrides applied, and what messages call it.
    files
        Name in the case -> content of the files that it names.
    keep
        What the folder keeps.
    runs
        Where the folder goes; None where the caller's disk is out of reach.
    program
        Version that the caller runs.

    """

    key: str
    text: str
    source: str
    files: dict[str, bytes]
    keep: Keep
    runs: str | None
    program: str


@dataclass(frozen=True)
class Done:
    """How a run went.

    Parameters
    ----------
    summary
        As in ``summary.json``; None where it came to nothing.
    why
        Reason, where it failed.
    files
        Content of the folder, where the caller has to write it.

    """

    summary: dict[str, Any] | None
    why: str = ""
    files: dict[str, bytes] | None = None


def work(task: Task) -> Done:
    """Do a run; whatever goes wrong with it is its answer, and no other run's trouble."""
    if task.program != program():
        return Done(None, f"the worker has another version: {program()}, not {task.program}")
    with _ONE_AT_A_TIME, tempfile.TemporaryDirectory(prefix="rimefront-") as scratch:
        runs = Path(scratch if task.runs is None else task.runs)
        part = runs / f"{PART}{task.key}-{os.getpid()}"
        try:
            summary, why = _run(task, part, Path(scratch))
            if summary is None or task.runs is None:
                return Done(summary, why, _content(part) if summary is not None else None)
            settle(part, runs / task.key)
            return Done(summary, why)
        # A run must not take the others with it, whatever it stumbles over; the reason is listed.
        except Exception as error:
            return Done(None, f"{type(error).__name__}: {error}")
        finally:
            shutil.rmtree(part, ignore_errors=True)


def _run(task: Task, part: Path, scratch: Path) -> tuple[dict[str, Any] | None, str]:
    """Run into a folder; return its summary, and the reason of a failure."""
    from fem.case.read import loads
    from fem.result.folder import open_run
    from fem.run import run

    for name, content in task.files.items():
        path = scratch / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content)
    try:
        case = loads(task.text, task.source, scratch)
        summary = run(case, part, ranges=task.keep.ranges, numerical_error=task.keep.numerical_error).summary
    except CaseError as error:
        return None, reason_of(error)
    except RunFailure:
        summary = open_run(part).summary
        return summary, summary["why"]
    if task.keep.reports:
        from fem.result.report import write_report

        write_report(part)
    if not task.keep.curves:
        for name in ("curves.csv", "fronts.csv", "log.txt"):
            (part / name).unlink(missing_ok=True)
    return summary, ""


def reason_of(error: CaseError) -> str:
    """Return the problems of a case in one line."""
    said = [(p.place.removeprefix("--set "), p.message.removesuffix(" (--set)")) for p in error.problems]
    return "; ".join(f"{place}: {message}" for place, message in said)


def _content(folder: Path) -> dict[str, bytes]:
    return {p.relative_to(folder).as_posix(): p.read_bytes() for p in folder.rglob("*") if p.is_file()}
