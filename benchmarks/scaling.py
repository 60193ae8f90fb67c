"""How do time and memory grow from a thousand to a million nodes?

A rod and a bar with its wall march a few steps at standard accuracy, each size in a process of
its own, whose peak memory the system reports. The time of a step is its processor time over its
factorisations, times two: a typical step makes about two, and how many a step of these few needs
is chance. From 10,000 to 1,000,000 nodes an exponent is fitted.
"""

from __future__ import annotations

import json
import resource
import subprocess
import sys
import time
from pathlib import Path

from table import Tables, options

ROD = """
schema = 1
title = "A rod in brine"
[piece]
section = "axisymmetric"
start_temperature = "4 degC"
[shape]
form = "rod"
radius = "14 mm"
height = "100 mm"
cell = "{cell} mm"
[regions]
product = "mix"
[materials.mix]
kind = "recipe"
sucrose = "18 %"
density = "1075 kg/m3"
[[stages]]
name = "freeze"
lasts = "40 min"
[stages.surfaces.side]
exchange = "fluid"
h = "250 W/m2/K"
coolant = "-22 degC"
"""
BAR = Path(__file__).parent.parent / "cases" / "workshop_bar.toml"
SIZES = (1_000, 3_000, 10_000, 30_000, 100_000, 300_000, 1_000_000)
# The finest bar that the case language lets through has fewer nodes than the finest rod.
MOST_OF_BAR = 400_000
STEPS = 5
FIRST_STEP = 0.5
LIMIT_BYTES, LIMIT_EXPONENT = 2500.0, 1.2


def child(form: str, nodes: int) -> dict[str, float | int | str]:
    """March a few steps; return what they took."""
    from dataclasses import replace

    from fem.case.read import load, loads
    from fem.heat.problem import HeatProblem
    from fem.march.march import Effort, begin, march
    from fem.plan import Plan

    before = _peak()
    if form == "rod":
        case = loads(ROD.format(cell=(14 * 100 / nodes) ** 0.5), "rod")
    else:
        case = load(BAR, (f"shape.cell={(11 * 25 / nodes) ** 0.5} mm",))
    began = time.process_time()
    plan = Plan.of(case)
    stage = case.stages[0]
    problem = HeatProblem(plan.body, stage.surfaces, 0.0, plan.span)
    start = begin(problem, 0.0, plan.start, plan.no_accounts(stage))
    solver = type(plan.body.factor).__name__
    built = time.process_time() - began
    # A larger first step than the first millisecond's: the matrices of the bulk of a run.
    control = replace(case.stepping.control(), first_step=FIRST_STEP)
    effort = Effort()
    began = time.process_time()
    for _, _step in zip(range(STEPS), march(problem, start, stage.lasts, [], control, effort), strict=False):
        pass
    marched = time.process_time() - began
    return {
        "nodes": plan.body.size,
        "solver": solver,
        "build": built,
        "step": 2.0 * marched / effort.factorisations,
        "peak": _peak(),
        "above": _peak() - before,
    }


def _peak() -> int:
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024


def main() -> None:
    parser = options(__doc__)
    parser.add_argument("--most", type=int, default=SIZES[-1], help="largest number of nodes")
    parser.add_argument("--child", nargs=2, help="used by the benchmark itself")
    asked = parser.parse_args()
    if asked.child:
        print(json.dumps(child(asked.child[0], int(asked.child[1]))))
        return
    import numpy as np

    tables = Tables(asked.json)
    fits = []
    for form, most in (("bar", MOST_OF_BAR), ("rod", SIZES[-1])):
        found = [_run(form, n) for n in SIZES if n <= min(asked.most, most)]
        tables.add(
            f"{STEPS} steps of a {form}",
            ["nodes", "solver", "mesh, assembly [s]", "a step [ms]", "peak [MB]", "less libraries [kB/node]"],
            [[f["nodes"], f["solver"], f["build"], 1e3 * f["step"], f["peak"] / 1e6,
              f["above"] / f["nodes"] / 1e3] for f in found],
        )  # fmt: skip
        large = [f for f in found if f["nodes"] >= 10_000]
        if len(large) > 1:
            n, step = (np.log([f[key] for f in large]) for key in ("nodes", "step"))
            fits.append([form, float(np.polyfit(n, step, 1)[0]), LIMIT_EXPONENT,
                         large[-1]["peak"] / large[-1]["nodes"], LIMIT_BYTES])  # fmt: skip
    tables.add(
        "From 10,000 nodes up",
        [
            "form",
            "exponent of a step's time",
            "wanted at most",
            "bytes a node, the largest",
            "wanted at most ",
        ],
        fits,
    )
    tables.close()


def _run(form: str, nodes: int) -> dict:
    command = [sys.executable, __file__, "--child", form, str(nodes)]
    said = subprocess.run(command, check=True, capture_output=True, text=True).stdout
    return json.loads(said.splitlines()[-1])


if __name__ == "__main__":
    main()
