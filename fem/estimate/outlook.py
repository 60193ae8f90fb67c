"""What can be said of a case before anything is solved."""

from __future__ import annotations

from typing import Any

from fem.case.case import Case
from fem.estimate.by_hand import estimates
from fem.estimate.by_poisson import poisson
from fem.estimate.conditions import (
    NO_FILM,
    Cooling,
    NoMethod,
    cooling_of,
    depth,
    frozen_conductivity,
    product_of,
)
from fem.plan import Plan

FILM = "coolant film"
FEW_CELLS = 8
FLATTEST = 0.1

# Measured on one core: factorisations of a run with one stage, and the time for each.
FACTORISATIONS = 250
SLOWER = {"quick": 0.8, "standard": 1.0, "tight": 1.5}


def outlook(case: Case) -> dict[str, Any]:
    """Mesh a case and say what is known of it without solving it.

    Returns
    -------
    ``title``; ``mass_kg`` and ``volume_m3`` of each region of the whole piece; ``biot`` (None where
    it has none), ``resistances_m2K_per_W`` from the core outwards and ``depth_m`` of the core;
    ``mesh`` (``nodes``, ``cells``, ``quality``, ``cell_m`` of each region); ``effort`` (``nodes``
    and roughly the ``seconds`` of a run); ``estimates`` by hand and by a Poisson solve; ``cautions``.

    Raises
    ------
    CaseError
        Where a watched place lies outside the piece.

    """
    plan = Plan.of(case)
    plan.record()
    body, domain = plan.body, plan.body.domain
    said: dict[str, Any] = {
        "title": case.title,
        "aim": None if case.aim is None else {"reach_degC": case.aim.reach, "within_s": case.aim.within},
        "mass_kg": body.masses(),
        "volume_m3": {region: float(volume.sum()) for region, volume in body.volumes.items()},
        **_resistances(plan),
        "mesh": {
            "nodes": body.size,
            "cells": int(domain.mesh.t.shape[1]),
            "quality": domain.quality,
            "cell_m": {region: domain.size(region) for region in domain.regions},
        },
        "effort": {"nodes": body.size, "seconds": seconds(plan)},
        "estimates": [*estimates(plan), poisson(plan)],
    }
    return {**said, "cautions": [*plan.cautions(), *_cautions(said, domain.product)]}


def resistances(plan: Plan, cooling: Cooling) -> dict[str, float]:
    """Return the resistances that heat meets on its way out [m2 K/W], from the core outwards.

    The product counts with half of its half thickness over its frozen conductivity, as in Plank's
    formula for slab, cylinder and sphere alike.
    """
    k = frozen_conductivity(product_of(plan), cooling.coolant)
    found = {"product": depth(plan, cooling) / (2.0 * k)}
    found |= {name: thickness / conductivity for name, (thickness, conductivity) in cooling.walls.items()}
    return found | {FILM: 0.0 if cooling.h >= NO_FILM else 1.0 / cooling.h}


def seconds(plan: Plan) -> float:
    """Return roughly how long a run takes [s]; it may well be twice or half of that."""
    thousands = plan.body.size / 1000.0
    each = 0.3e-3 + 0.9e-3 * thousands**1.36
    stages = 0.5 + 0.5 * len(plan.case.stages)
    return 0.5 + FACTORISATIONS * stages * SLOWER[plan.case.stepping.accuracy] * each


def _resistances(plan: Plan) -> dict[str, Any]:
    try:
        cooling = cooling_of(plan)
        product, deep = product_of(plan), depth(plan, cooling)
        met = resistances(plan, cooling)
    except NoMethod:
        return {"biot": None, "depth_m": None, "resistances_m2K_per_W": {}}
    outside = sum(value for name, value in met.items() if name != "product")
    inside = deep / frozen_conductivity(product, cooling.coolant)
    return {"biot": inside / outside if outside else None, "depth_m": deep, "resistances_m2K_per_W": met}


def _cautions(said: dict[str, Any], product: tuple[str, ...]) -> list[str]:
    """Return what is odd about the mesh."""
    found = []
    if said["mesh"]["quality"] < FLATTEST:
        quality = f"quality {said['mesh']['quality']:.2g}, best 1"
        found.append(f"the worst cell of the mesh is nearly flat ({quality}): mesh it again")
    if said["depth_m"] is not None:
        cell = max(said["mesh"]["cell_m"][region] for region in product)
        across = said["depth_m"] / cell
        if across < FEW_CELLS:
            found.append(
                f"only about {across:.0f} cells lie between the surface and the core: take smaller ones"
            )
    return found
