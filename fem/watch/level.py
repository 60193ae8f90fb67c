"""What a front is the level of, and how frozen each place is beside it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fem.curve import Array, Curve
from fem.heat.body import Body, Part
from fem.material import Material
from fem.watch.product import Product
from fem.watch.schedule import Level


@dataclass(frozen=True, eq=False)
class FrozenShare:
    """How far each place is on the frozen side of a level, 0.5 on it.

    At a jump of the enthalpy it is the share of the jump's heat that has left, 1 frozen to 0
    not, so that a node which is half frozen says so. Elsewhere it is a straight function of the
    Kirchhoff integral, whose slope does not break where the conductivity does.

    Parameters
    ----------
    curve
        Of the material.
    low, high
        Enthalpies between which the share runs from 1 to 0 [J/m3]; equal where there is no jump.
    temperature
        The level [degC].

    """

    curve: Curve
    low: float
    high: float
    temperature: float

    @property
    def sharp(self) -> bool:
        """Whether the level is a jump of the enthalpy."""
        return self.high > self.low

    def at(self, H: Array, T: Array) -> Array:
        """Return the share at enthalpies [J/m3] and temperatures [degC], same shapes."""
        if self.sharp:
            return np.clip((self.high - H) / (self.high - self.low), 0.0, 1.0)
        gap = self.curve.kirchhoff(T) - self.curve.kirchhoff(self.temperature)
        return np.asarray(0.5 - gap / float(self.curve.conductivity(self.temperature)))


def frozen_share(curve: Curve, temperature: float) -> FrozenShare:
    """Return the measure of a level, at a jump of the curve where the level lies in one."""
    i = int(np.clip(np.searchsorted(curve.T, temperature), 1, len(curve.T) - 1))
    if curve.jumps(i):
        return FrozenShare(curve, float(curve.H[i - 1]), float(curve.H[i]), temperature)
    return FrozenShare(curve, 0.0, 0.0, temperature)


def frozen_shares(body: Body, product: Product, level: Level) -> list[tuple[Part, FrozenShare]]:
    """Return the measure of a level for each material of the product that has it."""
    out: list[tuple[Part, FrozenShare]] = []
    materials = {id(body.materials[r]) for r in product.regions}
    for part in body.parts:
        if id(part.material) not in materials:
            continue
        if level.kind == "temperature":
            temperature = level.value
        elif level.kind == "ice":
            temperature = _temperature_of_ice(part.material, level.value)
        else:
            temperature = part.material.freezing_point
        if temperature is not None:
            out.append((part, frozen_share(part.curve, temperature)))
    return out


def _temperature_of_ice(material: Material, ice: float | None) -> float | None:
    """Return where a material holds a share of ice [degC]; None where it never holds so much."""
    if material.ice_rows is None or ice is None or ice > material.freezable:
        return None
    T, shares = material.ice_rows
    return float(np.interp(ice, shares[::-1], T[::-1]))
