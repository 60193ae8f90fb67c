"""How far a run's numbers are from the exact solution of its own model, for a fifth of its cost.

A twin of the case on cells twice as wide, with steps for eight times the tolerance, is run beside
it. Errors of second order, in the cell and in the step, would make the run's own error a third of
the difference between the two; half of it is stated. Two levels can agree by luck, so no less
than a tenth of the step's tolerance is. Where that is not enough, `rimefront refine` has three.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any

from fem.case.case import Case
from fem.estimate.by_poisson import poisson
from fem.mesh.level import coarse_cells
from fem.mesh.shape import MeshShape
from fem.plan import Plan

COARSER_STEPS = 8.0
"""The error of a step is of third order, so this halves the number of steps."""

# A third of the difference if the order is two, and half as much again.
SHARE = 0.5
# Of an error that is seen through halved cells, the rest down to no size at all is a third more.
HALVED = 4.0 / 3.0
LEAST_OF_TOLERANCE = 0.1


def twin_of(case: Case) -> Case:
    """Return a case as its coarse twin: wide cells and steps, and nothing watched that it need not."""
    stepping = case.stepping
    wide = {"tolerance": 100.0 * COARSER_STEPS * stepping.control().tolerance}
    if stepping.largest_step is not None:
        wide["largest_step"] = 2.0 * stepping.largest_step
    watch = {"rays": {}, "every": case.lasts, "frames": case.lasts, "fields": "none"}
    shape = case.shape
    if not isinstance(shape, MeshShape):
        shape = shape.model_copy(update={"cell": coarse_cells(shape)})
    return replace(
        case,
        shape=shape,
        stepping=stepping.model_copy(update=wide),
        watch=case.watch.model_copy(update=watch),
    )


def numerical_error(plan: Plan, own: Mapping[str, Any], twin: Mapping[str, Any]) -> dict[str, Any]:
    """Return the error estimate as ``summary.json`` has it.

    Parameters
    ----------
    plan
        Of the case itself.
    own, twin
        Summaries of the run and of its coarse twin.

    Returns
    -------
    ``time_s``, of the time to the aim; ``heat_removed_J``; ``how``, a sentence. None for what either
    run does not have, or where nothing is known of the mesh's share.

    """
    mesh, how = 0.0, "half the difference to a run on cells twice as wide with half as many steps"
    if isinstance(plan.case.shape, MeshShape):
        how = "half the difference to a run with half as many steps, the mesh's share from one Poisson solve"
        share = _mesh_share(plan)
        if share is None:
            unknown = (
                "the mesh comes from a file, and no estimate tells what its cells cost: run rimefront refine"
            )
            return {"time_s": None, "heat_removed_J": None, "how": unknown}
        mesh = share
    least = LEAST_OF_TOLERANCE * plan.case.stepping.control().tolerance

    def error(ours: float | None, other: float | None) -> float | None:
        if ours is None or other is None:
            return None
        return max(SHARE * abs(ours - other) + mesh * abs(ours), least * abs(ours))

    times = [summary["aim"]["time_s"] if summary["aim"] else None for summary in (own, twin)]
    heats = [summary["heat_removed_J"] for summary in (own, twin)]
    return {"time_s": error(*times), "heat_removed_J": error(*heats), "how": how}


def _mesh_share(plan: Plan) -> float | None:
    """Return the error of a mesh file's cells as a share of the freezing time; None if not known.

    A file has no wider cells, and whole runs on halved ones would cost far more than the run; in
    the limit of small Stefan number one linear solve on halved cells tells what they cost.
    """
    shape = plan.case.shape
    assert isinstance(shape, MeshShape)
    finer = replace(plan.case, shape=shape.model_copy(update={"split": shape.split + 1}))
    ours, halved = (poisson(p)["time_s"] for p in (plan, Plan.of(finer)))
    return None if ours is None or halved is None else HALVED * abs(halved / ours - 1.0)
