"""What does it cost to know what the answer hangs on, and is the range an honest one?

Three tables: the cost of eight uncertain inputs as a ratio to the run without them; each tangent at
standard accuracy beside a central difference of tight runs; and the range beside the 2.5 to 97.5 %
of a Latin hypercube of whole tight runs, in which every input is drawn from its normal distribution.
"""

from __future__ import annotations

import argparse
import json
import time
from dataclasses import replace
from pathlib import Path

import numpy as np
from rich.console import Console
from rich.table import Table
from scipy.stats import norm, qmc

from fem.case.case import Case
from fem.case.read import load
from fem.case.shift import kind_of, read_spread, shifted
from fem.case.uncertainty import usual_uncertainty
from fem.hangs_on import HangsOn
from fem.plan import Plan
from fem.result.folder import Result
from fem.run import run
from fem.spread import HALF_WIDTH

CASES = Path(__file__).parent.parent / "cases"
EIGHT = {
    "stages.freeze.surfaces.outside.h": "30 %",
    "stages.freeze.surfaces.outside.coolant": "1.5 K",
    "shape.thickness": "0.5 mm",
    "shape.wall": "10 %",
    "materials.mix.conductivity_factor": "15 %",
    "materials.mix.freezing_point": "0.2 K",
    "materials.mix.sucrose": "5 %",
    "piece.start_temperature": "2 K",
}


def uncertain(case: Case, spreads: dict[str, str] | None = None) -> Case:
    plan = Plan.of(case)
    product = {region: case.regions[region] for region in plan.body.domain.product}
    if spreads is None:
        return replace(case, uncertainty=usual_uncertainty(case, product))
    return replace(case, uncertainty={k: read_spread(v, kind_of(case, k)) for k, v in spreads.items()})


def tight(case: Case) -> Case:
    return replace(case, stepping=case.stepping.model_copy(update={"accuracy": "tight"}))


def moved(case: Case, moves: dict[str, float], plan: Plan) -> Case:
    assert case.uncertainty is not None
    out = case
    for key, by in moves.items():
        last = key.rsplit(".", 1)[1]
        default = plan.body.materials["product"].freezing_point if last == "freezing_point" else None
        out = shifted(out, key, case.uncertainty[key], by, default)
    return out


def time_of(result: Result) -> float:
    return result.summary["aim"]["time_s"]


def cost(rounds: int) -> dict[str, float]:
    case = uncertain(load(CASES / "workshop_bar.toml"), EIGHT)
    seconds: dict[bool, list[float]] = {False: [], True: []}
    run(case)
    for _ in range(rounds):
        for ranges in (False, True):
            start = time.perf_counter()
            run(case, ranges=ranges)
            seconds[ranges].append(time.perf_counter() - start)
    without, with_ranges = (min(seconds[r]) for r in (False, True))
    return {"without_s": without, "with_eight_inputs_s": with_ranges, "extra": with_ranges / without - 1.0}


def tangents() -> list[dict[str, float | str]]:
    case = uncertain(load(CASES / "workshop_bar.toml"), EIGHT)
    plan, slopes = Plan.of(case), slopes_of(case)
    exact = tight(case)
    out = []
    for key, slope in slopes.items():
        low, high = (time_of(run(moved(exact, {key: x}, plan), ranges=False)) for x in (-0.1, 0.1))
        truth = (high - low) / 0.2
        out.append({"key": key, "tangent_s": slope, "truth_s": truth, "error": slope / truth - 1.0})
    return out


def slopes_of(case: Case) -> dict[str, float]:
    """Return the derivative of the time per half-width, as the run carried it."""
    seen: dict[str, float] = {}
    as_dict = HangsOn.as_dict

    def spy(self: HangsOn, arrival):  # type: ignore[no-untyped-def]
        sensitivity = self._sensitivity
        seen.update(
            zip((i.key for i in sensitivity.inputs), map(float, sensitivity.effects.time), strict=True)
        )
        return as_dict(self, arrival)

    HangsOn.as_dict = spy  # type: ignore[method-assign]
    try:
        run(case)
    finally:
        HangsOn.as_dict = as_dict  # type: ignore[method-assign]
    return seen


def hypercube(name: str, overrides: list[str], samples: int) -> dict[str, float | str]:
    case = uncertain(load(CASES / f"{name}.toml", overrides))
    plan = Plan.of(case)
    ours = run(case).summary["uncertainty"]["time_s"]
    keys = list(case.uncertainty or {})
    draws = norm.ppf(qmc.LatinHypercube(len(keys), rng=7).random(samples)) / HALF_WIDTH
    exact = tight(case)
    times = [
        time_of(run(moved(exact, dict(zip(keys, row, strict=True)), plan), ranges=False)) for row in draws
    ]
    low, high = np.percentile(times, [2.5, 97.5])
    return {
        "case": name,
        "low_s": ours["low"],
        "high_s": ours["high"],
        "cube_low_s": float(low),
        "cube_high_s": float(high),
        "off_low": abs(ours["low"] - low) / (high - low),
        "off_high": abs(ours["high"] - high) / (high - low),
    }


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--json", type=Path, help="also write the numbers here")
    parser.add_argument("--samples", type=int, default=300, help="runs of each Latin hypercube")
    parser.add_argument("--rounds", type=int, default=5, help="timed rounds of the cost")
    options = parser.parse_args()
    console = Console()
    numbers = {"cost": cost(options.rounds), "tangents": tangents()}
    cells = {"workshop_bar": ["shape.cell=1 mm", "stages.freeze.lasts=60 min"], "tube_in_brine": []}
    numbers["ranges"] = [hypercube(name, overrides, options.samples) for name, overrides in cells.items()]
    price = numbers["cost"]
    console.print(
        f"eight inputs: {price['with_eight_inputs_s']:.2f} s against {price['without_s']:.2f} s without, "
        f"{100 * price['extra']:.0f} % more"
    )
    for title, rows in (("tangents, s per half-width", "tangents"), ("ranges", "ranges")):
        table = Table(*numbers[rows][0], title=title, box=None)
        for row in numbers[rows]:
            table.add_row(*(v if isinstance(v, str) else f"{v:.4g}" for v in row.values()))
        console.print(table)
    if options.json:
        options.json.write_text(json.dumps(numbers, indent=2), encoding="utf-8")


if __name__ == "__main__":
    main()
