"""Freezing times by hand for a case: Plank's bound, and Pham's method with the shape factor.

What the methods need of a material comes from its own curve, so that a difference to the run is
the method's and not the data's.
"""

from __future__ import annotations

from typing import Any

from fem import handbook
from fem.estimate.conditions import (
    Cooling,
    NoMethod,
    Simple,
    cooling_of,
    end_of,
    frozen_conductivity,
    product_of,
    simple_of,
)
from fem.material import Material
from fem.plan import Plan

FROZEN_THROUGH = -40.0
"""Where hardly any water is left to freeze [degC]: the frozen heat capacity is sensible there."""

# With less ice than this at the aim, freezing has not ended where the methods take it to end. A bar of
# 28 % sugar, half of it ice at -12 degC, took 1283 s by finite volumes and 1024 s by hand (computed).
HARD = 0.55


def estimates(plan: Plan) -> list[dict[str, Any]]:
    """Return the hand estimates of a case, as ``summary.json`` has them.

    Returns
    -------
    Of each method: ``method``, ``time_s`` (None where it cannot be had), ``in_range``, ``remarks``.

    """
    try:
        product, end, cooling = product_of(plan), end_of(plan), cooling_of(plan)
        simple = simple_of(plan, cooling)
    except NoMethod as reason:
        return [_entry("hand methods", None, False, [str(reason)])]
    soft = _softness(product, end)
    found = []
    for method, work_out in (("Plank", _plank), ("Pham", _pham)):
        remarks = [*simple.remarks, *cooling.remarks]
        try:
            time, good, said = work_out(product, cooling, simple, plan.start_temperature, end)
        except ValueError as error:
            found.append(_entry(method, None, False, [str(error)]))
            continue
        if soft and method == "Pham":
            good, said = False, [*said, soft]
        found.append(_entry(method, time, good, [*said, *remarks]))
    return found


def _entry(method: str, time: float | None, in_range: bool, remarks: list[str]) -> dict[str, Any]:
    return {"method": method, "time_s": time, "in_range": in_range, "remarks": remarks}


def _softness(product: Material, end: float) -> str:
    """Say that a product is hardly hard at its aim; empty where it is, or where ice is not known."""
    ice = float(product.ice(end)) if product.has_ice else 1.0
    if ice >= HARD or product.kind == "table":
        return ""
    return (
        f"only {100 * ice:.0f} % of the mass is ice at {end:g} degC: so soft a mix is still freezing there, "
        "and takes about a fifth longer"
    )


def _slabs(cooling: Cooling, simple: Simple, k: float) -> tuple[float, list[str]]:
    """Return by how much a shape is faster than a slab of its thickness."""
    if simple.shape != "bar":
        return handbook.SHAPES[simple.shape][2], []
    factor = handbook.shape_factor(simple.beta, cooling.conductance * 2.0 * simple.half / k)
    return factor, [f"long bar, sides {simple.beta:.3g} to 1: shape factor {factor:.3f}"]


def _unfrozen_capacity(product: Material, start: float) -> float:
    """Return the heat capacity of the unfrozen product [J/m3/K], which hardly changes as it cools."""
    T_f = product.freezing_point
    above = start if T_f is None else T_f + product.melting_range / 2.0 + 0.01
    return float(product.curve.capacity(max(start, above)))


def _plank(
    product: Material, cooling: Cooling, simple: Simple, start: float, end: float
) -> tuple[float, bool, list[str]]:
    if product.freezing_point is None:
        raise ValueError("the material does not say its freezing point")
    k = frozen_conductivity(product, cooling.coolant)
    factor, said = _slabs(cooling, simple, k)
    shape = "slab" if simple.shape == "bar" else simple.shape
    # Latent heat down to -10 degC, or to the aim where that is warmer: no less is given off.
    found = handbook.plank(
        shape, 2.0 * simple.half, cooling.conductance, k, product.latent_heat(max(-10.0, end)),
        product.freezing_point, cooling.coolant, start=start,
        capacity_frozen=float(product.curve.capacity(FROZEN_THROUGH)),
        capacity_unfrozen=_unfrozen_capacity(product, start),
    )  # fmt: skip
    share = factor if shape == "slab" else 1.0
    return found.time_s / share, found.in_range, [*found.remarks, *said]


def _pham(
    product: Material, cooling: Cooling, simple: Simple, start: float, end: float
) -> tuple[float, bool, list[str]]:
    k = frozen_conductivity(product, cooling.coolant)
    factor, said = _slabs(cooling, simple, k)
    found = handbook.pham(
        simple.half, cooling.conductance, k, start=start, end=end, coolant=cooling.coolant,
        capacity_unfrozen=_unfrozen_capacity(product, start), heat=product.heat(start, end),
        shape_factor=factor, freezing_point=product.freezing_point,
        capacity_frozen=float(product.curve.capacity(FROZEN_THROUGH)),
    )  # fmt: skip
    return found.time_s, found.in_range, [*found.remarks, *said]
