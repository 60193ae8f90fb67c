"""What does accuracy cost, in factorisations, on a front and on a core time that are known?

Front: water at 5 degC in a half space whose wall steps to -20 degC (Neumann's solution), judged at
120 times while the front goes from 5 to 15 mm, at its worst over five cell sizes 2 % apart, which
move every node past the front. Core time: the workshop bar, against its own value with steps a
hundred times finer on the same mesh (time alone) and against a mesh refined as well. Steps and
cells of the front are varied independently, and the cheapest pair that keeps a bound is what the
bound costs.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from table import Tables, options

CASE = Path(__file__).parent.parent / "cases" / "workshop_bar.toml"
OFFSETS = (1.0, 0.98, 0.96, 0.94, 0.92)
CELLS = (1.0e-3, 0.7e-3, 0.55e-3, 0.45e-3, 0.35e-3, 0.25e-3)
TOLERANCES = (5e-2, 2e-2, 1e-2, 5e-3, 2e-3, 1e-3, 3e-4)
T_WALL, T_START, DEPTH = -20.0, 5.0, 0.08
SLAB = """
schema = 1
title = "Neumann"
[piece]
section = "plane"
length = "1 m"
start_temperature = "{start} degC"
[shape]
form = "slab"
thickness = "{depth} m"
width = "2 mm"
cell = ["{cell} m", "1 mm"]
[regions]
product = "water"
[materials.water]
kind = "melting"
melting_point = "0 degC"
latent_heat = "334 kJ/kg"
density = "1000 kg/m3"
solid = {{ conductivity = "2.2 W/m/K", heat_capacity = "2050 J/kg/K" }}
liquid = {{ conductivity = "0.56 W/m/K", heat_capacity = "4200 J/kg/K" }}
[[stages]]
name = "freeze"
lasts = "{lasts} s"
[stages.surfaces.left]
exchange = "fixed"
temperature = "{wall} degC"
[watch.rays]
depth = {{ from = ["0 mm", "1 mm"], to = ["70 mm", "1 mm"] }}
"""


def front(cell: float, control) -> tuple[float, int]:  # type: ignore[no-untyped-def]
    """Return the worst relative error of the front, and the factorisations."""
    import numpy as np

    from fem.case.read import loads
    from fem.exact import Neumann, SharpFreezing
    from fem.heat.problem import HeatProblem
    from fem.march.march import Effort, begin, march
    from fem.plan import Plan
    from fem.watch.fronts import Fronts
    from fem.watch.product import Product

    water = SharpFreezing(k_s=2.2, c_s=2050.0, k_l=0.56, c_l=4200.0, rho=1000.0, latent_heat=334e3, T_m=0.0)
    law = Neumann(water, T_WALL, T_START)
    speed = float(law.front(np.array([1.0]))[0])
    first, last = (5e-3 / speed) ** 2, (15e-3 / speed) ** 2
    times = np.linspace(first, last, 120)
    text = SLAB.format(start=T_START, wall=T_WALL, depth=DEPTH, cell=cell, lasts=last)
    plan = Plan.of(loads(text, "Neumann"))
    stage = plan.case.stages[0]
    problem = HeatProblem(plan.body, stage.surfaces, 0.0, plan.span)
    fronts = Fronts(Product(plan.body), plan.case.watch.front, plan.case.watch.rays)
    effort, worst = Effort(), 0.0
    start = begin(problem, 0.0, plan.start, plan.no_accounts(stage))
    for step in march(problem, start, last, [], control, effort):
        for time in times[(times > step.before.time) & (times <= step.after.time)]:
            u = step.chord(time)
            position, _ = fronts.see(time, u, plan.body.temperature(u))["depth"]
            worst = max(worst, abs(position / float(law.front(np.array([time]))[0]) - 1.0))
    return worst, effort.factorisations


def core_time(control, cell: float | None = None) -> tuple[float, int]:  # type: ignore[no-untyped-def]
    """Return when the slowest point of the workshop bar is cold enough [s], and the factorisations."""
    from fem.case.read import load
    from fem.heat.problem import HeatProblem
    from fem.march.march import Effort, begin, march
    from fem.plan import Plan
    from fem.watch.arrival import Arrival
    from fem.watch.product import Product

    plan = Plan.of(load(CASE, () if cell is None else (f"shape.cell={cell} mm",)))
    stage = plan.case.stages[0]
    problem = HeatProblem(plan.body, stage.surfaces, 0.0, plan.span)
    product, effort = Product(plan.body), Effort()
    arrival = Arrival(lambda u: product.slowest(plan.body.temperature(u))[1], plan.case.aim.reach, below=True)
    start = begin(problem, 0.0, plan.start, plan.no_accounts(stage))
    for step in march(problem, start, stage.lasts, plan.landings(stage, 0.0), control, effort):
        arrival.see(step)
        if arrival.time is not None:
            return arrival.time, effort.factorisations
    raise RuntimeError("the workshop bar never got cold enough")


def main() -> None:
    asked = options(__doc__).parse_args()
    from fem.march.control import ACCURACIES

    tables = Tables(asked.json)
    found = {}
    for cell in CELLS:
        for tolerance in TOLERANCES:
            control = replace(ACCURACIES["standard"], tolerance=tolerance)
            runs = [front(cell * offset, control) for offset in OFFSETS]
            found[cell, tolerance] = max(e for e, _ in runs), max(n for _, n in runs)
    tables.add(
        "Front of Neumann's solution, worst of five cell sizes and all times",
        ["cell [mm]", "tolerance of a step", "error [%]", "factorisations"],
        [[1e3 * cell, tolerance, 100 * error, n] for (cell, tolerance), (error, n) in found.items()],
    )
    tables.add("What a bound on the front costs", ["bound [%]", "cell [mm]", "tolerance", "factorisations"],
               [[b, *_cheapest(found, b / 100)] for b in (1.0, 0.5, 0.3, 0.2, 0.1)])  # fmt: skip

    exact, _ = core_time(replace(ACCURACIES["tight"], tolerance=3e-5))
    fine, _ = core_time(replace(ACCURACIES["tight"], tolerance=1e-4), cell=0.2)
    rows = []
    for name, control in ACCURACIES.items():
        time, n = core_time(control)
        runs = [front(4e-4 * offset, control) for offset in OFFSETS]
        errors = [100 * abs(time / true - 1) for true in (exact, fine)]
        deep = [100 * max(e for e, _ in runs), max(m for _, m in runs)]
        rows.append([name, control.tolerance, time, *errors, n, *deep])
    tables.add(
        "What accuracy means",
        ["accuracy", "tolerance", "core time [s]", "error of steps [%]", "error of steps and cells [%]",
         "factorisations", "front, cells of 0.4 mm [%]", "factorisations of the front"],
        rows,
    )  # fmt: skip
    tables.close()


def _cheapest(found: dict, bound: float) -> tuple[object, object, object]:
    """Return cell, tolerance and cost where every tighter tolerance on those cells keeps it too."""
    best: tuple[object, object, float] = ("none", "none", float("inf"))
    for (cell, tolerance), (_, n) in found.items():
        tighter = [error for (c, t), (error, _) in found.items() if c == cell and t <= tolerance]
        if max(tighter) <= bound and n < best[2]:
            best = (1e3 * cell, tolerance, n)
    return best


if __name__ == "__main__":
    main()
