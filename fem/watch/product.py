"""The product as a whole: its slowest point, its mean, its ice."""

from __future__ import annotations

from functools import cached_property

import numpy as np
from scipy.optimize import brentq

from fem.curve import Array
from fem.heat.body import Body

TIE = 1e-6
"""Temperatures closer than this count as equal [K]."""


class Product:
    """The regions of a body that are product, as against mould and film.

    Parameters
    ----------
    body
        Mesh and materials.
    cooling
        Whether the run means to cool: the slowest point is then the warmest one.

    """

    def __init__(self, body: Body, cooling: bool = True):
        self.body = body
        self.cooling = cooling
        self.regions = body.domain.product
        self.volume = np.asarray(sum((body.volumes[r] for r in self.regions), np.zeros(body.size)))
        self.nodes = np.flatnonzero(self.volume > 0)

    @cached_property
    def mass(self) -> float:
        """Mass of the product of the whole piece [kg]."""
        masses = self.body.masses()
        return sum(masses[r] for r in self.regions)

    def slowest(self, T: Array) -> tuple[int, float]:
        """Return the node that is furthest behind, and its temperature [degC]."""
        values = T[self.nodes]
        behind = values if self.cooling else -values
        # Where a line of points is equally late, rounding must not choose among them.
        i = int(np.argmax(behind >= behind.max() - TIE))
        return int(self.nodes[i]), float(values[i])

    def mean(self, u: Array) -> float:
        """Return the temperature that the product would have once mixed, no heat lost [degC]."""
        held = self.body.heat(u)
        total = sum(held[r] for r in self.regions)
        shares = [(self.body.materials[r], float(self.body.volumes[r].sum())) for r in self.regions]
        if len({id(material) for material, _ in shares}) == 1:
            return float(shares[0][0].curve.temperature(total / sum(v for _, v in shares)))
        T = self.body.temperature(u)[self.nodes]
        low, high = float(T.min()) - 1e-6, float(T.max()) + 1e-6

        def surplus(mixed: float) -> float:
            return sum(float(m.curve.enthalpy(mixed)) * v for m, v in shares) - total

        return float(brentq(surplus, low, high, xtol=1e-9))

    def ice(self, T: Array) -> Array:
        """Return the ice at each node, share of the product's mass [-]; 0 outside the product.

        NaN where a table does not say how much of it is ice.
        """
        out = np.zeros(self.body.size)
        product = {id(self.body.materials[r]) for r in self.regions}
        for part in self.body.parts:
            if id(part.material) in product:
                out[part.hosted] = part.material.ice(T[part.hosted])
        return out

    def mean_ice(self, ice: Array) -> float:
        """Return the mean of nodal ice by mass [-]."""
        weight = np.zeros(self.body.size)
        for region in self.regions:
            weight += self.body.volumes[region] * self.body.materials[region].density
        return float(weight @ ice / weight.sum())
