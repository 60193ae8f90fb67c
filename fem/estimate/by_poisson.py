"""Freezing time of any shape from one Poisson solve, corrected for what the exact limit leaves out."""

from __future__ import annotations

from typing import Any

import numpy as np

from fem.case.case import Stage
from fem.estimate.conditions import NoMethod, end_of, product_of
from fem.exact.inward import stefan_root
from fem.heat.quasi_steady import Film, NeverFreezes, QuasiSteady
from fem.material import Material
from fem.plan import Plan

METHOD = "Poisson"

BAND = (0.85, 1.15)
"""Run over estimate inside its range. Exact in two limits: a piece of one temperature (small Biot
number), and latent heat at one temperature with a small Stefan number. Between them the runs of
slabs and rods of water and of mix, Bi 0.05 to 20, coolant -20 and -36 degC, start 4 and 25 degC,
were 10 % below to 6 % above (computed with this program)."""

# The numbers within which that was seen.
MOST_STEFAN = 0.4
MOST_SUPERHEAT = 0.6
NEAREST_COOLANT = 3.0

ROWS = 2000


def poisson(plan: Plan) -> dict[str, Any]:
    """Return the estimate as ``summary.json`` has it.

    The exact time per latent heat, ``phi / (T_f - T_c)``, is used for each part of the heat at the
    temperature where the material's own curve gives it up: ``phi times the integral of dH / (T -
    T_c)`` from the start to the aim. A split of the heat as in Pham's method, with as many parts as
    the curve has rows, and with the piece's own shape in place of a shape factor.

    Returns
    -------
    ``method``; ``time_s`` (None where it cannot be had); ``limit_s``, the exact limit for the latent
    heat alone; ``in_range``; ``band`` that the run's time over this one keeps within; ``remarks``.

    """
    try:
        product, stage = product_of(plan), _stage(plan)
        end = _end(plan, product)
        return _work_out(plan, product, stage, end)
    except (NoMethod, NeverFreezes) as reason:
        return {"method": METHOD, "time_s": None, "in_range": False, "remarks": [str(reason)]}


def _work_out(plan: Plan, product: Material, stage: Stage, end: float) -> dict[str, Any]:
    T_f = product.freezing_point
    if T_f is None:
        raise NoMethod("the material does not say its freezing point")
    films = {
        name: film for name, e in stage.surfaces.items() if (film := Film.of(e, stage.lasts)) is not None
    }
    coldest = min(film.coolant for film in films.values() if film.h > 0)
    frozen = T_f - product.melting_range / 2.0
    curve = product.curve
    # What drives heat through ice is the Kirchhoff integral, so its mean is exact for held walls.
    k = float(curve.kirchhoff(frozen) - curve.kirchhoff(coldest)) / (frozen - coldest)
    conductivity = {
        region: k if material is product else float(material.curve.conductivity(coldest))
        for region, material in plan.body.materials.items()
    }
    found = QuasiSteady.of(plan.body, films, conductivity, T_f)
    if end <= found.coolant:
        raise NoMethod(f"the core never reaches {end:.4g} degC: what cools it is at {found.coolant:.4g} degC")
    limit = found.time(product.latent_heat(end), T_f)
    remarks = [f"the latent heat alone, exactly, takes {limit:.4g} s from a liquid at its freezing point"]
    remarks += _stefan(product, found.coolant, T_f, end, limit)
    inputs = [f"frozen conductivity {k:.3g} W/m/K, its mean down to the coolant"]
    if len(conductivity) > len(plan.body.domain.product):
        inputs.append("the heat that walls hold is left out")
    doubts = _doubts(plan, product, stage, films, found.coolant, end)
    return {
        "method": METHOD,
        "time_s": found.phi * _heat_over_drive(product, plan.start_temperature, end, found.coolant),
        "limit_s": limit,
        "in_range": not doubts,
        "band": list(BAND),
        "remarks": [*remarks, *doubts, *inputs],
    }


