"""What texture hangs on: when each place froze, and how long it took to freeze through."""

from __future__ import annotations

import numpy as np

from fem.curve import Array
from fem.march.step import Moment, Step
from fem.watch.product import Product

DEFAULT_REACH = -8.0
"""Where the local freezing time ends without an aim below the freezing point [degC].

Common practice, no source: most of the water that will freeze has frozen by then.
"""

NEAR = 1e-4
"""Temperatures within this of the aim have reached it [K]: a march that stops there ends on it."""

# Places of a step at which the path of a node is looked at. Between two of them it counts as
# straight, which leaves less than a thousandth of the step.
LOOKS = 64


class FreezingTimes:
    """When each node of the product froze, and its local freezing time.

    A node freezes when it falls to the freezing point of its material; for `melting`, when half
    of what can freeze has frozen. The last freezing counts: a node that thaws has not frozen
    until it freezes again, and one that was frozen from the start never does. Both moments are
    crossings of an enthalpy, found in the dense output of the steps.

    Parameters
    ----------
    product
        What freezes.
    reach
        Temperature at which a node has frozen through [degC], such as that of the aim;
        `DEFAULT_REACH` where it is None, not below the freezing point, or the run warms.
    start
        Enthalpies before a first stage imposed anything [J/m3], shape (nodes,); by default
        those that the first step begins with.

    Attributes
    ----------
    frozen_at
        Time since the run began at which each node froze [s], NaN where it has not, (nodes,).

    """

    def __init__(self, product: Product, reach: float | None = None, start: Array | None = None):
        body = product.body
        materials = {id(body.materials[region]) for region in product.regions}
        parts = [part for part in body.parts if id(part.material) in materials]
        points = [p.material.freezing_point for p in parts if p.material.freezing_point is not None]
        within = product.cooling and reach is not None and all(reach < point for point in points)
        self.reach = reach if within and reach is not None else DEFAULT_REACH
        # An enthalpy that no node falls to stands where there is nothing to find.
        self._freezes, self._reaches = np.full(body.size, -np.inf), np.full(body.size, -np.inf)
        for part in parts:
            front, point = part.material.front_enthalpy(), part.material.freezing_point
            if front is not None and point is not None:
                self._freezes[part.hosted] = front
                if self.reach < point:
                    self._reaches[part.hosted] = part.curve.enthalpy(self.reach + NEAR)
        self.frozen_at = np.full(body.size, np.nan)
        self._reached_at = np.full(body.size, np.nan)
        self._frozen = None if start is None else start < self._freezes

    @property
    def local(self) -> Array:
        """Time from the freezing point to `reach` [s], NaN where either is missing, (nodes,)."""
        return self._reached_at - self.frozen_at

    def see(self, step: Step) -> None:
        """Take note of the nodes that freeze, freeze through or thaw in a step."""
        if self._frozen is None:
            self._frozen = step.before.u < self._freezes
        self._jump(self._frozen, step.before)
        began = self._frozen
        ended = step.after.u < self._freezes
        self._thaw(began & ~ended)
        freezing = np.flatnonzero(ended & ~began)
        through = ended & (step.after.u <= self._reaches) & np.isnan(self._reached_at)
        through = np.flatnonzero(through & ~(began & np.isnan(self.frozen_at)))
        if len(freezing) or len(through):
            path = _path(step)
            self.frozen_at[freezing] = _last(step, path[:, freezing], self._freezes[freezing])
            reached = _first(step, path[:, through], self._reaches[through])
            self._reached_at[through] = np.maximum(reached, self.frozen_at[through])
        self._frozen = ended

    def _jump(self, before: np.ndarray, now: Moment) -> None:
        """Take note of what a surface temperature did to its nodes when a stage imposed it."""
        frozen = now.u < self._freezes
        self._thaw(before & ~frozen)
        self.frozen_at[frozen & ~before] = now.time
        through = ~np.isnan(self.frozen_at) & np.isnan(self._reached_at) & (now.u <= self._reaches)
        self._reached_at[through] = now.time
        self._frozen = frozen

    def _thaw(self, nodes: np.ndarray) -> None:
        self.frozen_at[nodes] = np.nan
        self._reached_at[nodes] = np.nan


def _path(step: Step) -> Array:
    """Return the unknowns at both ends and both thirds of a step, shape (4, nodes)."""
    t, size = step.before.time, step.size
    return np.stack([step.before.u, step.at(t + size / 3)[0], step.at(t + 2 * size / 3)[0], step.after.u])


def _looks(path: Array, level: Array) -> Array:
    """Return by how much paths lie above their levels, shape (LOOKS + 1, nodes).

    The dense output is a cubic of time, so four samples say all of it.
    """
    return np.asarray(_CUBIC @ (path - level))


def _last(step: Step, path: Array, level: Array) -> Array:
    """Return when paths fall below their levels for the last time [s]."""
    above = _looks(path, level)
    falls = (above[:-1] >= 0.0) & (above[1:] < 0.0)
    return _crossing(step, above, LOOKS - 1 - np.argmax(falls[::-1], axis=0))


def _first(step: Step, path: Array, level: Array) -> Array:
    """Return when paths reach their levels for the first time [s]."""
    above = _looks(path, level)
    return _crossing(step, above, np.argmax(above[1:] <= 0.0, axis=0))


def _crossing(step: Step, above: Array, i: np.ndarray) -> Array:
    nodes = np.arange(above.shape[1])
    a, b = above[i, nodes], above[i + 1, nodes]
    return np.asarray(step.before.time + step.size * (i + a / (a - b)) / LOOKS)


def _cubic() -> Array:
    """Return the matrix from values at 0, 1/3, 2/3 and 1 to those of their cubic at the looks."""
    knots = np.arange(4) / 3.0
    s = np.arange(LOOKS + 1) / LOOKS
    columns = [
        np.prod([(s - k) / (knot - k) for k in np.delete(knots, j)], axis=0) for j, knot in enumerate(knots)
    ]
    return np.stack(columns, axis=1)


_CUBIC = _cubic()
