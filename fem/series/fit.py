"""What a case's numbers were really: fitted to thermocouple logs, on the time at each temperature.

Least squares on times, not on temperatures, so that no degree counts more than another; each time
is weighed by what the log's noise makes of it, and by the 0.1 % that the march itself is good for.
Gauss-Newton on the tangents that a march carries along, mostly two or three marches.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from fem.case.case import Case
from fem.curve import Array
from fem.errors import CaseError, Problem
from fem.plan import Plan
from fem.series.evidence import evidence
from fem.series.fitted import Fit, Number, Pour, Trace
from fem.series.gauss_newton import Progress, Search, State
from fem.series.probe import ProbeLog, read_log
from fem.series.unknowns import unknowns
from fem.watch.sample import Outside, locate

ROUGH = 0.5
PROBE_POSITION = 2e-3
"""How well the place of a probe is known [m] (common practice)."""


def fit(
    case: Case,
    logs: str | Path | ProbeLog | Sequence[str | Path | ProbeLog],
    *,
    fitted: Sequence[str] = ("h",),
    points: Sequence[str] = (),
    pour: str | None = None,
    columns: Sequence[str] = (),
    unit: str | None = None,
    down_to: float | None = None,
    moved_probes: bool = True,
    progress: Progress | None = None,
) -> Fit:
    """Fit numbers of a case to logs.

    Parameters
    ----------
    case
        From `fem.case.read.load`; it watches the points where the probes were.
    logs
        Files, or logs read before.
    fitted
        "h" (one for each stage), "freezing_point", "conductivity_factor", or dotted keys.
    points
        The watched point of each log; one for all, or none where the case watches only one.
    pour
        When the mix was poured: a clock as the log writes it ("14:03:20"), or a time since its
        first row ("35 s"). Fitted too where it is not given.
    columns
        The column of each log, for files with several probes.
    unit
        Unit of the logs' temperatures where they do not say it: "degC", "degF", "K".
    down_to
        Coldest level that counts [degC]; by default -8 degC, or 5 K below the freezing point.
    moved_probes
        Whether to fit again with each probe 2 mm away, which takes as many marches again.
    progress
        Called with a sentence before each march.

    Returns
    -------
    Fitted numbers with their intervals, and what they hang on.

    Raises
    ------
    CaseError
        A log that cannot be used, words that mean nothing, and what the logs cannot tell apart;
        each with the reason.
    RunFailure
        Where a march cannot go on.

    """
    plan = _watching(Plan.of(case), points)
    if not plan.cooling:
        raise CaseError(case.source, [Problem("--log", "belongs to a case that freezes; this one warms up")])
    try:
        wanted = unknowns(plan, fitted)
    except ValueError as error:
        raise CaseError(case.source, [Problem("--fit", str(error))]) from error
    files = [logs] if isinstance(logs, (str, Path, ProbeLog)) else list(logs)
    seen = evidence(plan, _read(plan, files, columns, unit), points, pour, down_to)
    search = Search(plan, wanted, seen, progress or (lambda said: None))
    state = search.run()
    return _result(search, state, _moved_probes(search, state) if moved_probes else {})


def _watching(plan: Plan, points: Sequence[str]) -> Plan:
    """Return the case with only what a fit needs to watch."""
    watch = plan.case.watch
    if not watch.points:
        message = 'has to watch the place of the probe: add [watch.points], such as centre = ["0 mm", "0 mm"]'
        raise CaseError(plan.case.source, [Problem("watch.points", message)])
    frames = plan.case.lasts
    return Plan(replace(plan.case, watch=watch.model_copy(update={"frames": frames, "rays": {}})), plan.body)


def _read(
    plan: Plan, logs: Sequence[str | Path | ProbeLog], columns: Sequence[str], unit: str | None
) -> list[ProbeLog]:
    if columns and len(columns) != len(logs):
        message = f"is given {len(columns)} times for {len(logs)} logs; give one for each"
        raise CaseError(plan.case.source, [Problem("--column", message)])
    freezing_point = plan.body.materials[plan.body.domain.product[0]].freezing_point
    if freezing_point is None:
        raise CaseError(plan.case.source, [Problem("--log", "needs a product with a freezing point")])
    bounds = (plan.span[0], freezing_point)
    names: list[str | None] = [*columns] or [None] * len(logs)
    return [
        log if isinstance(log, ProbeLog) else read_log(log, name, unit, bounds)
        for log, name in zip(logs, names, strict=True)
    ]


def _moved_probes(search: Search, best: State) -> dict[str, Array]:
    """Fit again with each probe 2 mm away; return the values by the place that was moved."""
    out = {}
    points = search.plan.case.watch.points
    for at in dict.fromkeys(search.seen.at):
        for name, place in _around(search.plan, points[at]).items():
            watch = search.plan.case.watch.model_copy(update={"points": {**points, at: place}})
            plan = Plan(replace(search.plan.case, watch=watch), search.plan.body)
            again = Search(plan, search.wanted, search.seen, search.progress)
            try:
                # The answer is a range of a few per cent: no need to go as close as before.
                out[f"{at} {name}"] = again.run(ROUGH, best.values, best.pours).values
            except CaseError:
                out[f"{at} {name}"] = np.full(len(best.values), np.nan)
            search.marches += again.marches
    return out


def _around(plan: Plan, place: tuple[float, float]) -> dict[str, tuple[float, float]]:
    """Return the places 2 mm away that lie in the product, of mirror images only one."""
    domain = plan.body.domain
    product = np.concatenate([domain.regions[region] for region in domain.product])
    found: dict[str, tuple[float, float]] = {}
    for axis, letter in enumerate("rz" if domain.axisymmetric else "xy"):
        for sign in (1.0, -1.0):
            moved = np.array(place)
            moved[axis] += sign * PROBE_POSITION
            if domain.axisymmetric:
                moved[0] = abs(moved[0])
            folded = domain.fold(moved[:, None])
            try:
                cells, _ = locate(domain, moved[:, None])
            except Outside:
                continue
            spot = (float(folded[0, 0]), float(folded[1, 0]))
            if cells[0] in product and not any(
                np.allclose(spot, other, atol=1e-6) for other in found.values()
            ):
                found[f"{2 * sign:+.0f} mm in {letter}"] = spot
    return found


def _result(search: Search, state: State, places: dict[str, Array]) -> Fit:
    """Put into words and numbers what the search has found."""
    n = len(search.wanted)
    half = state.half_widths()
    numbers = []
    for i, unknown in enumerate(search.wanted):
        value = float(state.values[i])
        low, high = unknown.interval(value, float(half[i]))
        moved = {place: float(values[i]) for place, values in places.items()}
        numbers.append(
            Number(unknown.name, unknown.keys, unknown.kind, value, low, high, unknown.start, moved)
        )
    pours = [
        Pour(name, clock, float(state.pours[i]), float(half[n + i]))
        for i, (name, clock) in enumerate(search.seen.pour_names)
    ]
    residuals = state.residuals + state.jacobian @ state.step
    traces = [
        Trace(
            log,
            at,
            state.times[rows],
            residuals[rows],
            search.seen.temperatures[rows],
            1.0 / state.weights[rows],
            float(search.seen.pour_columns[rows[0]] @ state.pours + search.seen.known[i]),
        )
        for i, (log, at, rows) in enumerate(search.seen.traces())
    ]
    remarks = [*search.seen.remarks, *search.remarks]
    if state.scatter > 2.0:
        remarks.append(
            f"the misfit is {state.scatter:.1f} times what the log's noise explains: something "
            "else differs too, such as the probe's place, the coolant or the recipe; it widens the intervals"
        )
    if pours:
        remarks.append(
            "the pour is not marked in the log: its time is fitted from the first cooling, which stirring "
            "and convection in the mix hasten; give --pour where it is known"
        )
    return Fit(search.plan.case, numbers, pours, traces, search.marches, state.scatter, remarks)
