"""Where does the time of the workshop bar go: reading, meshing, marching, observing, writing?

The case is run in a process of its own, the pieces are timed from outside by wrapping the
functions named below; whichever is innermost gets the time, except that all an observer calls is
the observer's. The least of several runs counts, for the rest is the machine's.
"""

from __future__ import annotations

import json
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from functools import wraps
from pathlib import Path
from typing import Any

from table import Tables, options

CASE = Path(__file__).parent.parent / "cases" / "workshop_bar.toml"


OTHER = "estimates and the rest"


class Stopwatch:
    """Adds up the time spent in wrapped functions, each second counted once."""

    def __init__(self) -> None:
        self.seconds: dict[str, float] = {}
        self.calls: dict[str, int] = {}
        self._inside: list[str] = []
        self._since = time.perf_counter()

    def wrap(self, owner: Any, name: str, label: str, whole: bool = False) -> None:
        """Time a function; `whole` where what it calls is its own."""
        function: Callable = getattr(owner, name)

        @wraps(function)
        def timed(*args: Any, **kwargs: Any) -> Any:
            if self._inside and self._inside[-1].startswith("+"):
                return function(*args, **kwargs)
            self.turn()
            self._inside.append(("+" if whole else "") + label)
            self.calls[label] = self.calls.get(label, 0) + 1
            try:
                result = function(*args, **kwargs)
                # A generator does its work when it is asked for its values.
                return list(result) if whole and hasattr(result, "__next__") else result
            finally:
                self.turn()
                self._inside.pop()

        setattr(owner, name, timed)

    def wrap_generator(self, owner: Any, name: str, label: str) -> None:
        """Time what a generator does between its values."""
        function: Callable = getattr(owner, name)

        @wraps(function)
        def timed(*args: Any, **kwargs: Any) -> Any:
            values = function(*args, **kwargs)
            while True:
                self.turn()
                self._inside.append(label)
                try:
                    value = next(values)
                except StopIteration:
                    return
                finally:
                    self.turn()
                    self._inside.pop()
                yield value

        setattr(owner, name, timed)

    def turn(self) -> None:
        """Give the time since the last turn to what is going on."""
        now = time.perf_counter()
        label = self._inside[-1].removeprefix("+") if self._inside else OTHER
        self.seconds[label] = self.seconds.get(label, 0.0) + now - self._since
        self._since = now


def child(folder: str) -> dict[str, Any]:
    """Run the case once; return seconds and calls of each piece."""
    watch = Stopwatch()
    began = time.perf_counter()
    import fem.plan
    import fem.run
    from fem.case.read import load
    from fem.heat.body import Body
    from fem.heat.problem import HeatProblem
    from fem.result.folder import RunFolder
    from fem.result.report import write_report
    from fem.summary import Summary
    from fem.watch.record import Record

    imported = time.perf_counter() - began
    began = time.perf_counter()
    case = load(CASE)
    read = time.perf_counter() - began
    watch.wrap(fem.plan, "build", "mesh", whole=True)
    watch.wrap(Body, "__init__", "assemble", whole=True)
    watch.wrap(HeatProblem, "look", "look: properties, fluxes, residual")
    watch.wrap(HeatProblem, "correct", "set up the matrix")
    watch.wrap(HeatProblem, "settle", "settle")
    watch.wrap_generator(fem.run, "march", "predict and judge a step")
    for name in ("of", "begin_stage", "see", "end_stage", "as_dict"):
        watch.wrap(fem.run.HangsOn, name, "ranges: what the answer hangs on", whole=True)
    watch.wrap(Record, "__init__", "observers", whole=True)
    watch.wrap(Record, "see", "observers", whole=True)
    watch.wrap(Record, "begin_stage", "observers", whole=True)
    for name in ("begin", "add", "progress", "end_stage", "end"):
        watch.wrap(Summary, name, "write folder and fields", whole=True)
    watch.wrap(RunFolder, "__init__", "write folder and fields", whole=True)
    from fem.heat import linear

    for kind in (linear.BandedCholesky, linear.SparseLDL, linear.Multigrid):
        watch.wrap(kind, "solve", "factorise and solve", whole=True)
    watch._since = began = time.perf_counter()
    result = fem.run.run(case, folder, overwrite=True)
    watch.turn()
    whole = time.perf_counter() - began
    began = time.perf_counter()
    write_report(Path(folder))
    report = time.perf_counter() - began
    effort = result.summary["effort"]
    return {
        "seconds": {"import": imported, "read the case": read, **watch.seconds, "write report": report},
        "calls": watch.calls,
        "run": whole,
        "effort": effort,
        "nodes": effort.get("nodes"),
    }


MARCH = (
    "factorise and solve",
    "set up the matrix",
    "look: properties, fluxes, residual",
    "settle",
    "predict and judge a step",
)


def main() -> None:
    parser = options(__doc__)
    parser.add_argument("--repeats", type=int, default=3)
    parser.add_argument("--child", help="used by the benchmark itself")
    asked = parser.parse_args()
    if asked.child:
        print(json.dumps(child(asked.child)))
        return
    tables = Tables(asked.json)
    with tempfile.TemporaryDirectory() as folder:
        command = [sys.executable, __file__, "--child", f"{folder}/run"]
        runs = [
            json.loads(subprocess.run(command, check=True, capture_output=True, text=True).stdout)
            for _ in range(asked.repeats)
        ]
    best = min(runs, key=lambda r: r["run"])
    seconds, calls = best["seconds"], best["calls"]
    total = sum(seconds.values())
    march = sum(seconds.get(name, 0.0) for name in MARCH)
    order = sorted(seconds, key=lambda name: -seconds[name])
    tables.add(
        "Where the time of the workshop bar goes",
        ["piece", "seconds", "share [%]", "calls"],
        [[n, seconds[n], 100 * seconds[n] / total, calls.get(n, 1)] for n in order]
        + [["of which the march", march, 100 * march / total, best["effort"]["steps"]]]
        + [["all", total, 100.0, 1]],
    )
    effort = best["effort"]
    tables.add(
        "Effort",
        ["steps", "rejected", "factorisations", "march over factorisations [ms]"],
        [
            [
                *(effort[n] for n in ("steps", "rejected", "factorisations")),
                1e3 * march / effort["factorisations"],
            ]
        ],
    )
    tables.close()


if __name__ == "__main__":
    main()
