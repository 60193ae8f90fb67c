"""The frozen front along rays: where a level surface lies, and how fast it moves."""

from __future__ import annotations

import numpy as np

from fem.curve import Array
from fem.heat.body import Body
from fem.watch.level import FrozenShare, frozen_shares
from fem.watch.product import Product
from fem.watch.sample import Outside, sampler
from fem.watch.schedule import Level, Ray

# Samples to a cell: the nodal field is a chain of straight pieces along a ray, and its kinks
# fall between samples.
SAMPLES = 10


class Fronts:
    """Positions of the front along the rays of a case.

    Parameters
    ----------
    product
        Where a front can be.
    level
        What the front is.
    rays
        Name -> ray.

    Raises
    ------
    ValueError
        Where a ray does not lie in the piece at all.

    """

    def __init__(self, product: Product, level: Level, rays: dict[str, Ray]):
        self.product = product
        body = product.body
        self._shares = [(part.hosted, share) for part, share in frozen_shares(body, product, level)]
        self._rays = {name: _Track(body, product, ray, name) for name, ray in rays.items()}
        self._last: dict[str, tuple[float, float | None]] = {}

    @property
    def sharp(self) -> bool:
        """Whether the level is a jump of the enthalpy, whose place `see` reads from `u` alone."""
        return any(measure.sharp for _, measure in self._shares)

    def see(self, time: float, u: Array, T: Array) -> dict[str, tuple[float | None, float | None]]:
        """Return position [m] and speed [m/s] on each ray; None where there is no front.

        The speed is that since the last row.
        """
        share = np.full(self.product.body.size, np.nan)
        for nodes, measure in self._shares:
            share[nodes] = measure.at(u[nodes], T[nodes])
        out: dict[str, tuple[float | None, float | None]] = {}
        for name, track in self._rays.items():
            position = track.position(share, self._shares[0][1]) if self._shares else None
            then, before = self._last.get(name, (time, None))
            moving = position is not None and before is not None and time > then
            speed = (position - before) / (time - then) if moving else None  # type: ignore[operator]
            self._last[name] = (time, position)
            out[name] = (position, speed)
        return out


class _Track:
    """One ray, sampled densely where it runs through product."""

    def __init__(self, body: Body, product: Product, ray: Ray, name: str):
        start, stop = np.array(ray.from_), np.array(ray.to)
        length = float(np.hypot(*(stop - start)))
        cell = min(body.domain.size(r) for r in product.regions)
        count = int(np.clip(np.ceil(SAMPLES * length / cell), 20, 20_000))
        along = np.linspace(0.0, 1.0, count + 1)
        points = start[:, None] + (stop - start)[:, None] * along
        try:
            matrix, cells = sampler(body.domain, points)
        except Outside as outside:
            inside = np.setdiff1d(np.arange(count + 1), outside.which)
            if not len(inside):
                raise ValueError(f'ray "{name}" does not meet the piece') from None
            along = along[inside]
            matrix, cells = sampler(body.domain, points[:, inside])
        in_product = np.isin(cells, np.concatenate([body.domain.regions[r] for r in product.regions]))
        if in_product.sum() < 2:
            raise ValueError(f'ray "{name}" does not run through product')
        self._along = along[in_product] * length
        self._matrix = matrix[np.flatnonzero(in_product)]

    def position(self, share: Array, measure: FrozenShare) -> float | None:
        """Return where frozen turns to unfrozen, or the other way, nearest the first point [m]."""
        known = np.nan_to_num(share, nan=0.0) if np.isnan(share).any() else share
        frozen = self._matrix @ known
        inside = frozen > 0.5
        turns = np.flatnonzero(inside[1:] != inside[:-1])
        if measure.sharp:
            return self._sharp(frozen, turns)
        if not len(turns):
            return None
        i = int(turns[0])
        a, b = frozen[i] - 0.5, frozen[i + 1] - 0.5
        return float(self._along[i] + (self._along[i + 1] - self._along[i]) * a / (a - b))

    def _sharp(self, frozen: Array, turns: np.ndarray) -> float | None:
        """Return the place from how much of the cells around the turn has frozen.

        The frozen length between the last whole cell and the first untouched one is the integral
        of the share, whichever side the frozen part lies on.
        """
        along = self._along
        if not len(turns):
            # A front that has not reached half of the first cell, or has less than half of the
            # last one to go, is still inside the ray.
            begun = 0.0 < frozen[0] < 1.0 or 0.0 < frozen[-1] < 1.0
            if not begun:
                return None
            turn = 0 if 0.0 < frozen[0] < 1.0 else len(frozen) - 2
        else:
            turn = int(turns[0])
        rising = frozen[-1] > frozen[0] if not len(turns) else frozen[turn + 1] > frozen[turn]
        share = 1.0 - frozen if rising else frozen
        whole = np.flatnonzero(share[: turn + 1] >= 1.0 - 1e-9)
        first = int(whole[-1]) if len(whole) else 0
        untouched = np.flatnonzero(share[turn + 1 :] <= 1e-9)
        last = turn + 1 + int(untouched[0]) if len(untouched) else len(share) - 1
        return float(along[first] + np.trapezoid(share[first : last + 1], along[first : last + 1]))
