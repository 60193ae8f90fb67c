"""Do tangents cost at most half of what differences do, and does a fit's interval hold the truth?

A march that carries tangents is timed against the marches that differences of the same times would
take, one more for each unknown (one-sided) or two (central). Then logs of a known h, with 0.2 K of
noise, are fitted one by one. The least of several times counts; the rest is the machine's.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from table import Tables, options

from fem.case.read import load
from fem.plan import Plan
from fem.run import run
from fem.series.fit import fit
from fem.series.passages import Level, passages
from fem.series.probe import ProbeLog
from fem.series.unknowns import unknowns

CASE = Path(__file__).parent.parent / "cases" / "workshop_bar.toml"
H = "stages.freeze.surfaces.outside.h"
WORDS = ("h", "freezing_point", "conductivity_factor")
LEVELS = [Level("centre", T) for T in (3.0, 1.0, -2.0, -4.0, -6.0, -8.0)]
TRUE_H, NOISE = 215.0, 0.2


def main() -> None:
    parser = options(__doc__)
    parser.add_argument("--repeats", type=int, default=3)
    parser.add_argument("--logs", type=int, default=100)
    asked = parser.parse_args()
    tables = Tables(asked.json)
    heads = [
        "unknowns",
        "bare [s]",
        "tangents [s]",
        "one-sided [s]",
        "central [s]",
        "to one-sided",
        "to central",
    ]
    tables.add("Times of a Jacobian", heads, [_jacobian(n, asked.repeats) for n in (1, 2, 3)])
    heads = [
        "pour",
        "logs",
        "interval holds",
        "bias [%]",
        "scatter [%]",
        "half-width [%]",
        "marches",
        "each [s]",
    ]
    tables.add("Fits of h", heads, [_fits(pour, asked.logs) for pour in ("known", "fitted")])
    tables.close()


def _jacobian(count: int, repeats: int) -> list[object]:
    """Time a bare march and one with tangents; differences take whole bare marches more."""
    plan = Plan.of(load(CASE, ["watch.frames=40 min"]))
    inputs = [entry for unknown in unknowns(plan, WORDS[:count]) for entry in unknown.inputs()]
    bare = _least(lambda: passages(plan, LEVELS, []), repeats)
    tangents = _least(lambda: passages(plan, LEVELS, inputs), repeats)
    one_sided, central = (1 + count) * bare, (1 + 2 * count) * bare
    return [count, bare, tangents, one_sided, central, tangents / one_sided, tangents / central]


def _fits(pour: str, logs: int) -> list[object]:
    """Fit logs that differ in their noise only."""
    case = load(CASE, ["shape.cell=2 mm", "watch.frames=40 min"])
    overrides = [f"{H}={TRUE_H} W/m2/K", "watch.every=5 s", "watch.fields=none", "shape.cell=2 mm"]
    curves = run(load(CASE, overrides), ranges=False, numerical_error=False).curves
    times, T = curves["time [s]"], curves["point.centre [degC]"]
    values, held, widths, marches, began = [], 0, [], 0, time.perf_counter()
    for seed in range(logs):
        readings = T + np.random.default_rng(seed).normal(0.0, NOISE, len(T))
        log = ProbeLog("probe", Path("probe.csv"), times, readings, 0.0)
        known = "0 s" if pour == "known" else None
        found = fit(case, log, pour=known, moved_probes=False)
        (h,) = found.numbers
        held += h.low <= TRUE_H <= h.high
        values.append(h.value / TRUE_H)
        widths.append((h.high - h.low) / (2.0 * TRUE_H))
        marches += found.marches
    each = (time.perf_counter() - began) / logs
    bias, scatter = 100.0 * (np.mean(values) - 1.0), 100.0 * np.std(values)
    return [pour, logs, f"{held} of {logs}", bias, scatter, 100.0 * np.mean(widths), marches / logs, each]


def _least(work: Callable[[], object], repeats: int) -> float:
    best = np.inf
    for _ in range(repeats):
        began = time.perf_counter()
        work()
        best = min(best, time.perf_counter() - began)
    return best


if __name__ == "__main__":
    main()
