"""What a case means to a hand method: the simple shape, and what cools it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fem import handbook
from fem.case.case import Stage
from fem.heat.exchange import Exchange, Insulated
from fem.material import Material
from fem.mesh.shape import Bar, Ring, Rod, Slab
from fem.plan import Plan

FROZEN_AT = -15.0
"""Where the conductivity of the frozen product is taken [degC], as the methods want it."""

# A surface held at a temperature; its film is far thinner than any other resistance.
NO_FILM = 1e7
# Rods this many times as long as thick freeze from the side as if they had no ends.
LONG = 3.0


class NoMethod(ValueError):
    """Says why no hand method applies to a case."""


@dataclass(frozen=True)
class Cooling:
    """What the outside does to the product, seen from its surface.

    Parameters
    ----------
    stage
        Name of the stage.
    surfaces
        Surfaces that it cools.
    h
        Coefficient of the fluid's film [W/m2/K].
    coolant
        Temperature of the fluid [degC].
    walls
        Region -> thickness [m] and conductivity [W/m/K] of what lies between.
    remarks
        What was simplified.

    """

    stage: str
    surfaces: tuple[str, ...]
    h: float
    coolant: float
    walls: dict[str, tuple[float, float]]
    remarks: tuple[str, ...]

    @property
    def conductance(self) -> float:
        """Coefficient through film and walls [W/m2/K]."""
        return handbook.conductance(self.h, self.walls.values())


@dataclass(frozen=True)
class Simple:
    """The simple shape that stands for the piece.

    Parameters
    ----------
    shape
        "slab", "bar" or "cylinder".
    half
        Half thickness or radius [m].
    beta
        Long over short side of a bar; 1 for the others.
    remarks
        What the piece has and the simple shape has not.

    """

    shape: str
    half: float
    beta: float = 1.0
    remarks: tuple[str, ...] = ()


def depth(plan: Plan, cooling: Cooling) -> float:
    """Return the half thickness or radius of the product [m]: how deep its core lies."""
    try:
        return simple_of(plan, cooling).half
    except NoMethod:
        from scipy.spatial import cKDTree

        body, domain = plan.body, plan.body.domain
        cold = np.unique(np.concatenate([np.flatnonzero(body.exposures[name]) for name in cooling.surfaces]))
        cells = np.concatenate([domain.regions[region] for region in domain.product])
        inside = np.unique(domain.mesh.t[:, cells])
        far, _ = cKDTree(domain.points[:, cold].T).query(domain.points[:, inside].T)
        return float(far.max()) - sum(thickness for thickness, _ in cooling.walls.values())


def frozen_conductivity(product: Material, coolant: float) -> float:
    """Return the conductivity of the frozen product [W/m/K], at -15 degC or half-way to the coolant."""
    T = FROZEN_AT
    if product.freezing_point is not None and coolant > FROZEN_AT:
        T = min(product.freezing_point, 0.5 * (product.freezing_point + coolant))
    return float(product.curve.conductivity(T))


def cooling_of(plan: Plan) -> Cooling:
    """Return what cools the product: the longest stage that can bring it to the aim, or that cools at all.

    Raises
    ------
    NoMethod
        Where no stage does, or its surfaces meet different conditions.

    """
    if not plan.cooling:
        raise NoMethod("no hand method knows thawing")
    able = []
    for stage in plan.case.stages:
        means = [_mean(exchange, stage.lasts) for exchange in _active(stage).values()]
        known = [one for one in means if one is not None]
        if known and len(known) == len(means) and max(m[1] for m in known) < plan.start_temperature:
            able.append((stage, known))
    if not able:
        raise NoMethod("no stage cools the piece through a known coolant")
    end = plan.case.aim.reach if plan.case.aim is not None else plan.start_temperature
    cold = [one for one in able if max(m[1] for m in one[1]) < end] or able
    stage, sides = max(cold, key=lambda one: one[0].lasts)
    h, coolant, _ = sides[0]
    if any(abs(side[0] / h - 1.0) > 0.01 or abs(side[1] - coolant) > 0.1 for side in sides):
        raise NoMethod("the surfaces of the piece meet different conditions")
    remarks = [f"of stage {stage.name} alone"] if len(plan.case.stages) > 1 else []
    remarks += list(dict.fromkeys(text for side in sides for text in side[2]))
    surfaces = tuple(_active(stage))
    return Cooling(stage.name, surfaces, h, coolant, _walls(plan, surfaces, coolant), tuple(remarks))


def _active(stage: Stage) -> dict[str, Exchange]:
    return {name: e for name, e in stage.surfaces.items() if not isinstance(e, Insulated)}


def _mean(exchange: Exchange, lasts: float) -> tuple[float, float, list[str]] | None:
    """Return the mean coefficient and temperature of an exchange; None where it has no temperature."""
    clocks = np.linspace(0.0, lasts, 41) if len(exchange.knots()) else np.zeros(1)
    around = [exchange.environment(float(c)) for c in clocks]
    if any(T is None for T in around):
        return None
    through = [exchange.coefficient(float(c)) for c in clocks]
    h = np.array([NO_FILM if value is None else value for value in through])
    T = np.array(around, dtype=float)
    remarks = ["coefficient and coolant are their means over the stage"] if np.ptp(h) or np.ptp(T) else []
    if exchange.exchange == "radiant":
        remarks.append("radiation is taken as a film, at the temperature around")
    return float(h.mean()), float(T.mean()), remarks


def _walls(plan: Plan, surfaces: tuple[str, ...], coolant: float) -> dict[str, tuple[float, float]]:
    """Return thickness and conductivity of each region between the product and what cools it."""
    body = plan.body
    area = float(sum(body.exposures[name].sum() for name in surfaces))
    reached = np.flatnonzero(sum(body.exposures[name] for name in surfaces))
    found: dict[str, tuple[float, float]] = {}
    waiting = [region for region in body.domain.regions if region not in body.domain.product]
    while touching := [r for r in waiting if np.any(body.volumes[r][reached] > 0)]:
        for region in touching:
            waiting.remove(region)
            thickness = float(body.volumes[region].sum()) / area
            if isinstance(plan.case.shape, Bar) and plan.case.shape.wall is not None:
                thickness = plan.case.shape.wall
            found[region] = (thickness, float(body.materials[region].curve.conductivity(coolant)))
            reached = np.union1d(reached, np.flatnonzero(body.volumes[region]))
    return dict(reversed(found.items()))


def simple_of(plan: Plan, cooling: Cooling) -> Simple:
    """Return the simple shape that stands for the piece.

    Raises
    ------
    NoMethod
        Where none does.

    """
    shape, cold = plan.case.shape, set(cooling.surfaces)
    if isinstance(shape, Bar):
        beta = max(shape.thickness, shape.width) / shape.smallest
        if shape.corner > 0.45 * shape.smallest and beta < 1.1:
            return Simple("cylinder", shape.smallest / 2.0)
        rounded = ("its corners are taken as sharp",) if not shape.sharp else ()
        return Simple("bar", shape.smallest / 2.0, beta, rounded)
    if isinstance(shape, Slab):
        across = _between(shape.thickness, cold & {"left", "right"})
        along = _between(shape.width, cold & {"bottom", "top"})
        return _box(across, along)
    if isinstance(shape, Rod):
        along = _between(shape.height, cold & {"bottom", "top"})
        if "side" not in cold:
            return _box(None, along)
        if along is not None and along < LONG * 2.0 * shape.radius:
            raise NoMethod("no hand method knows a short rod that freezes from its side and its ends")
        left_out = ("its ends are left out",) if along is not None else ()
        return Simple("cylinder", shape.radius, remarks=left_out)
    what = "a ring" if isinstance(shape, Ring) else "a shape from a mesh file"
    raise NoMethod(f"no hand method knows {what}")


def _between(extent: float, cold: set[str]) -> float | None:
    """Return the thickness of the slab between two cold sides; one cold side is half of it."""
    return None if not cold else extent * (2.0 if len(cold) == 1 else 1.0)


def _box(across: float | None, along: float | None) -> Simple:
    sides = [side for side in (across, along) if side is not None]
    if not sides:
        raise NoMethod("nothing cools the piece")
    if len(sides) == 1:
        return Simple("slab", sides[0] / 2.0)
    return Simple("bar", min(sides) / 2.0, max(sides) / min(sides))


def product_of(plan: Plan) -> Material:
    """Return the one material that freezes.

    Raises
    ------
    NoMethod
        Where there are several, or none.

    """
    materials = {id(m): m for r, m in plan.body.materials.items() if r in plan.body.domain.product}
    if len(materials) != 1:
        raise NoMethod("no hand method knows a product of several materials")
    (material,) = materials.values()
    if not material.freezes:
        raise NoMethod("the product does not freeze")
    return material


def end_of(plan: Plan) -> float:
    """Return the temperature that the core has to reach [degC].

    Raises
    ------
    NoMethod
        Where the case does not say.

    """
    if plan.case.aim is not None:
        return plan.case.aim.reach
    ends = [stage.until.temperature for stage in plan.case.stages if stage.until is not None]
    if not ends:
        raise NoMethod("the case has no aim: give one in [aim]")
    return ends[-1]