def _heat_over_drive(product: Material, start: float, end: float, coolant: float) -> float:
    """Return the integral of dH / (T - T_c) from start to end [J/m3/K]."""
    rows = product.curve.T
    T = np.unique(np.concatenate([np.linspace(end, start, ROWS), rows[(rows > end) & (rows < start)]]))
    H = product.curve.enthalpy(T)
    # A start at the melting point is liquid, whatever the curve says of that temperature.
    H[-1] = product.start_enthalpy(start)
    # Exact where the heat capacity is even between two rows.
    mean = np.diff(T) / np.log1p(np.diff(T) / (T[:-1] - coolant))
    return float(np.sum(np.diff(H) / mean))


def _stefan(product: Material, coolant: float, T_f: float, end: float, limit: float) -> list[str]:
    """Say what the ice's own cooling adds to the limit, by the exact times of simple shapes."""
    ste = _stefan_number(product, coolant, T_f, end)
    slab = ste / (2.0 * stefan_root(ste) ** 2)
    return [
        f"with the cooling of the ice meanwhile, Ste = {ste:.2f}, {slab * limit:.4g} s (as a slab, exact) to "
        f"{(1.0 + ste) * limit:.4g} s (as a cylinder or sphere, 1 + Ste: leading order, value from memory)"
    ]


def _stefan_number(product: Material, coolant: float, T_f: float, end: float) -> float:
    # Where hardly any water is left to freeze, the capacity is that of the ice and the solids.
    capacity = float(product.curve.capacity(min(coolant, -40.0)))
    return capacity * (T_f - coolant) / product.latent_heat(end)


def _doubts(
    plan: Plan, product: Material, stage: Stage, films: dict[str, Film], coolant: float, end: float
) -> list[str]:
    """Say what takes the case out of what was tried."""
    T_f = product.freezing_point
    assert T_f is not None
    said = []
    latent = product.latent_heat(end)
    if latent <= 0.2 * product.latent_heat():
        said.append("hardly any of it freezes before the aim")
    if (ste := _stefan_number(product, coolant, T_f, end)) > MOST_STEFAN:
        said.append(f"Ste = {ste:.2g} is above {MOST_STEFAN:g}")
    above = product.melting_range / 2.0 + T_f
    superheat = product.heat(plan.start_temperature, above) if plan.start_temperature > above else 0.0
    if superheat > MOST_SUPERHEAT * latent:
        said.append(f"the heat above the freezing point is {superheat / latent:.2g} of the latent heat")
    if end - coolant < NEAREST_COOLANT:
        said.append(f"the aim lies only {end - coolant:.2g} K above what the core comes to in the end")
    if plan.start_temperature < T_f - product.melting_range / 2.0:
        said.append("the product starts partly frozen")
    if not all(film.steady for film in films.values()):
        said.append("coefficients and coolants are their means over the stage")
    if len(plan.case.stages) > 1:
        said.append(f"of stage {stage.name} alone")
    return said


def _stage(plan: Plan) -> Stage:
    """Return the longest stage that can freeze the product.

    Raises
    ------
    NoMethod
        Where there is none.

    """
    if not plan.cooling:
        raise NoMethod("the estimate is for freezing, not for thawing")
    product = product_of(plan)
    goal = plan.start_temperature if product.freezing_point is None else product.freezing_point
    if plan.case.aim is not None:
        goal = min(goal, plan.case.aim.reach)

    def coldest(stage: Stage) -> float:
        films = [Film.of(exchange, stage.lasts) for exchange in stage.surfaces.values()]
        return min((film.coolant for film in films if film is not None and film.h > 0), default=np.inf)

    able = [stage for stage in plan.case.stages if coldest(stage) < goal]
    if not able:
        raise NoMethod("no stage cools the piece to its aim through a known coolant")
    return max(able, key=lambda stage: stage.lasts)


def _end(plan: Plan, product: Material) -> float:
    """Return the temperature that the slowest point has to reach [degC]."""
    try:
        end = end_of(plan)
    except NoMethod:
        if product.melting_point is None:
            raise
        end = product.melting_point - product.melting_range / 2.0
    if end >= plan.start_temperature:
        raise NoMethod("the product starts at its aim")
    return end
