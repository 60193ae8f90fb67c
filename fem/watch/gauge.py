"""Temperatures that a case asks for: at the slowest point, at a watched one, of the whole."""

from __future__ import annotations

import numpy as np

from fem.curve import Array
from fem.heat.body import Body
from fem.watch.product import Product
from fem.watch.sample import Outside, sampler
from fem.watch.schedule import SLOWEST


class Gauge:
    """Reads temperatures off the unknowns of a body.

    Parameters
    ----------
    body
        Mesh and materials.
    points
        Name -> coordinates in the whole piece [m].
    cooling
        Whether the slowest point is the warmest one.

    Raises
    ------
    ValueError
        Where a point does not lie in the piece.

    """

    def __init__(self, body: Body, points: dict[str, tuple[float, float]], cooling: bool):
        self.body = body
        self.product = Product(body, cooling)
        self.names = tuple(points)
        try:
            self.matrix, _ = sampler(body.domain, np.array(list(points.values())).reshape(-1, 2).T)
        except Outside as outside:
            names = ", ".join(f'"{self.names[i]}"' for i in outside.which)
            raise ValueError(f"watched point {names} lies outside the piece") from None

    def measure(self, u: Array, at: str) -> float:
        """Return the temperature at the slowest point or at a watched one [degC]."""
        T = self.body.temperature(u)
        if at == SLOWEST:
            return self.product.slowest(T)[1]
        return float((self.matrix[self.names.index(at)] @ T)[0])

    def points(self, T: Array) -> dict[str, float]:
        """Return the temperature at each watched point [degC]."""
        return dict(zip(self.names, map(float, self.matrix @ T), strict=True))
