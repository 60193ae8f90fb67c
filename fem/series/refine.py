"""A case on three levels of cells and steps together: order, extrapolated value, numerical error.

From level to level the cells are halved and the tolerance of a step is divided by eight, with the
largest step halved, so that both errors of second order fall by four.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np

from fem.case.case import Case
from fem.case.read import loads
from fem.mesh.drawn import MOST_SPLITS, MeshShape
from fem.mesh.level import coarse_cells
from fem.result.folder import Result
from fem.run import run

ORDERS = (0.5, 3.5)
"""Observed orders that are believed; outside them the levels do not tell a rate."""

BEST_ORDER = 2.0
"""Of cells and steps; a higher observed one is luck, and is not used."""

SAFETY = 1.25
"""On the extrapolated error of three levels (Roache's grid convergence index, value from memory)."""

SPREAD = 2.0
"""On the spread of the levels where no order is seen: enough for any order down to one half."""

FINER_STEPS = 8.0
# Largest step of the coarse level, as a share of the time that the case takes.
STRIDE = 1 / 50
# Where along its way a front is judged.
SHARES = (0.25, 0.5, 0.75)
LEAST_OF_TOLERANCE = 0.1


@dataclass(frozen=True)
class Level:
    """Cells and steps of one level.

    Parameters
    ----------
    cell_m
        Size of the cells: one, or across and along [m]; of a mesh file the typical one.
    tolerance
        Of a step [-].
    largest_step_s
        [s].
    nodes, steps
        Their number.
    elapsed_s
        What the run took [s].

    """

    cell_m: tuple[float, float]
    tolerance: float
    largest_step_s: float
    nodes: int
    steps: int
    elapsed_s: float


@dataclass(frozen=True)
class Refined:
    """One number on three levels.

    Parameters
    ----------
    quantity, unit
        What it is.
    as_run
        As the case itself gives it.
    levels
        From coarse to fine.
    order
        Observed; None where there is none to claim.
    value
        Extrapolated to no cell and no step; the finest where there is no order.
    error
        Bound on what `value` may be off.
    as_run_error
        Bound on what `as_run` may be off.
    why
        How it was found, or why no order is claimed.

    """

    quantity: str
    unit: str
    as_run: float
    levels: tuple[float, float, float]
    order: float | None
    value: float
    error: float
    as_run_error: float
    why: str


@dataclass(frozen=True)
class Refinement:
    """A case refined.

    Parameters
    ----------
    title
        Of the case.
    levels
        From coarse to fine.
    numbers
        Time to the aim, fronts, heat.

    """

    title: str
    levels: tuple[Level, ...]
    numbers: tuple[Refined, ...]

    def as_dict(self) -> dict[str, Any]:
        """Return it for JSON."""
        return asdict(self)


@dataclass(frozen=True)
class Limit:
    """Where three values go.

    Parameters
    ----------
    order
        Observed; None where there is none to claim.
    value
        Extrapolated, or the finest.
    error
        Bound on what `value` may be off.
    why
        In words.

    """

    order: float | None
    value: float
    error: float
    why: str


def extrapolate(coarse: float, middle: float, fine: float, least: float = 0.0) -> Limit:
    """Return where values on three levels, each twice as fine, go.

    Parameters
    ----------
    coarse, middle, fine
        In any unit.
    least
        Least error to state, in the same unit.

    References
    ----------
    Richardson's extrapolation with a limited order, after Roache (value from memory).

    """
    first, second = middle - coarse, fine - middle
    spread = max(coarse, middle, fine) - min(coarse, middle, fine)
    bound = max(SPREAD * spread, least)
    if spread <= least:
        return Limit(None, fine, bound, "the levels agree to what steps can tell")
    if first * second <= 0.0:
        return Limit(None, fine, bound, "no order: the values do not go one way")
    order = math.log2(first / second)
    if not ORDERS[0] <= order <= ORDERS[1]:
        return Limit(
            None,
            fine,
            bound,
            f"no order: {order:.2g} would be seen, {ORDERS[0]:g} to {ORDERS[1]:g} is believed",
        )
    rest = second / (2.0 ** min(order, BEST_ORDER) - 1.0)
    return Limit(order, fine + rest, max(SAFETY * abs(rest), least), "extrapolated")


def refine(case: Case, progress: Callable[[str], None] | None = None) -> Refinement:
    """Run a case as it is, and on three levels of cells and steps.

    Parameters
    ----------
    case
        From `fem.case.read.load`. Its cells and steps are those of the middle level, with steps an
        eighth as tolerant; of a mesh file they are the coarse level, for there are none wider.
    progress
        Called with what begins.

    Raises
    ------
    CaseError
        Where a level cannot be meshed.
    RunFailure
        Where a march cannot go on.

    """
    say = progress or (lambda text: None)
    say("the case as it is")
    plain = run(case, ranges=False, numerical_error=False)
    levels, results = [], []
    for number in range(3):
        say(f"level {number + 1} of 3")
        overrides, cell, tolerance, stride = _level(case, plain, number)
        refined = loads(case.text, case.source, case.folder, overrides)
        result = run(refined, ranges=False, numerical_error=False)
        effort = result.summary["effort"]
        levels.append(Level(cell, tolerance, stride, effort["nodes"], effort["steps"], effort["elapsed_s"]))
        results.append(result)
    numbers = [
        _refined(name, unit, values, LEAST_OF_TOLERANCE * levels[-1].tolerance)
        for name, unit, values in _numbers([plain, *results])
    ]
    return Refinement(case.title, tuple(levels), tuple(numbers))


def _level(case: Case, plain: Result, number: int) -> tuple[list[str], tuple[float, float], float, float]:
    """Return the overrides of a level, its cells [m], tolerance [-] and largest step [s]."""
    shape, fine = case.shape, 2.0**number
    if isinstance(shape, MeshShape):
        least = min(shape.split, MOST_SPLITS - 2)
        overrides = [f"shape.split={least + number}"]
        size = _typical(shape, least + number)
        cell = (size, size)
    else:
        across, along = coarse_cells(shape)
        cell = (across / fine, along / fine)
        overrides = [f'shape.cell=["{cell[0]!r} m", "{cell[1]!r} m"]']
    tolerance = case.stepping.control().tolerance / FINER_STEPS**number
    stride = plain.summary["time_s"] * STRIDE
    if case.stepping.largest_step is not None:
        stride = min(stride, case.stepping.largest_step)
    stride /= fine
    overrides += [f'stepping.tolerance="{100.0 * tolerance!r} %"', f'stepping.largest_step="{stride!r} s"']
    if case.stepping.first_step is not None:
        overrides.append(f'stepping.first_step="{min(case.stepping.first_step / fine, stride)!r} s"')
    # Frames would bound the steps of the coarse level and not those of the fine one.
    return [*overrides, f'watch.frames="{case.lasts!r} s"'], cell, tolerance, stride


def _typical(shape: MeshShape, split: int) -> float:
    """Return the side of a square of a mesh file's mean cell [m]."""
    x, y = shape.file.points[:, shape.file.cells]
    area = 0.5 * (x * np.roll(y, -1, axis=0) - np.roll(x, -1, axis=0) * y).sum(axis=0).mean()
    return float(shape.length_unit * np.sqrt(area) / 2.0**split)


def _numbers(results: list[Result]) -> list[tuple[str, str, list[float]]]:
    """Return name, unit and values of what is compared: as run, then from coarse to fine."""
    found: list[tuple[str, str, list[float]]] = []
    aims = [result.summary["aim"] for result in results]
    if all(aim is not None and aim["time_s"] for aim in aims):
        found.append(("time to the aim", "s", [aim["time_s"] for aim in aims]))
    rows = min(len(result.fronts["time [s]"]) for result in results) - 1
    time = results[0].fronts["time [s]"][:rows]
    for column in results[0].fronts:
        ray, _, kind = column.partition(".position")
        if not kind:
            continue
        positions = np.array([result.fronts[column][:rows] for result in results])
        there = np.flatnonzero(np.all(np.isfinite(positions), axis=0))
        for row in dict.fromkeys(int(there[int(share * (len(there) - 1))]) for share in SHARES if len(there)):
            found.append(
                (f"front on {ray} at {time[row]:.4g} s", "mm", [float(p) for p in positions[:, row]])
            )
    found.append(("heat removed", "J", [result.summary["heat_removed_J"] for result in results]))
    return found


def _refined(name: str, unit: str, values: list[float], least: float) -> Refined:
    as_run, coarse, middle, fine = values
    limit = extrapolate(coarse, middle, fine, least * abs(fine))
    return Refined(
        name, unit, as_run, (coarse, middle, fine), limit.order, limit.value, limit.error,
        abs(as_run - limit.value) + limit.error, limit.why,
    )  # fmt: skip
